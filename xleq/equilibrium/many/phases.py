"""Which pure solids and liquids are present: sets of them are tried, and the one without contradiction is it.

A pure phase that is present has activity 1 and an amount of at least 0; one that is absent has no driving
force to form. The free energy is convex, so a set that satisfies both for every phase is the answer,
however it was come by.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace
from itertools import combinations, islice
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from xleq.equilibrium.many.follow import NO_DRIVE, contradiction, first_guess, follow, with_phases
from xleq.equilibrium.many.linear import by_linear_program
from xleq.equilibrium.many.newton import MAX_STEPS, Frame, Path, System, continuation, frame, newton
from xleq.equilibrium.many.polish import Polished, polish
from xleq.equilibrium.structure import exact_totals

Floats = NDArray[np.float64]
Verdict = Literal["found", "vanished", "impossible", "indeterminate", "failed"]

#: Sets of phases that are tried before giving up.
MAX_SETS = 600
#: Newton steps (of a system of ordinary size) that trying them may take in all: a second or two.
MAX_SEARCH = 15_000


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
    for attempt in _attempts(system, ln_n) if hard and done is None else ():
        path = attempt()
        if path is not None:
            steps += path.steps
            done = polish(system, path) if path.converged else None
        if done is not None:
            break
    if done is None:
        return Outcome("failed", present, steps)
    return Outcome("found", present, steps, done, system, path)


def _attempts(system: System, ln_n: Floats) -> Iterator[Callable[[], Path | None]]:
    """Other ways to an equilibrium: led there, or from where one species rules."""
    yield lambda: continuation(system, ln_n)
    for i in system.fluid.tolist():
        ruled = ln_n - 15.0
        ruled[i] = ln_n.max()
        yield lambda start=ruled: newton(system, start, MAX_STEPS // 2)  # type: ignore[misc]


def _without_inert(system: System, present: frozenset[int], f: Frame, ln_n: Floats) -> Outcome:
    """A fluid that the phases present could take up wholly: it vanishes, or the set is wrong.

    At fixed pressure such a fluid has a composition but no amount. If its partial pressures would sum to
    less than the pressure it vanishes; if to more, some phase is used up; if to just the pressure, any
    amount of it is in equilibrium.
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


def choose(base: System, pure: NDArray[np.intp], near: Outcome | None = None) -> Outcome:
    """The set of pure phases that contradicts nothing, and the equilibrium with it.

    Phases are dropped and added one by one, worst first, from those that are fed. If that comes to no end,
    the set is followed from an easy equilibrium to the one wanted, then guessed by a linear program; if all
    that fails, the sets are tried in turn, nearest first, up to `MAX_SETS`.

    Parameters
    ----------
    base : System
        With no pure phase present.
    pure : array of int
        Pure phases that can be there.
    near : Outcome, optional
        Of a problem that differs little: where to begin.
    """
    tried: dict[frozenset[int], Outcome] = {}
    ln_n = first_guess(base)
    fed = frozenset(int(p) for p in pure if base.n0[p] > 0.0)
    done = None
    if near is not None and near.amounts is not None:
        done = _exchange(base, pure, near.present, near.amounts.ln_n, tried)
    if done is None:
        done = _exchange(base, pure, fed, ln_n, tried)
    if done is None and len(pure) and len(base.fluid):
        led, at = follow(base, pure, ln_n)
        if led is not None:
            done = _exchange(base, pure, led, at, tried)
    if done is None and len(pure):
        guess, at = by_linear_program(base, pure)
        done = None if guess is None else _exchange(base, pure, guess, at, tried)
    if done is None:
        done = _search(base, pure, fed, tried, ln_n)
    steps = sum(o.steps for o in tried.values())
    if done is None:
        return Outcome("failed", fed, steps)
    return replace(_settled(base, pure, done), steps=steps)


def _exchange(
    base: System,
    pure: NDArray[np.intp],
    present: frozenset[int],
    ln_n: Floats,
    tried: dict[frozenset[int], Outcome],
) -> Outcome | None:
    """Drop and add phases, worst first; None if a set comes again or cannot be solved."""
    for _ in range(4 * len(pure) + 4):
        known = tried.get(present)
        if known is not None and known.verdict != "failed":
            return None
        o = solve_set(base, pure, present, ln_n, hard=not len(pure))
        tried[present] = o
        if o.verdict == "indeterminate":
            return o
        if o.amounts is None:
            return None
        worst = contradiction(o.amounts.n, o.amounts.drive, present, pure)
        if worst is None:
            return o
        present = present.symmetric_difference({worst})
        if o.verdict == "found":
            ln_n = o.amounts.ln_n
    return None


def _search(
    base: System,
    pure: NDArray[np.intp],
    near: frozenset[int],
    tried: dict[frozenset[int], Outcome],
    ln_n: Floats,
) -> Outcome | None:
    """Try set after set, quickly first and thoroughly then."""
    # A step of a large system costs more.
    work, size = 0.0, max(1.0, base.whole.size / 200.0)
    for hard in (False, True):
        for present in islice(_sets(pure, near), MAX_SETS):
            if work > MAX_SEARCH:
                return None
            known = tried.get(present)
            if known is not None and (known.verdict != "failed" or not hard):
                continue
            o = solve_set(base, pure, present, ln_n, hard)
            work += (o.steps + 1.0) * size
            tried[present] = o
            if o.verdict == "indeterminate":
                return o
            if o.amounts is not None and contradiction(o.amounts.n, o.amounts.drive, present, pure) is None:
                return o
    return None


def _sets(pure: NDArray[np.intp], near: frozenset[int]) -> Iterator[frozenset[int]]:
    """Every set of phases, those that differ least from `near` first."""
    everything = [int(p) for p in pure]
    for size in range(len(everything) + 1):
        for change in combinations(everything, size):
            yield near.symmetric_difference(change)


def _settled(base: System, pure: NDArray[np.intp], o: Outcome) -> Outcome:
    """The outcome, or indeterminate if a phase that is just saturated could be there in any amount."""
    if o.amounts is None:
        return o
    for p in pure.tolist():
        if p in o.present or abs(float(o.amounts.drive[p])) > NO_DRIVE:
            continue
        with_it = with_phases(base, pure, o.present | {p})
        f = frame(with_it, o.amounts.ln_n)
        if f is None or (with_it.per_total and not any(f.exact[0])):
            return replace(o, verdict="indeterminate")
    return o
