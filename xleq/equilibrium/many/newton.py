"""Newton's method in log moles for a fluid, with a given set of pure phases present.

The unknowns are ln n of a basis of the fluid and ln of its total amount. Each balance is solved in the form
ln(all that adds) = ln(all that takes away), and the basis is always that of the most abundant species: then
no term of a balance exceeds what it is balanced against by more than its coefficient, traces are as exact
as the bulk, and nothing overflows whatever the constants are.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from xleq.equilibrium.structure import Elimination, eliminate, exact_totals

Floats = NDArray[np.float64]

#: A species may exceed one of its basis by this much in ln n before the basis is chosen anew. [-]
BASIS_SLACK = 1.0
#: Largest change of ln n of a basis species in one step. [-]
LONGEST_STEP = 30.0
MAX_STEPS = 80
#: Steps of Newton's method spent on following one equilibrium.
MAX_CONTINUATION = 2000
_CONVERGED = 1e-12
_BALANCED = 1e-6


@dataclass(frozen=True, slots=True)
class System:
    """A fluid with some pure phases present, and the rest of them taken away.

    Parameters
    ----------
    whole : array [n_reactions, n_species] of whole numbers
        Independent reactions.
    ln_k : array [n_reactions] of float
        ln K of these (scaled as they are). [-]
    n0 : tuple [n_species] of float
        Amounts fed. [mol]
    fluid : array of int
        Fluid species that can be there.
    present : array of int
        Pure phases taken to be present, at activity 1.
    gone : array of int
        Species whose amount is 0: pure phases taken away, and what cannot form.
    per_total : int
        1 where activities follow fractions, else 0.
    shift : float
        Constant of the ln activity. [-]
    ln_gamma : array [n_species] of float
        Held fixed here. [-]
    """

    whole: NDArray[Any]
    ln_k: Floats
    n0: tuple[float, ...]
    fluid: NDArray[np.intp]
    present: NDArray[np.intp]
    gone: NDArray[np.intp]
    per_total: int
    shift: float
    ln_gamma: Floats


@dataclass(frozen=True, slots=True)
class Frame:
    """A system written in one basis.

    Parameters
    ----------
    elimination : Elimination
    basis, made : array of int
        Fluid species of the basis [n_basis], and fluid species made from it [n_made].
    recipe : array [n_made, n_basis] of float
        How much of each basis species one of a made species holds.
    linear : array [n_basis + n_made, n_unknowns] of float
        How ln n of basis and made species follows the unknowns.
    offset : array [n_basis + n_made] of float
        The rest of ln n. [-]
    totals : array [n_basis] of float
        What is conserved of each basis species, correctly rounded. [mol]
    rows_of_made : tuple [n_made] of int
        Row of the elimination that makes each made species.
    log_adds, log_takes : array [n_basis, n_basis + n_made + 1] of float
        ln of the coefficients on the two sides of each balance, the total last; -inf where there is none.
    """

    elimination: Elimination
    basis: NDArray[np.intp]
    made: NDArray[np.intp]
    recipe: Floats
    linear: Floats
    offset: Floats
    totals: Floats
    exact: tuple[tuple[int, ...], int]
    rows_of_made: tuple[int, ...]
    log_adds: Floats
    log_takes: Floats
    feasible: bool


def frame(system: System, ln_n: Floats) -> Frame | None:
    """The system in the basis of the species that are most abundant by `ln_n` [n_species].

    None if the phases taken to be present cannot be: they react with each other alone, or what is taken away
    is conserved.
    """
    rank_of = ln_n[system.fluid]
    order = [*system.gone, *system.fluid[np.argsort(rank_of, kind="stable")], *system.present]
    e = eliminate(system.whole, order)
    pivots = set(e.pivots)
    gone, present = set(system.gone.tolist()), set(system.present.tolist())
    if pivots & present:
        return None
    basis = np.array([i for i in system.fluid if i not in pivots], dtype=np.intp)
    rows = [r for r, k in enumerate(e.pivots) if k not in gone]
    made = np.array([e.pivots[r] for r in rows], dtype=np.intp)
    stuck = [i for i in system.gone if i not in pivots]
    totals, denominator = exact_totals(e, [*basis.tolist(), *stuck], system.n0)
    if any(totals[len(basis) :]):
        return None
    d = float(e.denominator)
    recipe = -e.rows[rows][:, basis].astype(np.float64) / d
    ln_k = e.combos[rows].astype(np.float64) @ system.ln_k / d
    s, n_basis = system.per_total, len(basis)
    excess = recipe.sum(axis=1) - 1.0
    linear = np.zeros((n_basis + len(made), n_basis + s))
    linear[:n_basis, :n_basis] = np.eye(n_basis)
    linear[n_basis:, :n_basis] = recipe
    if s:
        linear[n_basis:, -1] = -excess
    offset = np.zeros(n_basis + len(made))
    offset[n_basis:] = ln_k + excess * system.shift + recipe @ system.ln_gamma[basis] - system.ln_gamma[made]
    b = np.array([x / denominator for x in totals[:n_basis]])
    sides = np.concatenate([np.eye(n_basis), recipe.T, -b[:, None]], axis=1)
    with np.errstate(divide="ignore"):
        log_adds = np.log(np.maximum(sides, 0.0))
        log_takes = np.log(np.maximum(-sides, 0.0))
    feasible = bool(np.isfinite(log_takes).any(axis=1).all())
    exact = (tuple(totals[:n_basis]), denominator)
    return Frame(e, basis, made, recipe, linear, offset, b, exact, tuple(rows), log_adds, log_takes, feasible)


def log_sums(terms: Floats) -> tuple[Floats, Floats]:
    """Ln of the row sums of exp(terms), and the share of each term in its sum."""
    top = terms.max(axis=1, keepdims=True)
    weights = np.exp(terms - top)
    sums = weights.sum(axis=1, keepdims=True)
    return (top + np.log(sums))[:, 0], weights / sums


def residual(system: System, f: Frame, x: Floats) -> tuple[Floats, Floats, Floats]:
    """Residual [n_unknowns], its derivatives and ln n of basis and made species at the unknowns x."""
    ln_n = f.offset + f.linear @ x
    terms = np.append(ln_n, 0.0)
    adds, add_share = log_sums(f.log_adds + terms)
    takes, take_share = log_sums(f.log_takes + terms)
    value = adds - takes
    slope = (add_share - take_share)[:, :-1] @ f.linear
    if system.per_total:
        total, share = log_sums(ln_n[None, :])
        last = share @ f.linear
        last[0, -1] -= 1.0
        value = np.append(value, total - x[-1])
        slope = np.concatenate([slope, last])
    return value, slope, ln_n


def out_of_order(f: Frame, ln_n: Floats) -> bool:
    """Whether some made species has come to exceed a basis species that it holds."""
    n_basis = len(f.basis)
    if not len(f.made) or not n_basis:
        return False
    ahead = ln_n[n_basis:, None] - ln_n[None, :n_basis]
    return bool((ahead[f.recipe != 0.0] > BASIS_SLACK).any())


@dataclass(frozen=True, slots=True)
class Path:
    """Where Newton's method has come to: the frame, the unknowns in it, and how."""

    frame: Frame
    x: Floats
    converged: bool
    steps: int


