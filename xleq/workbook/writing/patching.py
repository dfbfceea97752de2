"""A sheet's bytes with new cached values in it and every other byte as it was."""

from __future__ import annotations

import re
from collections import defaultdict
from collections.abc import Iterable, Iterator
from heapq import merge
from operator import itemgetter
from typing import Final, NamedTuple
from xml.parsers import expat

from xleq.cells import BLANK, address_text
from xleq.errors import DamagedBookError, ParseError
from xleq.workbook.records import Area, Place, parse_area
from xleq.workbook.writing.edits import Edit, Role
from xleq.workbook.writing.scanning import START_TAG, Layout, Row, scan
from xleq.workbook.writing.values import constant_markup_of, markup_of

#: A cell as nearly all are written: plain attributes, a formula or none, a value or none.
_USUAL: Final = re.compile(
    rb"<((?:[\w.-]+:)?)c((?: [\w:]+=\"[^\"<=& ]*\")*)"
    rb"(?:/>|>(<\1f(?: [\w:]+=\"[^\"<]*\")*(?:/>|>[^<]*</\1f>))?"
    rb"(?:<\1v(?: [\w:]+=\"[^\"<]*\")?(?:/>|>[^<]*</\1v>))?</\1c>)"
)
_ATTRIBUTE: Final = re.compile(rb"\s+([\w.:-]+)\s*=\s*(\"[^\"]*\"|'[^']*')")
#: What tells of the old value: its kind, and rich data that stand for it.
_TYPE: Final = re.compile(rb" (?:t|vm)=\"[^\"]*\"")
_REF: Final = re.compile(rb"(\sref\s*=\s*)(?:\"[^\"]*\"|'[^']*')")
_SPANS: Final = re.compile(rb"\sspans\s*=\s*(?:\"[^\"]*\"|'[^']*')")
_DECLARED: Final = re.compile(r"^(<\?xml[^>]*?)\s+encoding\s*=\s*(?:\"[^\"]*\"|'[^']*')")


_POSITION: Final = itemgetter(0, 1)


class Piece(NamedTuple):
    """Bytes to put in place of those from `start` to `end`."""

    start: int
    end: int
    text: bytes


def patched(data: bytes, edits: dict[Place, Edit], part: str) -> bytes:
    """The sheet with its edits made.

    Parameters
    ----------
    data : bytes
        The sheet as it is.
    edits : dict
        (row, column) → what changes there.
    part : str
        Name of the sheet, for messages.

    Raises
    ------
    DamagedBookError
        If the sheet's order does not let a cell be put in.
    """
    data = in_utf8(data)
    by_row: dict[int, dict[int, Edit]] = defaultdict(dict)
    for (row, column), edit in edits.items():
        by_row[row][column] = edit
    layout = scan(data, by_row.keys(), part)
    present = {row.number for row in layout.rows}
    new_rows = {n: _to_create(row, n, part) for n, row in sorted(by_row.items()) if n not in present}
    around = [*_dimension_piece(data, layout, edits), *_new_rows(data, layout, new_rows, part)]
    # Pieces are joined as they come: at any time only a few of a hundred thousand are held.
    return _joined(data, merge(_sorted(around), _row_pieces(data, layout, by_row, part), key=_POSITION))


def _sorted(pieces: list[Piece]) -> list[Piece]:
    """In the order of the bytes; pieces at one place follow one another as they are listed."""
    return sorted(pieces, key=_POSITION)


def _joined(data: bytes, pieces: Iterable[Piece]) -> bytes:
    """The bytes with pieces, in their order, replaced."""
    out = bytearray()
    at = 0
    for start, end, text in pieces:
        out += data[at:start]
        out += text
        at = end
    out += data[at:]
    return bytes(out)


def in_utf8(data: bytes) -> bytes:
    """The bytes as they are when in UTF-8, else the same document in UTF-8."""
    if data.startswith((b"\xff\xfe", b"\xfe\xff", b"<\x00", b"\x00<")):
        text = data.decode("utf-16" if data[0] in b"\xff\xfe" else ("utf-16-le" if data[0] else "utf-16-be"))
    else:
        declared = re.match(rb"(?:\xef\xbb\xbf)?<\?xml[^>]*?encoding\s*=\s*[\"']([\w.-]+)", data)
        name = declared[1].decode().casefold() if declared else "utf-8"
        if name in {"utf-8", "utf8", "us-ascii", "ascii"}:
            return data
        text = data.decode(name)
    return _DECLARED.sub(r'\1 encoding="UTF-8"', text, count=1).encode()


