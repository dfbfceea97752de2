"""Worksheet functions without a spreadsheet program: single formulas, and whole workbook files."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from datetime import datetime
from functools import partial
from pathlib import Path
from typing import TYPE_CHECKING, Any

from xleq.cells import BLANK, CellAddress, CellError, Grid, Value, parse_address
from xleq.errors import InputError, ParseError
from xleq.units import number_or_none

if TYPE_CHECKING:
    from xleq.recalc import Recalculation
    from xleq.workbook import Book, Written


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

    Raises
    ------
    BookError
        If the workbook is refused; nothing has been written then.
    InputError
        If a setting names no input.
    """
    from xleq.recalc import recalculate
    from xleq.workbook import open_book, write_book

    book = open_book(path)
    found = recalculate(
        book,
        worksheet_functions(),
        overrides=read_settings(book, settings),
        now=now,
        seed=seed,
        trust_fresh=True if trust_fresh else None,
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
        )
    return FileReport(path, found, written)


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
