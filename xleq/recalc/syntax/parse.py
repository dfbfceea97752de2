"""Formula text to syntax tree."""

from __future__ import annotations

import re
from typing import Final

from xleq.cells import ERRORS, MAX_COLUMN, MAX_ROW, CellError, column_number, error_named
from xleq.errors import FormulaError, ParseError
from xleq.recalc.syntax.brackets import read_structured
from xleq.recalc.syntax.tree import (
    Apply,
    Block,
    Call,
    Cells,
    Infix,
    Literal,
    Name,
    Node,
    Omitted,
    Place,
    Postfix,
    Prefix,
)

#: Longest formula that is read. (source: Excel specifications and limits)
MAX_LENGTH: Final = 8192
#: Deepest nesting that is read; the spreadsheet allows 64 levels of functions.
_MAX_DEPTH: Final = 150

_ERROR_CODES = "|".join(re.escape(code) for code in sorted(ERRORS, key=len, reverse=True))
_TOKEN = re.compile(
    rf"""
    (?P<blank>[ \t\r\n\xa0]+)
  | (?P<text>"(?:[^"]|"")*")
  | (?P<error>{_ERROR_CODES})
  | (?P<place>'(?:[^']|'')+'!|(?:\[[^\[\]]+\])?[\w.]*!|
      (?:\[[^\[\]]+\])?(?!\$?[A-Z]{{1,3}}\$?[0-9]+:)[^\W\d][\w.]*:[\w.]+!|\[[^\[\]]+\]!)
  | (?P<rows>\$?[0-9]{{1,7}}:\$?[0-9]{{1,7}}(?![\w.]))
  | (?P<number>(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[Ee][+-]?[0-9]+)?)
  | (?P<columns>\$?[A-Za-z]{{1,3}}:\$?[A-Za-z]{{1,3}}(?![\w.($!\[]))
  | (?P<cell>\$?[A-Za-z]{{1,3}}\$?[1-9][0-9]{{0,6}}(?![\w.(!\[?\\]))
  | (?P<name>[^\W\d][\w.?\\]*|\\[\w.?\\]*)
  | (?P<sign><=|>=|<>|[-+*/^&=<>%@#:,;(){{}}\[])
    """,
    re.VERBOSE | re.IGNORECASE,
)
_CELL = re.compile(r"(\$?)([A-Za-z]{1,3})(\$?)([0-9]+)")
_PREFIXES = re.compile(
    r"(?:_xlfn\.|_xlws\.|_xludf\.|_xll\.|_xldudf_|_xleta\.|_xlpm\.|_xlop\.)+", re.IGNORECASE
)
_BINDING: Final = {
    "=": 10, "<>": 10, "<": 10, ">": 10, "<=": 10, ">=": 10,
    "&": 20, "+": 30, "-": 30, "*": 40, "/": 40, "^": 50,
    " ": 90, ":": 100,
}  # fmt: skip
_SIGNED, _PERCENT, _AT = 70, 75, 85


class _Token:
    __slots__ = ("at", "kind", "text")

    def __init__(self, kind: str, text: str, at: int) -> None:
        self.kind = kind
        self.text = text
        self.at = at


def bare_name(name: str) -> str:
    """A function's name in capitals without the prefixes of files.

    Examples
    --------
    >>> bare_name("_xlfn._xlws.Filter"), bare_name("_xldudf_HF_RATE")
    ('FILTER', 'HF_RATE')
    """
    return _PREFIXES.sub("", name, count=1).upper() if name[:1] == "_" else name.upper()


def parse(text: str, row: int = 1, column: int = 1) -> Node:
    """Syntax tree of a formula.

    Parameters
    ----------
    text : str
        With or without the equals sign.
    row, column : int
        The cell for which it is written; relative references become distances from it.

    Raises
    ------
    FormulaError
        Where the text is not a formula; the message names the position of the first wrong character.

    Examples
    --------
    >>> parse("=A1*2", 1, 2).left.columns
    (-1, -1)
    >>> parse("=2*(3")
    Traceback (most recent call last):
    xleq.errors.FormulaError: expected ')' at position 6 of '=2*(3', found the end
    """
    return _Parser(text, row, column).whole()


