"""Newton's method in log moles for many instances at once: one basis, arrays over the instances."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from xleq.equilibrium.many.newton import BASIS_SLACK, LONGEST_STEP
from xleq.equilibrium.structure import Elimination, eliminate, exact_totals

Floats = NDArray[np.float64]
Flags = NDArray[np.bool_]
Places = NDArray[np.intp]

MAX_STEPS = 40
_CONVERGED = 1e-12
# A difference of feeds below this part of them is formed in exact arithmetic.
_CANCELS = 1e-2


@dataclass(slots=True)
class Work:
    """Instances that share which species are fed.

    Parameters
    ----------
    whole : array [n_reactions, n_species] of whole numbers
        Independent reactions.
    ln_k : array [n, n_reactions] of float
        ln K of these, scaled as they are. [-]
    n0 : array [n, n_species] of float
        Amounts fed. [mol]
    shift : array [n] of float
    per_total : int
    fluid, pure, never : array of int
        Fluid species and pure phases that can be there, and species that cannot form.
    n : array [n, n_species] of float
        Result; nan where there is none. [mol]
    steps : array [n] of int
    """

    whole: NDArray[Any]
    ln_k: Floats
    n0: Floats
    shift: Floats
    per_total: int
    fluid: Places
    pure: Places
    never: Places
    n: Floats
    steps: NDArray[np.int_]


@dataclass(slots=True)
class Basis:
    """One basis, for any number of instances.

    Parameters
    ----------
    elimination : Elimination
    basis, made, present, gone : array of int
        Fluid species of the basis, made from it, pure phases present, species at 0 that are pivots.
    rows, gone_rows : list of int
        Rows that make the made and the gone species.
    recipe : array [n_made, n_basis] of float
    linear : array [n_basis + n_made, n_unknowns] of float
    adds, takes : array [n_basis, n_basis + n_made] of float
        ln of the coefficients on the two sides of each balance.
    """

    elimination: Elimination
    basis: Places
    made: Places
    present: Places
    gone: Places
    rows: list[int]
    gone_rows: list[int]
    recipe: Floats
    linear: Floats
    adds: Floats
    takes: Floats


def basis_of(work: Work, here: Flags, ln_n: Floats) -> Basis | None:
    """The basis of the most abundant species by ln n [n_species]; None if the set of phases is impossible."""
    present, away = work.pure[here], work.pure[~here]
    fluid = work.fluid[np.argsort(ln_n[work.fluid], kind="stable")]
    e = eliminate(work.whole, [*work.never, *away, *fluid, *present])
    pivots, absent = set(e.pivots), set(work.never.tolist()) | set(away.tolist())
    if pivots & set(present.tolist()) or any(i not in pivots for i in away.tolist()):
        return None
    basis = np.array([i for i in work.fluid if i not in pivots], dtype=np.intp)
    rows = [r for r, k in enumerate(e.pivots) if k not in absent]
    gone_rows = [r for r, k in enumerate(e.pivots) if k in absent]
    made = np.array([e.pivots[r] for r in rows], dtype=np.intp)
    recipe = -e.rows[rows][:, basis].astype(np.float64) / e.denominator
    size = len(basis)
    linear = np.zeros((size + len(made), size + work.per_total))
    linear[:size, :size] = np.eye(size)
    linear[size:, :size] = recipe
    if work.per_total:
        linear[size:, -1] = 1.0 - recipe.sum(axis=1)
    sides = np.concatenate([np.eye(size), recipe.T], axis=1)
    gone = np.array([e.pivots[r] for r in gone_rows], dtype=np.intp)
    adds, takes = np.log(np.maximum(sides, 0.0)), np.log(np.maximum(-sides, 0.0))
    return Basis(e, basis, made, present, gone, rows, gone_rows, recipe, linear, adds, takes)


def out_of_order(b: Basis, basis: Floats, made: Floats) -> Flags:
    """Instances in which a made species exceeds a basis species that it holds."""
    if not len(b.made) or not len(b.basis):
        return np.zeros(len(basis), dtype=bool)
    ahead = np.where(b.recipe != 0.0, made[:, :, None] - basis[:, None, :], -np.inf)
    worst: Flags = np.asarray(ahead.max(axis=(1, 2)) > BASIS_SLACK)
    return worst


def totals_of(work: Work, b: Basis, columns: Places, members: Places) -> Floats:
    """What is conserved of species that are no pivots [n_members, n_columns, mol]."""
    e = b.elimination
    share = -e.rows[:, columns].astype(np.float64) / e.denominator
    n0 = work.n0[members]
    parts = n0[:, list(e.pivots)]
    totals = n0[:, columns] + parts @ share
    gross = n0[:, columns] + parts @ np.abs(share)
    for i in np.flatnonzero((np.abs(totals) < _CANCELS * gross).any(axis=1)):
        exact, denominator = exact_totals(e, columns.tolist(), n0[i].tolist())
        totals[i] = [x / denominator for x in exact]
    return np.asarray(totals)


def _offsets(work: Work, b: Basis, members: Places) -> Floats:
    combos = b.elimination.combos[b.rows].astype(np.float64) / b.elimination.denominator
    excess = b.recipe.sum(axis=1) - 1.0
    out = np.zeros((len(members), len(b.basis) + len(b.made)))
    out[:, len(b.basis) :] = work.ln_k[members] @ combos.T + np.outer(work.shift[members], excess)
    return out


def iterate(work: Work, b: Basis, members: Places, ln_n: Floats) -> tuple[Flags, Flags]:
    """Newton's method in one basis, in place; which members converged, and which need no other basis."""
    size, n_members = len(b.basis), len(members)
    totals, offset = totals_of(work, b, b.basis, members), _offsets(work, b, members)
    extra_adds, extra_takes = np.log(np.maximum(-totals, 0.0)), np.log(np.maximum(totals, 0.0))
    x = ln_n[members][:, b.basis]
    if work.per_total:
        total = np.logaddexp.reduce(ln_n[members][:, work.fluid], axis=1)
        x = np.concatenate([x, total[:, None]], axis=1)
    done, ended = np.zeros(n_members, dtype=bool), np.zeros(n_members, dtype=bool)
    best = np.full(n_members, np.inf)
    at = np.arange(n_members)
    for _ in range(MAX_STEPS):
        here = offset[at] + x[at] @ b.linear.T
        value, slope = _residual(work, b, here, x[at], extra_adds[at], extra_takes[at])
        fine = np.isfinite(value).all(axis=1) & np.isfinite(slope).all(axis=(1, 2))
        ended[at[~fine]] = True
        stray = fine & out_of_order(b, here[:, :size], here[:, size:])
        work.steps[members[at[fine & ~stray]]] += 1
        keep = fine & ~stray
        at, value, slope = at[keep], value[keep], slope[keep]
        if not len(at):
            break
        change = _solved(slope, -value)
        longest = np.abs(change).max(axis=1, initial=0.0)
        x[at] += change * np.minimum(1.0, LONGEST_STEP / np.maximum(longest, 1e-300))[:, None]
        near = longest < 1e-9
        finished = (longest < _CONVERGED) | (near & (longest >= best[at]))
        best[at] = np.where(near, longest, np.inf)
        broken = ~np.isfinite(longest)
        done[at[finished]] = True
        ended[at[finished | broken]] = True
        at = at[~(finished | broken)]
        if not len(at):
            break
    ended[at] = True
    species = np.concatenate([b.basis, b.made])
    ln_n[np.ix_(members, species)] = offset + x @ b.linear.T
    return done, ended


