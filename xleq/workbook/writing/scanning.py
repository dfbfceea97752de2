"""Where the rows and cells of a sheet stand in its bytes."""

from __future__ import annotations

import re
from collections.abc import Callable, Collection
from dataclasses import dataclass, field
from typing import Final

from xleq.cells import column_number, parse_address
from xleq.errors import DamagedBookError, ParseError
from xleq.workbook.markup import bare, feed, new_parser
from xleq.workbook.tokens import ATTRIBUTE, TOKEN_BYTES, usual_region

#: A start tag; quoted values may hold anything.
START_TAG: Final = re.compile(rb"""<[^<>"']*(?:"[^"]*"[^<>"']*|'[^']*'[^<>"']*)*>""")


@dataclass(slots=True)
class Span:
    """An element in the bytes of a sheet.

    Parameters
    ----------
    start, end : int
        Where it begins, and one past where it ends.
    tag_end : int
        One past the end of its start tag; equal to `end` when it is ``<like/>``.
    """

    start: int
    tag_end: int
    end: int


@dataclass(slots=True)
class Row(Span):
    """A row, with those of its cells that matter, in the order of the file."""

    number: int
    attributes: dict[str, str]
    cells: list[tuple[int, int, int]] = field(default_factory=list)  # column, start, end


@dataclass(slots=True)
class Layout:
    """What patching needs to know of a sheet's bytes.

    Parameters
    ----------
    prefix : bytes
        Namespace prefix of its elements with the colon, usually empty.
    data : Span
        The `sheetData` element.
    dimension : Span or None
        The `dimension` element, and the text of its `ref`.
    rows : list of Row
        Every row; cells are listed only in the rows asked for.
    column_styles : list of (int, int, str)
        First and last column and style index, for columns that have one.
    """

    prefix: bytes
    data: Span
    rows: list[Row]
    dimension: Span | None = None
    dimension_ref: str = ""
    column_styles: list[tuple[int, int, str]] = field(default_factory=list)


def _kept(attributes: dict[str, str]) -> dict[str, str]:
    """What matters of a row's attributes."""
    return {name: attributes[name] for name in ("r", "s", "customFormat", "spans") if name in attributes}


class _Scanner:
    """Handlers of the parser that notes positions."""

    def __init__(self, data: bytes, wanted_rows: Collection[int]) -> None:
        self.bytes = data
        self.wanted_rows = wanted_rows
        self.rows: list[Row] = []
        self.data: Span | None = None
        self.dimension: Span | None = None
        self.dimension_ref = ""
        self.column_styles: list[tuple[int, int, str]] = []
        self.parser = new_parser()
        self.parser.StartElementHandler = self.start
        self.parser.EndElementHandler = self.end
        self._row: Row | None = None
        self._number = self._column = self._cell_start = 0
        self._starts: dict[str, Callable[[dict[str, str]], None]] = {
            "row": self._start_row,
            "c": self._start_cell,
            "sheetData": self._start_data,
            "dimension": self._start_dimension,
            "col": self._start_col,
        }

    def start(self, name: str, attributes: dict[str, str]) -> None:
        handler = self._starts.get(bare(name))
        if handler is not None:
            handler(attributes)

    def end(self, name: str) -> None:
        local = bare(name)
        if local == "c":
            if self._row is not None:
                self._row.cells.append((self._column, self._cell_start, self._end_of(self._cell_start)))
        elif local == "row":
            row = self.rows[-1]
            row.end = self._end_of(row.start)
            self._row = None
        elif local == "sheetData" and self.data is not None:
            self.data.end = self._end_of(self.data.start)

    def _span(self) -> tuple[int, int]:
        start = self.parser.CurrentByteIndex
        match = START_TAG.match(self.bytes, start)
        if match is None:
            raise DamagedBookError("has a tag that cannot be found in its bytes")
        return start, match.end()

    def _end_of(self, start: int) -> int:
        """One past an element whose end the parser just met."""
        match = START_TAG.match(self.bytes, start)
        if match is None:
            raise DamagedBookError("has a tag that cannot be found in its bytes")
        if match[0].endswith(b"/>"):
            return match.end()
        return self.bytes.index(b">", self.parser.CurrentByteIndex) + 1

    def _start_row(self, attributes: dict[str, str]) -> None:
        text = attributes.get("r")
        self._number = int(text) if text else self._number + 1
        self._column = 0
        start, tag_end = self._span()
        row = Row(start, tag_end, tag_end, self._number, _kept(attributes))
        self.rows.append(row)
        self._row = row if self._number in self.wanted_rows or not text else None

    def _start_cell(self, attributes: dict[str, str]) -> None:
        if self._row is None:
            return
        text = attributes.get("r")
        if text is None:
            self._column += 1
        else:
            self._locate(text, self._row)
        self._cell_start = self.parser.CurrentByteIndex

    def _locate(self, text: str, row: Row) -> None:
        number = str(row.number)
        if text.endswith(number) and text[: -len(number)].isalpha():
            self._column = column_number(text[: -len(number)])
            return
        try:
            found, self._column = parse_address(text)
        except ParseError as error:
            raise DamagedBookError(f"has a cell whose place cannot be read: {error}") from error
        if row.cells or "r" in row.attributes:
            raise DamagedBookError(f"has cell {text} in row {row.number}, so that nothing can be written")
        row.number = self._number = found

    def _start_data(self, _: dict[str, str]) -> None:
        start, tag_end = self._span()
        self.data = Span(start, tag_end, tag_end)

    def _start_dimension(self, attributes: dict[str, str]) -> None:
        start, tag_end = self._span()
        self.dimension, self.dimension_ref = Span(start, tag_end, tag_end), attributes.get("ref", "")

    def _start_col(self, attributes: dict[str, str]) -> None:
        first, last, style = (attributes.get(name, "0") for name in ("min", "max", "style"))
        if style != "0" and first.isdecimal() and last.isdecimal():
            self.column_styles.append((int(first), int(last), style))


