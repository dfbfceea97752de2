"""How tests of functions say what a formula gives."""

from datetime import datetime

from xleq.cells import CellError
from xleq.recalc import evaluate_text
from xleq.recalc.operands import Array

NOW = datetime(2026, 3, 5, 18)


def shown(formula: str):
    """Value of a formula: an error as its code, an array as its rows."""
    value = evaluate_text(formula, now=NOW)
    if isinstance(value, Array):
        return [[v.code if isinstance(v, CellError) else v for v in row] for row in value.rows()]
    return value.code if isinstance(value, CellError) else value
