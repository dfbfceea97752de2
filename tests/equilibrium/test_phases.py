from __future__ import annotations

import math
from dataclasses import replace
from fractions import Fraction

import numpy as np
import pytest

from tests.cases.reader import read
from tests.equilibrium.several_systems import error_of, random_problem
from xleq.equilibrium import solve
from xleq.equilibrium.many import solve as solve_several
from xleq.equilibrium.problem import Problem, State
from xleq.errors import NotCertifiedError

SEEDS = range(100, 160)


def rows(*lines: str) -> tuple[tuple[Fraction, ...], ...]:
    return tuple(tuple(map(Fraction, line.split())) for line in lines)


@pytest.mark.parametrize("case", read("solids"), ids=lambda case: case.id)
def test_every_reference_case_is_met_with_its_phases(case):
    s = solve(case.problem).require()
    assert case.is_met_by(s.n), case.errors(s.n)
    gone = any(n == 0 for n, phase in zip(case.n, case.problem.phases, strict=True) if phase == "pure")
    assert solve_several(case.problem).status == ("exhausted" if gone else "equilibrium")


@pytest.mark.parametrize("seed", SEEDS)
def test_fresh_systems_with_pure_phases_agree_with_four_hundred_digits(seed):
    problem = random_problem(seed, pure=True)
    s = solve_several(problem)
    assert s.certificate.ok or "cannot be certified" in s.certificate.reason, s.certificate.reason
    if s.status != "fluid vanished":
        assert error_of(problem, s.n) < 1e-12


@pytest.mark.parametrize("seed", SEEDS[::2])
def test_the_order_of_the_phases_does_not_matter(seed):
    problem = random_problem(seed, pure=True)
    i = np.random.default_rng(seed).permutation(len(problem.species))
    turned = replace(
        problem,
        species=tuple(problem.species[k] for k in i),
        phases=tuple(problem.phases[k] for k in i),
        nu=tuple(tuple(row[k] for k in i) for row in problem.nu),
        n0=tuple(problem.n0[k] for k in i),
    )
    here, there = solve_several(problem), solve_several(turned)
    assert there.n == pytest.approx([here.n[k] for k in i], rel=1e-10, abs=1e-300)
    assert there.status == here.status
    assert set(there.exhausted) == set(here.exhausted)


@pytest.mark.parametrize("seed", SEEDS[::2])
def test_twice_the_feed_makes_twice_of_every_phase(seed):
    problem = random_problem(seed, pure=True)
    state = replace(problem.state, v=2.0 * problem.state.v)
    double = solve_several(replace(problem, n0=tuple(2.0 * n for n in problem.n0), state=state))
    once = solve_several(problem)
    assert double.n == pytest.approx([2.0 * n for n in once.n], rel=1e-10, abs=1e-299)
    assert double.status == once.status


@pytest.mark.parametrize("seed", SEEDS[::2])
def test_rewriting_the_reactions_keeps_the_phases(seed):
    problem = random_problem(seed, pure=True)
    nu, ln_k = [list(row) for row in problem.nu], list(problem.ln_k)
    for r in range(1, len(nu)):
        nu[r] = [a - 2 * b for a, b in zip(nu[r], nu[r - 1], strict=True)]
        ln_k[r] -= 2.0 * ln_k[r - 1]
    once = solve_several(problem)
    rewritten = solve_several(replace(problem, nu=tuple(map(tuple, nu)), ln_k=tuple(ln_k)))
    # Rounding of the combined ln K is an input error of that size.
    size = 1e-13 * sum(map(abs, ln_k))
    assert rewritten.n == pytest.approx(once.n, rel=max(1e-10, size), abs=1e-300)
    assert rewritten.status == once.status


@pytest.mark.parametrize("seed", SEEDS[::3])
def test_an_inert_gas_at_fixed_volume_changes_no_phase(seed):
    problem = random_problem(seed, pure=True)
    problem = replace(problem, state=State("V", problem.state.t, v=problem.state.v))
    more = replace(
        problem,
        species=(*problem.species, "inert"),
        phases=(*problem.phases, "fluid"),
        nu=tuple((*row, Fraction(0)) for row in problem.nu),
        n0=(*problem.n0, 55.0),
    )
    assert solve_several(more).n == pytest.approx((*solve_several(problem).n, 55.0), rel=1e-12, abs=1e-300)


# Seeds of systems whose gas is taken up wholly.
@pytest.mark.parametrize("seed", [2, 22, 46, 49, 69, 89, 104, 105, 116, 117, 164, 168])
def test_where_the_gas_vanishes_a_trace_of_inert_leaves_the_phases_as_they_are(seed):
    problem = random_problem(seed, pure=True)
    s = solve_several(problem).require()
    assert s.status == "fluid vanished"
    fed = math.fsum(problem.n0)
    traced = replace(
        problem,
        species=(*problem.species, "inert"),
        phases=(*problem.phases, "fluid"),
        nu=tuple((*row, Fraction(0)) for row in problem.nu),
        n0=(*problem.n0, 1e-9 * fed),
    )
    n = solve_several(traced).require().n
    assert error_of(traced, n) < 1e-9
    assert n[:-1] == pytest.approx(s.n, rel=0, abs=1e-6 * fed)


