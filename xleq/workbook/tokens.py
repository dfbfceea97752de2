r"""The usual way to write cell data, as a regular expression: a quick path beside the XML parser.

Nearly every sheet is written by a program in one plain style: no comments, no sections, attributes in one
order. If such tokens cover the cell data without a gap, and what stands around them goes through the
parser, then the tokens are the cells: the pattern admits no ``<`` in a value and no quote in an attribute.
Reading and writing use it for speed (0.3 s against 0.9 s for 110,000 cells) and take the parser's way
whenever anything is out of the ordinary. A test holds the two ways against each other on every workbook.
"""

from __future__ import annotations

import re
from typing import Final

from xleq.workbook.markup import MAIN

_ATTRIBUTES: Final = r"(?: (?:\w+|x14ac:dyDescent)=\"[^\"<&\t\r\n]*\")*"
_PATTERN: Final = (
    r"\s*(?:<c r=\"([A-Z]{1,3})([1-9][0-9]{0,6})\"(?: s=\"([0-9]{1,6})\")?(?: t=\"(\w+)\")?"
    r"(?: cm=\"([0-9]{1,6})\")?(?: vm=\"([0-9]{1,6})\")?(?:/>|>"
    rf"(?:<f({_ATTRIBUTES})(?:/>|>([^<]*)</f>))?"
    r"(?:<v/>()|<v(?: xml:space=\"preserve\")?>([^<]*)</v>|"
    r"<is><t(?: xml:space=\"preserve\")?>([^<]*)</t></is>)?</c>)"
    rf"|<row(?P<row>{_ATTRIBUTES}) ?(?P<slash>/?)>|</row>)"
)
#: Groups: column letters, row, style, type, cm, vm, attributes and text of the formula, mark of an empty
#: value, value, inline text; attributes of a row and its closing slash. All None: the end of a row.
TOKEN: Final = re.compile(_PATTERN, re.ASCII)
#: The same on bytes.
TOKEN_BYTES: Final = re.compile(_PATTERN.encode())
#: One attribute of a formula or row.
ATTRIBUTE: Final = re.compile(r" ([\w:]+)=\"([^\"]*)\"", re.ASCII)

_OPEN: Final = b"<sheetData>"
_CLOSE: Final = b"</sheetData>"
_HEAD: Final = re.compile(
    rb"(?:\xef\xbb\xbf)?(?:<\?xml version=\"1\.0\"(?: encoding=\"[Uu][Tt][Ff]-8\")?"
    rb"(?: standalone=\"\w+\")?\s*\?>)?"
    rb"\s*(<worksheet [^<>]*>)"
)
#: Comments, sections, instructions; and characters that no XML holds.
_FORBIDDEN: Final = (b"<!", b"<?", b"]]>")
_CONTROLS: Final = bytes(code for code in range(32) if code not in b"\t\n\r")
_NAMESPACES: Final = tuple(b'xmlns="%b"' % name.encode() for name in MAIN)


def usual_region(data: bytes) -> tuple[int, int] | None:
    """Where the rows of a sheet begin and end, if all around them is usual; None when the parser must look.

    Examples
    --------
    >>> usual_region(b"<worksheet xmlns:x='urn:x'><sheetData></sheetData></worksheet>") is None
    True
    """
    head = _HEAD.match(data)
    if head is None or not any(name in head[1] for name in _NAMESPACES):
        return None
    start, end = data.find(_OPEN, head.end()), data.rfind(_CLOSE)
    alone = data.count(_OPEN) == 1 and data.count(_CLOSE) == 1
    if not alone or end < start or any(data.find(mark, head.end()) >= 0 for mark in _FORBIDDEN):
        return None
    if len(data.translate(None, _CONTROLS)) != len(data):
        return None
    if b"x14ac:" in data[start:end] and b"xmlns:x14ac=" not in head[1]:
        return None
    return start + len(_OPEN), end
