"""What a workbook says, as records: everything recalculation needs to know about a file.

Rows and columns count from 1. Nothing here computes: formulas are text as the file has it (no leading
``=``), stored values are cell values (`xleq.cells.values`).

A sheet is stored by column of fact, not by cell, because a hundred thousand cells are usual: three
dictionaries from ``(row, column)`` to the stored value, to the formula and to the style. A cell that is
in none of them is blank.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from enum import Enum
from pathlib import Path
from typing import NamedTuple, TypeAlias

from xleq.cells import BLANK, Value, parse_address

#: Row and column of a cell, from 1.
Place: TypeAlias = tuple[int, int]


class Area(NamedTuple):
    """A rectangle of cells, ends included, rows and columns from 1.

    Examples
    --------
    >>> (3, 2) in Area(1, 1, 4, 2).places(), Area(1, 1, 4, 2).holds(3, 2), Area(1, 1, 4, 2).n_cells
    (True, True, 8)
    """

    top: int
    left: int
    bottom: int
    right: int

    def holds(self, row: int, column: int) -> bool:
        """Whether the cell lies inside."""
        return self.top <= row <= self.bottom and self.left <= column <= self.right

    def places(self) -> list[Place]:
        """Every cell of it, row by row."""
        columns = range(self.left, self.right + 1)
        return [(row, column) for row in range(self.top, self.bottom + 1) for column in columns]

    @property
    def n_cells(self) -> int:
        """Number of cells."""
        return (self.bottom - self.top + 1) * (self.right - self.left + 1)


def parse_area(text: str) -> Area:
    """An area from its A1 text; one cell is an area too.

    Raises
    ------
    ParseError
        If it is neither.

    Examples
    --------
    >>> parse_area("B2:D5")
    Area(top=2, left=2, bottom=5, right=4)
    """
    first, _, last = text.partition(":")
    top, left = parse_address(first)
    bottom, right = parse_address(last) if last else (top, left)
    return Area(min(top, bottom), min(left, right), max(top, bottom), max(left, right))


class FormulaKind(Enum):
    """How a formula stands in the file."""

    #: In one cell, or in a cell of a shared group (then `Formula.origin` says where its text was written).
    PLAIN = "plain"
    #: An array formula; its values fill `Formula.area`. With `Formula.dynamic` it spills.
    ARRAY = "array"
    #: A what-if data table over `Formula.area`; it has no text, `Formula.table` tells its inputs.
    DATA_TABLE = "data table"


class DataTable(NamedTuple):
    """Inputs of a what-if data table: ``TABLE(row_input, column_input)``.

    Parameters
    ----------
    two_way : bool
        Whether both a row and a column input vary (`dt2D`).
    by_row : bool
        One-way only: whether `first` takes the values of the row above (`dtr`), else of the column left.
    first, second : str
        Addresses of the input cells (`r1`, `r2`) on the same sheet; `second` only when two-way.
        Two-way: `first` is the row input, `second` the column input.
    first_deleted, second_deleted : bool
        Whether that input cell has been deleted, so that the table cannot be computed.
    """

    two_way: bool
    by_row: bool
    first: str
    second: str
    first_deleted: bool
    second_deleted: bool


class Formula(NamedTuple):
    """The formula of a cell.

    Parameters
    ----------
    text : str or None
        As in the file, without ``=``. In a shared group it is the **master's** text, as it reads in the
        cell `origin`; shift its relative references by (row − origin row, column − origin column).
        None when the file does not tell (a shared cell without a master, a data table): keep the
        stored value.
    origin : tuple of int
        The cell for which `text` is written; the formula's own cell unless it belongs to a shared group.
    kind : FormulaKind
        How it stands in the file.
    area : Area or None
        Cells that an array formula or a data table fills, as the file has it.
    dynamic : bool
        Whether it is a dynamic-array formula (`cm` metadata): it spills, and there is no implicit
        intersection.
    group : int or None
        Number of the shared group in this sheet; unique to one master (the file may reuse its own).
    table : DataTable or None
        Inputs, when `kind` is a data table.
    always : bool
        Whether the file asks to calculate it at every load (`ca`).
    """

    text: str | None
    origin: Place
    kind: FormulaKind = FormulaKind.PLAIN
    area: Area | None = None
    dynamic: bool = False
    group: int | None = None
    table: DataTable | None = None
    always: bool = False


class Cell(NamedTuple):
    """One cell, gathered from its sheet for the reader's convenience."""

    row: int
    column: int
    stored: Value
    formula: Formula | None
    style: int


