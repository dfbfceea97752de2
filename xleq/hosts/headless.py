"""Worksheet functions without a spreadsheet program: single formulas, and whole workbook files."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, fields
from datetime import datetime
from functools import partial
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

from xleq.cells import BLANK, CellAddress, CellError, Grid, Value, parse_address
from xleq.errors import InputError, ParseError
from xleq.units import number_or_none

if TYPE_CHECKING:
    from xleq.recalc import Recalculation
    from xleq.workbook import Book, Limits, Written

#: Longest time that a recalculation may take where nothing else is said. [s]
SECONDS: Final = 3600.0


class WorksheetFunctions(Mapping[str, Callable[[list[Any]], Any]]):
    """Every worksheet function as the evaluator calls it, by name.

    The chemistry is imported when the first of them is asked for: many workbooks use none.
    """

    def __getitem__(self, name: str) -> Callable[[list[Any]], Any]:
        if name.startswith("XLEQ_"):
            from xleq.functions import TABLE, call

            if name in TABLE:
                return partial(call, name)
        raise KeyError(name)

    def __iter__(self) -> Iterator[str]:
        from xleq.functions import TABLE

        return iter(TABLE)

    def __len__(self) -> int:
        return sum(1 for _ in self)


def worksheet_functions() -> WorksheetFunctions:
    """Every worksheet function as the evaluator calls it, by name."""
    return WorksheetFunctions()


def evaluate_formula(formula: str, book: Book | None = None) -> Value | Grid:
    """Value or block of one formula.

    Parameters
    ----------
    formula : str
        With or without the equals sign.
    book : Book, optional
        A workbook whose cells and names the formula may use.

    Raises
    ------
    FormulaError
        If it is no formula, or uses something that is not supported.

    Examples
    --------
    >>> evaluate_formula('=2*XLEQ_GAS_CHANGE("N2 + 3 H2 = 2 NH3")')
    -4.0
    """
    from xleq.recalc import evaluate_text

    found = evaluate_text(formula, book, worksheet_functions())
    return found.rows() if hasattr(found, "rows") else found


@dataclass(frozen=True, slots=True)
class FileReport:
    """What recalculating one workbook file did.

    Parameters
    ----------
    path : Path
        The workbook.
    found : Recalculation
        Fresh values, changes, kept cells, disagreements.
    written : Written or None
        What was written; None where nothing was to be.
    """

    path: Path
    found: Recalculation
    written: Written | None

    @property
    def complete(self) -> bool:
        """Whether every formula was computed and none contradicts its stored value."""
        return not (self.found.kept or self.found.disagreements)

    def errors(self) -> list[tuple[CellAddress, CellError]]:
        """Cells that show an error for which there is a reason, where it arose."""
        return [
            (address, value)
            for address, value in self.found.values.items()
            if isinstance(value, CellError) and value.reason and value.origin in ("", str(address))
        ]


def recalculate_file(
    path: Path,
    out: Path | None = None,
    *,
    in_place: bool = False,
    backup: bool = True,
    settings: Sequence[str] = (),
    trust_fresh: bool = False,
    now: datetime | None = None,
    seed: int = 0,
    limits: Limits | None = None,
    seconds: float = SECONDS,
) -> FileReport:
    """Recalculate a workbook and, if asked to, write it.

    Parameters
    ----------
    path : Path
    out : Path, optional
        Where the recalculated copy goes. With neither this nor `in_place`, nothing is written.
    in_place : bool
        Replace the workbook itself.
    backup : bool
        In place, keep the old file beside the new one.
    settings : sequence of str
        Inputs to change first, as ``ADDRESS=VALUE``; see `read_settings`.
    trust_fresh : bool
        Write fresh values even where a stored value could not be reproduced.
    now : datetime, optional
        What NOW and TODAY tell; the present by default.
    seed : int
        Of the random numbers.
    limits : Limits, optional
        Which workbooks are too large; see `read_limits`.
    seconds : float
        Longest time that the recalculation may take. [s]

    Raises
    ------
    BookError
        If the workbook is refused, or takes too long; nothing has been written then.
    InputError
        If a setting names no input.
    """
    from xleq.recalc import recalculate
    from xleq.workbook import open_book, write_book
    from xleq.workbook.package import about

    book = open_book(path, limits)
    with about(path):
        found = recalculate(
            book,
            worksheet_functions(),
            overrides=read_settings(book, settings),
            now=now,
            seed=seed,
            trust_fresh=True if trust_fresh else None,
            seconds=seconds,
        )
    written = None
    if out is not None or in_place:
        if out is not None:
            out.parent.mkdir(parents=True, exist_ok=True)
        written = write_book(
            book,
            found.results,
            out,
            in_place=in_place,
            keep_backup=backup,
            recalculate_on_load=bool(found.kept or found.disagreements),
            limits=limits,
        )
    return FileReport(path, found, written)


def read_limits(texts: Sequence[str]) -> tuple[Limits, float]:
    """Limits from texts such as ``cells=20000000`` or ``seconds=60``.

    Parameters
    ----------
    texts : sequence of str
        ``NAME=VALUE`` with the names of `xleq.workbook.Limits`, or ``seconds``; the last of a name counts.

    Returns
    -------
    limits : Limits
    seconds : float
        Longest time that a recalculation may take. [s]

    Raises
    ------
    InputError
        If a name is none of a limit, or a value is not a number above 0 (whole, where it counts things).

    Examples
    --------
    >>> limits, seconds = read_limits(["cells=2E6", "seconds=0.5"])
    >>> limits.cells, limits.entries, seconds
    (2000000, 20000, 0.5)
    """
    from xleq.workbook import Limits

    whole = {f.name: isinstance(f.default, int) for f in fields(Limits)} | {"seconds": False}
    found: dict[str, float] = {}
    for text in texts:
        name, equals, value = (part.strip() for part in text.partition("="))
        if not equals:
            raise InputError(f"{text!r}: a limit is written NAME=VALUE, for example seconds=60")
        if name not in whole:
            raise InputError(f"{name!r} is not a limit; the limits are {', '.join(whole)}")
        number = number_or_none(value)
        if number is None or number <= 0 or (whole[name] and number != int(number)):
            wanted = "a whole number" if whole[name] else "a number"
            raise InputError(f"the limit {name} must be {wanted} above 0, not {value!r}")
        found[name] = int(number) if whole[name] else number
    seconds = found.pop("seconds", SECONDS)
    return Limits(**found), seconds  # type: ignore[arg-type]


def read_settings(book: Book, settings: Sequence[str]) -> Mapping[CellAddress, Value]:
    """Input cells and their new values from texts such as ``Loop!B15=460`` or ``T_outlet=460``.

    Parameters
    ----------
    book : Book
    settings : sequence of str
        Address with or without a sheet (then the first one), or a defined name of one cell; then ``=`` and a
        number, TRUE, FALSE, or text. Text in double quotes is text even where it looks like a number;
        nothing empties the cell.

    Raises
    ------
    InputError
        If a text is not of this form, or names no cell.
    """
    found: dict[CellAddress, Value] = {}
    for text in settings:
        place, equals, value = text.partition("=")
        if not equals or not place.strip():
            raise InputError(f"{text!r}: a setting is written ADDRESS=VALUE, for example Loop!B15=460")
        found[_cell_named(book, place.strip())] = _constant(value.strip())
    return found


def _cell_named(book: Book, text: str) -> CellAddress:
    for name in book.names:
        if name.name.casefold() == text.casefold():
            return _address(book, name.text, f"the name {text} stands for {name.text}, which is not one cell")
    return _address(book, text, f"{text!r} is neither the address of a cell nor a defined name")


def _address(book: Book, text: str, otherwise: str) -> CellAddress:
    sheet_text, bang, cell = text.rpartition("!")
    if bang:
        if sheet_text.startswith("'") and sheet_text.endswith("'"):
            sheet_text = sheet_text[1:-1].replace("''", "'")
        sheet = book.sheet_named(sheet_text)
        if sheet is None:
            known = ", ".join(s.name for s in book.sheets)
            raise InputError(f"there is no sheet {sheet_text!r}; the workbook has {known}")
    else:
        sheet = book.sheets[0]
    try:
        row, column = parse_address(cell)
    except ParseError as e:
        raise InputError(otherwise) from e
    return CellAddress(sheet.name, row, column)


def _constant(text: str) -> Value:
    if not text:
        return BLANK
    if len(text) > 1 and text[0] == text[-1] == '"':
        return text[1:-1]
    if text.upper() in ("TRUE", "FALSE"):
        return text.upper() == "TRUE"
    number = number_or_none(text)
    return text if number is None else number
