from __future__ import annotations

import math
import time
from dataclasses import replace
from fractions import Fraction

import numpy as np
import pytest

from tests.cases.reader import read
from tests.equilibrium.several_systems import error_of, random_problem
from xleq.equilibrium import solve
from xleq.equilibrium.many import solve as solve_several
from xleq.equilibrium.problem import Problem, Solution, State
from xleq.errors import AmbiguousError, InputError, OutOfRangeError

SEEDS = range(60)


def certified(problem: Problem) -> Solution:
    return solve_several(problem).require()


@pytest.mark.parametrize("case", read("multi"), ids=lambda case: case.id)
def test_every_reference_case_is_met_to_the_last_trace(case):
    solution = solve(case.problem).require()
    assert case.is_met_by(solution.n), case.errors(solution.n)


@pytest.mark.parametrize("case", read("single")[::8], ids=lambda case: case.id)
def test_one_reaction_given_as_several_comes_out_the_same(case):
    assert case.is_met_by(certified(case.problem).n)


@pytest.mark.parametrize("seed", SEEDS)
def test_fresh_systems_agree_with_four_hundred_digits(seed):
    problem = random_problem(seed)
    assert error_of(problem, certified(problem).n) < 1e-12


@pytest.mark.parametrize("seed", SEEDS)
def test_extents_take_the_feed_to_the_amounts(seed):
    problem = random_problem(seed)
    s = certified(problem)
    nu = np.array([[float(c) for c in row] for row in problem.nu])
    gross = np.array(problem.n0) + np.abs(nu).T @ np.abs(s.xi)
    assert np.abs(np.array(problem.n0) + nu.T @ np.array(s.xi) - np.array(s.n)).max() <= 1e-12 * gross.max()


@pytest.mark.parametrize("seed", SEEDS[::2])
def test_the_order_of_species_and_reactions_does_not_matter(seed):
    problem = random_problem(seed)
    rng = np.random.default_rng(seed)
    i, r = rng.permutation(len(problem.species)), rng.permutation(len(problem.nu))
    turned = replace(
        problem,
        species=tuple(problem.species[k] for k in i),
        phases=tuple(problem.phases[k] for k in i),
        nu=tuple(tuple(problem.nu[a][k] for k in i) for a in r),
        n0=tuple(problem.n0[k] for k in i),
        ln_k=tuple(problem.ln_k[a] for a in r),
    )
    here, there = certified(problem).n, certified(turned).n
    assert there == pytest.approx([here[k] for k in i], rel=1e-11, abs=1e-300)


@pytest.mark.parametrize("seed", SEEDS[::2])
def test_twice_the_feed_makes_twice_of_everything(seed):
    problem = random_problem(seed)
    state = replace(problem.state, v=2.0 * problem.state.v)
    double = replace(problem, n0=tuple(2.0 * n for n in problem.n0), state=state)
    twice = [2.0 * n for n in certified(problem).n]
    assert certified(double).n == pytest.approx(twice, rel=1e-11, abs=1e-299)


@pytest.mark.parametrize("seed", SEEDS[::2])
def test_rewriting_the_reactions_as_combinations_changes_nothing(seed):
    problem = random_problem(seed)
    nu, ln_k = [list(row) for row in problem.nu], list(problem.ln_k)
    for r in range(1, len(nu)):
        nu[r] = [a - 2 * b for a, b in zip(nu[r], nu[r - 1], strict=True)]
        ln_k[r] -= 2.0 * ln_k[r - 1]
    rewritten = replace(problem, nu=tuple(map(tuple, nu)), ln_k=tuple(ln_k))
    # Rounding of the combined ln K is an input error of that size.
    size = 1e-15 * sum(map(abs, ln_k)) * 100.0
    assert certified(rewritten).n == pytest.approx(certified(problem).n, rel=max(1e-10, size), abs=1e-300)


@pytest.mark.parametrize("seed", SEEDS[::2])
def test_starting_from_the_equilibrium_gives_it_back(seed):
    problem = random_problem(seed)
    first = np.array(certified(problem).n)
    again = np.array(certified(replace(problem, n0=tuple(first.tolist()))).n)
    # As doubles the amounts of the bulk hold the balances of the bulk only.
    bulk = first > 1e-5 * first.max()
    assert again[bulk] == pytest.approx(first[bulk], rel=1e-9)


@pytest.mark.parametrize("seed", SEEDS[::3])
def test_an_inert_at_fixed_volume_changes_nothing(seed):
    problem = random_problem(seed)
    problem = replace(problem, state=State("V", problem.state.t, v=problem.state.v))
    more = replace(
        problem,
        species=(*problem.species, "inert"),
        phases=(*problem.phases, "fluid"),
        nu=tuple((*row, Fraction(0)) for row in problem.nu),
        n0=(*problem.n0, 55.0),
    )
    assert certified(more).n == (*certified(problem).n, 55.0)


