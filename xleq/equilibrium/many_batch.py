"""Several reactions, many instances: the method of `many` carried out in arrays.

Instances that share their absent species, their pure phases and their basis are solved together. Those that
the arrays do not bring to a certified end are solved one by one.
"""

from __future__ import annotations

from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from xleq.equilibrium.certificate.batch import accept
from xleq.equilibrium.many import solve as solve_one
from xleq.equilibrium.many.arrays import Basis, Work, basis_of, iterate, out_of_order, totals_of
from xleq.equilibrium.many.follow import NO_DRIVE
from xleq.equilibrium.problem import SMALLEST_AMOUNT, Batch, BatchSolution, Status, shifts
from xleq.equilibrium.structure import (
    LN_K_AGREEMENT,
    Structure,
    check_size,
    eliminate,
    formable,
    structure,
)
from xleq.errors import XleqError

Floats = NDArray[np.float64]
Flags = NDArray[np.bool_]
Places = NDArray[np.intp]

#: Instances taken at once, so that the arrays stay in the cache.
CHUNK = 1000
#: Representatives solved one by one to learn which phases are present.
MAX_GUIDES = 12


def solve_batch(batch: Batch) -> BatchSolution:
    """The equilibria of many instances of several reactions in an ideal fluid.

    Parameters
    ----------
    batch : Batch

    Returns
    -------
    BatchSolution
        The same amounts as `many.solve` gives for each, to the last few digits.

    Raises
    ------
    OutOfRangeError
        If the system is too large.
    """
    check_size(len(batch.species), len(batch.nu))
    s = structure(batch.nu)
    n = np.full(batch.n0.shape, np.nan)
    steps = np.zeros(len(batch), dtype=int)
    sound = np.flatnonzero(_sound(batch) & _consistent(batch, s))
    guides: dict[int, Any] = {}
    with np.errstate(all="ignore"):
        fed = batch.n0[sound] > 0.0
        patterns, which = np.unique(fed, axis=0, return_inverse=True)
        for k, pattern in enumerate(patterns):
            for places in _chunks(sound[which.reshape(-1) == k]):
                work = _work(batch, s, places, pattern)
                if work is not None:
                    _solve_work(batch, work, places, guides)
                    n[places], steps[places] = work.n, work.steps
        n[n < SMALLEST_AMOUNT] = 0.0
        ok = np.isfinite(n).all(axis=1)
        ok[ok] = accept(_part(batch, ok), n[ok])
    return _finish(batch, s, n, steps, ok)


def _finish(batch: Batch, s: Structure, n: Floats, steps: NDArray[np.int_], ok: Flags) -> BatchSolution:
    """The record; what the arrays did not solve is solved one by one."""
    pure = np.array([phase == "pure" for phase in batch.phases])
    status: list[Status | Literal[""]] = [""] * len(batch)
    for i in np.flatnonzero(ok).tolist():
        status[i] = "exhausted" if pure.any() and (n[i, pure] == 0.0).any() else "equilibrium"
    reasons = [""] * len(batch)
    xi = np.full(batch.ln_k.shape, np.nan)
    xi[ok] = _extents(batch, s, n[ok], batch.n0[ok])
    for i in np.flatnonzero(~ok).tolist():
        n[i] = np.nan
        try:
            solution = solve_one(batch.problem(i))
        except XleqError as error:
            reasons[i] = str(error)
            continue
        status[i], steps[i], ok[i] = solution.status, solution.iterations, solution.certificate.ok
        reasons[i] = solution.certificate.reason
        if ok[i]:
            n[i], xi[i] = solution.n, solution.xi
    return BatchSolution(n, xi, ok, tuple(reasons), tuple(status), steps)


def _chunks(places: Places) -> list[Places]:
    return [places[k : k + CHUNK] for k in range(0, len(places), CHUNK)]


