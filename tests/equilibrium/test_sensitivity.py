from __future__ import annotations

import math
from dataclasses import replace
from fractions import Fraction
from functools import lru_cache

import numpy as np
import pytest
from mpmath import mp, mpf

from tests.cases.reader import read
from tests.equilibrium.several_systems import random_problem, refine
from xleq.equilibrium import solve
from xleq.equilibrium.many import solve as solve_several
from xleq.equilibrium.problem import Problem, Solution, State
from xleq.equilibrium.sensitivity import sensitivities, uncertainty
from xleq.errors import InputError, NotCertifiedError

H = mpf(10) ** -60


def difference(s: Solution, up: Problem, down: Problem) -> list[float]:
    """Central difference of two solutions in 400 digits; the inputs differ by 2 H."""
    with mp.workdps(400):
        at = exact_amounts(s)
        high, low = refine(up, at, 2), refine(down, at, 2)
        assert high is not None
        assert low is not None
        return [float((a - b) / (2 * H)) for a, b in zip(high, low, strict=True)]


@lru_cache(maxsize=4)
def exact_amounts(s: Solution) -> tuple[mpf, ...]:
    at = refine(s.problem, s.n, 7)
    assert at is not None
    return tuple(at)


def moved(values: tuple, place: int, by: object) -> tuple:
    return tuple(v + by if i == place else v for i, v in enumerate(values))


def assert_close(got: np.ndarray, exact: list[float], unit: float) -> None:
    """Within 1e-8 of the derivative itself, or of 1e-15 units where it is nothing."""
    assert got.tolist() == pytest.approx(exact, rel=1e-8, abs=1e-15 * unit)


# The large ones take a second or more each in 400 digits.
CASES = [
    pytest.param(c, id=c.id, marks=[pytest.mark.slow] if len(c.n) > 7 else [])
    for family in ("multi", "solids")
    for c in read(family)[::13]
]


@pytest.mark.parametrize("case", CASES)
def test_derivatives_by_ln_k_are_those_of_exact_solutions(case):
    s = solve_several(case.problem).require()
    with mp.workdps(400):
        exact = [
            difference(
                s,
                replace(case.problem, ln_k=moved(tuple(map(mpf, case.problem.ln_k)), r, H)),
                replace(case.problem, ln_k=moved(tuple(map(mpf, case.problem.ln_k)), r, -H)),
            )
            for r in range(len(case.problem.nu))
        ]
    got = sensitivities(s).by_ln_k
    for r, column in enumerate(exact):
        assert_close(got[:, r], column, 0.0)


@pytest.mark.parametrize("case", CASES)
def test_derivatives_by_the_feed_are_those_of_exact_solutions(case):
    s = solve_several(case.problem).require()
    got = sensitivities(s).by_feed
    h = Fraction(1, 10**60)
    feed = tuple(map(Fraction, case.problem.n0))
    for j in range(len(feed)):
        if np.isnan(got[:, j]).any():
            assert s.n[j] == 0.0
            continue
        if not s.n[j] and not any(row[j] for row in case.problem.nu):
            assert got[j, j] == 1.0
            continue
        up = replace(case.problem, n0=moved(feed, j, h))
        down = replace(case.problem, n0=moved(feed, j, -h))
        assert_close(got[:, j], difference(s, up, down), 1.0)


@pytest.mark.parametrize("case", CASES)
def test_derivatives_by_pressure_and_volume_are_those_of_exact_solutions(case):
    s = solve_several(case.problem).require()
    state = case.problem.state
    name = "p" if state.kind == "P" else "v"
    with mp.workdps(400):
        up = replace(case.problem, state=replace(state, **{name: mpf(getattr(state, name)) + H}))
        down = replace(case.problem, state=replace(state, **{name: mpf(getattr(state, name)) - H}))
        exact = difference(s, up, down)
    got = sensitivities(s)
    at = getattr(state, name)
    assert_close(got.by_p if name == "p" else got.by_v, exact, max(s.n) / at)
    assert not (got.by_v if name == "p" else got.by_p).any()


