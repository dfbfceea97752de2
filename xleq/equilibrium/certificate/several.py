"""The certificate of several reactions, or of a fluid that is not ideal.

The reactions are rewritten so that each makes one species out of the most abundant ones: species that are
absent first, then those present from the least to the most. In that form a residual is the relative error of
a trace, a balance is held against the largest amounts, and what is absent can be judged by itself.
"""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from xleq.equilibrium.certificate.absent import Rows, absent_phases, absent_species
from xleq.equilibrium.certificate.verdict import (
    BALANCE_TOLERANCE,
    ERROR_TOLERANCE,
    ROUNDING,
    ROUNDING_TOLERANCE,
    Verdict,
)
from xleq.equilibrium.problem import Problem
from xleq.equilibrium.structure import LN_K_AGREEMENT, Elimination, eliminate, structure

Floats = NDArray[np.float64]


def certify_several(problem: Problem, n: Sequence[float]) -> Verdict:
    """Verdict on amounts that are numbers, at least 0.

    Parameters
    ----------
    problem : Problem
    n : sequence [n_species] of float
        Amounts claimed. [mol]
    """
    s = structure(problem.nu)
    amounts = np.array(n, dtype=float)
    fluid = np.array([phase == "fluid" for phase in problem.phases])
    order = np.lexsort((np.where(amounts > 0.0, amounts, ~fluid), amounts > 0.0))
    e = eliminate(s.whole[list(s.independent)], [int(i) for i in order])
    ln_a, size = _ln_activities(problem, amounts, fluid)
    whole_ln_k = np.array([problem.ln_k[r] * s.scales[r] for r in s.independent])
    rows = _rows(e, ln_a, size, whole_ln_k)
    reason, balance = _balance(problem, e, amounts)
    present = amounts[rows.pivots] > 0.0
    nu = np.asarray(s.whole, dtype=float) / np.array(s.scales)[:, None]
    residuals = _residuals(nu, np.array(problem.ln_k), fluid & (amounts == 0.0), ln_a)
    if reason:
        return Verdict(reason, residuals, balance, math.nan)
    reason, error = _at_equilibrium(problem, rows, present, amounts, fluid)
    reason = (
        reason
        or absent_species(problem, rows, amounts, fluid)
        or absent_phases(problem, rows, amounts, fluid)
        or _dependent(problem, amounts, residuals, [r for r, _ in s.relations])
    )
    return Verdict(reason, residuals, balance, error)


def _ln_activities(problem: Problem, amounts: Floats, fluid: NDArray[np.bool_]) -> tuple[Floats, Floats]:
    """Ln a of each species, and the size of the terms that it is the sum of; 0 for what is absent or pure.

    For an absent fluid species the logarithm of its amount is left out, so that what remains is known.
    """
    state = problem.state
    total = float(amounts[fluid].sum())
    shift = state.shift - (math.log(total) if state.per_total and total else 0.0)
    there = fluid & (amounts > 0.0)
    ln_n = np.log(amounts, out=np.zeros(len(amounts)), where=there)
    ln_a = np.where(fluid, ln_n + shift, 0.0)
    size = np.where(fluid, np.abs(ln_n) + abs(shift) + 1.0, 0.0)
    if problem.model is not None:
        ln_gamma = problem.model.ln_gamma(amounts, state)
        ln_a = ln_a + np.where(fluid, ln_gamma, 0.0)
        # A model is itself a calculation: its logarithms are not good to the last digit.
        size = size + np.where(fluid, 100.0 * (np.abs(ln_gamma) + 1.0), 0.0)
    return ln_a, size


def _rows(e: Elimination, ln_a: Floats, size: Floats, ln_k: Floats) -> Rows:
    nu = np.asarray(e.rows / e.denominator, dtype=float)
    combos = np.asarray(e.combos / e.denominator, dtype=float)
    row_ln_k = combos @ ln_k
    floor = ROUNDING * (np.abs(nu) @ size + np.abs(combos) @ np.abs(ln_k))
    return Rows(np.array(e.pivots, dtype=np.intp), nu, nu @ ln_a - row_ln_k, floor)


def _balance(problem: Problem, e: Elimination, amounts: Floats) -> tuple[str, float]:
    """Whether the amounts come from the feed by the reactions, each good to BALANCE_TOLERANCE of itself.

    What the pivots, the least amounts, have changed fixes the extents; every other species follows.
    """
    n0 = np.array(problem.n0)
    pivots = list(e.pivots)
    others = np.ones(len(n0), dtype=bool)
    others[pivots] = False
    nu = np.asarray(e.rows / e.denominator, dtype=float)[:, others]
    moved = amounts - n0
    off = np.abs(moved[others] - moved[pivots] @ nu)
    allowed = amounts[others] + amounts[pivots] @ np.abs(nu)
    gross = amounts + n0
    blur = 4.0 * ROUNDING * (gross[others] + gross[pivots] @ np.abs(nu))
    unsure = off + blur > BALANCE_TOLERANCE * allowed
    off = np.maximum(off - blur, 0.0)
    places = np.flatnonzero(others)
    for k in np.flatnonzero(unsure):
        off[k] = _exact_departure(problem, e, int(places[k]), amounts)
    ratio = np.divide(off, allowed, out=np.where(off > 0.0, math.inf, 0.0), where=allowed > 0.0)
    worst = int(np.argmax(ratio)) if len(ratio) else -1
    if worst < 0 or ratio[worst] <= BALANCE_TOLERANCE:
        return "", float(ratio[worst]) if worst >= 0 else 0.0
    name = problem.species[places[worst]]
    return f"the change of {name} does not fit the reactions: off by {ratio[worst]:.2g}", float(ratio[worst])