class SheetKind(Enum):
    """What a tab of the workbook is."""

    WORKSHEET = "worksheet"
    CHART = "chartsheet"
    DIALOG = "dialogsheet"
    MACRO = "macrosheet"


class SheetState(Enum):
    """Whether a tab is shown."""

    VISIBLE = "visible"
    HIDDEN = "hidden"
    VERY_HIDDEN = "veryHidden"


@dataclass(slots=True)
class Sheet:
    """One sheet of a workbook, with its cells.

    Parameters
    ----------
    name : str
        As on its tab.
    index : int
        Place among the tabs, from 0; the scope of local names refers to it.
    part : str
        Member of the archive that holds it.
    kind, state
        What it is, whether it is shown. Only worksheets have cells here.
    stored : dict
        (row, column) → stored value, formula cells and constants alike; blank cells are absent.
    formulas : dict
        (row, column) → `Formula`, in the order of the file.
    styles : dict
        (row, column) → index of its cell format, where not 0.
    used : Area or None
        Smallest area that holds every cell that the file lists with a value or a formula.
    hidden_rows : frozenset of int
        Rows not shown, for whatever reason.
    filtered_rows : frozenset of int
        Those of them that lie in an active filter (SUBTOTAL 1 to 11 leaves these out too).
    hidden_columns : tuple of (int, int)
        First and last column of each hidden stretch.
    formats : sequence of str
        Number-format code of each cell format of the workbook, by style index.
    """

    name: str
    index: int
    part: str
    kind: SheetKind = SheetKind.WORKSHEET
    state: SheetState = SheetState.VISIBLE
    stored: dict[Place, Value] = field(default_factory=dict)
    formulas: dict[Place, Formula] = field(default_factory=dict)
    styles: dict[Place, int] = field(default_factory=dict)
    used: Area | None = None
    hidden_rows: frozenset[int] = frozenset()
    filtered_rows: frozenset[int] = frozenset()
    hidden_columns: tuple[tuple[int, int], ...] = ()
    formats: Sequence[str] = ("General",)

    def cell(self, row: int, column: int) -> Cell:
        """The cell at a place, blank when the file does not list it."""
        place = (row, column)
        return Cell(
            row, column, self.stored.get(place, BLANK), self.formulas.get(place), self.styles.get(place, 0)
        )

    def format_of(self, row: int, column: int) -> str:
        """Number-format code of a cell, for example ``0.00%`` or ``General``."""
        style = self.styles.get((row, column), 0)
        return self.formats[style] if style < len(self.formats) else "General"

    def column_is_hidden(self, column: int) -> bool:
        """Whether a column is not shown."""
        return any(first <= column <= last for first, last in self.hidden_columns)


@dataclass(frozen=True, slots=True)
class DefinedName:
    """A name of the workbook or of one sheet.

    Parameters
    ----------
    name : str
        As written; names are compared without case.
    text : str
        What it refers to: a reference, a constant or any formula, without ``=``.
    scope : int or None
        Index of the sheet it belongs to; None for the whole workbook.
    hidden : bool
        Whether it is kept from the user (filters, parameters of LAMBDA …).
    is_macro : bool
        Whether it names a macro or an add-in's function, so that `text` is no reference.
    """

    name: str
    text: str
    scope: int | None = None
    hidden: bool = False
    is_macro: bool = False


