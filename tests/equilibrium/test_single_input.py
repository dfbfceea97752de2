from __future__ import annotations

import math
import random
from dataclasses import replace
from fractions import Fraction

import pytest

from tests.equilibrium.single_systems import one_reaction
from xleq.equilibrium import Problem, State, solve
from xleq.errors import InputError, NotCertifiedError, OutOfRangeError

GOOD = Problem(
    ("A", "B"),
    ("fluid", "fluid"),
    ((Fraction(-1), Fraction(2)),),
    (1.0, 0.0),
    (0.5,),
    State("P", 300.0, p=1.0),
)
LIME = Problem(
    ("CaCO3", "CaO", "CO2"),
    ("pure", "pure", "fluid"),
    ((Fraction(-1), Fraction(1), Fraction(1)),),
    (1.0, 0.0, 0.0),
    (0.0,),
    State("P", 1170.0, p=1.0),
)


@pytest.mark.parametrize("amount", [-1.0, math.nan, math.inf, -math.inf, -5e-324])
def test_an_amount_that_cannot_be_is_refused(amount):
    with pytest.raises(InputError, match="the feed of B is"):
        solve(replace(GOOD, n0=(1.0, amount)))


@pytest.mark.parametrize("ln_k", [math.nan, math.inf, -math.inf])
def test_a_constant_that_is_no_number_is_refused(ln_k):
    with pytest.raises(InputError, match="ln K of reaction 1"):
        solve(replace(GOOD, ln_k=(ln_k,)))


def test_an_empty_feed_is_refused():
    with pytest.raises(InputError, match="nothing is fed"):
        solve(replace(GOOD, n0=(0.0, 0.0)))


def test_a_system_without_fluid_is_refused():
    with pytest.raises(OutOfRangeError, match="no gas or solution"):
        solve(replace(GOOD, phases=("pure", "pure")))


@pytest.mark.parametrize(
    "state",
    [
        State("P", 0.0, p=1.0),
        State("P", -3.0, p=1.0),
        State("P", math.nan, p=1.0),
        State("P", 300.0, p=0.0),
        State("P", 300.0),
        State("V", 300.0, v=0.0),
        State("C", v=-1.0),
    ],
)
def test_a_state_that_cannot_be_is_refused(state):
    with pytest.raises(OutOfRangeError, match="must be above 0"):
        solve(replace(GOOD, state=state))


@pytest.mark.parametrize(
    ("change", "reason"),
    [
        ({"state": State("V", 300.0, v=math.inf)}, "volume is inf L: it must be from 1e-100 to 1e[+]100"),
        ({"state": State("P", 1e9, p=1.0)}, "temperature is 1e[+]09 K: it must be from 0.001 to 1e[+]06"),
        ({"n0": (1.0, 1e-310)}, "feed of B is 1e-310 mol: it must be 0 or from 1e-300"),
        ({"n0": (1e200, 1.0)}, "feed of A is 1e[+]200 mol"),
        ({"ln_k": (-2e6,)}, "ln K of reaction 1 is -2e[+]06"),
    ],
)
def test_numbers_beyond_what_doubles_can_carry_are_refused(change, reason):
    with pytest.raises(OutOfRangeError, match=reason):
        solve(replace(GOOD, **change))


def test_records_of_unequal_length_are_refused():
    with pytest.raises(InputError, match="same length"):
        solve(replace(GOOD, n0=(1.0,)))
    with pytest.raises(InputError, match="1 reactions with 2 constants"):
        solve(replace(GOOD, ln_k=(1.0, 2.0)))


def test_a_problem_without_a_reaction_is_refused():
    with pytest.raises(InputError, match="0 reactions"):
        solve(replace(GOOD, nu=(), ln_k=()))


@pytest.mark.parametrize("row", [(Fraction(1), Fraction(2)), (Fraction(0), Fraction(0))])
def test_a_reaction_without_a_reactant_is_refused(row):
    with pytest.raises(InputError, match="the reaction has no"):
        solve(replace(GOOD, nu=(row,)))


