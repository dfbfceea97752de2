"""The syntax tree of a formula, with references relative to the formula's own cell.

A formula that was filled down or right has one tree for all its cells, so it is compiled once.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TypeAlias

from xleq.cells import CellError


@dataclass(frozen=True, slots=True)
class Literal:
    """A number, text, logical or error."""

    value: float | str | bool | CellError


@dataclass(frozen=True, slots=True)
class Omitted:
    """An argument left empty."""


@dataclass(frozen=True, slots=True)
class Block:
    """An array written in braces."""

    rows: tuple[tuple[float | str | bool | CellError, ...], ...]


@dataclass(frozen=True, slots=True)
class Place:
    """Where sheets are looked for: an external book or this one, one sheet or from one to another."""

    book: str = ""
    first: str = ""
    last: str = ""


@dataclass(frozen=True, slots=True)
class Cells:
    """A reference to cells.

    Parameters
    ----------
    place : Place or None
        None for the sheet of the formula.
    rows, columns : tuple of int, or None
        First and last; None for all of them.
    fixed : tuple of bool
        Whether first row, last row, first column, last column are absolute; where not, the number is the
        distance from the formula's cell.
    """

    place: Place | None
    rows: tuple[int, int] | None
    columns: tuple[int, int] | None
    fixed: tuple[bool, bool, bool, bool]


@dataclass(frozen=True, slots=True)
class Name:
    """A defined name, a table, or a name of LET and LAMBDA."""

    place: Place | None
    name: str


@dataclass(frozen=True, slots=True)
class Structured:
    """A structured reference to a table.

    Parameters
    ----------
    table : str
        Empty for the table around the formula.
    items : tuple of str
        Of ``#All``, ``#Data``, ``#Headers``, ``#Totals``, ``#This Row``, in lower case.
    first, last : str
        Columns, unescaped; empty for all.
    """

    table: str
    items: tuple[str, ...]
    first: str
    last: str


@dataclass(frozen=True, slots=True)
class Prefix:
    """``-``, ``+`` or ``@`` before an expression, or ``(`` for brackets around it."""

    operator: str
    operand: Node


@dataclass(frozen=True, slots=True)
class Postfix:
    """``%`` or ``#`` after an expression."""

    operator: str
    operand: Node


@dataclass(frozen=True, slots=True)
class Infix:
    """An operator between two expressions; a blank is the intersection, a comma the union."""

    operator: str
    left: Node
    right: Node


@dataclass(frozen=True, slots=True)
class Call:
    """A function by name, in capitals, with its arguments.

    Parameters
    ----------
    name : str
        Without the prefixes that files put before newer functions.
    arguments : tuple of Node
    own : str
        The name as written.
    """

    name: str
    arguments: tuple[Node, ...]
    own: str


@dataclass(frozen=True, slots=True)
class Apply:
    """The value of an expression called as a function."""

    function: Node
    arguments: tuple[Node, ...]


Node: TypeAlias = (
    Literal | Omitted | Block | Cells | Name | Structured | Prefix | Postfix | Infix | Call | Apply
)
