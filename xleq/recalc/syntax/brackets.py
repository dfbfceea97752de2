"""The square brackets of structured references to tables."""

from __future__ import annotations

from typing import Final

from xleq.errors import FormulaError, ParseError
from xleq.recalc.syntax.tree import Structured

_ITEMS: Final = ("#all", "#data", "#headers", "#totals", "#this row")


def read_structured(text: str, table: str, at: int) -> tuple[Structured, int]:
    """A structured reference whose opening bracket stands at `at`, and the position behind it.

    Raises
    ------
    FormulaError
        If the brackets don't follow the grammar.

    Examples
    --------
    >>> read_structured("T[[#This Row],[a'[b]]", "T", 1)
    (Structured(table='T', items=('#this row',), first='a[b', last=''), 21)
    >>> read_structured("T[@x]", "T", 1)[0]
    Structured(table='T', items=('#this row',), first='x', last='')
    """
    end = _closing(text, at)
    body = text[at + 1 : end].strip()
    items: list[str] = []
    columns: list[str] = []
    if body[:1] == "@":
        items.append("#this row")
        body = body[1:].strip()
    if body[:1] == "[":
        _read_parts(text, at, body, items, columns)
    elif body.lower() in _ITEMS:
        items.append(body.lower())
    elif body:
        columns.append(unescaped(body))
    first = columns[0] if columns else ""
    last = columns[1] if len(columns) > 1 else ""
    return Structured(table, tuple(items), first, last), end + 1


def _read_parts(text: str, at: int, body: str, items: list[str], columns: list[str]) -> None:
    """The inner brackets: items and at most two columns, separated by commas or a colon."""
    position = 0
    while position < len(body):
        if body[position] in ", :\t\r\n":
            position += 1
            continue
        if body[position] != "[":
            raise FormulaError(str(ParseError(text, at, "a table's items and columns in brackets")))
        end = _closing(body, position)
        part = body[position + 1 : end]
        if part.strip().lower() in _ITEMS:
            items.append(part.strip().lower())
        elif len(columns) < 2:
            columns.append(unescaped(part))
        else:
            raise FormulaError(str(ParseError(text, at, "at most two columns of a table")))
        position = end + 1


def _closing(text: str, at: int) -> int:
    """Position of the bracket that closes the one at `at`; an apostrophe escapes the next character."""
    depth = 0
    position = at
    while position < len(text):
        character = text[position]
        if character == "'":
            position += 1
        elif character == "[":
            depth += 1
        elif character == "]":
            depth -= 1
            if depth == 0:
                return position
        position += 1
    raise FormulaError(str(ParseError(text, len(text), "']'")))


def unescaped(column: str) -> str:
    """A column's name without the apostrophes that escape.

    Examples
    --------
    >>> unescaped("a'[b"), unescaped("it''s")
    ('a[b', "it's")
    """
    found: list[str] = []
    position = 0
    while position < len(column):
        if column[position] == "'" and position + 1 < len(column):
            position += 1
        found.append(column[position])
        position += 1
    return "".join(found)
