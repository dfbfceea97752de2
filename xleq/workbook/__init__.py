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
from xleq.workbook.writing.placing import open_elsewhere
from xleq.workbook.writing.saving import Written, write_book

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
    "Written",
    "open_book",
    "open_elsewhere",
    "write_book",
]
