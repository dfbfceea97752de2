"""Searching in text: FIND, SEARCH, SUBSTITUTE, splitting at delimiters, regular expressions."""

from __future__ import annotations

import re

from xleq.cells import CALC, MISSING, NA, VALUE, CellError, Missing, Value
from xleq.recalc.expressions import is_quick, regular_expression
from xleq.recalc.natives.table import native
from xleq.recalc.natives.text.characters import as_text, fitting, is_narrow, length, listed
from xleq.recalc.operands import Array, Fail, Operand
from xleq.recalc.patterns import has_wildcard, wildcard_position
from xleq.recalc.sheets.columns import Unsupported


def _start(within: str, start: float) -> int:
    """Index of the character at a 1-based UTF-16 position."""
    first = int(start) - 1
    if first < 0 or first > length(within):
        raise Fail(CellError("#VALUE!", "the position lies outside the text"))
    if is_narrow(within):
        return first
    return len(within.encode("utf-16-le")[: 2 * first].decode("utf-16-le", "ignore"))


def _found(within: str, at: int) -> float:
    if at < 0:
        raise Fail(CellError("#VALUE!", "the text is not found"))
    return float(length(within[:at]) + 1)


@native("FIND FINDB", "text text number?")
def find(wanted: str, within: str, start: float = 1.0) -> float:
    """Position of a text within another, as it is written."""
    return _found(within, within.find(wanted, _start(within, start)))


@native("SEARCH SEARCHB", "text text number?")
def search(wanted: str, within: str, start: float = 1.0) -> float:
    """Position of a text within another, without case and with wildcards."""
    first = _start(within, start)
    if not has_wildcard(wanted):
        return _found(within, within.lower().find(wanted.lower(), first))
    return _found(within, wildcard_position(wanted, within, first))


@native("SUBSTITUTE", "text text text number?")
def substitute(text: str, old: str, new: str, instance: float | None = None) -> str:
    """Text with every, or one, occurrence of a text replaced."""
    if instance is None:
        return fitting(text.replace(old, new)) if old else text
    if instance < 1:
        raise Fail(VALUE)
    if not old:
        return text
    at = -len(old)
    for _ in range(int(instance)):
        at = text.find(old, at + len(old))
        if at < 0:
            return text
    return fitting(text[:at] + new + text[at + len(old) :])


def _delimiter_pattern(delimiter: Operand, ignore_case: bool) -> re.Pattern[str]:
    texts = sorted((as_text(v) for v in listed((delimiter,))), key=len, reverse=True)
    return re.compile("|".join(map(re.escape, texts)), re.IGNORECASE if ignore_case else 0)


def _cut(
    text: str, delimiter: Operand, instance: float, match_mode: float, match_end: float
) -> tuple[int, int] | None:
    """Where the wanted delimiter stands in the text; None if it does not."""
    wanted = int(instance)
    if wanted == 0 or abs(wanted) > max(length(text), 1):
        raise Fail(CellError("#VALUE!", "the instance is 0 or beyond the length of the text"))
    if int(match_mode) not in (0, 1) or int(match_end) not in (0, 1):
        raise Fail(VALUE)
    pattern = _delimiter_pattern(delimiter, int(match_mode) == 1)
    if pattern.match(""):  # an empty delimiter stands at the very start, or the very end
        return (0, 0) if wanted > 0 else (len(text), len(text))
    places = [m.span() for m in pattern.finditer(text)]
    if int(match_end) == 1:
        places = [*places, (len(text), len(text))] if wanted > 0 else [(0, 0), *places]
    if abs(wanted) > len(places):
        return None
    return places[wanted - 1 if wanted > 0 else wanted]


@native("TEXTBEFORE", "text list number~ number~ number~ any?")
def textbefore(
    text: str,
    delimiter: Operand,
    instance: float = 1.0,
    match_mode: float = 0.0,
    match_end: float = 0.0,
    if_not_found: Value | Missing = NA,
) -> Value:
    """Text before a delimiter; a negative instance counts from the end."""
    place = _cut(text, delimiter, instance, match_mode, match_end)
    return _otherwise(if_not_found) if place is None else text[: place[0]]


@native("TEXTAFTER", "text list number~ number~ number~ any?")
def textafter(
    text: str,
    delimiter: Operand,
    instance: float = 1.0,
    match_mode: float = 0.0,
    match_end: float = 0.0,
    if_not_found: Value | Missing = NA,
) -> Value:
    """Text after a delimiter; a negative instance counts from the end."""
    place = _cut(text, delimiter, instance, match_mode, match_end)
    return _otherwise(if_not_found) if place is None else text[place[1] :]


