"""The cells of a sheet, in one streaming pass.

openpyxl is not used for cells: it takes two loads for formulas and values (8.6 s for 110,000 cells,
against about half a second here), drops the dynamic-array mark and loses shared groups.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Container
from typing import Final, Protocol

from xleq.cells import (
    BLANK,
    ERRORS,
    MAX_COLUMN,
    MAX_ROW,
    Value,
    address_text,
    column_number,
    error_named,
    parse_address,
)
from xleq.errors import DamagedBookError, LimitError, ParseError
from xleq.workbook.collecting import collection_paused
from xleq.workbook.limits import Limits
from xleq.workbook.markup import bare, feed, is_true, new_parser, unescaped
from xleq.workbook.reading.dates import serial_of
from xleq.workbook.reading.metadata import Metadata
from xleq.workbook.reading.quick import NotUsualError, read_quickly
from xleq.workbook.records import Area, DataTable, Formula, FormulaKind, Place, Sheet, parse_area

_NO_ATTRIBUTES: Final[dict[str, str]] = {}


class Shared(Protocol):
    """What a sheet needs to know about its workbook."""

    strings: list[str]
    metadata: Metadata
    date_1904: bool
    text_may_be_error: bool
    limits: Limits
    n_cells: int


class SheetReader:
    """Handlers of the streaming parser; one instance reads one sheet."""

    def __init__(self, sheet: Sheet, shared: Shared) -> None:
        self.sheet = sheet
        self.shared = shared
        self.hidden_rows: set[int] = set()
        self.hidden_columns: list[tuple[int, int]] = []
        self.filter_area: Area | None = None
        self._depth_left = shared.limits.xml_depth
        self.cells_left = shared.limits.cells - shared.n_cells
        self._columns: dict[str, int] = {}
        self._masters: dict[str, Formula] = {}
        self._orphans: list[tuple[Place, str]] = []
        self._n_groups = 0
        self._row = self._column = 0
        self._row_text = "0"
        self._type = "n"
        self._text = ""
        self._value: str | None = None
        self._formula: str | None = None
        self._formula_attributes = _NO_ATTRIBUTES
        self._inline: list[str] = []
        self._phonetic = 0
        self._extension = 0
        self._pending_filter: Area | None = None
        self._starts: dict[str, Callable[[dict[str, str]], None]] = {
            "row": self.start_row,
            "c": self._start_cell,
            "f": self._start_formula,
            "rPh": self._start_phonetic,
            "extLst": self._start_extension,
            "col": self._start_col,
            "autoFilter": self._start_filter,
            "filterColumn": self._start_filter_column,
        }
        self._dynamic = False
        self._rich = ""

    # What the parser calls

    def start(self, name: str, attributes: dict[str, str]) -> None:
        """An element begins."""
        self._depth_left -= 1
        if self._depth_left < 0:
            raise LimitError("has too many elements inside one another (xml_depth)")
        self._text = ""
        handler = self._starts.get(bare(name))
        if handler is not None and not self._extension:
            handler(attributes)

    def characters(self, text: str) -> None:
        """Text, or a piece of it."""
        self._text += text

    def end(self, name: str) -> None:
        """An element ends."""
        self._depth_left += 1
        local = bare(name)
        if self._extension:  # whatever it holds is nothing of the cell's
            self._extension -= local == "extLst"
        elif local == "v":
            self._value = self._text
        elif local == "c":
            self._end_cell()
        elif local == "f":
            self._formula = self._text
        elif local == "t":
            if not self._phonetic:
                self._inline.append(self._text)
        elif local == "rPh":
            self._phonetic -= 1

    # Rows, columns, filters

    def start_row(self, attributes: dict[str, str]) -> None:
        """A row begins."""
        text = attributes.get("r")
        if text is None:
            self._row += 1
        else:
            self._row = self._whole(text, MAX_ROW, "row number")
        self._row_text = text or str(self._row)
        self._column = 0
        if "hidden" in attributes and is_true(attributes["hidden"]):
            self.hidden_rows.add(self._row)

    def _start_col(self, attributes: dict[str, str]) -> None:
        if is_true(attributes.get("hidden", "")):
            first = self._whole(attributes.get("min", ""), MAX_COLUMN, "column number")
            last = self._whole(attributes.get("max", ""), MAX_COLUMN, "column number")
            self.hidden_columns.append((first, last))

    def _start_filter(self, attributes: dict[str, str]) -> None:
        self._pending_filter = self._area(attributes.get("ref", ""))

    def _start_filter_column(self, _: dict[str, str]) -> None:
        self.filter_area = self._pending_filter

    def _start_phonetic(self, _: dict[str, str]) -> None:
        self._phonetic += 1

    def _start_extension(self, _: dict[str, str]) -> None:
        self._extension = 1

    # Cells

    def _start_cell(self, attributes: dict[str, str]) -> None:
        self.cells_left -= 1
        if self.cells_left < 0:
            raise LimitError(f"brings the book over {self.shared.limits.cells} cells (cells)")
        text = attributes.get("r")
        if text is None:
            self._column += 1
            if self._column > MAX_COLUMN or not 1 <= self._row <= MAX_ROW:
                raise DamagedBookError(f"has a cell outside the sheet in row {self._row}")
        elif text.endswith(self._row_text) and text[: -len(self._row_text)] in self._columns:
            self._column = self._columns[text[: -len(self._row_text)]]
        else:
            self._locate(text)
        self._type = attributes.get("t", "n")
        style = attributes.get("s", "0")
        if style != "0":
            self.sheet.styles[self._row, self._column] = self._whole(style, 1 << 20, "style index", least=0)
        mark = attributes.get("cm")
        self._rich = attributes.get("vm", "")
        self._dynamic = mark is not None and mark.isdigit() and int(mark) in self.shared.metadata.dynamic
        self._value = self._formula = None
        self._inline = []

    def _locate(self, text: str) -> None:
        try:
            row, column = parse_address(text)
        except ParseError as error:
            raise DamagedBookError(f"has a cell whose place cannot be read: {error}") from error
        if row == self._row:
            letters = text[: -len(self._row_text)]
            if letters.isalpha():
                self._columns[letters] = column_number(letters)
        self._row, self._column, self._row_text = row, column, str(row)

    def take_cell(
        self,
        place: Place,
        kind: str,
        mark: str | None,
        rich: str | None,
        formula_attributes: dict[str, str] | None,
        formula: str,
        value: str | None,
        inline: str | None,
    ) -> None:
        """A cell that was taken apart elsewhere; `formula_attributes` is None where it has no formula."""
        self._row, self._column = place
        self._type, self._value, self._rich = kind, value, rich or ""
        self._dynamic = mark is not None and int(mark) in self.shared.metadata.dynamic
        self._formula = None if formula_attributes is None else formula
        self._formula_attributes = formula_attributes or _NO_ATTRIBUTES
        self._inline = [] if inline is None else [inline]
        self._end_cell()

    def _start_formula(self, attributes: dict[str, str]) -> None:
        self._formula_attributes = attributes

    def _end_cell(self) -> None:
        place = (self._row, self._column)
        sheet = self.sheet
        value = self._read_value()
        if self._formula is not None:
            formula = self._read_formula(place, self._formula)
            if formula is not None:
                self._refuse_twice(place, sheet.formulas)
                sheet.formulas[place] = formula
                if self._type == "str" and self.shared.text_may_be_error and value in ERRORS:
                    value = error_named(str(value))
        if value is not BLANK:
            self._refuse_twice(place, sheet.stored)
            sheet.stored[place] = value

    @staticmethod
    def _refuse_twice(place: Place, cells: Container[Place]) -> None:
        if place in cells:
            raise DamagedBookError(f"lists cell {address_text(*place)} twice")

    def _read_value(self) -> Value:
        text, kind = self._value, self._type
        if kind == "inlineStr":
            return unescaped("".join(self._inline) if self._inline or not text else text)
        if text is None or (text == "" and kind != "str"):
            return BLANK
        try:
            return self._decoded(text, kind)
        except (ValueError, IndexError) as error:
            where = address_text(self._row, self._column)
            raise DamagedBookError(f"holds {text[:40]!r} in {where}, which is no {kind!r} value") from error

    def _decoded(self, text: str, kind: str) -> Value:
        if kind == "n":
            number = float(text)
            if not math.isfinite(number) or "_" in text or not text.isascii():
                raise ValueError(text)
            return number
        if kind == "s":
            index = int(text)
            if index < 0:
                raise IndexError(text)
            return self.shared.strings[index]
        if kind == "str":
            return unescaped(text)
        if kind == "b":
            return is_true(text.strip())
        if kind == "e":
            errors = self.shared.metadata.errors
            rich = errors.get(int(self._rich)) if errors and self._rich.isdecimal() else None
            return rich or error_named(text.strip())
        if kind == "d":
            return serial_of(text.strip(), self.shared.date_1904)
        raise ValueError(kind)

    # Formulas

    def _read_formula(self, place: Place, text: str) -> Formula | None:
        attributes = self._formula_attributes
        if len(text) > self.shared.limits.formula_length:
            where = address_text(*place)
            raise LimitError(
                f"has a formula of {len(text)} characters in {where}; the limit (formula_length) is "
                f"{self.shared.limits.formula_length}"
            )
        if "_x" in text:
            text = unescaped(text)
        text = text[1:] if text.startswith("=") else text
        kind = attributes.get("t", "normal") if attributes else "normal"
        if kind == "shared":
            return self._shared_formula(place, text, attributes)
        if kind == "array":
            area = self._area(attributes.get("ref", "")) or Area(*place, *place)
            always = is_true(attributes.get("ca", ""))
            return Formula(text or None, place, FormulaKind.ARRAY, area, self._dynamic, always=always)
        if kind == "dataTable":
            area = self._area(attributes.get("ref", "")) or Area(*place, *place)
            return Formula(None, place, FormulaKind.DATA_TABLE, area, table=_data_table(attributes))
        if not text:
            return None
        always = "ca" in attributes and is_true(attributes["ca"])
        return Formula(text, place, dynamic=self._dynamic, always=always)

    def _shared_formula(self, place: Place, text: str, attributes: dict[str, str]) -> Formula:
        number = attributes.get("si", "")
        if text and ("ref" in attributes or number not in self._masters):
            master = Formula(text, place, dynamic=self._dynamic, group=self._n_groups)
            self._n_groups += 1
            self._masters[number] = master
            return master
        found = self._masters.get(number)
        if found is None:
            self._orphans.append((place, number))
            return Formula(None, place)
        return found

    def adopt_orphans(self) -> None:
        """Give shared cells that stand before their master its formula."""
        for place, number in self._orphans:
            if number in self._masters:
                self.sheet.formulas[place] = self._masters[number]

    # Attributes

    def _whole(self, text: str, most: int, what: str, least: int = 1) -> int:
        if not (text.isascii() and text.isdigit()) or not least <= int(text) <= most:
            raise DamagedBookError(f"has {text[:20]!r} as a {what}")
        return int(text)

    @staticmethod
    def _area(text: str) -> Area | None:
        try:
            return parse_area(text)
        except ParseError:
            return None


def _data_table(attributes: dict[str, str]) -> DataTable:
    return DataTable(
        two_way=is_true(attributes.get("dt2D", "")),
        by_row=is_true(attributes.get("dtr", "")),
        first=attributes.get("r1", ""),
        second=attributes.get("r2", ""),
        first_deleted=is_true(attributes.get("del1", "")),
        second_deleted=is_true(attributes.get("del2", "")),
    )


def read_cells(sheet: Sheet, data: bytes, shared: Shared) -> None:
    """Fill a sheet's cells, hidden rows and columns from its part.

    Parameters
    ----------
    sheet : Sheet
        With its name, index and part; the rest is filled in.
    data : bytes
        The whole part.
    shared : Shared
        Strings, marks, limits; its `n_cells` is advanced.

    Raises
    ------
    DamagedBookError, LimitError
        If the part is not well-formed, a cell cannot be read, or a limit is exceeded.
    """
    part = f"sheet {sheet.name!r}"
    with collection_paused():
        reader = _read(sheet, data, shared, part)
    reader.adopt_orphans()
    shared.n_cells = shared.limits.cells - reader.cells_left
    sheet.hidden_rows = frozenset(reader.hidden_rows)
    sheet.hidden_columns = tuple(reader.hidden_columns)
    area = reader.filter_area
    if area is not None:
        sheet.filtered_rows = frozenset(row for row in reader.hidden_rows if area.top < row <= area.bottom)
    places = sheet.stored.keys() | sheet.formulas.keys()
    if places:
        rows = [row for row, _ in places]
        columns = [column for _, column in places]
        sheet.used = Area(min(rows), min(columns), max(rows), max(columns))


def _read(sheet: Sheet, data: bytes, shared: Shared, part: str) -> SheetReader:
    """Read by tokens if the sheet is usual, else by the parser alone."""
    reader = SheetReader(sheet, shared)
    try:
        _parse(reader, part, read_quickly(reader, data))
    except (NotUsualError, DamagedBookError, LimitError):  # the parser reads it, or says what is wrong
        for cells in (sheet.stored, sheet.formulas, sheet.styles):
            cells.clear()
        reader = SheetReader(sheet, shared)
        _parse(reader, part, data)
    return reader


def _parse(reader: SheetReader, part: str, data: bytes) -> None:
    parser = new_parser()
    parser.StartElementHandler = reader.start
    parser.EndElementHandler = reader.end
    parser.CharacterDataHandler = reader.characters
    feed(parser, part, data)