def _part(batch: Batch, keep: Flags) -> Batch:
    return Batch(
        batch.species,
        batch.phases,
        batch.nu,
        batch.n0[keep],
        batch.ln_k[keep],
        batch.kind,
        batch.t[keep],
        batch.p[keep],
        batch.v[keep],
        batch.formulas,
    )


def _sound(batch: Batch) -> Flags:
    """Instances whose numbers mean something; the others are refused one by one, with the reason."""
    amounts = np.asarray((np.isfinite(batch.n0) & (batch.n0 >= 0.0)).all(axis=1))
    ok: Flags = np.asarray(amounts & (batch.n0 > 0.0).any(axis=1) & np.isfinite(batch.ln_k).all(axis=1))
    for kinds, values in (("PV", batch.t), ("P", batch.p), ("VC", batch.v)):
        if batch.kind in kinds:
            ok &= np.isfinite(values) & (values > 0.0)
    return ok if "fluid" in batch.phases else np.zeros_like(ok)


def _consistent(batch: Batch, s: Structure) -> Flags:
    """Instances whose dependent reactions agree with the others."""
    ok = np.ones(len(batch), dtype=bool)
    for r, share in s.relations:
        terms = batch.ln_k * np.array([float(x) for x in share])
        scale = np.maximum(1.0, np.maximum(np.abs(batch.ln_k[:, r]), np.abs(terms).max(axis=1)))
        ok &= np.abs(batch.ln_k[:, r] - terms.sum(axis=1)) <= LN_K_AGREEMENT * scale
    return ok


def _work(batch: Batch, s: Structure, places: Places, fed: Flags) -> Work | None:
    """The instances of one pattern of feed, or None where nothing can react."""
    rows = list(s.independent)
    whole = s.whole[rows]
    can = formable(whole, fed)
    fluid = np.array([phase == "fluid" for phase in batch.phases])
    never = np.flatnonzero(~can)
    e = eliminate(whole, [*never, *np.flatnonzero(can)])
    if not (can & fluid).any() or all(not can[k] for k in e.pivots):
        return None
    scales = np.array([s.scales[r] for r in rows], dtype=float)
    n0 = batch.n0[places]
    return Work(
        whole,
        batch.ln_k[places][:, rows] * scales,
        n0,
        shifts(batch)[places],
        1 if batch.kind in "PX" else 0,
        np.flatnonzero(can & fluid),
        np.flatnonzero(can & ~fluid),
        never,
        np.full(n0.shape, np.nan),
        np.zeros(len(places), dtype=int),
    )


def _solve_work(batch: Batch, work: Work, places: Places, guides: dict[int, Any]) -> None:
    """Solve what can be in arrays: sets of phases are guessed from representatives and corrected."""
    n0 = work.n0
    floor = 1e-4 * n0.sum(axis=1, keepdims=True)
    ln_n = np.log(np.maximum(n0, floor))
    present = n0[:, work.pure] > 0.0
    pending = np.arange(len(n0))
    lost = np.zeros(len(n0), dtype=bool)
    for _ in range(3 * len(work.pure) + 3 + MAX_GUIDES):
        sets, which = np.unique(present[pending], axis=0, return_inverse=True)
        wrong = []
        for k, here in enumerate(sets):
            members = pending[which.reshape(-1) == k]
            wrong.append(_solve_set(work, members, here, ln_n, present, lost))
        pending = np.concatenate(wrong) if wrong else pending[:0]
        stuck = np.flatnonzero(lost)
        if len(stuck) and len(guides) < MAX_GUIDES:
            # One of the stuck is solved by itself; the others begin where it has come to, with its phases.
            guide = int(places[stuck[0]])
            solution = solve_one(batch.problem(guide))
            guides[guide] = solution
            present[stuck] = np.array(solution.n)[work.pure] > 0.0
            ln_n[stuck] = np.log(np.maximum(solution.n, SMALLEST_AMOUNT))
            lost[stuck] = False
            if solution.certificate.ok:
                work.n[stuck[0]], work.steps[stuck[0]] = solution.n, solution.iterations
            pending = np.concatenate([pending, stuck[1:]])
        if not len(pending):
            return


