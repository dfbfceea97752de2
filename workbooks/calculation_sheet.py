"""The look of a calculation sheet at Hallow Fen Works, shared by the scripts that make the example workbooks.

Everything in these workbooks is invented: the site, its numbers, its people. What a script writes are labels,
inputs and formulas; the values that stand beside the formulas are computed afterwards by xleq itself.
"""

from __future__ import annotations

from pathlib import Path

from openpyxl import Workbook
from openpyxl.comments import Comment
from openpyxl.styles import Alignment, Border, Font, PatternFill, Side
from openpyxl.utils import get_column_letter
from openpyxl.worksheet.worksheet import Worksheet

INK = "22313F"
ACCENT = "1F5C66"
PALE = "E4EEF0"
INPUT = "FFF6DC"
RESULT = "E3F1E1"
RULE = "9FB4B9"

CAUTIONS = (
    "Equilibrium is a limit: it says nothing about how fast, and it is not a design.",
    (
        "Invented figures for illustration. Before use in pressurised, toxic or flammable service, "
        "a qualified person must check the calculation; local codes and licensed practice decide."
    ),
)

_LINE = Side(style="thin", color=RULE)


def new_sheet(book: Workbook, name: str, widths: list[float]) -> Worksheet:
    """A sheet with the house's fonts, column widths and page set-up."""
    sheet: Worksheet = book.create_sheet(name)
    for i, width in enumerate(widths, 1):
        sheet.column_dimensions[get_column_letter(i)].width = width
    sheet.sheet_view.showGridLines = False
    sheet.page_setup.orientation = "landscape"
    sheet.page_setup.paperSize = 9
    sheet.page_setup.fitToWidth = 1
    sheet.page_setup.fitToHeight = 1
    sheet.sheet_properties.pageSetUpPr.fitToPage = True
    sheet.oddFooter.left.text = "&F  &A"
    sheet.oddFooter.right.text = "page &P of &N"
    return sheet


def title_block(sheet: Worksheet, title: str, number: str, revision: str, columns: int) -> int:
    """Site, title, number, revision, prepared and checked, with the cautions; gives the next free row."""
    last = get_column_letter(columns)
    for row in (1, 2):
        for column in range(1, columns + 1):
            sheet.cell(row, column).fill = PatternFill("solid", fgColor=ACCENT)
    sheet["A1"] = "Hallow Fen Works"
    sheet["A1"].font = Font(name="Calibri", size=10, color="FFFFFF")
    sheet["A2"] = title
    sheet["A2"].font = Font(name="Calibri", size=16, bold=True, color="FFFFFF")
    sheet.row_dimensions[2].height = 24
    facts = (
        ("Calculation", number, "Revision", revision),
        ("Prepared", "J. Marl, 2026-11-03", "Checked", "not yet checked"),
    )
    for row, (a, b, c, d) in enumerate(facts, 3):
        for column, text in ((1, a), (2, b), (4, c), (5, d)):
            cell = sheet.cell(row, column, text)
            cell.font = Font(name="Calibri", size=10, color=INK, bold=column in (2, 5))
    for row, text in enumerate(CAUTIONS, 5):
        sheet.merge_cells(f"A{row}:{last}{row}")
        cell = sheet.cell(row, 1, text)
        cell.font = Font(name="Calibri", size=9, italic=True, color=INK)
        cell.alignment = Alignment(wrap_text=True, vertical="top")
        sheet.row_dimensions[row].height = 14 if len(text) < 130 else 26
    for column in range(1, columns + 1):
        sheet.cell(6, column).border = Border(bottom=_LINE)
    return 8


def heading(sheet: Worksheet, row: int, text: str, columns: int) -> int:
    """A section's heading; gives the row below it."""
    cell = sheet.cell(row, 1, text)
    cell.font = Font(name="Calibri", size=12, bold=True, color=ACCENT)
    for column in range(1, columns + 1):
        sheet.cell(row, column).border = Border(bottom=_LINE)
    return row + 1


def column_heads(sheet: Worksheet, row: int, heads: list[str], first: int = 1) -> int:
    """Heads of a table; gives the row below them."""
    for column, text in enumerate(heads, first):
        cell = sheet.cell(row, column, text)
        cell.font = Font(name="Calibri", size=10, bold=True, color=INK)
        cell.fill = PatternFill("solid", fgColor=PALE)
        cell.alignment = Alignment(
            wrap_text=True, vertical="center", horizontal="left" if column == 1 else "center"
        )
    return row + 1


def label(sheet: Worksheet, row: int, text: str, column: int = 1) -> None:
    """Plain text of the sheet."""
    cell = sheet.cell(row, column, text)
    cell.font = Font(name="Calibri", size=10, color=INK)
    cell.alignment = Alignment(vertical="center")


def note(sheet: Worksheet, row: int, column: int, text: str) -> None:
    """A remark, or the source of a value, in small print."""
    cell = sheet.cell(row, column, text)
    cell.font = Font(name="Calibri", size=9, italic=True, color=INK)
    cell.alignment = Alignment(vertical="center")


def entry(sheet: Worksheet, address: str, value: object, number_format: str = "General") -> None:
    """A value that the user may change."""
    _fill(sheet, address, value, number_format, INPUT)


def result(sheet: Worksheet, address: str, formula: object, number_format: str = "General") -> None:
    """A formula that is a result of the sheet."""
    _fill(sheet, address, formula, number_format, RESULT)


def step(sheet: Worksheet, address: str, formula: object, number_format: str = "General") -> None:
    """A formula on the way."""
    _fill(sheet, address, formula, number_format, None)


def _fill(sheet: Worksheet, address: str, value: object, number_format: str, colour: str | None) -> None:
    sheet[address] = value
    cell = sheet[address]
    cell.number_format = number_format
    cell.font = Font(name="Calibri", size=10, color=INK)
    cell.border = Border(left=_LINE, right=_LINE, top=_LINE, bottom=_LINE)
    if isinstance(value, str) and not value.startswith("="):
        cell.alignment = Alignment(horizontal="center")
    if colour:
        cell.fill = PatternFill("solid", fgColor=colour)


def remark(sheet: Worksheet, address: str, text: str) -> None:
    """A comment on a cell."""
    comment = Comment(text, "J. Marl")
    comment.width, comment.height = 320, 110
    sheet[address].comment = comment


def save(book: Workbook, path: Path) -> None:
    """Save the workbook, then let xleq compute the value beside each formula."""
    from xleq.hosts.headless import recalculate_file

    del book["Sheet"]
    book.properties.creator = "Hallow Fen Works"
    book.properties.title = path.stem.replace("_", " ")
    book.save(path)
    report = recalculate_file(path, in_place=True, backup=False)
    assert report.complete, report.found.kept or report.found.disagreements
    assert not report.errors(), report.errors()
