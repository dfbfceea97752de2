"""Regular expressions of the functions that take them, compiled, and kept from running for ever."""

from __future__ import annotations

import re
from dataclasses import dataclass, field
from functools import lru_cache
from typing import Final

from xleq.cells import CellError
from xleq.recalc.operands import Fail

#: Most steps that a search may take in the worst case, apart from one pass over the places to begin.
_MOST_STEPS: Final = 1e9
#: A repeat of at most so many times counts as one of a fixed number.
_FEW: Final = 9

_ELEMENT = re.compile(
    r"\\.|\[\^?\]?(?:\\.|[^\]\\])*\]|\((?:\?(?:[:=!>]|<[=!]|P?<\w+>))?|.",
    re.DOTALL,
)
_QUANTIFIER = re.compile(r"[*+?]|\{(\d*)(,?)(\d*)\}")


@lru_cache(maxsize=256)
def regular_expression(pattern: str, ignore_case: bool = False) -> re.Pattern[str]:
    """A pattern compiled.

    Raises
    ------
    Fail
        #VALUE! if it is no regular expression.
    """
    try:
        return re.compile(pattern, re.IGNORECASE if ignore_case else 0)
    except (re.error, OverflowError, RecursionError) as error:
        raise Fail(CellError("#VALUE!", f"the pattern is not a regular expression: {error}")) from None


def is_quick(pattern: str, length: int) -> bool:
    """Whether searching a text of that length certainly ends soon.

    Examples
    --------
    >>> is_quick("[A-Z][a-z]*", 30000), is_quick("(a+)+b", 30)
    (True, False)
    """
    repeats = unbounded_repeats(pattern)
    return repeats is not None and float(length) ** min(repeats, 60) <= _MOST_STEPS


@dataclass(slots=True)
class _Group:
    """What is known of a group of a pattern while it is read: repeats inside, how its alternatives begin."""

    repeats: int = 0
    begins: list[str] = field(default_factory=list)
    at_begin: bool = True

    @property
    def is_ambiguous(self) -> bool:
        """Whether two of its alternatives could match the same text."""
        if len(self.begins) < 2:
            return False
        plain = all(len(b) == 1 and b not in "(.$^" for b in self.begins)
        return not plain or len({b.lower() for b in self.begins}) < len(self.begins)

    def add(self, element: str) -> None:
        if self.at_begin:
            self.begins.append(element)
            self.at_begin = False


@lru_cache(maxsize=256)
def unbounded_repeats(pattern: str) -> int | None:
    """How many repeats without a limit a regular expression has; None where one lies inside another.

    The time that a search may take grows with the length of the text to the power of that number, and without
    any bound where repeats, or alternatives that begin alike, lie inside a repeat.

    Examples
    --------
    >>> unbounded_repeats("[A-Z]+[0-9]*x?"), unbounded_repeats("(a+)+"), unbounded_repeats("(a|ab)*")
    (2, None, None)
    """
    total = 0
    groups = [_Group()]
    at = 0
    while at < len(pattern):
        match = _ELEMENT.match(pattern, at)
        assert match is not None
        element, at = match[0], match.end()
        if element[0] == "(":
            groups[-1].add("(")
            groups.append(_Group())
            continue
        if element == "|":
            groups[-1].add("")
            groups[-1].at_begin = True
            continue
        inside = _Group()
        if element == ")" and len(groups) > 1:
            inside = groups.pop()
        else:
            groups[-1].add(element)
        endless, at = _repeat(pattern, at)
        if endless and (inside.repeats or inside.is_ambiguous):
            return None
        total += endless
        groups[-1].repeats += inside.repeats + endless
    return total


def _repeat(pattern: str, at: int) -> tuple[bool, int]:
    """Whether a quantifier stands there that repeats many times, and where the pattern goes on."""
    match = _QUANTIFIER.match(pattern, at)
    if match is None:
        return False, at
    at = match.end()
    if pattern[at : at + 1] in ("?", "+"):
        at += 1
    if match[0][0] != "{":
        return match[0] != "?", at
    low, comma, high = match[1], match[2], match[3]
    return (not high) if comma and not high else int(high or low or 0) > _FEW, at
