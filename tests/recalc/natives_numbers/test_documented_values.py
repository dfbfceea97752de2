"""Each function against the values that Microsoft's documentation of it prints."""

from __future__ import annotations

from decimal import Decimal, InvalidOperation
from pathlib import Path

import pytest

from xleq.cells import CellError
from xleq.recalc.operands import spilled
from xleq.recalc.recalculation import evaluate_text

ROWS = [
    line.split("\t")
    for table in sorted(Path(__file__).parent.glob("documented_*.tsv"))
    for line in table.read_text("utf-8").splitlines()
    if line and not line.startswith("#")
]


def half_digit(printed: str) -> float:
    return float(Decimal(1).scaleb(int(Decimal(printed).as_tuple().exponent))) / 2


@pytest.mark.parametrize(("formula", "printed"), ROWS, ids=[f"{f[:60]}" for f, _ in ROWS])
def test_the_documented_value_comes_out(formula: str, printed: str) -> None:
    found = spilled(evaluate_text("=" + formula))
    if printed.startswith("#"):
        assert isinstance(found, CellError)
        assert found.code == printed
    elif printed.startswith("'"):
        assert found == printed[1:]
    else:
        try:
            Decimal(printed)
        except InvalidOperation:
            assert found == printed
            return
        assert isinstance(found, float)
        tolerance = half_digit(printed) * 1.000001 if "." in printed or "E" in printed else 1e-9
        if "." not in printed and abs(float(printed)) > 100_000:
            tolerance = 0.5
        assert found == pytest.approx(float(printed), rel=0, abs=tolerance)