@pytest.mark.parametrize("case", [c for c in CASES if c.values[0].problem.state.kind == "V"])
def test_derivatives_by_temperature_follow_ln_k_and_the_gas_law(case):
    s = solve_several(case.problem).require()
    slopes = [0.01 * (r + 1) for r in range(len(case.problem.nu))]
    with mp.workdps(400):
        exact = []
        for h in (H, -H):
            ln_k = tuple(mpf(k) + h * mpf(d) for k, d in zip(case.problem.ln_k, slopes, strict=True))
            state = replace(case.problem.state, t=mpf(case.problem.state.t) + h)
            exact.append(replace(case.problem, ln_k=ln_k, state=state))
        exact_change = difference(s, *exact)
    got = sensitivities(s, slopes).by_t
    assert got is not None
    assert_close(got, exact_change, max(s.n) / case.problem.state.t)


@pytest.mark.parametrize("k", [0.01, 1.0, 7.0])
def test_a_dimer_has_the_derivatives_of_its_closed_form(k):
    # A2 = 2 A of 1 mol A2 at P = 1 bar: 4 x^2 / (1 - x^2) = K, so x = sqrt(K / (4 + K)).
    row = (Fraction(-1), Fraction(2))
    problem = Problem(
        ("A2", "A"), ("fluid",) * 2, (row,), (1.0, 0.0), (math.log(k),), State("P", 300.0, p=1.0)
    )
    s = sensitivities(solve(problem), (0.02,))
    x = math.sqrt(k / (4.0 + k))
    slope = 0.5 * x * 4.0 / (4.0 + k)
    assert s.by_ln_k[:, 0].tolist() == pytest.approx([-slope, 2.0 * slope], rel=1e-14)
    # At another pressure K / P takes the place of K.
    assert s.by_p.tolist() == pytest.approx([slope, -2.0 * slope], rel=1e-14)
    assert s.by_t is not None
    assert s.by_t.tolist() == pytest.approx([-0.02 * slope, 0.04 * slope], rel=1e-14)
    assert s.by_feed[:, 0].tolist() == pytest.approx([1.0 - x, 2.0 * x], rel=1e-14)


@pytest.mark.parametrize("seed", range(300, 330))
def test_amounts_grow_with_the_feed_as_a_whole(seed):
    # Euler: at fixed P or on fractions the amounts are homogeneous of degree one in the feed.
    problem = random_problem(seed, pure=seed % 2 == 0)
    problem = replace(problem, state=replace(problem.state, kind="P"))
    s = solve_several(problem)
    if not s.certificate.ok:
        pytest.skip("refused")
    fed = np.array(problem.n0)
    by_feed = sensitivities(s).by_feed[:, fed > 0.0]
    gross = np.abs(by_feed) @ fed[fed > 0.0]
    assert (np.abs(by_feed @ fed[fed > 0.0] - np.array(s.n)) <= 1e-9 * gross).all()


def test_absent_phases_do_not_answer_to_anything():
    problem = read("solids")[1].problem
    s = solve(problem).require()
    gone = s.n.index(0.0)
    got = sensitivities(s)
    assert problem.phases[gone] == "pure"
    assert not got.by_ln_k[gone].any()
    assert not got.by_feed[gone].any()


LIME = Problem(
    ("CaCO3(s)", "CaO(s)", "CO2", "N2"),
    ("pure", "pure", "fluid", "fluid"),
    (tuple(map(Fraction, (-1, 1, 1, 0))), tuple(map(Fraction, (-2, 2, 2, 0)))),
    (2.0, 1.0, 0.5, 0.0),
    (-1.0, -2.0),
    State("P", 1100.0, p=1.0),
)


def test_where_the_gas_has_vanished_only_the_feed_counts():
    s = solve(LIME).require()
    assert s.status == "fluid vanished"
    got = sensitivities(s)
    assert got.by_feed[:, :3].tolist() == [
        [1.0, 0.0, 1.0],
        [0.0, 1.0, -1.0],
        [0.0, 0.0, 0.0],
        [0.0, 0.0, 0.0],
    ]
    assert not got.by_ln_k.any()