class _Parser:
    def __init__(self, text: str, row: int, column: int) -> None:
        if len(text) > MAX_LENGTH:
            raise FormulaError(f"a formula of {len(text)} characters; at most {MAX_LENGTH} are read")
        self.text = text
        self.row = row
        self.column = column
        self.depth = 0
        self.at = 1 if text[:1] == "=" else 0
        self.blank = False  # whether blanks stood before the token
        self.token = self.scan()

    def fail(self, wanted: str, at: int | None = None) -> FormulaError:
        return FormulaError(str(ParseError(self.text, self.token.at if at is None else at, wanted)))

    def scan(self) -> _Token:
        """The next token; `at` moves behind it."""
        self.blank = False
        while True:
            start = self.at
            if start >= len(self.text):
                return _Token("end", "", start)
            match = _TOKEN.match(self.text, start)
            if match is None:
                raise FormulaError(str(ParseError(self.text, start, "a part of a formula")))
            self.at = match.end()
            kind = match.lastgroup or ""
            if kind != "blank":
                return _Token(kind, match[0], start)
            self.blank = True

    def move(self) -> _Token:
        token = self.token
        self.token = self.scan()
        return token

    def is_sign(self, text: str) -> bool:
        return self.token.kind == "sign" and self.token.text == text

    def expect(self, sign: str) -> None:
        if not self.is_sign(sign):
            raise self.fail(repr(sign))
        self.move()

    def whole(self) -> Node:
        node = self.expression(0)
        while self.is_sign(","):
            self.move()
            node = Infix(",", node, self.expression(0))
        if self.token.kind != "end":
            raise self.fail("an operator or the end")
        return node

    def expression(self, floor: int) -> Node:
        self.depth += 1
        if self.depth > _MAX_DEPTH:
            raise FormulaError(f"nested more than {_MAX_DEPTH} deep at position {self.token.at + 1}")
        node = self.operand()
        while True:
            operator = self.infix()
            if operator == "%" and floor <= _PERCENT:
                self.move()
                node = Postfix("%", node)
                continue
            binding = _BINDING.get(operator, -1)
            if binding <= floor:
                break
            if operator != " ":
                self.move()
            node = join(operator, node, self.expression(binding))
        self.depth -= 1
        return node

    def infix(self) -> str:
        """The operator that the token stands for; a blank before an operand is the intersection."""
        token = self.token
        if token.kind == "sign" and token.text not in "([{":
            return token.text
        if self.blank and (token.kind in ("cell", "name", "place", "rows", "columns") or token.text == "("):
            return " "
        return ""

    def operand(self) -> Node:
        token = self.token
        if token.kind == "sign":
            if token.text in "+-":
                self.move()
                return Prefix(token.text, self.expression(_SIGNED))
            if token.text == "@":
                self.move()
                return Prefix("@", self.expression(_AT))
        node = self.primary()
        while True:
            if self.is_sign("#"):
                self.move()
                node = Postfix("#", node)
            elif self.is_sign("(") and not self.blank and isinstance(node, Call | Apply):
                node = Apply(node, self.arguments())
            else:
                return node

    def primary(self) -> Node:
        token = self.token
        kind = token.kind
        if kind == "number":
            self.move()
            number = float(token.text)
            return Literal(
                number if number - number == 0.0 else CellError("#NUM!", "the number is too large")
            )
        if kind == "text":
            self.move()
            return Literal(token.text[1:-1].replace('""', '"'))
        if kind == "error":
            self.move()
            return Literal(error_named(token.text.upper()))
        if kind == "place":
            self.move()
            return self.placed(read_place(token.text))
        if kind in ("cell", "rows", "columns", "name"):
            return self.placed(None)
        if token.text == "(":
            return self.bracketed()
        if token.text == "{":
            return self.block()
        if token.text == "[":
            return self.structured("", token.at)
        raise self.fail("a value, a reference or a function")

    def placed(self, place: Place | None) -> Node:
        """What follows a sheet, or stands alone."""
        token = self.token
        if token.kind == "cell":
            self.move()
            return self.cell(place, token)
        if token.kind in ("rows", "columns"):
            self.move()
            return self.lines(place, token)
        if token.kind == "error" and place is not None:
            self.move()
            return Literal(error_named(token.text.upper()))
        if token.kind != "name":
            raise self.fail("a reference or a name")
        if self.text[self.at : self.at + 1] == "(":
            self.move()
            own = ("" if place is None else f"[{place.book}]!") + token.text
            return Call(bare_name(token.text), self.arguments(), own)
        if self.text[self.at : self.at + 1] == "[":
            return self.structured(token.text, self.at)
        self.move()
        if place is None and token.text.upper() in ("TRUE", "FALSE"):
            return Literal(token.text.upper() == "TRUE")
        return Name(place, token.text)

    def cell(self, place: Place | None, token: _Token) -> Cells | Name:
        match = _CELL.fullmatch(token.text)
        assert match is not None
        row, column = int(match[4]), column_number(match[2])
        if row > MAX_ROW or column > MAX_COLUMN:
            return Name(place, token.text)
        fix_row, fix_column = bool(match[3]), bool(match[1])
        row -= 0 if fix_row else self.row
        column -= 0 if fix_column else self.column
        return Cells(place, (row, row), (column, column), (fix_row, fix_row, fix_column, fix_column))

    def lines(self, place: Place | None, token: _Token) -> Cells:
        """Whole rows or whole columns."""
        ends = token.text.split(":")
        fixed = (ends[0][0] == "$", ends[1][0] == "$")
        bare = [end.lstrip("$") for end in ends]
        whole_rows = token.kind == "rows"
        numbers = [int(end) if whole_rows else column_number(end) for end in bare]
        if max(numbers) > (MAX_ROW if whole_rows else MAX_COLUMN) or min(numbers) < 1:
            raise self.fail("rows and columns that a sheet has", token.at)
        own = self.row if whole_rows else self.column
        first, last = (n if fix else n - own for n, fix in zip(numbers, fixed, strict=True))
        if whole_rows:
            return Cells(place, (first, last), None, (*fixed, True, True))
        return Cells(place, None, (first, last), (True, True, *fixed))

    def structured(self, table: str, at: int) -> Node:
        node, self.at = read_structured(self.text, table, at)
        self.token = self.scan()
        return node

    def bracketed(self) -> Node:
        self.expect("(")
        node = self.expression(0)
        while self.is_sign(","):
            self.move()
            node = Infix(",", node, self.expression(0))
        self.expect(")")
        return Prefix("(", node)

    def arguments(self) -> tuple[Node, ...]:
        self.expect("(")
        found: list[Node] = []
        if self.is_sign(")"):
            self.move()
            return ()
        while True:
            if self.is_sign(",") or self.is_sign(")"):
                found.append(Omitted())
            else:
                found.append(self.expression(0))
            if self.is_sign(")"):
                self.move()
                return tuple(found)
            if not self.is_sign(","):
                raise self.fail("',' or ')'")
            self.move()

    def block(self) -> Node:
        start = self.token.at
        self.expect("{")
        rows: list[list[float | str | bool | CellError]] = [[]]
        while True:
            rows[-1].append(self.constant())
            if self.is_sign("}"):
                break
            if self.is_sign(";"):
                rows.append([])
            elif not self.is_sign(","):
                raise self.fail("',', ';' or '}'")
            self.move()
        self.move()
        if len({len(row) for row in rows}) != 1:
            raise self.fail("rows of one length", start)
        return Block(tuple(tuple(row) for row in rows))

    def constant(self) -> float | str | bool | CellError:
        sign = 1.0
        while self.is_sign("-") or self.is_sign("+"):
            sign = -sign if self.move().text == "-" else sign
        at = self.token.at
        node = self.primary()
        if isinstance(node, Literal):
            return sign * node.value if type(node.value) is float else node.value
        raise self.fail("a constant", at)