def newton(system: System, ln_n: Floats, max_steps: int = MAX_STEPS) -> Path | None:
    """Newton's method from ln n [n_species]; None where the set of phases is impossible."""
    f = frame(system, ln_n)
    if f is None or not f.feasible:
        return None
    x = start(system, f, ln_n)
    best = np.inf
    for step in range(max_steps):
        value, slope, at = residual(system, f, x)
        if out_of_order(f, at):
            full = ln_n.copy()
            full[f.basis], full[f.made] = at[: len(f.basis)], at[len(f.basis) :]
            n_total = x[-1]
            f = frame(system, full)
            if f is None or not f.feasible:
                return None
            x = start(system, f, full)
            if system.per_total:
                x[-1] = n_total
            value, slope, at = residual(system, f, x)
        worst = float(np.abs(value).max(initial=0.0))
        if not np.isfinite(worst):
            return Path(f, x, False, step)
        try:
            change = np.linalg.solve(slope, -value)
        except np.linalg.LinAlgError:
            change = np.linalg.lstsq(slope, -value, rcond=None)[0]
        longest = float(np.abs(change).max(initial=0.0))
        if not np.isfinite(longest):
            return Path(f, x, False, step)
        if longest > LONGEST_STEP:
            change *= LONGEST_STEP / longest
        x = x + change
        if longest < _CONVERGED or (longest < 1e-9 and longest >= best):
            # A residual that no step makes smaller is no solution.
            return Path(f, x, worst < _BALANCED, step + 1)
        best = longest if longest < 1e-9 else np.inf
    return Path(f, x, False, max_steps)


def start(system: System, f: Frame, ln_n: Floats) -> Floats:
    """The unknowns of a frame at ln n [n_species]."""
    x = ln_n[f.basis]
    if not system.per_total:
        return x.copy()
    return np.append(x, log_sums(ln_n[system.fluid][None, :])[0])


def ln_amounts(system: System, path: Path) -> Floats:
    """Ln n [n_species] that a path has come to; pure phases and absent species are 0 there [-]."""
    f = path.frame
    full = np.zeros(len(system.n0))
    at = f.offset + f.linear @ path.x
    full[f.basis], full[f.made] = at[: len(f.basis)], at[len(f.basis) :]
    return full


def continuation(system: System, ln_n: Floats) -> Path | None:
    """Follow the equilibrium from amounts that are one, by their own constants, to the one that is wanted.

    ln K and the feed are led together along a straight line, in steps that Newton's method can take. As the
    free energy is convex there is one equilibrium all along the line.
    """
    first = frame(system, ln_n)
    if first is None or not first.feasible:
        return None
    x = start(system, first, ln_n)
    own = _quotients(system, ln_n, float(x[-1]) if system.per_total else 0.0)
    n_start = np.zeros(len(system.n0))
    n_start[system.fluid] = np.exp(ln_n[system.fluid])
    n0 = np.array(system.n0)
    t, dt, steps, path = 0.0, 0.25, 0, None
    while t < 1.0 and dt > 1e-6 and steps < MAX_CONTINUATION:
        to = min(1.0, t + dt)
        feed = system.n0 if to == 1.0 else tuple(((1.0 - to) * n_start + to * n0).tolist())
        ln_k = system.ln_k if to == 1.0 else (1.0 - to) * own + to * system.ln_k
        here = replace(system, n0=feed, ln_k=ln_k)
        trial = newton(here, ln_n, 15)
        steps += trial.steps if trial is not None else 1
        if trial is not None and trial.converged:
            t, path = to, trial
            ln_n = ln_amounts(here, trial)
            dt *= 2.0
        else:
            dt *= 0.4
    return replace(path, steps=steps, converged=t == 1.0) if path is not None else None


def _quotients(system: System, ln_n: Floats, ln_total: float) -> Floats:
    """Ln Q [n_reactions] at ln n; pure phases count as present."""
    ln_a = np.zeros(len(ln_n))
    i = system.fluid
    ln_a[i] = ln_n[i] - system.per_total * ln_total + system.shift + system.ln_gamma[i]
    return np.asarray(system.whole.astype(np.float64) @ ln_a)
