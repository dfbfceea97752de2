"""Opening a workbook and writing fresh cached values into a copy that lost nothing else. No chemistry."""

from xleq.workbook.limits import Limits
from xleq.workbook.reading.opening import open_book
from xleq.workbook.records import (
    Area,
    Book,
    Calculation,
    Cell,
    DataTable,
    DefinedName,
    ExternalBook,
    Formula,
    FormulaKind,
    Place,
    Results,
    Sheet,
    SheetKind,
    SheetResults,
    SheetState,
    Table,
)

__all__ = [
    "Area",
    "Book",
    "Calculation",
    "Cell",
    "DataTable",
    "DefinedName",
    "ExternalBook",
    "Formula",
    "FormulaKind",
    "Limits",
    "Place",
    "Results",
    "Sheet",
    "SheetKind",
    "SheetResults",
    "SheetState",
    "Table",
    "open_book",
]