def join(operator: str, left: Node, right: Node) -> Node:
    """The tree of two operands; a range between two cells becomes one reference."""
    if (
        operator == ":"
        and isinstance(left, Cells)
        and isinstance(right, Cells)
        and (right.place is None or right.place == left.place)
        and left.rows is not None
        and right.rows is not None
        and left.columns is not None
        and right.columns is not None
        and left.rows[0] == left.rows[1]
        and left.columns[0] == left.columns[1]
        and right.rows[0] == right.rows[1]
        and right.columns[0] == right.columns[1]
    ):
        fixed = (left.fixed[0], right.fixed[0], left.fixed[2], right.fixed[2])
        return Cells(left.place, (left.rows[0], right.rows[0]), (left.columns[0], right.columns[0]), fixed)
    return Infix(operator, left, right)


def read_place(text: str) -> Place:
    """The sheets that the text before a reference names, exclamation mark included.

    Examples
    --------
    >>> read_place("'It''s'!").first, read_place("[1]Sheet1!").book, read_place("Jan:Mar!").last
    ("It's", '1', 'Mar')
    """
    body = text[:-1]
    if body[:1] == "'":
        body = body[1:-1].replace("''", "'")
    book = ""
    opened, closed = body.find("["), body.rfind("]")
    if 0 <= opened < closed:
        book = body[opened + 1 : closed]
        body = body[closed + 1 :]
    first, _, last = body.partition(":")
    return Place(book, first, last)
