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


def _translated(text: str, any_character: str) -> str:
    parts: list[str] = []
    at = 0
    while at < len(text):
        c = text[at]
        if c == "~":  # takes any character literally; at the end it stands for nothing
            at += 1
            parts.append(re.escape(text[at : at + 1]))
        elif c != "*":
            parts.append(any_character if c == "?" else re.escape(c))
        elif not parts or parts[-1] != any_character + "*":
            parts.append(any_character + "*")
        at += 1
    return "".join(parts)