def _exact_departure(problem: Problem, e: Elimination, place: int, amounts: Floats) -> float:
    """The departure of one species from its balance, without rounding [mol]."""
    terms = [(e.denominator, place)]
    terms += [(-int(e.rows[k, place]), p) for k, p in enumerate(e.pivots) if e.rows[k, place]]
    pairs = [(c, float(amounts[i]).as_integer_ratio(), problem.n0[i].as_integer_ratio()) for c, i in terms]
    base = max(max(a[1], b[1]) for _, a, b in pairs)
    total = sum(c * (a[0] * (base // a[1]) - b[0] * (base // b[1])) for c, a, b in pairs)
    return abs(total) / (base * e.denominator)


def _at_equilibrium(
    problem: Problem, rows: Rows, present: NDArray[np.bool_], amounts: Floats, fluid: NDArray[np.bool_]
) -> tuple[str, float]:
    """Reason and largest relative error that the residuals of the reactions among what is present allow."""
    if not present.any():
        return "", 0.0
    nu, residual, floor = rows.nu[present], rows.residual[present], rows.floor[present]
    reach = _reach(problem, nu, amounts, fluid)
    if reach is None:
        return "the amounts are not determined: some combination of the reactions is indifferent", math.inf
    beyond = np.maximum(np.abs(residual) - floor, 0.0)
    blur = float((reach @ floor).max())
    excess = reach @ beyond
    worst = int(np.argmax(np.where(beyond > 0.0, np.abs(residual), 0.0)))
    if excess.max() > ERROR_TOLERANCE:
        name = problem.species[rows.pivots[present][worst]]
        reason = f"{name} is not at equilibrium: ln Q - ln K = {residual[worst]:.3g}"
        return reason, float(excess.max())
    if blur > ROUNDING_TOLERANCE:
        return f"rounding alone moves an amount by {blur:.2g} of itself", blur
    return "", float((reach @ np.minimum(np.abs(residual), floor)).max() + excess.max())


def _reach(problem: Problem, nu: Floats, amounts: Floats, fluid: NDArray[np.bool_]) -> Floats | None:
    """Bounds on |d ln n_i / d residual_k| [n_species, n_rows]; None where the amounts are not determined.

    The Hessian of the free energy is G G^T with G = nu sqrt(n) (1/n - mean), a form without cancellation;
    its rows are scaled to length one, so that traces do not make it singular.
    """
    there = fluid & (amounts > 0.0)
    root = np.sqrt(amounts[there])
    g = nu[:, there] / root
    gross = np.abs(g)
    total = float(amounts[there].sum())
    if problem.state.per_total and total:
        mean = np.outer(nu[:, fluid].sum(axis=1) / total, root)
        g = g - mean
        gross = gross + np.abs(mean)
    top = gross.max(axis=1, initial=0.0)
    if not (top > 0.0).all():
        return None
    g /= top[:, None]
    length = np.sqrt((g * g).sum(axis=1))
    if (length <= 4.0 * ROUNDING).any():
        return None
    g /= length[:, None]
    hessian = g @ g.T
    try:
        inverse = np.linalg.inv(hessian)
    except np.linalg.LinAlgError:
        return None
    if not np.isfinite(inverse).all() or np.abs(inverse).max() > 1e13:
        return None
    scale = 1.0 / (top * length)
    shares = np.divide(nu * scale[:, None], amounts, out=np.zeros_like(nu), where=amounts > 0.0)
    reach: Floats = np.abs(shares.T @ inverse) * scale
    return reach


def _residuals(nu: Floats, ln_k: Floats, missing: NDArray[np.bool_], ln_a: Floats) -> tuple[float, ...]:
    """Ln Q - ln K of each reaction as given; nan where a fluid species of it is absent."""
    values = nu @ ln_a - ln_k
    values[(nu[:, missing] != 0.0).any(axis=1)] = math.nan
    return tuple(values.tolist())


def _dependent(problem: Problem, amounts: Floats, residuals: tuple[float, ...], dependent: list[int]) -> str:
    """Whether the constants of dependent reactions agree with the amounts, as nearly as data can."""
    for r in dependent:
        scale = max(1.0, abs(problem.ln_k[r]))
        absent = any(c and not amounts[i] for i, c in enumerate(problem.nu[r]))
        if not absent and abs(residuals[r]) > 10.0 * LN_K_AGREEMENT * scale:
            return f"reaction {r + 1} depends on the others, but ln Q - ln K = {residuals[r]:.3g}"
    return ""
