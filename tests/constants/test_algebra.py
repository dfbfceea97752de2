"""Constants scaled, summed, moved in temperature, and compared with quotients."""

from __future__ import annotations

import math
from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st

from xleq.constants import (
    affinity,
    dg_from_ln_k,
    ln_k_at,
    ln_k_combined,
    ln_k_from_dg,
    ln_k_scaled,
    ln_quotient,
    read_k,
    write_k,
)
from xleq.errors import InputError, OutOfRangeError, ParseError
from xleq.reactions import combine, multipliers, natural_phases, parse_reaction
from xleq.units import R

logs = st.floats(-3000, 3000)
temperatures = st.floats(50, 4000)


@given(logs)
def test_reversing_twice_changes_nothing(ln_k: float) -> None:
    assert ln_k_scaled(ln_k_scaled(ln_k, -1.0), -1.0) == ln_k


@given(logs, logs)
def test_k_of_a_sum_is_the_product(one: float, other: float) -> None:
    assert ln_k_combined([one, other], [Fraction(1), Fraction(1)]) == one + other
    assert ln_k_combined([one, other], [Fraction(1), Fraction(-1)]) == one - other


@given(st.lists(st.fractions(-6, 6, max_denominator=6), min_size=3, max_size=3).filter(any))
def test_k_follows_the_reactions_through_a_sum(chosen: list[Fraction]) -> None:
    """ln K as a sum over species of ν times a potential is the same by either route."""
    parts = [parse_reaction(t) for t in ("CH4 + H2O = CO + 3 H2", "CO + H2O = CO2 + H2", "C + CO2 = 2 CO")]
    names = {s.name for r in parts for s in r.species}
    potential = {name: 1.7 * i - 3.1 for i, name in enumerate(sorted(names))}

    def ln_k(reaction: object) -> float:
        assert isinstance(reaction, type(parts[0]))
        pairs = zip(reaction.species, reaction.nu, strict=True)
        return sum(float(nu) * potential[s.name] for s, nu in pairs)

    total = parse_reaction(combine(parts, chosen))
    got = ln_k_combined([ln_k(r) for r in parts], multipliers(total, parts))
    assert got == pytest.approx(ln_k(total), rel=1e-12, abs=1e-12)


def test_combining_needs_a_constant_for_each_reaction() -> None:
    with pytest.raises(InputError, match="reactions: 2, constants: 1;"):
        ln_k_combined([1.0], [Fraction(1), Fraction(1)])


@given(logs, temperatures, temperatures, st.floats(-500, 500), st.floats(-100, 100))
def test_a_constant_moved_in_temperature_and_back_is_the_same(
    ln_k: float, t_one: float, t_other: float, dh: float, dcp: float
) -> None:
    there = ln_k_at(ln_k, t_one, t_other, dh, dcp)
    back = ln_k_at(there, t_other, t_one, dh + dcp * (t_other - t_one) / 1000.0, dcp)
    assert back == pytest.approx(ln_k, rel=1e-10, abs=1e-8)


@pytest.mark.parametrize(("dh", "dcp"), [(-92.2, 0.0), (-92.2, -45.0), (178.3, 12.5)])
def test_the_slope_of_ln_k_is_the_enthalpy(dh: float, dcp: float) -> None:
    """d ln K/dT = ΔH(T)/(R T²), by central difference."""
    t, step = 700.0, 1e-2
    slope = (ln_k_at(0.0, 298.15, t + step, dh, dcp) - ln_k_at(0.0, 298.15, t - step, dh, dcp)) / (2 * step)
    assert slope == pytest.approx((1000 * dh + dcp * (t - 298.15)) / (R * t * t), rel=1e-8)


def test_ammonia_moved_with_its_enthalpy_stays_near_the_table() -> None:
    """NIST-JANAF, 4th ed., table H-083: log10 Kf of NH3 2.867 at 298.15 K and -0.501 at 500 K; ΔfH° -45.898
    kJ/mol at 298.15 K. ΔCp of 1/2 N2 + 3/2 H2 = NH3 at 298.15 K from the Cp of the same tables: 35.652 -
    (29.124 + 3 · 28.836)/2 = -22.16 J/(mol K). Cp changes on the way, so to 0.03 in log10 K."""
    ln_k = ln_k_at(2.867 * math.log(10), 298.15, 500.0, -45.898, -22.16)
    assert ln_k / math.log(10) == pytest.approx(-0.501, abs=0.03)
    # Left out, ΔCp costs far more than that: the argument is used.
    assert ln_k_at(2.867 * math.log(10), 298.15, 500.0, -45.898) / math.log(10) > -0.42


