"""A number format code, read: its sections, and what stands in each."""

from __future__ import annotations

import operator
import re
from collections.abc import Callable
from dataclasses import dataclass
from functools import lru_cache
from typing import Final, Literal

from xleq.errors import ParseError

#: What a token is. `digit` is one of 0 # ?; `elapsed` a run of h, m or s in brackets; `minute` an m that is
#: not a month; `fraction` the decimals of a second, as many as its text is long.
TokenKind = Literal[
    "literal", "digit", "point", "comma", "percent", "exponent", "slash", "general", "text",
    "year", "month", "day", "hour", "minute", "second", "elapsed", "fraction", "half",
    "buddhist", "era",
]  # fmt: skip
DATE_KINDS: Final = frozenset(
    ("year", "month", "day", "hour", "minute", "second", "elapsed", "fraction", "half", "buddhist", "era")
)


@dataclass(frozen=True, slots=True)
class Token:
    """One element of a section and its text."""

    kind: TokenKind
    text: str


@dataclass(frozen=True, slots=True)
class Condition:
    """A comparison in brackets that decides whether the section is used."""

    test: Callable[[float, float], bool]
    limit: float
    only_negative: bool

    def holds(self, x: float) -> bool:
        """Whether the number meets the condition."""
        return self.test(x, self.limit)


@dataclass(frozen=True, slots=True)
class Section:
    """One section of a code."""

    tokens: tuple[Token, ...]
    condition: Condition | None = None
    foreign: bool = False

    @property
    def names_foreign(self) -> bool:
        """Whether it shows months, days or eras as they are in another language than English."""
        return self.foreign and any(
            t.kind == "era"
            or (t.kind == "year" and t.text[0] in "eE")
            or (t.kind in ("month", "day") and len(t.text) > 2)
            for t in self.tokens
        )

    def has(self, *kinds: TokenKind) -> bool:
        """Whether a token of one of these kinds stands in it."""
        return any(t.kind in kinds for t in self.tokens)

    @property
    def is_date(self) -> bool:
        """Whether it shows a date or a time."""
        return any(t.kind in DATE_KINDS for t in self.tokens)


_TESTS: Final[dict[str, Callable[[float, float], bool]]] = {
    "<": operator.lt, "<=": operator.le, ">": operator.gt, ">=": operator.ge, "=": operator.eq,
    "<>": operator.ne,
}  # fmt: skip
_CONDITION = re.compile(r"(<=|<>|>=|<|>|=)\s*([+-]?[0-9]*\.?[0-9]+(?:E[+-]?[0-9]+)?)", re.IGNORECASE)
_COLOUR = re.compile(r"black|blue|cyan|green|magenta|red|white|yellow|color\s*[0-9]{1,2}", re.IGNORECASE)
_NO_TEXT = re.compile(r"DBNum[0-9]|NatNum[0-9]+|~?(?:hijri|gregorian)|ENG|JPN|TWN", re.IGNORECASE)
_WORDS: Final[tuple[tuple[re.Pattern[str], TokenKind], ...]] = (
    (re.compile("general", re.IGNORECASE), "general"),
    (re.compile("am/pm|a/p", re.IGNORECASE), "half"),
    (re.compile("y+|e+(?![+-])", re.IGNORECASE), "year"),
    (re.compile("m+", re.IGNORECASE), "month"),
    (re.compile("d+", re.IGNORECASE), "day"),
    (re.compile("h+", re.IGNORECASE), "hour"),
    (re.compile("s+", re.IGNORECASE), "second"),
    (re.compile("b+[12]?", re.IGNORECASE), "buddhist"),
    (re.compile("g+", re.IGNORECASE), "era"),
    (re.compile(r"E[+-]", re.IGNORECASE), "exponent"),
    (re.compile(r"[0#?]"), "digit"),
    (re.compile(r"\."), "point"),
    (re.compile(","), "comma"),
    (re.compile("%"), "percent"),
    (re.compile("/"), "slash"),
    (re.compile("@"), "text"),
)
#: What the system's own long date and time stand for in the US-English locale.
_SYSTEM: Final = {"-f800": "dddd, mmmm d, yyyy", "-f400": "h:mm:ss AM/PM"}


@lru_cache(maxsize=2048)
def read_code(code: str) -> tuple[Section, ...]:
    """The sections of a code, one to four.

    Raises
    ------
    ParseError
        If it is not a number format.

    Examples
    --------
    >>> [len(s.tokens) for s in read_code('0.00;[Red]-0.00')]
    [4, 5]
    """
    reader = _Reader(code)
    sections = [reader.section()]
    while reader.at < len(code):
        reader.at += 1
        sections.append(reader.section())
    if len(sections) > 4:
        raise ParseError(code, len(code), "at most four sections")
    return tuple(sections)


