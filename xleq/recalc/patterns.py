"""Wildcards of the spreadsheet: ``?`` one character, ``*`` any number, ``~`` takes the next one literally."""

from __future__ import annotations

import re
from functools import lru_cache


def has_wildcard(text: str) -> bool:
    """Whether a text means something else than itself as a pattern.

    Examples
    --------
    >>> has_wildcard("N*"), has_wildcard("what~?"), has_wildcard("NH3")
    (True, True, False)
    """
    return "*" in text or "?" in text or "~" in text


@lru_cache(maxsize=1024)
def wildcard_pattern(text: str) -> re.Pattern[str]:
    """Regular expression of a text with wildcards, without case.

    Examples
    --------
    >>> bool(wildcard_pattern("n?3").fullmatch("NH3")), bool(wildcard_pattern("~*").fullmatch("a"))
    (True, False)
    """
    return re.compile(_translated(text, "."), re.IGNORECASE | re.DOTALL)


@lru_cache(maxsize=1024)
def line_pattern(text: str, separator: str) -> re.Pattern[str]:
    """Regular expression that finds a text with wildcards as a whole between two separators."""
    return re.compile(f"{separator}{_translated(text, f'[^{separator}]')}(?={separator})")


@lru_cache(maxsize=1024)
def _search_pattern(text: str) -> re.Pattern[str]:
    # What follows a star after a later place also follows it after the first one: only that has to be tried.
    first, *rest = _segments(text, ".")
    return re.compile(f"(?>.*?({first})){_starred(rest, '.')}", re.IGNORECASE | re.DOTALL)


def wildcard_position(text: str, within: str, start: int) -> int:
    """Where a text with wildcards first occurs in another, from index `start` on; -1 if nowhere.

    Examples
    --------
    >>> wildcard_position("b*d", "abcd", 0), wildcard_position("?x", "abc", 0)
    (1, -1)
    """
    match = _search_pattern(text).match(within, start)
    return match.start(1) if match else -1


def _translated(text: str, any_character: str) -> str:
    first, *rest = _segments(text, any_character)
    return first + _starred(rest, any_character)


def _segments(text: str, any_character: str) -> list[str]:
    """Regular expressions of the parts between stars."""
    segments = [""]
    at = 0
    while at < len(text):
        c = text[at]
        if c == "~":  # takes any character literally; at the end it stands for nothing
            at += 1
            segments[-1] += re.escape(text[at : at + 1])
        elif c == "*":
            segments.append("")
        else:
            segments[-1] += any_character if c == "?" else re.escape(c)
        at += 1
    return segments


def _starred(segments: list[str], any_character: str) -> str:
    """Segments with a star before each.

    One that is not the last is taken where it first occurs, which is always right, so that no pattern takes
    more than a few passes over a text.
    """
    if not segments:
        return ""
    *middle, last = segments
    found = "".join(f"(?>{any_character}*?{segment})" for segment in middle if segment)
    return f"{found}{any_character}*{last}"