def test_an_energy_of_rt_ln10_is_a_factor_of_ten() -> None:
    """RT ln 10 at 298.15 K is 5.708010 kJ/mol (BIPM, SI Brochure, 9th ed., 2019)."""
    assert math.exp(ln_k_from_dg(-5.708010, 298.15)) == pytest.approx(10.0, rel=1e-6)
    assert dg_from_ln_k(math.log(10.0), 298.15) == pytest.approx(-5.708010, abs=5e-7)


@given(logs, temperatures)
def test_gibbs_energy_there_and_back_is_the_same(ln_k: float, t: float) -> None:
    assert ln_k_from_dg(dg_from_ln_k(ln_k, t), t) == pytest.approx(ln_k, rel=1e-14)


def test_the_affinity_is_positive_forward_and_zero_at_equilibrium() -> None:
    assert affinity(2.0, 1.0, 500.0) == pytest.approx(R * 0.5, rel=1e-14)
    assert affinity(1.0, 2.0, 500.0) < 0.0
    assert affinity(-1234.5, -1234.5, 500.0) == 0.0


@pytest.mark.parametrize("t", [0.0, -1.0, math.nan, math.inf])
def test_a_temperature_that_is_none_is_refused(t: float) -> None:
    with pytest.raises(OutOfRangeError, match="above 0 K"):
        ln_k_at(0.0, t, 300.0, 1.0)
    with pytest.raises(OutOfRangeError, match="above 0 K"):
        ln_k_at(0.0, 300.0, t, 1.0)
    with pytest.raises(OutOfRangeError, match="above 0 K"):
        ln_k_from_dg(1.0, t)
    with pytest.raises(OutOfRangeError, match="above 0 K"):
        dg_from_ln_k(1.0, t)
    with pytest.raises(OutOfRangeError, match="above 0 K"):
        affinity(1.0, 0.0, t)


@pytest.mark.parametrize("factor", [0.0, math.nan, math.inf])
def test_a_factor_that_scales_nothing_is_refused(factor: float) -> None:
    with pytest.raises(InputError, match="the factor is"):
        ln_k_scaled(1.0, factor)


def test_a_quotient_passes_pure_phases_over_and_wants_the_others() -> None:
    reaction = natural_phases("C(s) + CO2 = 2 CO")
    _, co2, co = reaction.species
    assert ln_quotient(reaction, {co2: math.log(0.5), co: math.log(3.0)}) == pytest.approx(math.log(18.0))
    assert ln_quotient(reaction, {co2: 0.0, co: -math.inf}) == -math.inf
    with pytest.raises(OutOfRangeError, match="CO2 is absent"):
        ln_quotient(reaction, {co2: -math.inf, co: 0.0})
    with pytest.raises(InputError, match="CO takes part"):
        ln_quotient(reaction, {co2: 0.0})


@pytest.mark.parametrize(
    ("value", "ln_k"),
    [
        (1.0, 0.0), (math.e, 1.0), ("1", 0.0), (" 2.5E-3 ", math.log(2.5e-3)), ("ln -12.3", -12.3),
        ("LN 5", 5.0),
        ("ln K = -3", -3.0), ("log10 -60", -60 * math.log(10)), ("Log10 2", 2 * math.log(10)),
        ("1e-400", -400 * math.log(10)), ("2.5E+999", math.log(2.5) + 999 * math.log(10)),
        (5e-324, math.log(5e-324)),
        ("4e-320", math.log(4) - 320 * math.log(10)),
    ],
)  # fmt: skip
def test_a_constant_is_read_from_number_or_text(value: float | str, ln_k: float) -> None:
    assert read_k(value) == pytest.approx(ln_k, rel=1e-14)


@pytest.mark.parametrize(
    "value", [0.0, -1.0, math.nan, math.inf, "0", "-3", "0e5", "0.000", "-1e-400", "ln 1e999"]
)
def test_a_constant_that_is_not_positive_and_finite_is_refused(value: float | str) -> None:
    with pytest.raises(OutOfRangeError):
        read_k(value)


@pytest.mark.parametrize(
    "value", ["", "high", "ln", "ln x", "log -3", "1,5", "1e", "nan", "inf", "1 bar", "9" * 400]
)
def test_text_that_is_no_constant_is_refused(value: str) -> None:
    with pytest.raises(ParseError, match="K as a number"):
        read_k(value)


@given(st.floats(-1e6, 1e6))
def test_a_constant_goes_through_a_cell_unharmed(ln_k: float) -> None:
    value = write_k(ln_k)
    assert read_k(value) == pytest.approx(ln_k, rel=1e-15, abs=2e-16)
    assert isinstance(value, float) == (
        math.log(2.2250738585072014e-308) <= ln_k < math.log(1.7976931348623157e308)
    )


@pytest.mark.parametrize("ln_k", [math.nan, math.inf, -math.inf])
def test_a_constant_that_cannot_be_is_not_written(ln_k: float) -> None:
    with pytest.raises(OutOfRangeError):
        write_k(ln_k)
