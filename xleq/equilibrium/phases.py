"""Which pure solids and liquids are present: sets of them are tried, and the one without contradiction is it.

A pure phase that is present has activity 1 and an amount of at least 0; one that is absent has no driving force
to form. The free energy is convex, so a set that satisfies both for every phase is the answer, however it was
come by.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace
from itertools import combinations
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from xleq.equilibrium.newton import MAX_STEPS, Frame, Path, System, continuation, frame, ln_amounts, newton
from xleq.equilibrium.polish import Polished, polish
from xleq.equilibrium.structure import exact_totals

Floats = NDArray[np.float64]
Verdict = Literal["found", "vanished", "impossible", "indeterminate", "failed"]

#: Sets of phases that are tried before giving up.
MAX_SETS = 600
#: Driving forces and differences from saturation below this are taken to be none. [-]
NO_DRIVE = 1e-9


@dataclass(frozen=True, slots=True)
class Outcome:
    """What came of one set of phases.

    Parameters
    ----------
    verdict : Verdict
    present : frozenset of int
    steps : int
    amounts : Polished or None
        Where it was found, or the fluid vanished.
    system, path : System, Path or None
        As solved.
    """

    verdict: Verdict
    present: frozenset[int]
    steps: int
    amounts: Polished | None = None
    system: System | None = None
    path: Path | None = None


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


def solve_set(
    base: System, pure: NDArray[np.intp], present: frozenset[int], ln_n: Floats, hard: bool
) -> Outcome:
    """The equilibrium with these phases present and the other pure phases taken away.

    Parameters
    ----------
    base : System
        With no pure phase present; `gone` holds what cannot form.
    pure : array of int
        Pure phases that can be there.
    present : frozenset of int
    ln_n : array [n_species] of float
        Where to start. [-]
    hard : bool
        Whether to follow the equilibrium from an easy one if Newton's method fails.
    """
    system = with_phases(base, pure, present)
    f = frame(system, ln_n)
    if f is None:
        return Outcome("impossible", present, 0)
    if system.per_total and not any(f.exact[0]):
        return _without_inert(system, present, f, ln_n)
    if not f.feasible:
        return Outcome("impossible", present, 0)
    return _solve(system, present, ln_n, hard)


def _solve(system: System, present: frozenset[int], ln_n: Floats, hard: bool) -> Outcome:
    path = newton(system, ln_n, MAX_STEPS // 2)
    if path is None:
        return Outcome("impossible", present, 0)
    steps = path.steps
    done = polish(system, path) if path.converged else None
    if done is None and hard:
        path = continuation(system, ln_n)
        if path is not None:
            steps += path.steps
            done = polish(system, path) if path.converged else None
    if done is None:
        return Outcome("failed", present, steps)
    return Outcome("found", present, steps, done, system, path)


def _without_inert(system: System, present: frozenset[int], f: Frame, ln_n: Floats) -> Outcome:
    """A fluid that the phases present could take up wholly: it vanishes, or the set is wrong.

    At fixed pressure such a fluid has a composition but no amount. If its partial pressures would sum to less
    than the pressure it vanishes; if to more, some phase is used up; if to just the pressure, any amount of it
    is in equilibrium.
    """
    loose = replace(system, per_total=0)
    if len(f.basis):
        inner = _solve(loose, present, ln_n, True)
    else:
        path = Path(frame(loose, ln_n) or f, np.zeros(0), True, 0)
        done = polish(loose, path)
        inner = Outcome("found" if done else "failed", present, 0, done, loose, path)
    if inner.verdict != "found" or inner.amounts is None:
        return Outcome("impossible" if inner.verdict == "impossible" else "failed", present, inner.steps)
    ln = inner.amounts.ln_n[system.fluid]
    excess = float(np.logaddexp.reduce(ln)) if len(ln) else -np.inf
    if abs(excess) <= NO_DRIVE:
        return Outcome("indeterminate", present, inner.steps)
    if excess > 0.0:
        return Outcome("impossible", present, inner.steps)
    # Nothing is in the fluid: what is conserved lies in the phases.
    empty = replace(inner.amounts, n=np.zeros(len(system.n0)))
    shared = _amounts_alone(system, f)
    empty.n[system.present] = shared
    return Outcome("vanished", present, inner.steps, empty, loose, inner.path)


def _amounts_alone(system: System, f: Frame) -> list[float]:
    totals, denominator = exact_totals(f.elimination, system.present.tolist(), system.n0)
    return [x / denominator for x in totals]


def contradiction(o: Outcome, pure: NDArray[np.intp]) -> tuple[int, bool] | None:
    """The worst phase of a set and whether it is to be added (else dropped); None if the set is right."""
    if o.amounts is None:
        return None
    present = sorted(o.present)
    scale = float(np.abs(o.amounts.n).max(initial=0.0))
    negative = [p for p in present if o.amounts.n[p] < -1e-15 * scale]
    if negative:
        return min(negative, key=lambda p: float(o.amounts.n[p]) if o.amounts else 0.0), False
    eager = [p for p in pure.tolist() if p not in o.present and o.amounts.drive[p] > NO_DRIVE]
    if eager:
        return max(eager, key=lambda p: float(o.amounts.drive[p]) if o.amounts else 0.0), True
    return None


def choose(base: System, pure: NDArray[np.intp]) -> Outcome:
    """The set of pure phases that contradicts nothing, and the equilibrium with it.

    Phases are dropped and added one by one, worst first, from those that are fed; if that comes to no end, the
    sets are tried in turn, nearest first, up to `MAX_SETS`.
    """
    ln_n = first_guess(base)
    present = frozenset(int(p) for p in pure if base.n0[p] > 0.0)
    tried: dict[frozenset[int], Outcome] = {}
    steps = 0
    while present not in tried and len(tried) < 4 * len(pure) + 4:
        o = solve_set(base, pure, present, ln_n, hard=False)
        steps += o.steps
        tried[present] = o
        if o.verdict == "indeterminate":
            return replace(o, steps=steps)
        if o.amounts is None:
            break
        worst = contradiction(o, pure)
        if worst is None:
            return _settled(base, pure, replace(o, steps=steps), ln_n)
        phase, add = worst
        present = present | {phase} if add else present - {phase}
    return _search(base, pure, present, tried, steps, ln_n)


def _search(
    base: System,
    pure: NDArray[np.intp],
    near: frozenset[int],
    tried: dict[frozenset[int], Outcome],
    steps: int,
    ln_n: Floats,
) -> Outcome:
    """Try set after set, quickly first and thoroughly then."""
    uncertain = [s for s, o in tried.items() if o.verdict == "failed"]
    count = 0
    for present in _sets(pure, near):
        if present in tried:
            continue
        count += 1
        if count > MAX_SETS:
            break
        o = solve_set(base, pure, present, ln_n, hard=False)
        steps += o.steps
        if o.verdict == "indeterminate":
            return replace(o, steps=steps)
        if o.verdict == "failed":
            uncertain.append(present)
        elif o.amounts is not None and contradiction(o, pure) is None:
            return _settled(base, pure, replace(o, steps=steps), ln_n)
    for present in uncertain:
        o = solve_set(base, pure, present, ln_n, hard=True)
        steps += o.steps
        if o.amounts is not None and contradiction(o, pure) is None:
            return _settled(base, pure, replace(o, steps=steps), ln_n)
    return Outcome("failed", near, steps)


def _sets(pure: NDArray[np.intp], near: frozenset[int]) -> Iterator[frozenset[int]]:
    """Every set of phases, those that differ least from `near` first."""
    everything = [int(p) for p in pure]
    for size in range(len(everything) + 1):
        for change in combinations(everything, size):
            yield near.symmetric_difference(change)


def _settled(base: System, pure: NDArray[np.intp], o: Outcome, ln_n: Floats) -> Outcome:
    """The outcome, or indeterminate if a phase that is just saturated could be there in any amount."""
    if o.amounts is None:
        return o
    for p in pure.tolist():
        if p in o.present or abs(float(o.amounts.drive[p])) > NO_DRIVE:
            continue
        with_it = with_phases(base, pure, o.present | {p})
        f = frame(with_it, ln_n)
        if f is None or (with_it.per_total and not any(f.exact[0])):
            return replace(o, verdict="indeterminate")
    return o
