from __future__ import annotations

import math
from collections.abc import Callable
from fractions import Fraction

import numpy as np
import pytest
from mpmath import mp, mpf
from scipy.optimize import brentq

from xleq.activity import Aqueous, debye_huckel_a, peng_robinson
from xleq.equilibrium import solve
from xleq.equilibrium.problem import Problem, State
from xleq.equilibrium.sensitivity import sensitivities
from xleq.errors import OutOfRangeError


def rows(*lines: str) -> tuple[tuple[Fraction, ...], ...]:
    return tuple(tuple(map(Fraction, line.split())) for line in lines)


class ToyVirial:
    """A gas of second virial coefficients that are simply given: ln phi_i = (2 sum y_j B_ij - B) P / RT."""

    name = "toy virial"

    def __init__(self, b: list[list[float]]) -> None:
        self.b = np.array(b)

    def ln_gamma(self, n: np.ndarray, state: State) -> np.ndarray:
        y = n / n.sum()
        return (2.0 * self.b @ y - y @ self.b @ y) * state.p


class ToyIons:
    """Solutes of ln gamma_i = -z_i^2 sqrt(I) / (1 + sqrt(I)), without slopes of its own."""

    name = "toy ions"

    def __init__(self, charges: list[int]) -> None:
        self.z2 = np.array(charges, dtype=float) ** 2

    def ln_gamma(self, n: np.ndarray, state: State) -> np.ndarray:
        root = math.sqrt(0.5 * float(self.z2 @ n) / state.v)
        return -self.z2 * root / (1.0 + root)


def exact(problem: Problem, n: tuple[float, ...], ln_gamma: Callable[[list[mpf]], list[mpf]]) -> list[mpf]:
    """The equilibrium by extents, in 40 digits, with the model written out anew."""
    nu = [[mpf(c.numerator) / c.denominator for c in row] for row in problem.nu]
    change = np.array(n) - np.array(problem.n0)
    matrix = np.array([[float(c) for c in row] for row in problem.nu])
    start = np.linalg.lstsq(matrix.T, change, rcond=None)[0]
    fluid = [i for i, phase in enumerate(problem.phases) if phase == "fluid"]

    def amounts(xi: tuple[mpf, ...]) -> list[mpf]:
        return [
            mpf(f) + sum(x * row[i] for x, row in zip(xi, nu, strict=True)) for i, f in enumerate(problem.n0)
        ]

    def gaps(*xi: mpf) -> list[mpf]:
        m = amounts(xi)
        gamma, total = ln_gamma(m), sum(m[i] for i in fluid)
        shift = (
            mp.log(problem.state.p) - mp.log(total) if problem.state.kind == "P" else -mp.log(problem.state.v)
        )
        return [
            sum(row[i] * (mp.log(m[i]) + shift + gamma[i]) for i in fluid if row[i]) - mpf(k)
            for row, k in zip(nu, problem.ln_k, strict=True)
        ]

    found = mp.findroot(gaps, [mpf(x) for x in start], tol=1e-60, maxsteps=50)
    return amounts(tuple(found))


@pytest.mark.parametrize("p", [1.0, 30.0, 200.0])
def test_a_virial_gas_agrees_with_forty_digits(p):
    b = [
        [-1e-3, -8e-4, -2e-3, 5e-4],
        [-8e-4, -4e-4, -1e-3, 3e-4],
        [-2e-3, -1e-3, -5e-3, 1e-3],
        [5e-4, 3e-4, 1e-3, 8e-4],
    ]
    nu = rows("-1 -1 1 0", "0 -1 -1 2")
    problem = Problem(
        ("A", "B", "C", "D"),
        ("fluid",) * 4,
        nu,
        (1.0, 2.0, 0.0, 0.0),
        (0.5, -1.0),
        State("P", 500.0, p=p),
        model=ToyVirial(b),
    )
    n = solve(problem).require().n

    def ln_phi(m: list[mpf]) -> list[mpf]:
        y = [v / sum(m) for v in m]
        mixed = [sum(mpf(b[i][j]) * y[j] for j in range(4)) for i in range(4)]
        total = sum(y[i] * mixed[i] for i in range(4))
        return [(2 * x - total) * mpf(p) for x in mixed]

    with mp.workdps(40):
        assert n == pytest.approx([float(v) for v in exact(problem, n, ln_phi)], rel=1e-12)