def _solved(slope: Floats, right: Floats) -> Floats:
    """The linear systems solved; nan where one is singular."""
    try:
        return np.asarray(np.linalg.solve(slope, right[:, :, None])[:, :, 0])
    except np.linalg.LinAlgError:
        singular = np.linalg.matrix_rank(slope) < slope.shape[1]
        out = np.full(right.shape, np.nan)
        regular = ~singular
        if regular.any():
            out[regular] = np.linalg.solve(slope[regular], right[regular][:, :, None])[:, :, 0]
        return out


def _residual(
    work: Work, b: Basis, ln_n: Floats, x: Floats, extra_adds: Floats, extra_takes: Floats
) -> tuple[Floats, Floats]:
    """Residual [n, n_unknowns] and slope [n, n_unknowns, n_unknowns]."""
    adds, add_share = _log_sums(ln_n[:, None, :] + b.adds, extra_adds)
    takes, take_share = _log_sums(ln_n[:, None, :] + b.takes, extra_takes)
    value, slope = adds - takes, (add_share - take_share) @ b.linear
    if work.per_total:
        nothing = np.full((len(ln_n), 1), -np.inf)
        total, share = _log_sums(ln_n[:, None, :], nothing)
        last = share @ b.linear
        last[:, 0, -1] -= 1.0
        value = np.concatenate([value, total - x[:, -1:]], axis=1)
        slope = np.concatenate([slope, last], axis=1)
    return value, slope


def _log_sums(terms: Floats, extra: Floats) -> tuple[Floats, Floats]:
    """Ln of the sums over the last axis and one term more, and the share of each term."""
    top = np.maximum(terms.max(axis=2), extra)
    weights = np.exp(terms - top[:, :, None])
    sums = weights.sum(axis=2) + np.exp(extra - top)
    return top + np.log(sums), weights / sums[:, :, None]