def test_an_uncertified_solution_has_no_derivatives():
    indeterminate = solve(replace(LIME, ln_k=(0.0, 0.0)))
    with pytest.raises(NotCertifiedError):
        sensitivities(indeterminate)


REFORMER = next(c.problem for c in read("solids") if c.id == "n_c00")


def test_the_first_order_uncertainty_is_that_of_a_monte_carlo_run():
    s = solve(REFORMER).require()
    u_ln_k, u_t, u_p, slopes = (0.02, 0.01, 0.015), 0.5, 0.03, (0.05, -0.01, -0.04)
    u = uncertainty(s, u_ln_k, u_t, u_p, slopes)
    rng = np.random.default_rng(7)
    count = 4000
    t, p = rng.normal(0.0, u_t, count), REFORMER.state.p + rng.normal(0.0, u_p, count)
    ln_k = np.array(REFORMER.ln_k) + rng.normal(0.0, u_ln_k, (count, 3)) + np.outer(t, slopes)
    n = _batch(ln_k, p)
    # A standard deviation of 4000 draws is itself good to 1 in 89, one standard deviation; four are allowed.
    assert n.std(axis=0, ddof=1)[:6] == pytest.approx(u[:6], rel=4.0 / math.sqrt(2.0 * count))


def test_correlated_constants_have_the_uncertainty_of_a_monte_carlo_run():
    s = solve(REFORMER).require()
    between = [[1.0, 0.8, 0.0], [0.8, 1.0, -0.5], [0.0, -0.5, 1.0]]
    u = uncertainty(s, (0.02, 0.02, 0.02), correlation=between)
    rng = np.random.default_rng(11)
    ln_k = rng.multivariate_normal(REFORMER.ln_k, 4e-4 * np.array(between), 4000)
    n = _batch(ln_k, np.full(4000, REFORMER.state.p))
    assert n.std(axis=0, ddof=1)[:6] == pytest.approx(u[:6], rel=4.0 / math.sqrt(8000.0))
    assert u[:6] != pytest.approx(uncertainty(s, (0.02, 0.02, 0.02))[:6], rel=0.05)


def _batch(ln_k: np.ndarray, p: np.ndarray) -> np.ndarray:
    from xleq.equilibrium import solve_batch
    from xleq.equilibrium.problem import Batch

    one = np.ones(len(p))
    feed = np.outer(one, REFORMER.n0)
    r = REFORMER
    together = solve_batch(Batch(r.species, r.phases, r.nu, feed, ln_k, "P", r.state.t * one, p, one))
    assert together.ok.all()
    return together.n


@pytest.mark.parametrize(
    ("wrong", "match"),
    [
        ({"u_ln_k": (0.1,)}, "3 reactions with 1"),
        ({"u_ln_k": (0.1, -0.1, 0.1)}, "at least 0"),
        ({"u_ln_k": (0.1, 0.1, 0.1), "u_p": math.nan}, "uncertainty of P"),
        ({"u_ln_k": (0.1, 0.1, 0.1), "u_t": 1.0}, "needs d ln K / dT"),
        ({"u_ln_k": (0.1, 0.1, 0.1), "u_t": 1.0, "dln_k_dt": (1.0,)}, "1 temperature derivatives"),
        ({"u_ln_k": (0.1, 0.1, 0.1), "correlation": [[1.0, 2.0], [2.0, 1.0]]}, "3 rows"),
        ({"u_ln_k": (0.1, 0.1, 0.1), "correlation": [[1, 2, 0], [2, 1, 0], [0, 0, 1]]}, "symmetric"),
    ],
)
def test_uncertainties_that_mean_nothing_are_refused(wrong, match):
    with pytest.raises(InputError, match=match):
        uncertainty(solve(REFORMER), **wrong)