# A weak acid of two steps in brine, with its own autoprotolysis left out.
ACID = ("H2A", "H+", "HA-", "A-2", "Na+", "Cl-")
CHARGES = [0, 1, -1, -2, 1, -1]
ACID_NU = rows("-1 1 1 0 0 0", "0 1 -1 1 0 0")


def acid(model: object, salt: float) -> Problem:
    feed = (0.1, 0.0, 0.0, 0.0, salt, salt)
    k = (math.log(1e-3), math.log(1e-6))
    return Problem(ACID, ("fluid",) * 6, ACID_NU, feed, k, State("C", 298.15, v=1.0), model=model)  # type: ignore[arg-type]


@pytest.mark.parametrize("salt", [0.0, 0.01, 0.5, 3.0])
def test_ions_without_slopes_of_their_own_agree_with_forty_digits(salt):
    problem = acid(ToyIons(CHARGES), salt)
    n = solve(problem).require().n

    def ln_gamma(m: list[mpf]) -> list[mpf]:
        root = mp.sqrt(sum(z * z * v for z, v in zip(CHARGES, m, strict=True)) / 2)
        return [-z * z * root / (1 + root) for z in CHARGES]

    with mp.workdps(40):
        assert n == pytest.approx([float(v) for v in exact(problem, n, ln_gamma)], rel=1e-11)


@pytest.mark.parametrize("salt", [0.0, 0.1, 0.49])
def test_davies_up_to_half_molar_agrees_with_forty_digits(salt):
    problem = acid(Aqueous(CHARGES), salt)
    s = solve(problem).require()
    assert any("ionic strength" in note for note in s.notes)

    def ln_gamma(m: list[mpf]) -> list[mpf]:
        strength = sum(z * z * v for z, v in zip(CHARGES, m, strict=True)) / 2
        root = mp.sqrt(strength)
        a = mpf(debye_huckel_a(298.15)) * mp.log(10)
        return [-a * z * z * (root / (1 + root) - mpf("0.3") * strength) for z in CHARGES]

    with mp.workdps(40):
        assert s.n == pytest.approx([float(v) for v in exact(problem, s.n, ln_gamma)], rel=1e-11)


def test_a_composition_beyond_the_range_of_the_model_is_refused():
    with pytest.raises(OutOfRangeError, match="ionic strength"):
        solve(acid(Aqueous(CHARGES), 20.0))


@pytest.mark.parametrize("p", [1.0, 100.0, 300.0, 1000.0])
def test_ammonia_under_pressure_agrees_with_a_bracketed_extent(p):
    model = peng_robinson(["N2(g)", "H2(g)", "NH3(g)"], [True] * 3)
    state, ln_k = State("P", 723.15, p=p), math.log(4.8e-5)
    problem = Problem(
        ("N2", "H2", "NH3"), ("fluid",) * 3, rows("-1 -3 2"), (1.0, 3.0, 0.0), (ln_k,), state, model=model
    )

    def gap(xi: float) -> float:
        n = np.array([1.0 - xi, 3.0 - 3.0 * xi, 2.0 * xi])
        ln_a = np.log(n / n.sum() * p) + model.ln_gamma(n, state)
        return float(np.array([-1.0, -3.0, 2.0]) @ ln_a) - ln_k

    xi = brentq(gap, 1e-9, 1.0 - 1e-9, xtol=1e-16, rtol=1e-14)
    assert solve(problem).require().n == pytest.approx((1.0 - xi, 3.0 - 3.0 * xi, 2.0 * xi), rel=1e-11)