class _Reader:
    def __init__(self, code: str) -> None:
        self.code = code
        self.at = 0
        self.foreign = False

    def section(self) -> Section:
        tokens: list[Token] = []
        condition: Condition | None = None
        self.foreign = False
        while self.at < len(self.code) and self.code[self.at] != ";":
            if self.code[self.at] == "[":
                found = self._bracket(tokens)
                condition = found or condition
            else:
                tokens.append(self._token())
        tokens = _with_minutes(tokens)
        self._check(tokens)
        return Section(tuple(tokens), condition, self.foreign)

    def _until(self, end: str) -> str:
        start = self.at + 1
        stop = self.code.find(end, start)
        if stop < 0:
            raise ParseError(self.code, len(self.code), end)
        self.at = stop + 1
        return self.code[start:stop]

    def _bracket(self, tokens: list[Token]) -> Condition | None:
        at = self.at
        inner = self._until("]").strip()
        if inner.lower() in ("h" * len(inner), "m" * len(inner), "s" * len(inner)) and inner:
            tokens.append(Token("elapsed", inner.lower()))
        elif inner.startswith("$"):
            symbol, _, locale = inner[1:].partition("-")
            system = _SYSTEM.get("-" + locale.lower())
            if system:
                tokens += _Reader(system).section().tokens
                self.at = self.code.find(";", self.at) if ";" in self.code[self.at :] else len(self.code)
            else:
                tokens += [Token("literal", symbol)] if symbol else []
                self.foreign = self.foreign or not _is_english(locale)
        elif match := _CONDITION.fullmatch(inner):
            limit = float(match[2])
            negative = (match[1] == "<" and limit <= 0) or (match[1] in ("<=", "=") and limit < 0)
            return Condition(_TESTS[match[1]], limit, negative)
        elif not (_COLOUR.fullmatch(inner) or _NO_TEXT.fullmatch(inner)):
            raise ParseError(self.code, at, "a colour, a condition, an elapsed time or a currency")
        return None

    def _token(self) -> Token:
        code, at = self.code, self.at
        c = code[at]
        if c == '"':
            return Token("literal", self._until('"'))
        if c in "\\_*!":
            if at + 1 == len(code):
                raise ParseError(code, at + 1, "a character")
            self.at += 2
            return Token("literal", {"_": " ", "*": ""}.get(c, code[at + 1]))
        for pattern, kind in _WORDS:
            match = pattern.match(code, at)
            if match:
                self.at = match.end()
                return Token(kind, match[0])
        self.at += 1
        return Token("literal", c)

    def _check(self, tokens: list[Token]) -> None:
        kinds = {t.kind for t in tokens}
        dated = kinds & DATE_KINDS
        if dated and kinds & {"digit", "general", "exponent", "text"}:
            if dated == {"era"}:
                return
            raise ParseError(self.code, 0, "either a number or a date in one section")
        if "exponent" in kinds and "digit" not in kinds:
            raise ParseError(self.code, 0, "digits beside the exponent")


def _is_english(locale: str) -> bool:
    """Whether a locale, a tag or a hexadecimal number whose low ten bits are the language, is English."""
    tag = locale.split(",")[0].lower()
    if not tag or tag.startswith("en"):
        return True
    return re.fullmatch("[0-9a-f]+", tag) is not None and int(tag, 16) & 0x3FF in (0, 9)


def _with_minutes(tokens: list[Token]) -> list[Token]:
    """Tell minutes from months and decimals of seconds from digits."""
    result: list[Token] = []
    last = ""
    i = 0
    while i < len(tokens):
        token = tokens[i]
        if (
            token.kind == "month"
            and len(token.text) <= 2
            and (last in ("hour", "second") or _second_next(tokens, i))
        ):
            token = Token("minute", token.text)
        seconds = last == "second"
        if token.kind == "point" and seconds and i + 1 < len(tokens) and tokens[i + 1].text == "0":
            zeros = 0
            while i + 1 < len(tokens) and tokens[i + 1] == Token("digit", "0"):
                zeros += 1
                i += 1
            token = Token("fraction", "0" * zeros)
        if token.kind in DATE_KINDS and token.kind != "half":
            last = (
                {"h": "hour", "m": "minute", "s": "second"}[token.text[0]]
                if (token.kind == "elapsed")
                else token.kind
            )
        result.append(token)
        i += 1
    if any(t.kind in DATE_KINDS for t in result):
        plain = ("comma", "point", "percent", "slash")
        result = [Token("literal", t.text) if t.kind in plain else t for t in result]
    return result


def _second_next(tokens: list[Token], i: int) -> bool:
    for token in tokens[i + 1 :]:
        if token.kind in DATE_KINDS:
            return token.kind == "second" or (token.kind == "elapsed" and token.text[0] == "s")
    return False
