from __future__ import annotations

import math
from fractions import Fraction

import numpy as np
import pytest

from tests.cases.reader import read
from tests.equilibrium.several_systems import error_of, random_problem
from xleq.equilibrium import solve_batch
from xleq.equilibrium.many import solve
from xleq.equilibrium.problem import Batch, Problem, State

CASES = {case.id: case for family in ("multi", "solids") for case in read(family)}


def batch_of(problem: Problem, count: int, seed: int = 0, spread: float = 0.3) -> Batch:
    """Instances scattered about a problem; zeros in the feed stay zeros."""
    rng = np.random.default_rng(seed)
    n0 = np.array(problem.n0) * np.exp(rng.normal(0.0, spread, (count, len(problem.n0))))
    ln_k = np.array(problem.ln_k) + rng.normal(0.0, spread, (count, len(problem.ln_k)))
    one = np.ones(count)
    return Batch(
        problem.species,
        problem.phases,
        problem.nu,
        n0,
        ln_k,
        problem.state.kind,
        problem.state.t * one,
        problem.state.p * np.exp(rng.normal(0.0, spread, count)),
        problem.state.v * one,
    )


# Combustion gas, gas with every kind of feed, carbon from reforming gas, and two random ones with solids.
@pytest.mark.parametrize(
    "name", ["n_m00", "n_m05", "n_m31", "m0003", "m0096", "n_c00", "n_c01", "c0017", "c0057"]
)
def test_a_batch_gives_what_single_instances_give(name):
    batch = batch_of(CASES[name].problem, 60)
    together = solve_batch(batch)
    assert together.ok.all(), [r for r in together.reasons if r][:1]
    for i in range(0, 60, 4):
        alone = solve(batch.problem(i))
        assert together.n[i].tolist() == pytest.approx(alone.n, rel=1e-10, abs=1e-300)
        assert together.xi[i].tolist() == pytest.approx(alone.xi, rel=1e-7, abs=1e-12 * max(alone.n))
        assert together.status[i] == alone.status


@pytest.mark.parametrize("seed", range(200, 230))
def test_batches_of_fresh_systems_agree_with_four_hundred_digits(seed):
    batch = batch_of(random_problem(seed, pure=seed % 2 == 0), 12, seed, spread=2.0)
    together = solve_batch(batch)
    for i in range(0, 12, 3):
        if together.ok[i] and together.status[i] != "fluid vanished":
            assert error_of(batch.problem(i), tuple(together.n[i])) < 1e-9
        else:
            assert together.status[i] == "fluid vanished" or "cannot be certified" in together.reasons[i]


def test_instances_with_different_zeros_in_the_feed_are_solved_side_by_side():
    problem = CASES["n_m02"].problem
    batch = batch_of(problem, 30)
    batch.n0[::3, 1] = 0.0
    batch.n0[1::3, 0] = 2.0
    together = solve_batch(batch)
    assert together.ok.all()
    for i in range(6):
        assert together.n[i].tolist() == pytest.approx(solve(batch.problem(i)).n, rel=1e-10)


def test_a_bad_instance_has_its_reason_and_stops_no_other():
    batch = batch_of(CASES["n_m02"].problem, 6)
    batch.n0[1, 1] = -1.0
    batch.ln_k[2, 0] = math.nan
    batch.n0[3] = 0.0
    batch.p[4] = 0.0
    together = solve_batch(batch)
    assert together.ok.tolist() == [True, False, False, False, False, True]
    assert "at least 0" in together.reasons[1]
    assert "finite number" in together.reasons[2]
    assert "nothing is fed" in together.reasons[3]
    assert "pressure" in together.reasons[4]
    assert np.isnan(together.n[1:5]).all()
    assert np.isnan(together.xi[1:5]).all()


def test_dependent_reactions_are_judged_instance_by_instance():
    nu = tuple(tuple(map(Fraction, row)) for row in ((-1, 1, 0), (0, -1, 1), (-1, 0, 1)))
    problem = Problem(("A", "B", "C"), ("fluid",) * 3, nu, (6.0, 0.0, 0.0), (0.7, 0.4, 1.1), State("X"))
    batch = batch_of(problem, 3, spread=0.0)
    batch.ln_k[1, 2] = 1.2
    together = solve_batch(batch)
    assert together.ok.tolist() == [True, False, True]
    assert "reaction 3" in together.reasons[1]
    assert together.xi[0].tolist() == pytest.approx(solve(problem).xi, rel=1e-12)


def test_near_stoichiometric_feeds_keep_their_last_digit():
    # CO + 1/2 O2 = CO2 and H2 + 1/2 O2 = H2O, oxygen short by one unit in the last place.
    nu = tuple(
        tuple(map(Fraction, row)) for row in (("-1", "-1/2", "1", "0", "0"), ("0", "-1/2", "0", "-1", "1"))
    )
    feed = (1.0, 1.0 - 2.0**-53, 0.0, 1.0, 0.0)
    problem = Problem(
        ("CO", "O2", "CO2", "H2", "H2O"), ("fluid",) * 5, nu, feed, (90.0, 80.0), State("P", 600.0, p=1.0)
    )
    together = solve_batch(batch_of(problem, 3, spread=0.0))
    assert together.ok.all()
    assert error_of(problem, tuple(together.n[0])) < 1e-9


def test_an_empty_batch_is_empty():
    batch = batch_of(CASES["n_m02"].problem, 0)
    together = solve_batch(batch)
    assert together.n.shape == (0, 12)
    assert together.reasons == ()
