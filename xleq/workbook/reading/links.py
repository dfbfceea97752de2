"""External books: what this file remembers of the workbooks and add-ins that its formulas name."""

from __future__ import annotations

import math

from xleq.cells import BLANK, Value, error_named, parse_address
from xleq.errors import DamagedBookError, ParseError
from xleq.workbook.markup import Node, is_true, unescaped
from xleq.workbook.package import Package
from xleq.workbook.records import ExternalBook


def read_links(package: Package, workbook: Node, part: str) -> tuple[ExternalBook, ...]:
    """Every external book in the order of its number; never opens one.

    Raises
    ------
    DamagedBookError
        If a part is missing or a cached value cannot be read.
    """
    by_id = {link.id: link for link in package.relationships(part)}
    books = []
    for index, node in enumerate(workbook.inside("externalReferences", "externalReference"), 1):
        link = by_id.get(node.get("id"))
        if link is None or not package.has(link.target):
            books.append(ExternalBook(index, ""))
        else:
            books.append(_read_link(package, index, link.target))
    return tuple(books)


def _read_link(package: Package, index: int, part: str) -> ExternalBook:
    node = package.tree(part).first("externalBook")
    if node is None:  # a DDE or OLE link: no cells to remember
        return ExternalBook(index, "")
    targets = {link.id: link.target for link in package.relationships(part)}
    sheets = tuple(unescaped(sheet.get("val")) for sheet in node.inside("sheetNames", "sheetName"))
    names = {
        unescaped(name.get("name")): unescaped(name.get("refersTo")).removeprefix("=")
        for name in node.inside("definedNames", "definedName")
    }
    values: dict[tuple[str, int, int], Value] = {}
    for data in node.inside("sheetDataSet", "sheetData"):
        number = data.get("sheetId")
        if number.isdecimal() and int(number) < len(sheets):
            _read_values(data, sheets[int(number)], values, part)
    return ExternalBook(index, targets.get(node.get("id"), ""), sheets, values, names)


def _read_values(data: Node, sheet: str, values: dict[tuple[str, int, int], Value], part: str) -> None:
    for cell in (cell for row in data.all("row") for cell in row.all("cell")):
        try:
            row, column = parse_address(cell.get("r"))
            value = _value_of(cell)
        except (ParseError, ValueError) as error:
            raise DamagedBookError(f"has a cached value that cannot be read in {part!r}: {error}") from error
        if value is not BLANK:
            values[sheet, row, column] = value


def _value_of(cell: Node) -> Value:
    node, kind = cell.first("v"), cell.get("t", "n")
    if node is None or (not node.text and kind != "str"):
        return BLANK
    if kind == "str":
        return unescaped(node.text)
    if kind == "b":
        return is_true(node.text)
    if kind == "e":
        return error_named(node.text)
    number = float(node.text)
    if not math.isfinite(number):
        raise ValueError(node.text)
    return number
