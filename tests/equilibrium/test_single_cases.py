from __future__ import annotations

import math
import random
from dataclasses import replace
from fractions import Fraction

import numpy as np
import pytest

from tests.cases.reader import read
from tests.equilibrium.single_systems import exact_root, one_reaction, relative
from xleq.equilibrium import Batch, Problem, State, solve, solve_batch

CASES = read("single")
SEEDS = range(300)


@pytest.mark.parametrize("case", CASES, ids=lambda case: case.id)
def test_a_reference_case_is_met_and_certified(case):
    solution = solve(case.problem).require()
    errors = dict(zip(case.problem.species, case.errors(solution.n), strict=True))
    assert case.is_met_by(solution.n), errors
    assert solution.status == case.status
    assert solution.iterations <= 40


def test_random_systems_agree_with_bisection_in_long_decimals():
    compared = 0
    for seed in range(120):
        problem = one_reaction(seed)
        exact = exact_root(problem, 120)
        solution = solve(problem).require()
        if exact is None or solution.status != "equilibrium":
            continue
        compared += 1
        errors = [relative(found, known) for found, known in zip(solution.n, exact, strict=True)]
        assert max(errors) < 1e-11, (seed, errors)
    assert compared > 60


@pytest.mark.slow
def test_many_random_systems_are_all_certified():
    for seed in range(1000, 26_000):
        solution = solve(one_reaction(seed))
        assert solution.certificate.ok, (seed, solution.certificate.reason)
        assert solution.iterations <= 60


@pytest.mark.slow
def test_more_random_systems_agree_with_bisection_in_long_decimals():
    for seed in range(1000, 3500):
        problem = one_reaction(seed)
        solution = solve(problem).require()
        exact = exact_root(problem, 120)
        if exact is not None and solution.status == "equilibrium":
            errors = [relative(found, known) for found, known in zip(solution.n, exact, strict=True)]
            assert max(errors) < 1e-11, (seed, errors)


@pytest.mark.parametrize("seed", SEEDS)
def test_reordering_the_species_changes_nothing(seed):
    problem = one_reaction(seed)
    order = list(range(len(problem.species)))
    random.Random(seed).shuffle(order)
    turned = replace(
        problem,
        species=tuple(problem.species[i] for i in order),
        phases=tuple(problem.phases[i] for i in order),
        nu=(tuple(problem.nu[0][i] for i in order),),
        n0=tuple(problem.n0[i] for i in order),
    )
    here, there = solve(problem).require(), solve(turned).require()
    assert here.status == there.status
    assert all(relative(there.n[k], here.n[i]) < 1e-11 for k, i in enumerate(order))


@pytest.mark.parametrize("seed", SEEDS)
def test_twice_the_feed_in_twice_the_volume_gives_twice_the_amounts(seed):
    problem = one_reaction(seed)
    state = replace(problem.state, v=2.0 * problem.state.v)
    doubled = replace(problem, n0=tuple(2.0 * x for x in problem.n0), state=state)
    here, there = solve(problem).require(), solve(doubled).require()
    assert here.status == there.status
    assert all(relative(b, 2.0 * a) < 1e-11 for a, b in zip(here.n, there.n, strict=True) if a > 1e-290)


@pytest.mark.parametrize("seed", SEEDS)
def test_a_reversed_and_scaled_reaction_gives_the_same_amounts(seed):
    problem = one_reaction(seed)
    factor = random.Random(seed).choice((Fraction(-1), Fraction(2), Fraction(-1, 2), Fraction(-3)))
    rewritten = replace(
        problem,
        nu=(tuple(factor * c for c in problem.nu[0]),),
        ln_k=(float(factor) * problem.ln_k[0],),
    )
    here, there = solve(problem).require(), solve(rewritten).require()
    assert here.status == there.status
    assert all(relative(b, a) < 1e-10 for a, b in zip(here.n, there.n, strict=True))


@pytest.mark.parametrize("seed", SEEDS)
def test_an_inert_at_fixed_volume_changes_nothing(seed):
    problem = one_reaction(seed)
    if problem.state.kind not in ("V", "C"):
        problem = replace(problem, state=replace(problem.state, kind="V"))
    joined = replace(
        problem,
        species=(*problem.species, "inert"),
        phases=(*problem.phases, "fluid"),
        nu=((*problem.nu[0], Fraction(0)),),
        n0=(*problem.n0, 50.0),
    )
    here, there = solve(problem).require(), solve(joined).require()
    assert there.n[:-1] == here.n
    assert there.n[-1] == 50.0


