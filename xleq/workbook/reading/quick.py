"""Reading usual cell data by tokens (see `xleq.workbook.tokens`)."""

from __future__ import annotations

import math
import re
from typing import TYPE_CHECKING, Final

from xleq.cells import MAX_COLUMN, MAX_ROW, column_number
from xleq.workbook.records import Formula
from xleq.workbook.tokens import ATTRIBUTE, TOKEN, usual_region

if TYPE_CHECKING:
    from xleq.workbook.reading.sheets import SheetReader

_LEAST_DEPTH: Final = 6
_ENTITY: Final = re.compile(r"&(?:(amp|lt|gt|quot|apos)|#([0-9]{1,7})|#x([0-9A-Fa-f]{1,6}));")
_NAMED: Final = {"amp": "&", "lt": "<", "gt": ">", "quot": '"', "apos": "'"}
_CHARACTERS: Final = ((0x20, 0xD7FF), (0xE000, 0xFFFD), (0x10000, 0x10FFFF))


class NotUsualError(Exception):
    """The parser must look at this sheet. Never leaves this room."""


def read_quickly(reader: SheetReader, data: bytes) -> bytes:
    """Read the cells of a usual sheet into the reader; what is left to parse comes back.

    Raises
    ------
    NotUsualError
        If the sheet is not usual, or anything in it is wrong: the parser then says what.
    """
    region = usual_region(data)
    if region is None or reader.shared.limits.xml_depth < _LEAST_DEPTH:
        raise NotUsualError
    start, end = region
    try:
        text = data[start:end].decode()
    except UnicodeDecodeError as error:
        raise NotUsualError from error
    if "\r" in text:
        text = text.replace("\r\n", "\n").replace("\r", "\n")
    _read_tokens(reader, text)
    return data[:start] + data[end:]


def _read_tokens(reader: SheetReader, text: str) -> None:
    columns: dict[str, int] = {}
    stored, formulas, styles = reader.sheet.stored, reader.sheet.formulas, reader.sheet.styles
    longest, cells_left = reader.shared.limits.formula_length, reader.cells_left
    at, row, row_text, last_column = 0, 0, "", 0
    for token in TOKEN.finditer(text):
        if token.start() != at:
            raise NotUsualError
        at = token.end()
        letters, number, style, kind, cm, vm, of_formula, f, empty, v, inline, of_row, slash = token.groups()
        if letters is None:
            row, row_text = _row(reader, of_row, slash, row, row_text)
            last_column = 0
            continue
        column = columns.get(letters) or columns.setdefault(letters, column_number(letters))
        place = (row, column)
        cells_left -= 1
        if number != row_text or not last_column < column <= MAX_COLUMN or cells_left < 0:
            raise NotUsualError
        last_column = column
        if style is not None and style != "0":
            styles[place] = int(style)
        if kind is None and v and not of_formula and cm is None and (f is None or len(f) <= longest):
            if f:
                if "&" in f:
                    f = _plain(f)
                if "_x" in f or f[0] == "=":
                    raise NotUsualError
                formulas[place] = Formula(f, place)
            stored[place] = _number(v)
            continue
        reader.take_cell(
            place,
            kind or "n",
            cm,
            vm,
            None if of_formula is None else _attributes(of_formula),
            _plain(f or ""),
            empty if v is None else _plain(v),
            None if inline is None else _plain(inline),
        )
    if row_text or text[at:].strip():
        raise NotUsualError
    reader.cells_left = cells_left


def _row(
    reader: SheetReader, attributes: str | None, slash: str | None, last: int, last_text: str
) -> tuple[int, str]:
    """Number and text of the row that begins; the text is empty outside of rows."""
    if attributes is None:
        if not last_text:
            raise NotUsualError
        return last, ""
    known = _attributes(attributes)
    text = known.get("r", "")
    if last_text or not text.isdecimal() or text[0] == "0" or not last < int(text) <= MAX_ROW:
        raise NotUsualError
    reader.start_row(known)
    return int(text), "" if slash else text


def _attributes(text: str) -> dict[str, str]:
    if not text:
        return {}
    pairs = ATTRIBUTE.findall(text)
    known = dict(pairs)
    if len(known) != len(pairs):
        raise NotUsualError
    return known


def _number(text: str) -> float:
    try:
        number = float(text)
    except ValueError as error:
        raise NotUsualError from error
    if not math.isfinite(number) or "_" in text or not text.isascii():
        raise NotUsualError
    return number


def _plain(text: str) -> str:
    """Text with its entities replaced."""
    if "&" not in text:
        return text
    plain, n_entities = _ENTITY.subn(_character, text)
    if n_entities != text.count("&"):
        raise NotUsualError
    return plain


def _character(match: re.Match[str]) -> str:
    if match[1]:
        return _NAMED[match[1]]
    code = int(match[2]) if match[2] else int(match[3], 16)
    if code in {9, 10, 13} or any(low <= code <= high for low, high in _CHARACTERS):
        return chr(code)
    raise NotUsualError