def _row_pieces(
    data: bytes, layout: Layout, by_row: dict[int, dict[int, Edit]], part: str
) -> Iterator[Piece]:
    """Replacements and insertions in the rows that are there, in the order of the bytes."""
    seen: set[int] = set()
    for row in layout.rows:
        if row.number in by_row:
            if row.number in seen:
                raise DamagedBookError(f"{part} lists row {row.number} twice")
            seen.add(row.number)
            wanted = dict(by_row[row.number])
            pieces = list(_existing_cells(data, row, wanted))
            wanted = _to_create(wanted, row.number, part)
            if wanted:
                pieces = _sorted([*pieces, *_new_cells(data, layout, row, wanted, part)])
            yield from pieces


def _to_create(wanted: dict[int, Edit], row: int, part: str) -> dict[int, Edit]:
    """Edits of cells that the file does not list, without those that would stay blank."""
    for column, edit in wanted.items():
        if edit.role is Role.FORMULA:
            raise DamagedBookError(f"{part} lists cell {address_text(row, column)} where it does not belong")
    return {column: edit for column, edit in wanted.items() if edit.value is not BLANK}


def _existing_cells(data: bytes, row: Row, wanted: dict[int, Edit]) -> Iterator[Piece]:
    """Replacements of the cells that the row lists; what is left in `wanted` it does not list."""
    for column, start, end in row.cells:
        edit = wanted.pop(column, None)
        if edit is not None:
            yield Piece(start, end, _edited(data[start:end], edit))


def _new_cells(data: bytes, layout: Layout, row: Row, wanted: dict[int, Edit], part: str) -> Iterator[Piece]:
    """Insertions of cells into a row that is there."""
    columns = [column for column, _, _ in row.cells]
    if columns != sorted(set(columns)):
        raise DamagedBookError(f"{part} has its cells out of order in row {row.number}")
    style = row.attributes.get("s", "") if row.attributes.get("customFormat") in {"1", "true"} else ""
    cells = {c: _new_cell(layout, row.number, c, edit, style) for c, edit in sorted(wanted.items())}
    spans = row.attributes.get("spans")
    tag = data[row.start : row.tag_end]
    if spans:
        limits = [int(n) for span in spans.split() for n in span.split(":") if n.isdecimal()]
        low, high = min([*limits, *cells]), max([*limits, *cells])
        if low < min(limits, default=low + 1) or high > max(limits, default=high - 1):
            tag = _SPANS.sub(b' spans="%d:%d"' % (low, high), tag, count=1)
    if row.tag_end == row.end:  # <row/>: it gets an inside
        name = b"%brow" % layout.prefix
        yield Piece(row.start, row.end, tag[:-2].rstrip() + b">%b</%b>" % (b"".join(cells.values()), name))
        return
    if tag != data[row.start : row.tag_end]:
        yield Piece(row.start, row.tag_end, tag)
    closing = data.rindex(b"</", row.start, row.end)
    at = 0
    for column, text in cells.items():
        while at < len(row.cells) and row.cells[at][0] < column:
            at += 1
        place = row.cells[at][1] if at < len(row.cells) else closing
        yield Piece(place, place, text)


def _new_rows(data: bytes, layout: Layout, rows: dict[int, dict[int, Edit]], part: str) -> Iterator[Piece]:
    """Insertions of rows that are not there."""
    rows = {number: row for number, row in rows.items() if row}
    if not rows:
        return
    numbers = [row.number for row in layout.rows]
    if numbers != sorted(set(numbers)):
        raise DamagedBookError(f"{part} has its rows out of order, so that none can be put in")
    texts = {}
    for number, wanted in rows.items():
        cells = (_new_cell(layout, number, c, edit, "") for c, edit in sorted(wanted.items()))
        texts[number] = b'<%brow r="%d">%b</%brow>' % (layout.prefix, number, b"".join(cells), layout.prefix)
    if layout.data.tag_end == layout.data.end:  # <sheetData/>
        tag = data[layout.data.start : layout.data.end]
        inside = b"".join(texts.values())
        text = tag[:-2].rstrip() + b">%b</%bsheetData>" % (inside, layout.prefix)
        yield Piece(layout.data.start, layout.data.end, text)
        return
    closing = data.rindex(b"</", layout.data.start, layout.data.end)
    at = 0
    for number, text in texts.items():
        while at < len(layout.rows) and layout.rows[at].number < number:
            at += 1
        place = layout.rows[at].start if at < len(layout.rows) else closing
        yield Piece(place, place, text)


def _new_cell(layout: Layout, row: int, column: int, edit: Edit, row_style: str) -> bytes:
    """A cell where there was none, in the format that its row or column shows there."""
    assert edit.value is not None
    style = row_style or next((s for a, b, s in layout.column_styles if a <= column <= b), "")
    kind, value = (constant_markup_of if edit.role is Role.CONSTANT else markup_of)(edit.value, layout.prefix)
    styled = b' s="%b"' % style.encode() if style else b""
    where = address_text(row, column).encode()
    return b'<%bc r="%b"%b%b>%b</%bc>' % (layout.prefix, where, styled, kind, value, layout.prefix)