@pytest.mark.parametrize("seed", range(100))
def test_starting_from_the_equilibrium_stays_there(seed):
    problem = one_reaction(seed)
    solution = solve(problem).require()
    if solution.status != "equilibrium" or min(solution.n) < 1e-6:
        return
    again = solve(replace(problem, n0=solution.n)).require()
    assert all(relative(b, a) < 1e-8 for a, b in zip(solution.n, again.n, strict=True))


def test_the_extent_accounts_for_every_amount():
    for seed in SEEDS:
        problem = one_reaction(seed)
        solution = solve(problem).require()
        for found, fed, c in zip(solution.n, problem.n0, problem.nu[0], strict=True):
            assert abs(fed + float(c) * solution.xi[0] - found) <= 1e-14 * max(fed, found, sum(problem.n0))


def batch_of(problem: Problem, n_instances: int, seed: int) -> Batch:
    rng = np.random.default_rng(seed)
    n0 = np.tile(problem.n0, (n_instances, 1)) * rng.uniform(0.5, 2.0, (n_instances, len(problem.n0)))
    state = problem.state
    return Batch(
        problem.species,
        problem.phases,
        problem.nu,
        n0,
        problem.ln_k[0] + rng.normal(0.0, 5.0, (n_instances, 1)),
        state.kind,
        np.full(n_instances, state.t),
        state.p * rng.uniform(0.5, 2.0, n_instances),
        np.full(n_instances, state.v),
    )


@pytest.mark.parametrize("seed", range(60))
def test_a_batch_gives_what_single_solutions_give(seed):
    batch = batch_of(one_reaction(seed), 40, seed)
    together = solve_batch(batch)
    for i in range(len(batch)):
        alone = solve(batch.problem(i))
        assert together.ok[i] == alone.certificate.ok
        assert together.status[i] == alone.status
        assert all(relative(b, a) < 1e-12 for a, b in zip(alone.n, together.n[i].tolist(), strict=True))


def test_the_reference_cases_are_met_in_batches():
    for case in CASES:
        p = case.problem
        ones = np.ones(3)
        batch = Batch(
            p.species,
            p.phases,
            p.nu,
            np.tile(p.n0, (3, 1)),
            np.tile(p.ln_k, (3, 1)),
            p.state.kind,
            p.state.t * ones,
            p.state.p * ones,
            p.state.v * ones,
        )
        found = solve_batch(batch)
        assert found.ok.all(), found.reasons
        assert all(case.is_met_by(tuple(row)) for row in found.n.tolist()), case.id


def test_an_instance_without_an_answer_does_not_stop_its_batch():
    nu = ((Fraction(-1), Fraction(2)),)
    n0 = np.array([[1.0, 0.0], [-1.0, 0.0], [1.0, 0.0], [0.0, 0.0], [1.0, 0.0]])
    ln_k = np.array([[0.0], [0.0], [math.nan], [0.0], [1.0]])
    p = np.array([1.0, 1.0, 1.0, 1.0, -1.0])
    batch = Batch(("A", "B"), ("fluid", "fluid"), nu, n0, ln_k, "P", np.full(5, 300.0), p, np.ones(5))
    found = solve_batch(batch)
    assert found.ok.tolist() == [True, False, False, False, False]
    assert "feed of A is -1.0" in found.reasons[1]
    assert "ln K" in found.reasons[2]
    assert "nothing is fed" in found.reasons[3]
    assert "pressure" in found.reasons[4]
    assert np.isnan(found.n[1:]).all()


def test_constants_far_beyond_a_double_leave_traces_as_zero_and_say_so():
    nu = ((Fraction(-1), Fraction(1)),)
    problem = Problem(("A", "B"), ("fluid", "fluid"), nu, (1.0, 1.0), (5000.0,), State("X"))
    solution = solve(problem).require()
    assert solution.n == (0.0, 2.0)
    assert solution.notes == ("A is below 1e-300 mol, given as 0",)