def _solve_set(work: Work, members: Places, here: Flags, ln_n: Floats, present: Flags, lost: Flags) -> Places:
    """Solve instances with one set of phases; those whose set proves wrong are given back, corrected."""
    wrong = []
    left = members
    rounds = 0
    while len(left) and rounds < 30:
        rounds += 1
        b = basis_of(work, here, ln_n[left[0]])
        if b is None:
            break
        fits = ~out_of_order(b, ln_n[left][:, b.basis], ln_n[left][:, b.made])
        fits[0] = True
        batch = left[fits]
        done, ended = iterate(work, b, batch, ln_n)
        wrong.append(_settle(work, b, batch[done], here, ln_n, present))
        lost[batch[ended & ~done]] = True
        left = np.concatenate([left[~fits], batch[~ended]])
    lost[left] = True
    return np.concatenate(wrong) if wrong else members[:0]


def _settle(work: Work, b: Basis, members: Places, here: Flags, ln_n: Floats, present: Flags) -> Places:
    """Write down what is right; give back instances whose worst phase has been dropped or added."""
    if not len(members):
        return members
    e = b.elimination
    n = np.zeros((len(members), work.n0.shape[1]))
    species = np.concatenate([b.basis, b.made])
    n[:, species] = np.exp(ln_n[np.ix_(members, species)])
    if not len(work.pure):
        work.n[members] = n
        return members[:0]
    holds = e.rows[b.rows][:, b.present].astype(np.float64) / e.denominator
    fed = totals_of(work, b, b.present, members)
    n[:, b.present] = fed + n[:, b.made] @ holds
    # What is left of a difference within its rounding is for the solver of single instances.
    clear = np.abs(n[:, b.present]) > 1e-14 * (np.abs(fed) + n[:, b.made] @ np.abs(holds))
    sure = clear.all(axis=1)
    drive = np.zeros(n.shape)
    ln_a = ln_n[np.ix_(members, b.basis)] + work.shift[members, None]
    if work.per_total:
        ln_a -= np.logaddexp.reduce(ln_n[np.ix_(members, work.fluid)], axis=1)[:, None]
    combos = e.combos[b.gone_rows].astype(np.float64) / e.denominator
    needs = e.rows[b.gone_rows][:, b.basis].astype(np.float64) / e.denominator
    drive[:, b.gone] = work.ln_k[members] @ combos.T - ln_a @ needs.T
    # How much each phase contradicts its place: a negative amount counts before any driving force.
    wrong = np.where(
        here, np.maximum(-n[:, work.pure], 0.0) * 1e6, np.maximum(drive[:, work.pure] - NO_DRIVE, 0.0)
    )
    right = wrong.max(axis=1) == 0.0
    work.n[members[right & sure]] = n[right & sure]
    again: Places = members[~right & sure]
    worst = wrong[~right & sure].argmax(axis=1)
    present[again, worst] = ~present[again, worst]
    return again


def _extents(batch: Batch, s: Structure, n: Floats, n0: Floats) -> Floats:
    """How far each reaction has run [n, n_reactions, mol]; of dependent ones the choice of least norm."""
    nu = np.array([[float(x) for x in row] for row in batch.nu])
    if not len(n):
        return np.zeros((0, len(nu)))
    if s.relations:
        return np.asarray((n - n0) @ np.linalg.pinv(nu))
    order = np.argsort(np.maximum(n, n0).max(axis=0), kind="stable")
    e = eliminate(s.whole, order.tolist())
    made = n[:, list(e.pivots)] - n0[:, list(e.pivots)]
    return np.asarray(made @ e.combos.astype(np.float64) / e.denominator * np.array(s.scales, dtype=float))