def scan(data: bytes, wanted_rows: Collection[int], part: str) -> Layout:
    """Positions of rows, and of the cells of the rows asked for.

    Parameters
    ----------
    data : bytes
        The sheet, in UTF-8.
    wanted_rows : collection of int
        Rows whose cells matter.
    part : str
        Name of the sheet, for messages.

    Raises
    ------
    DamagedBookError
        If the sheet has no `sheetData`, or its cells stand where they cannot be written.
    """
    found = _scan_quickly(data, wanted_rows, part)
    if found is not None:
        return found
    scanner = _Scanner(data, wanted_rows)
    feed(scanner.parser, part, data)
    return _layout(scanner, part)


def _layout(scanner: _Scanner, part: str) -> Layout:
    if scanner.data is None:
        raise DamagedBookError(f"{part} has no cell data")
    tag = scanner.bytes[scanner.data.start + 1 : scanner.data.tag_end]
    prefix = tag[: tag.index(b"sheetData")]
    return Layout(
        prefix,
        scanner.data,
        scanner.rows,
        scanner.dimension,
        scanner.dimension_ref,
        scanner.column_styles,
    )


def _scan_quickly(data: bytes, wanted_rows: Collection[int], part: str) -> Layout | None:
    """As `scan`, by tokens; None when the sheet is not written in the usual way."""
    region = usual_region(data)
    if region is None:
        return None
    start, end = region
    rows = _usual_rows(data, start, end, wanted_rows)
    if rows is None:
        return None
    scanner = _Scanner(data[:start] + data[end:], ())
    feed(scanner.parser, part, scanner.bytes)
    layout = _layout(scanner, part)
    layout.rows = rows
    layout.data.end += end - start
    return layout


def _usual_rows(data: bytes, start: int, end: int, wanted_rows: Collection[int]) -> list[Row] | None:
    rows: list[Row] = []
    columns: dict[bytes, int] = {}
    at, number, inside, wanted = start, b"", False, False
    for token in TOKEN_BYTES.finditer(data, start, end):
        if token.start() != at:
            return None
        at = token.end()
        letters = token[1]
        if letters is not None:
            if not inside or token[2] != number:
                return None
            if wanted:
                column = columns.get(letters) or columns.setdefault(letters, column_number(letters.decode()))
                rows[-1].cells.append((column, token.start(1) - len('<c r="'), at))
        elif token["row"] is not None:
            attributes = dict(ATTRIBUTE.findall(token["row"].decode()))
            number = attributes.get("r", "").encode()
            if inside or not number.isdigit():
                return None
            rows.append(Row(token.start("row") - len("<row"), at, at, int(number), _kept(attributes)))
            inside, wanted = not token["slash"], rows[-1].number in wanted_rows
        else:
            inside = False
            rows[-1].end = at
    return None if inside or data[at:end].strip() else rows
