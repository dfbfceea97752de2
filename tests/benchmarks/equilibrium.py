"""Times a solution, alone and in a batch of 10,000, beside what an engineer writes by hand.

Run from the project's folder: `python -m tests.benchmarks.equilibrium`. Each method is given the reference
cases too: an answer is right when every amount is within its bar, traces included.
"""

from __future__ import annotations

import math
import time
import warnings
from collections.abc import Callable, Sequence

import numpy as np

from tests.cases.reader import Case, read
from xleq.equilibrium import Batch, Problem, solve, solve_batch
from xleq.errors import XleqError

Amounts = Sequence[float]
Solver = Callable[[Problem], Amounts]

INSTANCES = 10_000
PEER_INSTANCES = 100
#: What is timed: a title and the reference case it starts from.
SYSTEMS = (("one reaction", "single", "n_s00"), ("7 species, 3 reactions, a solid", "solids", "n_c00"),
           ("12 species, 8 reactions", "multi", "n_m02"))  # fmt: skip


def ours(problem: Problem) -> Amounts:
    """The project's own solver, certificate included."""
    return solve(problem).require().n


class Sheet:
    """The problem as an engineer sets it up: arrays, and the residual of ln Q - ln K."""

    def __init__(self, problem: Problem) -> None:
        self.nu = np.array([[float(c) for c in row] for row in problem.nu])
        self.n0 = np.array(problem.n0)
        self.ln_k = np.array(problem.ln_k)
        self.fluid = np.array([phase == "fluid" for phase in problem.phases])
        self.state = problem.state

    def amounts(self, xi: np.ndarray) -> np.ndarray:
        return self.n0 + self.nu.T @ np.atleast_1d(xi)

    def ln_a(self, xi: np.ndarray) -> np.ndarray:
        n = np.where(self.fluid, np.maximum(self.amounts(xi), 1e-300), 1.0)
        ln_a = np.log(n) + self.state.shift
        if self.state.per_total:
            ln_a -= math.log(max(n[self.fluid].sum(), 1e-300))
        return np.where(self.fluid, ln_a, 0.0)

    def residual(self, xi: np.ndarray) -> np.ndarray:
        return self.nu @ self.ln_a(xi) - self.ln_k

    def product_residual(self, xi: np.ndarray) -> np.ndarray:
        """K times the reactants' activities less the products'."""
        a = np.exp(self.ln_a(xi))
        left = np.prod(a ** np.maximum(-self.nu, 0.0), axis=1)
        right = np.prod(a ** np.maximum(self.nu, 0.0), axis=1)
        return np.exp(self.ln_k) * left - right

    def start(self) -> np.ndarray:
        """A small extent of each reaction, forward if its reactants are there."""
        scale = self.n0.sum()
        xi = np.zeros(len(self.ln_k))
        for r, row in enumerate(self.nu):
            forward = (self.amounts(xi)[row < 0] > 0).all()
            xi[r] = (1e-3 if forward else -1e-3) * scale
        return xi


def by_brentq(problem: Problem) -> Amounts:
    from scipy.optimize import brentq

    sheet = Sheet(problem)
    row = sheet.nu[0]
    low = max(-sheet.n0[row > 0] / row[row > 0])
    high = min(-sheet.n0[row < 0] / row[row < 0])
    margin = 1e-15 * (high - low)
    if sheet.residual(low + margin)[0] >= 0.0:
        return np.maximum(sheet.amounts(low), 0.0).tolist()
    if sheet.residual(high - margin)[0] <= 0.0:
        return np.maximum(sheet.amounts(high), 0.0).tolist()
    xi = brentq(lambda x: sheet.residual(x)[0], low, high, xtol=1e-300, rtol=1e-15)
    return sheet.amounts(xi).tolist()


def by_fsolve_log(problem: Problem) -> Amounts:
    from scipy.optimize import fsolve

    sheet = Sheet(problem)
    return sheet.amounts(fsolve(sheet.residual, sheet.start(), xtol=1e-12)).tolist()


