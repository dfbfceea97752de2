"""Reading XML safely: one parser for every part, no document types, no entities, bounded depth.

Expat reads all parts. Small parts become a tree of `Node`; sheets and shared strings are streamed in
`xleq.workbook.reading` with a parser from here. Names in the main namespace of spreadsheets, transitional
or strict, come as bare local names; any other name as ``namespace local``.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass, field
from functools import lru_cache
from typing import Final
from xml.parsers import expat

from xleq.errors import DamagedBookError, LimitError

#: Main namespaces of spreadsheets: transitional, strict.
MAIN: Final = (
    "http://schemas.openxmlformats.org/spreadsheetml/2006/main",
    "http://purl.oclc.org/ooxml/spreadsheetml/main",
)
_MAIN_PREFIXES: Final = tuple(f"{namespace} " for namespace in MAIN)
_ESCAPE = re.compile(r"_x([0-9A-Fa-f]{4})_")
_TO_ESCAPE = re.compile("[\x00-\x08\x0b-\x1f\ud800-\udfff\ufffe\uffff]|_(?=x[0-9A-Fa-f]{4}_)")


@dataclass(slots=True)
class Node:
    """An element of a small part: bare name, attributes, children, text directly inside."""

    name: str
    attributes: dict[str, str]
    children: list[Node] = field(default_factory=list)
    text: str = ""

    def all(self, name: str) -> Iterator[Node]:
        """Children of a name."""
        return (child for child in self.children if child.name == name)

    def first(self, name: str) -> Node | None:
        """First child of a name, None if there is none."""
        return next(self.all(name), None)

    def inside(self, outer: str, inner: str) -> list[Node]:
        """Children `inner` of the first child `outer`; empty if there is none."""
        node = self.first(outer)
        return [] if node is None else list(node.all(inner))

    def get(self, name: str, default: str = "") -> str:
        """An attribute by its local name, whatever its namespace."""
        if name in self.attributes:
            return self.attributes[name]
        ending = f" {name}"
        return next((v for k, v in self.attributes.items() if k.endswith(ending)), default)

    def flag(self, name: str, default: bool = False) -> bool:
        """A logical attribute."""
        text = self.get(name)
        return is_true(text) if text else default


def is_true(text: str) -> bool:
    """Whether a logical attribute says yes.

    Examples
    --------
    >>> is_true("1"), is_true("true"), is_true("0")
    (True, True, False)
    """
    return text in {"1", "true", "on", "t"}


@lru_cache(maxsize=1024)
def bare(name: str) -> str:
    """Local name of an element of the main namespaces; other names unchanged.

    Examples
    --------
    >>> bare("http://purl.oclc.org/ooxml/spreadsheetml/main row"), bare("urn:other row")
    ('row', 'urn:other row')
    """
    for prefix in _MAIN_PREFIXES:
        if name.startswith(prefix):
            return name[len(prefix) :]
    return name


def new_parser() -> expat.XMLParserType:
    """A streaming parser that refuses document types; names come as ``namespace local``."""

    def refuse(*_: object) -> None:
        raise DamagedBookError("declares a document type, which no workbook needs")

    parser = expat.ParserCreate(namespace_separator=" ")
    parser.buffer_text = True
    parser.buffer_size = 65536
    parser.StartDoctypeDeclHandler = refuse
    parser.EntityDeclHandler = refuse
    return parser


def feed(parser: expat.XMLParserType, part: str, data: bytes) -> None:
    """Run a parser over a part.

    Raises
    ------
    DamagedBookError
        If it is not well-formed XML, or what a handler raised with the part's name before it.
    LimitError
        If a handler found a limit exceeded.
    """
    try:
        parser.Parse(data, True)
    except expat.ExpatError as error:
        raise DamagedBookError(f"{part} is not well-formed XML: {error}") from error
    except (LookupError, ValueError) as error:  # raised for an encoding it does not know
        raise DamagedBookError(f"{part} is in an encoding that cannot be read: {error}") from error
    except (DamagedBookError, LimitError) as error:
        raise type(error)(f"{part} {error}") from error


def parse(data: bytes, part: str, depth: int) -> Node:
    """The tree of a small part.

    Parameters
    ----------
    data : bytes
        The whole part.
    part : str
        Its name, for messages.
    depth : int
        Elements inside one another, at most.

    Raises
    ------
    DamagedBookError, LimitError

    Examples
    --------
    >>> parse(b'<a><b c="1"/>x</a>', "part", 9).first("b").attributes
    {'c': '1'}
    """
    top = Node("", {})
    stack = [top]

    def start(name: str, attributes: dict[str, str]) -> None:
        if len(stack) > depth:
            raise LimitError(f"has more than {depth} elements inside one another")
        node = Node(bare(name), attributes)
        stack[-1].children.append(node)
        stack.append(node)

    def end(_: str) -> None:
        stack.pop()

    def characters(text: str) -> None:
        stack[-1].text += text

    parser = new_parser()
    parser.StartElementHandler = start
    parser.EndElementHandler = end
    parser.CharacterDataHandler = characters
    feed(parser, part, data)
    return top.children[0]


def unescaped(text: str) -> str:
    r"""Text with ``_xHHHH_`` turned into the characters they stand for.

    Examples
    --------
    >>> unescaped("a_x000D_b"), unescaped("_x005F_x0041_")
    ('a\rb', '_x0041_')
    """
    if "_x" not in text:
        return text
    plain = _ESCAPE.sub(lambda match: chr(int(match[1], 16)), text)
    # A character beyond the basic plane may have been written as two escaped halves; a half alone is none.
    return plain.encode("utf-16-le", "surrogatepass").decode("utf-16-le", "replace")


def escaped(text: str) -> str:
    r"""Text as the content of an element: markup, forbidden characters and look-alikes escaped.

    Examples
    --------
    >>> escaped("a<b&c\r_x0041_")
    'a&lt;b&amp;c_x000D__x005F_x0041_'
    """
    text = _TO_ESCAPE.sub(lambda match: f"_x{ord(match[0]):04X}_", text)
    return text.replace("&", "&amp;").replace("<", "&lt;").replace(">", "&gt;")