def _otherwise(value: Value | Missing) -> Value:
    return NA if isinstance(value, Missing) else value


def _split(text: str, delimiter: Operand | Missing, ignore_empty: bool, ignore_case: bool) -> list[str]:
    if isinstance(delimiter, Missing):
        return [text]
    pattern = _delimiter_pattern(delimiter, ignore_case)
    if pattern.match(""):
        raise Fail(CellError("#VALUE!", "an empty delimiter splits nothing"))
    parts = pattern.split(text)
    return [p for p in parts if p] if ignore_empty else parts


@native("TEXTSPLIT", "text list list? logical~ number~ any?")
def textsplit(
    text: str,
    columns: Operand | Missing,
    rows: Operand | Missing = MISSING,
    ignore_empty: bool = False,
    match_mode: float = 0.0,
    pad: Value | Missing = NA,
) -> Value | Array:
    """Pieces between delimiters, in columns and rows."""
    if isinstance(columns, Missing) and isinstance(rows, Missing):
        raise Fail(VALUE)
    ignore_case = int(match_mode) == 1
    lines = [
        _split(line, columns, ignore_empty, ignore_case)
        for line in _split(text, rows, ignore_empty, ignore_case)
    ]
    width = max((len(line) for line in lines), default=0)
    if not width:
        raise Fail(CALC)
    filler = _otherwise(pad)
    filled: list[list[Value]] = [[*line, *[filler] * (width - len(line))] for line in lines]
    return Array.of_rows(filled)


def _expression(pattern: str, case: float, text: str) -> re.Pattern[str]:
    """The regular expression; one that could take for ever on this text is not tried."""
    if int(case) not in (0, 1):
        raise Fail(VALUE)
    expression = regular_expression(pattern, int(case) == 1)
    if not is_quick(pattern, len(text)):
        raise Unsupported("the regular expression could take too long on this text")
    return expression


@native("REGEXTEST", "text text number~")
def regextest(text: str, pattern: str, case: float = 0.0) -> bool:
    """Whether a regular expression occurs in a text."""
    return _expression(pattern, case, text).search(text) is not None


@native("REGEXEXTRACT", "text text number~ number~")
def regexextract(text: str, pattern: str, mode: float = 0.0, case: float = 0.0) -> Value | Array:
    """First match, all matches, or the groups of the first match."""
    expression = _expression(pattern, case, text)
    first = expression.search(text)
    if int(mode) not in (0, 1, 2):
        raise Fail(VALUE)
    if first is None:
        raise Fail(CellError("#N/A", "the pattern does not occur in the text"))
    if int(mode) == 0:
        return first[0]
    if int(mode) == 1:
        return Array.row([m[0] for m in expression.finditer(text)])
    if not first.groups():
        raise Fail(NA)
    return Array.row([g or "" for g in first.groups()])


_REFERENCE = re.compile(r"\$(?:\$|(?P<number>[0-9]{1,2})|\{(?P<name>\w+)\})")


@native("REGEXREPLACE", "text text text number~ number~")
def regexreplace(
    text: str, pattern: str, replacement: str, occurrence: float = 0.0, case: float = 0.0
) -> str:
    """Matches replaced, all of them or one, counted from the end where negative."""
    expression = _expression(pattern, case, text)

    def expanded(match: re.Match[str]) -> str:
        def group(reference: re.Match[str]) -> str:
            key = reference["number"] or reference["name"]
            if key is None:
                return "$"
            try:
                return match[int(key) if key.isdigit() else key] or ""
            except IndexError:
                raise Fail(CellError("#VALUE!", f"the pattern has no group {key}")) from None

        return _REFERENCE.sub(group, replacement)

    wanted = int(occurrence)
    if wanted == 0:
        return fitting(expression.sub(expanded, text))
    matches = list(expression.finditer(text))
    if abs(wanted) > len(matches):
        return text
    match = matches[wanted - 1 if wanted > 0 else wanted]
    return fitting(text[: match.start()] + expanded(match) + text[match.end() :])


@native("ENCODEURL", "text")
def encodeurl(text: str) -> str:
    """Text with the characters that have a meaning in addresses escaped."""
    from urllib.parse import quote

    return quote(text, safe="-_.")