def by_fsolve_product(problem: Problem) -> Amounts:
    from scipy.optimize import fsolve

    sheet = Sheet(problem)
    return sheet.amounts(fsolve(sheet.product_residual, sheet.start(), xtol=1e-12)).tolist()


def by_least_squares(problem: Problem) -> Amounts:
    from scipy.optimize import least_squares

    sheet = Sheet(problem)
    found = least_squares(sheet.residual, sheet.start(), xtol=1e-14, ftol=1e-14, gtol=1e-14, max_nfev=500)
    return sheet.amounts(found.x).tolist()


METHODS: dict[str, Solver] = {
    "xleq": ours,
    "brentq on the extent": by_brentq,
    "fsolve, log form": by_fsolve_log,
    "fsolve, product form": by_fsolve_product,
    "least_squares, log form": by_least_squares,
}


def attempt(method: Solver, problem: Problem) -> Amounts | None:
    """The amounts, or None where the method gives up; any failure of a peer is a failure, not a crash."""
    try:
        return method(problem)
    except (XleqError, ValueError, ArithmeticError, RuntimeError, np.linalg.LinAlgError):
        return None


def rate(method: Solver, cases: Sequence[Case]) -> int:
    """How many cases a method gets right."""
    right = 0
    for case in cases:
        n = attempt(method, case.problem)
        right += n is not None and case.is_met_by(tuple(n))
    return right


def varied(problem: Problem, n_instances: int) -> Batch:
    """Instances of one system with feed, pressure and constants around those given."""
    rng = np.random.default_rng(20)
    n0 = np.array(problem.n0) * rng.uniform(0.8, 1.25, (n_instances, len(problem.n0)))
    ln_k = np.array(problem.ln_k) + rng.normal(0.0, 1.0, (n_instances, len(problem.ln_k)))
    state, ones = problem.state, np.ones(n_instances)
    p = state.p * rng.uniform(0.8, 1.25, n_instances)
    return Batch(problem.species, problem.phases, problem.nu, n0, ln_k, state.kind, state.t * ones, p,
                 state.v * ones)  # fmt: skip


def seconds_alone(method: Solver, batch: Batch, count: int) -> float:
    """Median time of one solution over some instances, each the better of two."""
    times = []
    for i in range(count):
        problem = batch.problem(i)
        best = math.inf
        for _ in range(2):
            start = time.perf_counter()
            attempt(method, problem)
            best = min(best, time.perf_counter() - start)
        times.append(best)
    return float(np.median(times))


def time_system(title: str, problem: Problem) -> None:
    """Prints the times of one system."""
    batch = varied(problem, INSTANCES)
    print(f"\n{title}")
    print(f"  {'xleq, alone':28}{1e6 * seconds_alone(ours, batch, 200):12.1f} us")
    start = time.perf_counter()
    found = solve_batch(batch)
    each = (time.perf_counter() - start) / INSTANCES
    print(f"  {f'xleq, batch of {INSTANCES:,}':28}{1e6 * each:12.1f} us   {found.ok.mean():.2%} certified")
    for name, method in list(METHODS.items())[1:]:
        if method is by_brentq and len(problem.nu) > 1:
            continue
        print(f"  {name:28}{1e6 * seconds_alone(method, batch, PEER_INSTANCES):12.1f} us")


def main() -> None:
    """Prints times and rates."""
    warnings.simplefilter("ignore")
    with np.errstate(all="ignore"):
        for title, family, case_id in SYSTEMS:
            time_system(title, next(case.problem for case in read(family) if case.id == case_id))
        print("\nright answers on the reference cases")
        for name, method in METHODS.items():
            parts = []
            for family in ("single", "multi", "solids"):
                if method is by_brentq and family != "single":
                    continue
                cases = read(family)
                parts.append(f"{family} {rate(method, cases)}/{len(cases)}")
            print(f"  {name:28}{'   '.join(parts)}")


if __name__ == "__main__":
    main()
