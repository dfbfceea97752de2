from __future__ import annotations

import math
from fractions import Fraction

import pytest

from xleq.equilibrium import Problem, State
from xleq.equilibrium.inverse import approach, only_root, pressure_for, search, temperature_for
from xleq.errors import AmbiguousError, InputError, NoAnswerError, OutOfRangeError


def ammonia(t: float, p: float = 100.0) -> Problem:
    nu = ((Fraction(-1), Fraction(-3), Fraction(2)),)
    ln_k = (11000.0 / t - 24.5,)
    return Problem(("N2", "H2", "NH3"), ("fluid",) * 3, nu, (1.0, 3.0, 0.0), ln_k, State("P", t, p=p))


def lime(t: float, inert: float, p: float = 1.0) -> Problem:
    nu = ((Fraction(-1), Fraction(1), Fraction(1), Fraction(0)),)
    ln_k = (-20000.0 / t + 17.0,)
    phases = ("pure", "pure", "fluid", "fluid")
    return Problem(
        ("CaCO3", "CaO", "CO2", "N2"), phases, nu, (1.0, 0.0, 0.0, inert), ln_k, State("P", t, p=p)
    )


def fraction_of_ammonia(solution):
    return solution.n[2] / sum(solution.n)


def test_a_temperature_put_back_gives_the_value_wanted():
    t = temperature_for(ammonia, fraction_of_ammonia, 0.2, 500.0, 1000.0)
    from xleq.equilibrium import solve

    assert fraction_of_ammonia(solve(ammonia(t))) == pytest.approx(0.2, rel=1e-11)


def test_a_pressure_put_back_gives_the_value_wanted():
    p = pressure_for(lambda p: ammonia(700.0, p), fraction_of_ammonia, 0.2, 1.0, 1000.0)
    from xleq.equilibrium import solve

    assert fraction_of_ammonia(solve(ammonia(700.0, p))) == pytest.approx(0.2, rel=1e-11)


def test_a_value_out_of_reach_is_refused_with_the_range_that_is_reached():
    with pytest.raises(
        NoAnswerError, match=r"no temperature from 500 to 600 K gives 0.01: the values there run"
    ):
        temperature_for(ammonia, fraction_of_ammonia, 0.01, 500.0, 600.0)


def test_several_temperatures_are_listed():
    # Burning half the carbon: K rises, then falls.
    def problem(t):
        nu = ((Fraction(-1), Fraction(1)),)
        ln_k = (1.0 - ((t - 700.0) / 100.0) ** 2,)
        return Problem(("A", "B"), ("fluid",) * 2, nu, (1.0, 0.0), ln_k, State("P", t, p=1.0))

    with pytest.raises(AmbiguousError, match=r"600 K; 800 K"):
        temperature_for(problem, lambda s: s.n[1], 0.5, 400.0, 1000.0)


def test_the_jump_of_a_decomposition_without_inert_gas_is_no_answer():
    with pytest.raises(NoAnswerError, match=r"jumps across it, from 0 to 1 at 1176\.47"):
        temperature_for(lambda t: lime(t, 0.0), lambda s: s.n[1], 0.5, 900.0, 1500.0)


def test_with_inert_gas_the_same_decomposition_has_a_temperature_for_half_of_it():
    t = temperature_for(lambda t: lime(t, 1.0), lambda s: s.n[1], 0.5, 900.0, 1500.0)
    # Half of it: the fraction of CO2 is a third, so K = 1/3.
    assert t == pytest.approx(20000.0 / (17.0 + math.log(3.0)), rel=1e-12)


def test_a_value_held_over_a_stretch_is_ambiguous():
    with pytest.raises(AmbiguousError, match=r"all from 1\d\d\d(\.\d+)? to 1500 K"):
        temperature_for(lambda t: lime(t, 1.0), lambda s: s.n[1], 1.0, 900.0, 1500.0)


def test_a_kink_where_a_phase_is_used_up_does_not_hide_an_answer():
    t = temperature_for(lambda t: lime(t, 1.0), lambda s: s.n[1], 0.999999, 900.0, 1500.0)
    assert lime(t, 1.0).ln_k[0] == pytest.approx(math.log(0.999999 / 1.999999), rel=1e-9)