# Limestone (common practice, no source for the constants): CaCO3 = CaO + CO2, and quartz that binds the lime.
LIME = ("CaCO3(s)", "CaO(s)", "CO2", "SiO2(s)", "CaSiO3(s)")
LIME_NU = rows("-1 1 1 0 0", "0 -1 0 -1 1")
LIME_PHASES = ("pure", "pure", "fluid", "pure", "pure")


def lime(ln_k: float, feed: tuple[float, ...], p: float = 1.0) -> Problem:
    return Problem(LIME, LIME_PHASES, LIME_NU, feed, (ln_k, 10.0), State("P", 1100.0, p=p))


def test_below_its_decomposition_pressure_limestone_keeps_its_gas():
    s = solve(lime(-1.0, (2.0, 0.0, 0.5, 0.0, 0.0))).require()
    assert s.status == "exhausted"
    assert s.n == (2.0, 0.0, 0.5, 0.0, 0.0)


def test_above_its_decomposition_pressure_limestone_is_used_up():
    s = solve(lime(1.0, (2.0, 1.0, 0.5, 0.0, 0.0))).require()
    assert s.status == "exhausted"
    assert s.n == (0.0, 3.0, 2.5, 0.0, 0.0)


def test_at_its_decomposition_pressure_limestone_is_indeterminate_and_not_guessed():
    s = solve(lime(0.0, (2.0, 1.0, 0.5, 0.0, 0.0)))
    assert s.status == "indeterminate"
    with pytest.raises(NotCertifiedError, match="any split is at equilibrium"):
        s.require()


def test_a_gas_taken_up_wholly_vanishes():
    s = solve(lime(-1.0, (2.0, 1.0, 0.5, 0.0, 0.0))).require()
    assert s.status == "fluid vanished"
    assert s.n == (2.5, 0.5, 0.0, 0.0, 0.0)


def test_an_inert_gas_keeps_the_equilibrium_determinate():
    names, phases = (*LIME, "N2"), (*LIME_PHASES, "fluid")
    nu = tuple((*row, Fraction(0)) for row in LIME_NU)
    problem = Problem(
        names, phases, nu, (2.0, 1.0, 0.5, 0.0, 0.0, 1.0), (math.log(0.5), 10.0), State("P", 1100.0, p=1.0)
    )
    s = solve(problem).require()
    assert s.n == pytest.approx((1.5, 1.5, 1.0, 0.0, 0.0, 1.0), rel=1e-15)


def test_quartz_takes_the_lime_and_one_of_them_is_used_up():
    s = solve(lime(1.0, (2.0, 0.0, 0.5, 1.5, 0.0))).require()
    assert s.n == (0.0, 0.5, 2.5, 0.0, 1.5)
    assert s.exhausted == ("CaCO3(s)", "SiO2(s)")


def test_two_forms_of_a_solid_with_the_same_free_energy_are_indeterminate():
    nu = rows("-1 1 0 0", "-1 0 1 1")
    names, phases = ("calcite(s)", "aragonite(s)", "Ca+2", "CO3-2"), ("pure", "pure", "fluid", "fluid")
    same = Problem(names, phases, nu, (1.0, 0.0, 0.0, 0.0), (0.0, -19.5), State("C"))
    assert solve(same).status == "indeterminate"
    stable = solve(replace(same, ln_k=(-0.3, -19.5))).require()
    assert stable.exhausted == ("aragonite(s)",)
    assert stable.n[2] == pytest.approx(math.exp(-9.75), rel=1e-14)


def test_many_candidate_solids_come_to_an_end():
    # Forty solids that each want the same two ions; the least soluble wins.
    count = 40
    names = ("A+", "B-", *(f"S{k}(s)" for k in range(count)))
    nu = tuple(tuple(map(Fraction, (-1, -1, *(int(i == k) for i in range(count))))) for k in range(count))
    ln_k = tuple(5.0 + 0.37 * ((7 * k) % count) for k in range(count))
    problem = Problem(
        names, ("fluid", "fluid", *(["pure"] * count)), nu, (1.0, 2.0, *([0.0] * count)), ln_k, State("C")
    )
    s = solve(problem).require()
    best = max(range(count), key=lambda k: ln_k[k])
    assert [name for name, n in zip(names, s.n, strict=True) if n][2:] == [f"S{best}(s)"]


@pytest.mark.slow
@pytest.mark.parametrize("block", range(20))
def test_a_thousand_more_systems_with_pure_phases_have_none_wrong(block):
    for seed in range(20_000 + 50 * block, 20_050 + 50 * block):
        problem = random_problem(seed, pure=True)
        s = solve_several(problem)
        if s.certificate.ok and s.status != "fluid vanished":
            assert error_of(problem, s.n) < 1e-9, seed
        assert s.certificate.ok or "cannot be certified" in s.certificate.reason, (seed, s.certificate.reason)