@dataclass(frozen=True, slots=True)
class Table:
    """A table (list object).

    Parameters
    ----------
    name : str
        As structured references use it (`displayName`); compared without case.
    sheet : int
        Index of its sheet.
    area : Area
        Whole table, with header and totals rows.
    header_rows, totals_rows : int
        Number of rows of each kind, 0 or 1.
    columns : tuple of str
        Column names from left to right, unescaped.
    """

    name: str
    sheet: int
    area: Area
    header_rows: int
    totals_rows: int
    columns: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Calculation:
    """Calculation settings of the file.

    Parameters
    ----------
    iterate : bool
        Whether circular references are iterated.
    max_iterations : int
        At most so many rounds.
    max_change : float
        Iteration ends when no value changes by more.
    manual : bool
        Whether the user calculates by hand.
    full_calc_on_load : bool
        Whether the file asks to be calculated when opened.
    full_precision : bool
        False for "precision as displayed".
    r1c1 : bool
        Whether the interface shows R1C1 references (formula text in the file is A1 all the same).
    """

    iterate: bool = False
    max_iterations: int = 100
    max_change: float = 0.001
    manual: bool = False
    full_calc_on_load: bool = False
    full_precision: bool = True
    r1c1: bool = False


@dataclass(frozen=True, slots=True)
class ExternalBook:
    """A workbook or add-in that formulas refer to as ``[n]``, with the values cached in this file.

    Parameters
    ----------
    index : int
        The n of ``[n]``, from 1.
    target : str
        Where the file says it lies; never opened. Empty when unknown.
    sheets : tuple of str
        Names of its sheets, in order.
    values : dict
        (sheet name, row, column) → value cached in this file.
    names : dict
        Its names (add-in functions among them) → what they refer to, "" when not told.
    """

    index: int
    target: str
    sheets: tuple[str, ...] = ()
    values: dict[tuple[str, int, int], Value] = field(default_factory=dict)
    names: dict[str, str] = field(default_factory=dict)


@dataclass(slots=True)
class Book:
    """A workbook as read.

    Parameters
    ----------
    path : Path
        The file.
    sheets : tuple of Sheet
        In the order of the tabs.
    names, tables, links
        Defined names, tables, external books.
    date_1904 : bool
        Whether serial dates count from 1904.
    calculation : Calculation
        Calculation settings.
    has_macros, is_signed : bool
        Whether it carries a macro project, or a digital signature (then it is never written).
    application : str
        Program that says it saved the file, for example ``Microsoft Excel``; empty when not told.
    workbook_part : str
        Member of the archive that holds the workbook's own settings.
    stamp : tuple of int
        Size [bytes] and time of change [ns] of the file when it was read; writing refuses another.
    """

    path: Path
    sheets: tuple[Sheet, ...]
    names: tuple[DefinedName, ...] = ()
    tables: tuple[Table, ...] = ()
    links: tuple[ExternalBook, ...] = ()
    date_1904: bool = False
    calculation: Calculation = Calculation()
    has_macros: bool = False
    is_signed: bool = False
    application: str = ""
    workbook_part: str = ""
    stamp: tuple[int, int] = (0, 0)

    def sheet_named(self, name: str) -> Sheet | None:
        """The sheet of that name, compared without case; None if there is none."""
        wanted = name.casefold()
        return next((sheet for sheet in self.sheets if sheet.name.casefold() == wanted), None)


@dataclass(slots=True)
class SheetResults:
    """What recalculation found for one sheet.

    Parameters
    ----------
    values : dict
        (row, column) → fresh value of a formula cell, or of a cell that an array formula fills. Only
        those whose value differs from the stored one are rewritten. `BLANK` empties the cached value.
    areas : dict
        (row, column) of a dynamic-array formula → the area it fills now, where that differs from the file.
        Cells of its old area that it no longer fills are emptied; they need no entry in `values`.
    inputs : dict
        (row, column) → constant to put in place of a constant or a blank. A formula there is refused.
    """

    values: dict[Place, Value] = field(default_factory=dict)
    areas: dict[Place, Area] = field(default_factory=dict)
    inputs: dict[Place, Value] = field(default_factory=dict)


#: Index of a sheet → its results.
Results: TypeAlias = dict[int, SheetResults]