def test_a_feed_in_which_nothing_can_react_is_left_as_it_is():
    nu = ((Fraction(-1), Fraction(-1), Fraction(1), Fraction(1)),)
    problem = replace(
        GOOD, species=("A", "B", "C", "D"), phases=("fluid",) * 4, nu=nu, n0=(1.0, 0.0, 2.0, 0.0)
    )
    solution = solve(problem).require()
    assert solution.status == "frozen"
    assert solution.n == problem.n0
    assert solution.xi == (0.0,)
    assert "nothing can react" in solution.notes[0]


def test_a_decomposition_at_exactly_its_own_pressure_is_indeterminate():
    solution = solve(replace(LIME, n0=(1.0, 0.5, 0.2)))
    assert solution.status == "indeterminate"
    assert not solution.certificate.ok
    with pytest.raises(NotCertifiedError, match="any extent would do"):
        solution.require()


def test_a_decomposition_goes_to_the_end_on_either_side_of_its_pressure():
    above, below = solve(replace(LIME, ln_k=(0.01,))).require(), solve(replace(LIME, ln_k=(-0.01,))).require()
    assert above.n == (0.0, 1.0, 1.0)
    assert (above.status, above.exhausted) == ("exhausted", ("CaCO3",))
    assert below.n == (1.0, 0.0, 0.0)
    assert below.status == "fluid vanished"


def test_at_fixed_volume_the_same_decomposition_builds_its_pressure_up():
    # 0.0831446 L bar/(mol K) 1170 K / 100 L: 1 bar is 1.028 mol.
    solution = solve(replace(LIME, n0=(2.0, 0.0, 0.0), state=State("V", 1170.0, v=100.0))).require()
    assert solution.n[2] == pytest.approx(100.0 / (0.0831446261815324 * 1170.0), rel=1e-13)
    spent = solve(replace(LIME, n0=(1.0, 0.0, 0.0), state=State("V", 1170.0, v=100.0))).require()
    assert spent.exhausted == ("CaCO3",)
    assert spent.n == (0.0, 1.0, 1.0)


def test_pure_phases_turning_into_each_other_go_all_the_way():
    problem = Problem(
        ("A(s)", "B(s)", "Ar"),
        ("pure", "pure", "fluid"),
        ((Fraction(-1), Fraction(1), Fraction(0)),),
        (1.0, 1.0, 1.0),
        (2.0,),
        State("P", 300.0, p=1.0),
    )
    assert solve(problem).require().n == (0.0, 2.0, 1.0)
    assert solve(replace(problem, ln_k=(-2.0,))).require().n == (2.0, 0.0, 1.0)
    assert solve(replace(problem, ln_k=(0.0,))).status == "indeterminate"


def test_the_extremes_of_what_is_accepted_give_an_answer_or_a_reason():
    answered = 0
    for seed in range(3000):
        rng = random.Random(seed)
        problem = one_reaction(seed)
        amounts = (0.0, 1e-300, 3e-299, 1e-200, 1e-16, 1.0, 1.0 + 2.0**-52, 1e16, 1e50, 1e100)
        n0 = tuple(rng.choice(amounts) if rng.random() < 0.5 else x for x in problem.n0)
        if not any(n0):
            continue
        ln_k = rng.choice((0.0, 1e-300, 700.0, -700.0, 1e4, -1e4, 1e6, -1e6, 1.0, rng.gauss(0.0, 50.0)))
        t, p, v = (
            rng.choice((1e-3, 300.0, 1e6)),
            rng.choice((1e-100, 1.0, 1e100)),
            rng.choice((1e-100, 1e100)),
        )
        state = replace(problem.state, t=t, p=p, v=v)
        solution = solve(replace(problem, n0=n0, ln_k=(ln_k,), state=state))
        assert solution.iterations < 200
        assert solution.certificate.ok or solution.certificate.reason
        assert solution.status != "indeterminate" or not solution.certificate.ok
        answered += solution.certificate.ok
    assert answered > 2900
