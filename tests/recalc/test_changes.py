"""Following changes through stored values gives what computing everything afresh gives."""

from __future__ import annotations

import random

import pytest

from tests.recalc.books import at, book, result
from xleq.cells import BLANK

FORMS = """
{a}+{b}|{a}*2-{b}|IF({a}>{b},{a},{c})|SUM({r})|SUM({r})+COUNT({s})|MAX({r})-MIN({s})|SUMPRODUCT({r}*1)
COUNTIF({r},">"&{a})|IFERROR({a}/{b},{c})|{a}&"/"&{b}|INDEX({r},1)|OFFSET({a},0,0)+1|LET(x,{a},x*x)|SUM({r},{a})
IF(ISNUMBER({a}),ROUND({a},1),0)|AVERAGE({r})
"""
FORMULAS = [form for line in FORMS.split() for form in line.split("|")]


def sheet(rng: random.Random, n_rows: int) -> dict[str, object]:
    """Constants in A and B; in C to F formulas that look at cells to their left and above."""
    cells: dict[str, object] = {}
    for row in range(1, n_rows + 1):
        cells[f"A{row}"] = round(rng.uniform(-5, 5), 2)
        if rng.random() < 0.8:
            cells[f"B{row}"] = rng.choice([0, 1, "x", True, 2.5])
        for place, column in enumerate("CDEF", 3):

            def cell(place: int = place) -> str:
                return f"{rng.choice('ABCDEF'[: place - 1])}{rng.randint(1, n_rows)}"

            def area(place: int = place) -> str:
                left = rng.choice("ABCDEF"[: place - 1])
                first, last = sorted((rng.randint(1, n_rows), rng.randint(1, n_rows)))
                return f"{left}{first}:{left}{last}"

            cells[f"{column}{row}"] = "=" + rng.choice(FORMULAS).format(
                a=cell(), b=cell(), c=cell(), r=area(), s=area()
            )
    return cells


@pytest.mark.parametrize("seed", range(6))
def test_changed_inputs_are_followed_everywhere(seed):
    rng = random.Random(seed)
    cells = sheet(rng, rng.choice([12, 120]))
    first = result(book({"S": cells}), trust_fresh=True)
    stored = {str(address): value for address, value in first.values.items() if value is not BLANK}
    saved = book({"S": cells}, stored)
    unchanged = result(saved)
    assert (unchanged.changed, unchanged.disagreements, unchanged.kept) == ([], [], [])
    inputs = [a for a in cells if a[0] in "AB"]
    overrides = {at(a): float(rng.randint(-3, 9)) for a in rng.sample(inputs, 5)}
    followed = result(saved, overrides=overrides)
    afresh = result(saved, overrides=overrides, trust_fresh=True)
    assert followed.values == afresh.values
    assert followed.changed == afresh.changed
    assert followed.disagreements == []
    assert followed.changed
