"""The set of pure phases followed from an easy equilibrium to the one that is wanted.

Any amounts are an equilibrium by their own constants. From there ln K and the feed are led along a straight
line to those of the problem; the equilibrium moves continuously, and phases leave and enter one at a time.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from xleq.equilibrium.many.newton import Path, System, frame, ln_amounts, log_sums, newton
from xleq.equilibrium.structure import exact_totals

Floats = NDArray[np.float64]

#: Driving forces and differences from saturation below this are taken to be none. [-]
NO_DRIVE = 1e-9
#: ln of the activity that absent phases are given at the start. [-]
_ABSENT = -3.0
_MAX_STEPS = 1500
_MIN_ADVANCE = 1e-5
# What rounding leaves of a difference, in parts of its terms.
_ROUNDING = 1e-15


def first_guess(system: System) -> Floats:
    """Ln n [n_species] to start from: the feed, with a ten-thousandth of it for what is not fed."""
    n0 = np.array(system.n0)
    floor = 1e-4 * float(n0.sum()) or 1e-4
    return np.asarray(np.log(np.maximum(n0, floor)))


def with_phases(system: System, pure: NDArray[np.intp], present: frozenset[int]) -> System:
    """The system with just these of its pure phases present."""
    here = np.array(sorted(present), dtype=np.intp)
    away = np.array([p for p in pure if p not in present], dtype=np.intp)
    return replace(system, present=here, gone=np.concatenate([system.gone, away]))


def contradiction(n: Floats, drive: Floats, present: frozenset[int], pure: NDArray[np.intp]) -> int | None:
    """The worst phase of a set: present with an amount below 0, or else absent and eager to form.

    Parameters
    ----------
    n, drive : array [n_species] of float
        Amounts [mol], and driving forces to form of what is absent [-].
    present : frozenset of int
    pure : array of int
        Pure phases that can be there.

    Returns
    -------
    int or None
        None if the set is right.
    """
    negative = [p for p in present if n[p] < 0.0]
    if negative:
        return min(negative, key=lambda p: float(n[p]))
    eager = [p for p in pure.tolist() if p not in present and drive[p] > NO_DRIVE]
    return max(eager, key=lambda p: float(drive[p])) if eager else None


def follow(base: System, pure: NDArray[np.intp], ln_n: Floats) -> tuple[frozenset[int] | None, Floats]:
    """The set of phases that the path leads to, and ln n [n_species] there; None if it is lost.

    Parameters
    ----------
    base : System
        With no pure phase present.
    pure : array of int
        Pure phases that can be there.
    ln_n : array [n_species] of float
        Where the path begins. [-]
    """
    present = _independent(base, pure, ln_n)
    n_start = np.zeros(len(base.n0))
    n_start[base.fluid] = np.exp(ln_n[base.fluid])
    kept = sorted(present)
    n_start[kept] = np.exp(ln_n[kept])
    own = _own_ln_k(base, pure, present, ln_n)
    n0 = np.array(base.n0)
    t, dt, steps = 0.0, 0.25, 0
    while dt > _MIN_ADVANCE and steps < _MAX_STEPS:
        to = min(1.0, t + dt)
        # The last of the way is the wanted problem itself, whose phases are chosen with full precision.
        if to == 1.0 and t > 0.99:
            return present, ln_n
        to = min(to, 0.5 + 0.5 * t) if to == 1.0 else to
        feed = tuple(((1.0 - to) * n_start + to * n0).tolist())
        here = replace(base, n0=feed, ln_k=(1.0 - to) * own + to * base.ln_k)
        reached, at, used = _exchange(here, pure, present, ln_n)
        steps += used
        if reached is None:
            dt *= 0.4
        else:
            present, ln_n, t = reached, at, to
            dt *= 2.0
    return None, ln_n


def _independent(base: System, pure: NDArray[np.intp], ln_n: Floats) -> frozenset[int]:
    """A largest set of phases that do not react with each other alone, those fed first."""
    present: frozenset[int] = frozenset()
    for p in sorted(pure.tolist(), key=lambda p: -base.n0[p]):
        more = present | {p}
        f = frame(with_phases(base, pure, more), ln_n)
        if f is not None and len(f.basis):
            present = more
    return present


def _own_ln_k(base: System, pure: NDArray[np.intp], present: frozenset[int], ln_n: Floats) -> Floats:
    """The ln K [n_reactions] by which the start is at equilibrium."""
    ln_a = np.zeros(len(ln_n))
    i = base.fluid
    total = log_sums(ln_n[i][None, :])[0][0] if base.per_total else 0.0
    ln_a[i] = ln_n[i] - total + base.shift + base.ln_gamma[i]
    ln_a[[p for p in pure if p not in present]] = _ABSENT
    return np.asarray(base.whole.astype(np.float64) @ ln_a)


def _exchange(
    system: System, pure: NDArray[np.intp], present: frozenset[int], ln_n: Floats
) -> tuple[frozenset[int] | None, Floats, int]:
    """Phases dropped and added at one point of the path until none contradicts; None if that does not end."""
    steps = 0
    for _ in range(2 * len(pure) + 2):
        here = with_phases(system, pure, present)
        path = newton(here, ln_n, 15)
        steps += path.steps if path is not None else 1
        if path is None or not path.converged:
            return None, ln_n, steps
        ln_n = ln_amounts(here, path)
        n, drive = _phase_amounts(here, path)
        worst = contradiction(n, drive, present, pure)
        if worst is None:
            return present, ln_n, steps
        present = present.symmetric_difference({worst})
    return None, ln_n, steps


def _phase_amounts(system: System, path: Path) -> tuple[Floats, Floats]:
    """Amounts of the phases present, and driving forces of those that are not [n_species each]."""
    f, e = path.frame, path.frame.elimination
    size = len(system.n0)
    n, drive = np.zeros(size), np.zeros(size)
    made = np.exp((f.offset + f.linear @ path.x)[len(f.basis) :])
    totals, denominator = exact_totals(e, system.present.tolist(), system.n0)
    rows = e.rows[list(f.rows_of_made)][:, system.present].astype(np.float64) / e.denominator
    fed = np.array([x / denominator for x in totals])
    left, gross = fed + rows.T @ made, np.abs(fed) + np.abs(rows).T @ made
    n[system.present] = np.where(np.abs(left) > _ROUNDING * gross, left, 0.0)
    gone = set(system.gone.tolist())
    at = [r for r, k in enumerate(e.pivots) if k in gone]
    total = path.x[-1] if system.per_total else 0.0
    ln_a = path.x[: len(f.basis)] - total + system.shift + system.ln_gamma[f.basis]
    ln_k = e.combos[at].astype(np.float64) @ system.ln_k
    needs = np.asarray(e.rows[at][:, f.basis].astype(np.float64) @ ln_a)
    drive[[e.pivots[r] for r in at]] = np.asarray(ln_k - needs) / e.denominator
    return n, drive