def _edited(raw: bytes, edit: Edit) -> bytes:
    """A cell's bytes with its edit made."""
    match = _USUAL.fullmatch(raw)
    if match is None or edit.value is None:
        return _edited_by_parts(raw, edit)
    prefix, attributes, formula = match[1], _TYPE.sub(b"", match[2]), match[3] or b""
    if edit.area is not None:
        formula = _with_area(formula, edit.area)
    kind, value = (constant_markup_of if edit.role is Role.CONSTANT else markup_of)(edit.value, prefix)
    if formula or value:
        return b"<%bc%b%b>%b%b</%bc>" % (prefix, attributes, kind, formula, value, prefix)
    return b"<%bc%b%b/>" % (prefix, attributes, kind)


def _edited_by_parts(raw: bytes, edit: Edit) -> bytes:
    """As `_edited`, for a cell that is written unusually: white space, comments, extensions stay."""
    tag = START_TAG.match(raw)
    if tag is None:
        raise DamagedBookError("has a cell whose bytes cannot be taken apart")
    empty = tag[0].endswith(b"/>")
    name_end = next(at for at, byte in enumerate(raw) if byte in b" \t\r\n/>")
    prefix = raw[1 : name_end - 1]
    tag_end = tag.end() - (2 if empty else 1)
    children = [] if empty else _children(raw)
    pieces: list[Piece] = []
    formula = next((Piece(start, end, raw[start:end]) for name, start, end in children if name == "f"), None)
    if edit.area is not None and formula is not None:
        pieces.append(formula._replace(text=_with_area(formula.text, edit.area)))
    if edit.value is not None:
        kind, value = (constant_markup_of if edit.role is Role.CONSTANT else markup_of)(edit.value, prefix)
        attributes = (m for m in _ATTRIBUTE.finditer(raw, name_end, tag_end) if m[1] in {b"t", b"vm"})
        pieces += (Piece(m.start(), m.end(), b"") for m in attributes)
        pieces.append(Piece(tag_end, tag_end, kind))
        old = [(start, end) for name, start, end in children if name in {"v", "is"}]
        if empty and value:
            pieces.append(Piece(tag_end, len(raw), b">%b</%bc>" % (value, prefix)))
        elif not old and not empty:
            at = formula.end if formula is not None else tag.end()
            pieces.append(Piece(at, at, value))
        for start, end in old:
            pieces.append(Piece(start, end, value))
            value = b""
    return _joined(raw, _sorted(pieces))


def _with_area(formula: bytes, area: Area) -> bytes:
    text = address_text(area.top, area.left)
    if area.n_cells > 1:
        text += ":" + address_text(area.bottom, area.right)
    return _REF.sub(rb'\g<1>"%b"' % text.encode(), formula, count=1)


def _children(raw: bytes) -> list[tuple[str, int, int]]:
    """Local name, start and end of each element directly inside a cell."""
    found: list[tuple[str, int, int]] = []
    depth, begun = 0, 0
    parser = expat.ParserCreate("UTF-8")

    def start(_: str, __: dict[str, str]) -> None:
        nonlocal depth, begun
        depth += 1
        if depth == 2:
            begun = parser.CurrentByteIndex

    def end(name: str) -> None:
        nonlocal depth
        if depth == 2:
            tag = START_TAG.match(raw, begun)
            empty = tag is not None and tag[0].endswith(b"/>")
            stop = tag.end() if tag and empty else raw.index(b">", parser.CurrentByteIndex) + 1
            found.append((name.rpartition(":")[2], begun, stop))
        depth -= 1

    parser.StartElementHandler, parser.EndElementHandler = start, end
    parser.Parse(raw, True)
    return found


def _dimension_piece(data: bytes, layout: Layout, edits: dict[Place, Edit]) -> Iterator[Piece]:
    """The `dimension` widened, if a cell with a value now lies outside of it."""
    places = [place for place, edit in edits.items() if edit.value is not None and edit.value is not BLANK]
    if layout.dimension is None or not places:
        return
    try:
        now = parse_area(layout.dimension_ref)
    except ParseError:
        return
    rows, columns = [row for row, _ in places], [column for _, column in places]
    wide = Area(
        min(now.top, *rows, now.top),
        min(now.left, *columns, now.left),
        max(now.bottom, *rows, now.bottom),
        max(now.right, *columns, now.right),
    )
    if wide != now:
        span = layout.dimension
        yield Piece(span.start, span.tag_end, _with_area(data[span.start : span.tag_end], wide))