@pytest.mark.parametrize(
    ("f", "value", "roots"),
    [
        (lambda x: (x - 0.31) * (x - 0.3101), 0.0, [0.31, 0.3101]),
        (lambda x: (x - 0.4) ** 2, 0.0, [0.4]),
        (lambda x: abs(x - 0.4321), 0.0, [0.4321]),
        (lambda x: abs(x - 0.4321) + 1.0, 1.0, [0.4321]),
        (
            lambda x: math.sin(40.0 * x),
            0.5,
            [(math.asin(0.5) + 2 * math.pi * k) / 40 for k in range(7)]
            + [(math.pi - math.asin(0.5) + 2 * math.pi * k) / 40 for k in range(6)],
        ),
        (lambda x: x, 0.0, [0.0]),
        (lambda x: x, 1.0, [1.0]),
        (lambda x: math.tanh(1e5 * (x - 0.77777)), 0.3, [0.77777 + math.atanh(0.3) / 1e5]),
    ],
    ids=["close pair", "double", "corner", "corner above zero", "waves", "low end", "high end", "steep"],
)
def test_every_root_is_found(f, value, roots):
    found = search(f, value, 0.0, 1.0)
    assert found.roots == pytest.approx(sorted(roots), rel=2e-5, abs=1e-12)
    assert not found.jumps
    assert not found.plateaus


def test_a_simple_root_is_found_to_the_last_digits():
    assert search(lambda x: math.exp(x), 2.0, 0.0, 5.0).roots == pytest.approx([math.log(2.0)], rel=1e-15)


def test_a_jump_across_the_value_is_told_from_a_root():
    found = search(lambda x: 2.0 if x < 0.3 else 7.0, 5.0, 0.0, 1.0)
    assert found.roots == ()
    assert found.jumps == ((pytest.approx(0.3, rel=1e-12), 2.0, 7.0),)


def test_a_pole_is_a_jump():
    found = search(lambda x: 1.0 / (x - 0.3), 0.0, 0.0, 1.0)
    assert found.roots == ()
    assert len(found.jumps) == 1


def test_places_without_an_answer_do_not_stop_the_search():
    def f(x):
        if x < 0.5:
            raise OutOfRangeError("too low")
        return x

    found = search(f, 0.75, 0.0, 1.0)
    assert found.roots == pytest.approx([0.75])
    assert dict(found.gaps)[0.0] == "too low"
    with pytest.raises(NoAnswerError, match="there is none: too low"):
        only_root(search(f, 0.25, 0.0, 1.0), 0.25, 0.0, 1.0, "temperature", "K")


def test_an_interval_without_any_answer_gives_the_reason():
    def f(x):
        raise OutOfRangeError("not measured")

    with pytest.raises(NoAnswerError, match=r"no answer anywhere from 0 to 1; at 0: not measured"):
        search(f, 0.5, 0.0, 1.0)


@pytest.mark.parametrize(
    ("low", "high", "value"), [(1.0, 1.0, 0.0), (2.0, 1.0, 0.0), (math.nan, 1.0, 0.0), (0.0, 1.0, math.nan)]
)
def test_an_interval_or_value_that_means_nothing_is_refused(low, high, value):
    with pytest.raises(InputError):
        search(lambda x: x, value, low, high)


def test_pressures_from_zero_are_refused():
    with pytest.raises(InputError, match="above 0"):
        pressure_for(lambda p: ammonia(700.0, p), fraction_of_ammonia, 0.2, 0.0, 10.0)


def test_the_approach_is_positive_for_an_endothermic_reaction_short_of_equilibrium():
    # Reforming: ln K rises with T; the gas at 1100 K has the quotient of 1080 K.
    def ln_k(t):
        return 30.0 - 27000.0 / t

    assert approach(ln_k, ln_k(1080.0), 1100.0) == pytest.approx(20.0, abs=1e-9)


def test_the_approach_is_negative_for_an_exothermic_reaction_short_of_equilibrium():
    def ln_k(t):
        return 11000.0 / t - 24.5

    assert approach(ln_k, ln_k(730.0), 700.0) == pytest.approx(-30.0, abs=1e-9)


def test_the_samples_are_bounded():
    calls = 0

    def f(x):
        nonlocal calls
        calls += 1
        return math.sin(1.0 / (x + 1e-9))

    search(f, 0.5, 0.0, 1.0)
    assert calls < 30_000


def test_rounding_on_a_plateau_is_not_followed_like_a_dip() -> None:
    asked = []

    def plateau(x: float) -> float:
        asked.append(x)
        return 1.0 + 1e-15 * math.sin(1e6 * x) + (max(0.0, x - 4.0))

    assert search(plateau, 0.5, 0.0, 5.0).roots == ()
    assert len(asked) < 80


def test_a_narrow_dip_is_still_followed_to_the_value() -> None:
    # It crosses 0 within 0.02 either side of its bottom; samples stand 0.16 apart at first.
    found = search(lambda x: 1.0 - 1.2 / (1.0 + ((x - 2.51) / 0.05) ** 2), 0.0, 0.0, 5.0).roots
    assert len(found) == 2
    assert all(abs(1.0 - 1.2 / (1.0 + ((x - 2.51) / 0.05) ** 2)) < 1e-9 for x in found)