def test_dependent_reactions_that_agree_are_solved_and_noted():
    nu = tuple(tuple(map(Fraction, row)) for row in ((-1, 1, 0), (0, -1, 1), (-1, 0, 1)))
    k = (math.log(2.0), math.log(1.5), math.log(3.0))
    problem = Problem(("A", "B", "C"), ("fluid",) * 3, nu, (6.0, 0.0, 0.0), k, State("P", 300.0, p=1.0))
    s = certified(problem)
    assert s.n == pytest.approx((1.0, 2.0, 3.0), rel=1e-15)
    assert s.xi == pytest.approx((7.0 / 3.0, 1.0 / 3.0, 8.0 / 3.0))
    assert any("reaction 3 depends" in note for note in s.notes)


def test_dependent_reactions_that_contradict_are_refused_by_name():
    nu = tuple(tuple(map(Fraction, row)) for row in ((-1, 1, 0), (0, -1, 1), (-1, 0, 1)))
    problem = Problem(("A", "B", "C"), ("fluid",) * 3, nu, (6.0, 0.0, 0.0), (1.0, 2.0, 4.0), State("X"))
    with pytest.raises(AmbiguousError, match="reaction 3"):
        solve(problem)


def test_species_that_cannot_form_are_exactly_zero_and_named():
    # Without sulfur in the feed neither SO2 nor SO3.
    nu = tuple(tuple(map(Fraction, row)) for row in ((-2, -1, 2, 0, 0), (0, -1, 0, -2, 2)))
    problem = Problem(
        ("CO", "O2", "CO2", "SO2", "SO3"),
        ("fluid",) * 5,
        nu,
        (1.0, 1.0, 0.0, 0.0, 0.0),
        (40.0, 5.0),
        State("P", 1000.0, p=1.0),
    )
    s = certified(problem)
    assert s.n[3:] == (0.0, 0.0)
    assert any("SO2, SO3" in note for note in s.notes)


def test_nothing_that_can_react_is_said_to_be_frozen():
    nu = tuple(tuple(map(Fraction, row)) for row in ((-1, -1, 1, 0), (0, -1, -1, 1)))
    problem = Problem(("A", "B", "C", "D"), ("fluid",) * 4, nu, (1.0, 0.0, 0.0, 0.0), (3.0, 4.0), State("X"))
    s = certified(problem)
    assert (s.status, s.n, s.iterations) == ("frozen", (1.0, 0.0, 0.0, 0.0), 0)


def test_amounts_below_the_range_of_a_double_are_given_as_zero_and_noted():
    nu = tuple(tuple(map(Fraction, row)) for row in ((-1, 2, 0), (-1, 0, 1)))
    problem = Problem(
        ("A2", "A", "B2"), ("fluid",) * 3, nu, (1.0, 0.0, 0.0), (-1600.0, 0.0), State("V", 500.0)
    )
    s = certified(problem)
    assert s.n == pytest.approx((0.5, 0.0, 0.5))
    assert any("given as 0: A" in note for note in s.notes)


def test_ten_thousand_species_are_refused_quickly():
    width = 10_000
    one = tuple(Fraction(-1) if i == 0 else Fraction(int(i == 1)) for i in range(width))
    two = tuple(Fraction(-1) if i == 0 else Fraction(int(i == 2)) for i in range(width))
    problem = Problem(
        tuple(map(str, range(width))), ("fluid",) * width, (one, two), (1.0,) * width, (0.0, 0.0), State("X")
    )
    start = time.perf_counter()
    with pytest.raises(OutOfRangeError, match="10000 species are too many"):
        solve(problem)
    assert time.perf_counter() - start < 20.0  # a hang would take hours


def test_a_hundred_species_are_solved():
    # One species and its 99 polymers: n_k follows from n_1 alone.
    width = 100
    nu = tuple(
        tuple(Fraction(-k if i == 0 else int(i == k - 1)) for i in range(width)) for k in range(2, width + 1)
    )
    ln_k = tuple(0.1 * k for k in range(2, width + 1))
    feed = (10.0, *([0.0] * (width - 1)))
    problem = Problem(tuple(map(str, range(width))), ("fluid",) * width, nu, feed, ln_k, State("C"))
    n = certified(problem).n
    assert math.fsum(k * x for k, x in enumerate(n, 1)) == pytest.approx(10.0, rel=1e-14)
    assert n[49] == pytest.approx(n[0] ** 50 * math.exp(5.0), rel=1e-11)


def test_records_that_do_not_fit_are_refused():
    nu = ((Fraction(-1), Fraction(1)), (Fraction(-1), Fraction(1)))
    with pytest.raises(InputError, match="2 reactions with 1 constants"):
        solve(Problem(("A", "B"), ("fluid", "fluid"), nu, (1.0, 0.0), (0.0,), State("X")))


@pytest.mark.slow
@pytest.mark.parametrize("block", range(20))
def test_a_thousand_more_systems_have_none_wrong(block):
    for seed in range(10_000 + 50 * block, 10_050 + 50 * block):
        problem = random_problem(seed)
        s = solve_several(problem)
        assert not s.certificate.ok or error_of(problem, s.n) < 1e-9, seed
        assert s.certificate.ok, (seed, s.certificate.reason)
