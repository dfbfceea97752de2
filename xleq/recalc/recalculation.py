"""Recalculation of a whole workbook, and of one formula."""

from __future__ import annotations

import gc
import time
from collections.abc import Callable, Iterator, Mapping
from contextlib import contextmanager
from dataclasses import dataclass, field
from datetime import datetime
from pathlib import Path
from typing import TYPE_CHECKING, Any

from xleq.cells import BLANK, CellAddress, Value
from xleq.errors import FormulaError, InputError
from xleq.recalc.depth import deep
from xleq.recalc.texts import reading_dates
from xleq.workbook import Area as BookArea
from xleq.workbook import Book, Results, Sheet, SheetResults

if TYPE_CHECKING:
    from xleq.recalc.operands import Array
    from xleq.recalc.sheets.evaluate import Cell, Engine

#: Worksheet functions by name in capitals. Each takes the list of its arguments: a value, a `Grid` where the
#: argument is several cells, `MISSING` where it is left out; and gives a value or a `Grid`.
Functions = Mapping[str, Callable[[list[Any]], Any]]

#: Rounds after which spills that still grow are taken as they are.
_ROUNDS = 8


@dataclass(frozen=True, slots=True)
class Change:
    """A cell whose fresh value is not the stored one.

    Parameters
    ----------
    address : CellAddress
    stored, fresh : Value
    """

    address: CellAddress
    stored: Value
    fresh: Value


@dataclass(frozen=True, slots=True)
class Kept:
    """A formula that keeps its stored value.

    Parameters
    ----------
    address : CellAddress
    stored : Value
    reason : str
        Why it was not computed.
    """

    address: CellAddress
    stored: Value
    reason: str


@dataclass(frozen=True, slots=True)
class Marked:
    """A formula that depends on one which does not reproduce its stored value.

    Parameters
    ----------
    address : CellAddress
    because : CellAddress
        The cell through which it does.
    """

    address: CellAddress
    because: CellAddress


@dataclass(slots=True)
class Recalculation:
    """What recalculating a workbook found.

    Parameters
    ----------
    values : dict
        Address → fresh value of every formula cell and of every cell that a formula fills; those that keep
        their stored value are not here.
    changed : list of Change
        Cells among them whose value is new.
    kept : list of Kept
        Formulas that keep their stored value.
    disagreements : list of Change
        Formulas that do not reproduce their stored value from stored inputs, with what they gave.
        Unless their inputs changed, they keep the stored value.
    marked : list of Marked
        Formulas that depend on those.
    followed : list of CellAddress
        Formulas whose inputs changed; their own stored values were checked on the stored inputs.
    results : dict
        What `xleq.workbook.write_book` takes.
    n_formulas : int
        Number of formulas.
    seconds : float
        Time it took. [s]
    """

    values: dict[CellAddress, Value] = field(default_factory=dict)
    changed: list[Change] = field(default_factory=list)
    kept: list[Kept] = field(default_factory=list)
    disagreements: list[Change] = field(default_factory=list)
    marked: list[Marked] = field(default_factory=list)
    followed: list[CellAddress] = field(default_factory=list)
    results: Results = field(default_factory=dict)
    n_formulas: int = 0
    seconds: float = 0.0


def recalculate(
    book: Book,
    functions: Functions,
    *,
    overrides: Mapping[CellAddress, Value] | None = None,
    now: datetime | None = None,
    seed: int = 0,
    trust_fresh: bool | None = None,
    seconds: float = 3600.0,
) -> Recalculation:
    """Fresh values of every formula of a workbook.

    Parameters
    ----------
    book : Book
    functions : mapping
        Worksheet functions by name in capitals; see `Functions`.
    overrides : mapping, optional
        Address → constant in place of the file's constant.
    now : datetime, optional
        What NOW and TODAY tell; the present by default.
    seed : int
        Of the random numbers.
    trust_fresh : bool, optional
        Whether a fresh value is taken although it disagrees with the stored one. By default the file
        says: one that asks to be calculated when it is opened does not vouch for its values.
    seconds : float
        Longest time that it may take. [s]

    Raises
    ------
    InputError
        If an override names no sheet of the book, or a cell that holds a formula.
    LimitError
        If it takes longer; the time is looked at between cells.
    """
    from xleq.recalc.sheets.check import recheck
    from xleq.recalc.sheets.evaluate import Engine, Settings

    start = time.perf_counter()
    trust = book.calculation.full_calc_on_load if trust_fresh is None else trust_fresh
    settings = Settings(now or datetime.now(), seed, seconds, not trust)
    inputs = _inputs(book, overrides or {})
    areas: dict[Cell, Any] = {}
    with _without_collection(), deep(), reading_dates(settings.now.year, book.date_1904):
        for _ in range(_ROUNDS):
            engine = Engine(book, functions, settings, inputs, areas)
            engine.everything()
            if not engine.spread.grown:
                break
            areas = dict(engine.spread.spills)
        found = _gathered(engine)
        if engine.unchecked:
            found.disagreements += [_change(book, d.cell, d.stored, d.fresh) for d in recheck(engine)]
    found.seconds = time.perf_counter() - start
    return found


