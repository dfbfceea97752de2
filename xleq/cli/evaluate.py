"""``xleq eval``: one formula."""

from __future__ import annotations

import json
import sys

from xleq.cells import CellError, Grid, Value
from xleq.cli.show import plain_grid, shown
from xleq.hosts.headless import evaluate_formula


def run(formula: str, *, as_json: bool) -> int:
    """Print the value, or the error and its reason; gives the exit code."""
    value = evaluate_formula(formula)
    if as_json:
        print(json.dumps({"formula": formula, "value": plain_grid(value)}, ensure_ascii=False))
    else:
        _print(value)
    return 2 if isinstance(value, CellError) else 0


def _print(value: Value | Grid) -> None:
    if isinstance(value, CellError):
        print(value.code)
        if value.reason:
            print(value.reason, file=sys.stderr)
        return
    if not isinstance(value, list):
        print(shown(value))
        return
    rows = [[shown(v) for v in row] for row in value]
    widths = [max(len(row[i]) for row in rows) for i in range(len(rows[0]))]
    for row in rows:
        print("  ".join(text.ljust(width) for text, width in zip(row, widths, strict=True)).rstrip())
