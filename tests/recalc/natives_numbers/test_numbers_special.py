"""Special cases of arithmetic, units, regression and chance."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from xleq.recalc.natives.arithmetic.numerals import arabic, roman
from xleq.recalc.natives.arithmetic.rounding import round_
from xleq.recalc.natives.engineering.units import UNITS


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ("ROUND(2.675,2)", 2.68),
        ("ROUND(1.005,2)", 1.01),
        ("ROUND(-0.5,0)", -1.0),
        ("ROUND(1E300,2)", 1e300),
        ("ROUND(123456789012345,-3)", 123456789012000.0),
        ("ROUND(0.1+0.2,20)", 0.1 + 0.2),
        ("INT((0.1+0.7)*10)", 8.0),
        ("FLOOR(0.3,0.1)", pytest.approx(0.3)),
        ("MOD(1,0)", "#DIV/0!"),
        ("MOD(1E20,3)", "#NUM!"),
        ("POWER(0,0)", "#NUM!"),
        ("POWER(0,-1)", "#DIV/0!"),
        ("POWER(-8,1/3)", pytest.approx(-2.0)),
        ("POWER(-8,0.5)", "#NUM!"),
        ("EXP(1000)", "#NUM!"),
        ("LN(0)", "#NUM!"),
        ("LOG(10,1)", "#DIV/0!"),
        ("FACT(171)", "#NUM!"),
        ("COMBIN(3,4)", "#NUM!"),
        ("COMBIN(1030,515)", "#NUM!"),
        ("ATAN2(0,0)", "#DIV/0!"),
        ("SIN(134217728)", "#NUM!"),
        ("TAN(0)", 0.0),
        ("COT(0)", "#DIV/0!"),
        ("BASE(-1,2)", "#NUM!"),
        ('DECIMAL("12",2)', "#NUM!"),
        ("MDETERM({1,2})", "#VALUE!"),
        ("MINVERSE({1,2;2,4})", "#NUM!"),
        ("MMULT({1,2},{1,2})", "#VALUE!"),
        ("MUNIT(2)", [[1.0, 0.0], [0.0, 1.0]]),
        ('IMSUM("1+i","1+j")', "#VALUE!"),
        ('IMSUM("1+",1)', "#NUM!"),
        ('COMPLEX(1,1,"k")', "#VALUE!"),
        ("IMDIV(1,0)", "#NUM!"),
        ("DELTA(TRUE,1)", "#VALUE!"),
        ("BITAND(-1,1)", "#NUM!"),
        ("DEC2BIN(512)", "#NUM!"),
        ('CONVERT(1,"xx","m")', "#N/A"),
        ('CONVERT(1,"m","M")', "#N/A"),
        ("NORMSINV(0)", "#NUM!"),
        ("TDIST(-1,5,1)", "#NUM!"),
        ("CHIDIST(CHIINV(1E-100,3),3)", pytest.approx(1e-100, rel=1e-9)),
        ("NPV(0.1)", "#VALUE!"),
        ("PMT(0,10,1000)", -100.0),
        ("RATE(10,-100,1000)", pytest.approx(0.0, abs=1e-12)),
        ("IRR({1,2,3})", "#NUM!"),
        ("SQRT({4,-1})", [[2.0, "#NUM!"]]),
    ],
)
def test_special_cases(evaluate: Any, formula: str, value: Any) -> None:
    assert evaluate(formula) == value


@given(st.integers(0, 3999), st.integers(0, 4))
def test_roman_numerals_read_back(x: int, form: int) -> None:
    assert arabic(roman(float(x), float(form))) == x


@given(st.integers(-(10**9), 10**9), st.integers(0, 6))
def test_decimal_numbers_with_few_digits_stay_as_they_are_when_rounded(x: int, digits: int) -> None:
    number = x / 10**digits
    assert round_(number, float(digits)) == number


@pytest.mark.parametrize("name", sorted(UNITS))
def test_every_unit_converts_there_and_back(evaluate: Any, name: str) -> None:
    first = next(n for n, u in UNITS.items() if u.group == UNITS[name].group)
    there = evaluate(f'CONVERT(3,"{name}","{first}")')
    assert evaluate(f'CONVERT({there!r},"{first}","{name}")') == pytest.approx(3.0, rel=1e-9)


# source: Microsoft, documentation of LINEST, example 3 (office buildings; from memory)
OFFICES = {
    f"A{i + 1}": row
    for i, row in enumerate(
        [
            [2310, 2, 2, 20, 142000], [2333, 2, 2, 12, 144000], [2356, 3, 1.5, 33, 151000],
            [2379, 3, 2, 43, 150000], [2402, 2, 3, 53, 139000], [2425, 4, 2, 23, 169000],
            [2448, 2, 1.5, 99, 126000], [2471, 2, 2, 34, 142900], [2494, 3, 3, 23, 163000],
            [2517, 4, 4, 55, 169000], [2540, 2, 3, 22, 149000],
        ]
    )
}  # fmt: skip


def test_linest_gives_the_documented_statistics(evaluate: Any) -> None:
    found = evaluate("LINEST(E1:E11,A1:D11,TRUE,TRUE)", OFFICES)
    assert found[0] == pytest.approx([-234.2371645, 2553.21066, 12529.76817, 27.64138737, 52317.83051])
    assert found[1] == pytest.approx([13.26801148, 530.6691519, 400.0668382, 5.429374042, 12237.3616])
    assert found[2] == [pytest.approx(0.996747993), pytest.approx(970.5784629), "#N/A", "#N/A", "#N/A"]
    assert found[3][:2] == pytest.approx([459.7536742, 6.0])
    assert found[4][:2] == pytest.approx([1732393319.0, 5652135.3], rel=1e-7)


def test_a_column_that_others_determine_gets_no_coefficient(evaluate: Any) -> None:
    cells = {f"A{i}": [i, 2 * i, 3 * i + 1] for i in range(1, 8)}
    assert evaluate("LINEST(C1:C7,A1:B7)", cells)[0] == pytest.approx([0.0, 3.0, 1.0], abs=1e-9)


@given(st.lists(st.floats(-50, 50), min_size=3, max_size=12, unique_by=lambda x: round(x, 2)))
def test_the_straight_line_is_numpys(xs: list[float]) -> None:
    from xleq.recalc.natives.statistics.pairs import intercept, slope
    from xleq.recalc.operands import Array

    ys = [2.5 * x - 7.0 + (-1) ** i for i, x in enumerate(xs)]
    b, a = np.polyfit(xs, ys, 1)
    assert slope(Array.column(ys), Array.column(xs)) == pytest.approx(b, rel=1e-6, abs=1e-6)
    assert intercept(Array.column(ys), Array.column(xs)) == pytest.approx(a, rel=1e-6, abs=1e-5)


def test_random_numbers_repeat_with_their_seed(evaluate: Any) -> None:
    x = evaluate("RAND()")
    assert 0.0 <= x < 1.0
    assert evaluate("RAND()") == x
    assert evaluate("RANDBETWEEN(3,3)") == 3.0
    assert evaluate("RANDBETWEEN(2,1)") == "#NUM!"
    block = evaluate("RANDARRAY(3,2,1,6,TRUE)")
    assert len(block) == 3
    assert all(1.0 <= v <= 6.0 and v == int(v) for row in block for v in row)


# source: Abramowitz & Stegun 1964, tables 9.1, 9.8 (J0(1), J2(2), Y0(1), e^-x I0 at 1 scaled back, K by 9.8)
@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ("BESSELJ(1,0)", 0.7651976866),
        ("BESSELJ(2,2)", 0.3528340286),
        ("BESSELY(1,0)", 0.0882569642),
        ("BESSELI(1,0)", 1.2660658778),
        ("BESSELK(1,0)", 0.4210244382),
    ],
)
def test_bessel_functions_are_those_of_the_tables(evaluate: Any, formula: str, value: float) -> None:
    assert evaluate(formula) == pytest.approx(value, abs=1e-10)


@pytest.mark.parametrize(
    "pair", ["IMSEC IMCOS", "IMCOT IMTAN", "IMCSC IMSIN", "IMSECH IMCOSH", "IMCSCH IMSINH"]
)
def test_reciprocal_functions_multiply_to_one(evaluate: Any, pair: str) -> None:
    one, other = pair.split()
    for z in ("4+3i", "-0.5+2i", "1.25-0.75i"):
        assert evaluate(f'IMABS(IMSUB(IMPRODUCT({one}("{z}"),{other}("{z}")),1))') < 1e-13