@contextmanager
def _without_collection() -> Iterator[None]:
    """Leave out the search for cyclic garbage: many objects are made here, none of them in cycles."""
    was_enabled = gc.isenabled()
    gc.disable()
    try:
        yield
    finally:
        if was_enabled:
            gc.enable()


def _inputs(book: Book, overrides: Mapping[CellAddress, Value]) -> dict[Cell, Value]:
    found: dict[Cell, Value] = {}
    for address, value in overrides.items():
        sheet = book.sheet_named(address.sheet)
        if sheet is None:
            raise InputError(f"there is no sheet {address.sheet!r}")
        if (address.row, address.column) in sheet.formulas:
            raise InputError(f"{address} holds a formula; only inputs can be set")
        found[(sheet.index, address.row, address.column)] = value
    return found


def _change(book: Book, cell: Cell, stored: Value, fresh: Value) -> Change:
    return Change(_address(book, cell), stored, fresh)


def _address(book: Book, cell: Cell) -> CellAddress:
    sheet = book.sheets[cell[0]].name if cell[0] < len(book.sheets) else "a linked book"
    return CellAddress(sheet, cell[1], cell[2])


def _gathered(engine: Engine) -> Recalculation:
    from xleq.recalc.sheets.evaluate import identical

    book = engine.book
    found = Recalculation(n_formulas=sum(len(sheet.formulas) for sheet in book.sheets))
    for sheet in book.sheets:
        name, stored = sheet.name, sheet.stored
        fresh = engine.results[sheet.index]
        results = SheetResults()
        for spot, value in fresh.items():
            address = CellAddress(name, *spot)
            found.values[address] = value
            before = stored.get(spot, BLANK)
            if not identical(value, before):
                found.changed.append(Change(address, before, value))
                results.values[spot] = value
        for (index, row, column), value in engine.inputs.items():
            if index == sheet.index:
                results.inputs[(row, column)] = value
        for (index, row, column), area in engine.spread.spills.items():
            if index == sheet.index and tuple(area[1:]) != tuple(sheet.formulas[(row, column)].area or ()):
                results.areas[(row, column)] = BookArea(*area[1:])
        if results.values or results.inputs or results.areas:
            found.results[sheet.index] = results
    for cell, reason in engine.kept.items():
        value = book.sheets[cell[0]].stored.get(cell[1:], BLANK)
        found.kept.append(Kept(_address(book, cell), value, reason))
    found.disagreements = [_change(book, d.cell, d.stored, d.fresh) for d in engine.disagreements]
    found.followed = [_address(book, cell) for cell in engine.unchecked]
    found.marked = [Marked(_address(book, c), _address(book, b)) for c, b in engine.marked.items()]
    return found


def evaluate_text(
    formula: str,
    book: Book | None = None,
    functions: Functions | None = None,
    *,
    now: datetime | None = None,
    seed: int = 0,
) -> Value | Array:
    """The value of a formula, as if it were typed into a sheet with dynamic arrays.

    Parameters
    ----------
    formula : str
        With or without the equals sign.
    book : Book, optional
        A workbook whose cells and names it may use; references without a sheet mean the first one.
    functions : mapping, optional
        Worksheet functions by name in capitals; see `Functions`.

    Raises
    ------
    FormulaError
        If the text is no formula, or needs something that is not supported.

    Examples
    --------
    >>> evaluate_text("=SUM({1,2,3})*2")
    12.0
    >>> evaluate_text("=1/0").reason
    'divided by zero'
    """
    from xleq.recalc.operands import Array
    from xleq.recalc.sheets.columns import Blocked, Unsupported
    from xleq.recalc.sheets.evaluate import Engine, Settings, single_value
    from xleq.recalc.syntax.parse import parse

    if book is None:
        book = Book(Path(), (Sheet("Sheet1", 0, ""),))
    engine = Engine(book, functions or {}, Settings(now or datetime.now(), seed, check=False), {}, {})
    try:
        with deep(), reading_dates(engine.now().year, book.date_1904):
            run = engine.compilers[0].formula(parse(formula), True)
            while True:
                at = engine.place((0, 1, 1), array=True)
                try:
                    found = run(at)
                    break
                except Blocked as blocked:
                    for cell in blocked.cells:
                        engine.settle(cell)
    except Unsupported as reason:
        raise FormulaError(str(reason)) from None
    except RecursionError:
        raise FormulaError("the formula is nested too deeply") from None
    if isinstance(found, Array):
        return Array(found.height, found.width, [single_value(v) for v in found.flat])
    return single_value(found)
