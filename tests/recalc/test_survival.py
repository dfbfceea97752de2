"""Whatever is given to a native function, it gives a value or an error value, and soon."""

from __future__ import annotations

import random

import pytest

from tests.recalc.books import NOW, book
from xleq.cells import BLANK, NA, CellError
from xleq.recalc.natives import natives
from xleq.recalc.operands import Array
from xleq.recalc.sheets.columns import Unsupported
from xleq.recalc.sheets.evaluate import Engine, Settings, single_value
from xleq.recalc.syntax.parse import parse

CELLS = {
    **{f"A{r}": r for r in range(1, 31)}, "B1": "x", "B2": True, "B3": NA, "B4": 2.5, "B5": "12", "B6": "",
    "C1": -1, "C2": 0, "C3": 1e300, "C4": "2020-01-02", "D1": "=1/0", "D2": "=A1",
}  # fmt: skip
ATOMS = [
    "", "1", "0", "-1", "2.5", "1E300", "-3", "100", "45000", "0.5", "1E-300", '"x"', '""', '"12"',
    '"2020-01-01"', '">2"', '"a*"', '"yyyy-mm-dd"', '"i"', '"3+4i"', "TRUE", "FALSE", "#N/A", "1/0",
    "nothing",
    "A1", "B1", "B2", "B3", "C1", "C2", "C3", "E5", "A1:A5", "A1:A30", "B1:B6", "A1:C3", "E1:E3",
    "A:A", "S!A1:A3", "(A1:A2,B4)", "{1,2,3}", '{1;2;"a"}', "{TRUE,#N/A}", "{1,2;3,4}", "A1:A5*2",
    "INDEX(A1:A5,2)",
    "OFFSET(A1,1,0,3,1)", "IF(TRUE,A1:A3)", "LAMBDA(x,x)",
]  # fmt: skip


def formulas(name, rng, n):
    """Random calls of a native function."""
    native = natives()[name]
    for _ in range(n):
        count = rng.randint(native.least, min(native.most, native.least + 4))
        yield f"={name}({','.join(rng.choice(ATOMS) for _ in range(count))})"


def outcomes(engine, formula):
    """The values of a formula in both modes."""
    for array in (False, True):
        try:
            found = engine.compilers[0].formula(parse(formula), array)(engine.place((0, 50, 20), array))
        except Unsupported:
            continue
        yield from (
            (single_value(v) for v in found.flat[:100]) if isinstance(found, Array) else [single_value(found)]
        )


@pytest.mark.parametrize(("seed", "n"), [(1, 4), pytest.param(2, 60, marks=pytest.mark.slow)])
def test_every_native_function_survives_random_arguments(seed, n):
    engine = Engine(book({"S": CELLS}), {}, Settings(NOW, check=False), {}, {})
    engine.everything()
    rng = random.Random(seed)
    for name in sorted(natives()):
        for formula in formulas(name, rng, n):
            for value in outcomes(engine, formula):
                assert type(value) in (float, str, bool, CellError) or value is BLANK, formula
                assert type(value) is not float or value - value == 0.0, formula