@pytest.mark.parametrize("p", [30.0, 300.0, 1000.0, 2000.0])
def test_three_reactions_in_a_dense_gas_are_certified_in_few_steps(p):
    names = ("CH4(g)", "H2O(g)", "CO(g)", "H2(g)", "CO2(g)", "CH3OH(g)")
    nu = rows("-1 -1 1 3 0 0", "0 -1 -1 1 1 0", "0 0 -1 -2 0 1")
    model = peng_robinson(names, [True] * 6)
    feed, state = (0.2, 0.5, 1.0, 2.0, 0.3, 0.0), State("P", 520.0, p=p)
    s = solve(Problem(names, ("fluid",) * 6, nu, feed, (-12.0, 4.0, -9.0), state, model=model)).require()
    ln_a = np.log(np.array(s.n) / sum(s.n) * p) + model.ln_gamma(np.array(s.n), state)
    assert np.array([[float(c) for c in row] for row in nu]) @ ln_a == pytest.approx(
        [-12.0, 4.0, -9.0], abs=1e-11
    )
    assert s.iterations < 60


def test_a_solid_is_in_equilibrium_with_a_gas_that_is_not_ideal():
    names, phases = ("CH4(g)", "H2(g)", "C(s)"), ("fluid", "fluid", "pure")
    model = peng_robinson(names, [True, True, False])
    state = State("P", 900.0, p=300.0)
    s = solve(Problem(names, phases, rows("-1 2 1"), (1.0, 0.1, 0.0), (3.0,), state, model=model)).require()
    fluid = np.array(s.n[:2])
    ln_a = np.log(fluid / fluid.sum() * 300.0) + model.ln_gamma(np.array(s.n), state)[:2]
    assert 2.0 * ln_a[1] - ln_a[0] == pytest.approx(3.0, abs=1e-12)
    assert s.n[2] == pytest.approx(1.0 - s.n[0], rel=1e-12)


@pytest.mark.parametrize("model", [Aqueous(CHARGES), ToyIons(CHARGES)], ids=["davies", "toy"])
def test_derivatives_follow_the_activity_coefficients(model):
    def at(ln_k: tuple[float, ...], feed: tuple[float, ...]) -> np.ndarray:
        base = acid(model, 0.1)
        return np.array(
            solve(Problem(base.species, base.phases, base.nu, feed, ln_k, base.state, model=model))
            .require()
            .n
        )

    base = acid(model, 0.1)
    got, h = sensitivities(solve(base)), 1e-5
    up, down = (base.ln_k[0] + h, base.ln_k[1]), (base.ln_k[0] - h, base.ln_k[1])
    numeric = (at(up, base.n0) - at(down, base.n0)) / (2.0 * h)
    assert got.by_ln_k[:, 0].tolist() == pytest.approx(numeric.tolist(), rel=1e-6, abs=1e-12)
    more = tuple(x + (1e-6 if i == 4 else 0.0) for i, x in enumerate(base.n0))
    less = tuple(x - (1e-6 if i == 4 else 0.0) for i, x in enumerate(base.n0))
    numeric = (at(base.ln_k, more) - at(base.ln_k, less)) / 2e-6
    assert got.by_feed[:, 4].tolist() == pytest.approx(numeric.tolist(), rel=1e-5, abs=1e-9)


def test_derivatives_by_pressure_include_what_it_does_to_the_fugacities():
    model = peng_robinson(["N2(g)", "H2(g)", "NH3(g)"], [True] * 3)

    def problem(p: float) -> Problem:
        state = State("P", 723.15, p=p)
        return Problem(
            ("N2", "H2", "NH3"), ("fluid",) * 3, rows("-1 -3 2"), (1.0, 3.0, 0.0), (-9.9,), state, model=model
        )

    numeric = (np.array(solve(problem(500.01)).n) - np.array(solve(problem(499.99)).n)) / 0.02
    assert sensitivities(solve(problem(500.0))).by_p.tolist() == pytest.approx(numeric.tolist(), rel=1e-7)
