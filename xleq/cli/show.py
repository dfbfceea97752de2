"""How values look on a terminal and in JSON."""

from __future__ import annotations

import math

from xleq.cells import BLANK, CellError, Grid, Value


def shown(value: Value) -> str:
    """A value as a cell would show it: numbers with 15 digits."""
    if isinstance(value, bool):
        return "TRUE" if value else "FALSE"
    if isinstance(value, float):
        from xleq.recalc.texts import number_text

        return number_text(value)
    return "" if value is BLANK else str(value)


def plain(value: Value) -> object:
    """A value as JSON has it; an error becomes an object with its code, reason and origin."""
    if isinstance(value, CellError):
        found = {"error": value.code, "reason": value.reason, "origin": value.origin}
        return {key: text for key, text in found.items() if text}
    if value is BLANK:
        return None
    if isinstance(value, float) and math.isfinite(value) and value.is_integer() and abs(value) < 2**53:
        return int(value)
    return value


def plain_grid(value: Value | Grid) -> object:
    """A value or a block as JSON has it."""
    return [[plain(v) for v in row] for row in value] if isinstance(value, list) else plain(value)
