"""The same certificate for many instances of one system at once.

Instances whose least amounts belong to the same species share one set of rewritten reactions, and are judged
together in arrays. What the arrays cannot pass beyond doubt goes to the certificate of single problems, which
has exact arithmetic and finds the reason.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from xleq.equilibrium.certificate.absent import formable
from xleq.equilibrium.certificate.verdict import (
    BALANCE_TOLERANCE,
    ERROR_TOLERANCE,
    ROUNDING,
    ROUNDING_TOLERANCE,
)
from xleq.equilibrium.problem import Batch, shifts
from xleq.equilibrium.structure import LN_K_AGREEMENT, Elimination, Structure, eliminate, structure

Floats = NDArray[np.float64]
Flags = NDArray[np.bool_]
Places = NDArray[np.intp]


@dataclass(slots=True)
class Group:
    """Instances that share absent species and rewritten reactions.

    Parameters
    ----------
    pivots : array [rank] of int
        The species that each row makes.
    nu : array [rank, n_species]
        Coefficients of the rows.
    combos : array [rank, n_independent]
        Multipliers of the independent reactions, each scaled to whole numbers, that make the rows.
    ln_k : array [n_group, n_independent]
        ln K of the independent reactions so scaled. [-]
    n, n0 : array [n_group, n_species]
        Amounts claimed and fed. [mol]
    shift : array [n_group]
        The constant of the ln activity.
    fluid : array [n_species] of bool
    per_total : int
    """

    pivots: Places
    nu: Floats
    combos: Floats
    ln_k: Floats
    n: Floats
    n0: Floats
    shift: Floats
    fluid: Flags
    per_total: int


def accept(batch: Batch, n: Floats) -> Flags:
    """Which instances are certified beyond doubt; the rest need `certify` one by one.

    Parameters
    ----------
    batch : Batch
    n : array [n_instances, n_species]
        Amounts claimed. [mol]

    Returns
    -------
    array [n_instances] of bool
    """
    fluid = np.array([phase == "fluid" for phase in batch.phases])
    s = structure(batch.nu)
    whole = s.whole[list(s.independent)]
    ok = np.zeros(len(n), dtype=bool)
    pending = np.flatnonzero(np.isfinite(n).all(axis=1) & (n >= 0.0).all(axis=1))
    weight = np.where(n > 0.0, n, np.where(fluid, -2.0, -1.0))
    shift = shifts(batch)
    with np.errstate(all="ignore"):
        while len(pending):
            first = pending[0]
            e = eliminate(whole, [int(i) for i in np.argsort(weight[first], kind="stable")])
            same = _shares(e, weight[pending], (n[pending] == 0.0) == (n[first] == 0.0))
            members = pending[same]
            group = _group(batch, s, e, n, members, shift, fluid)
            ok[members] = _judge(group) & _balances(batch, n[members], members)
            if s.relations:
                ok[members] &= _dependent_agree(batch, s, group, members)
            pending = pending[~same]
    return ok


def _shares(e: Elimination, weight: Floats, pattern: Flags) -> Flags:
    """Instances for which the pivots are the least amounts that can be pivots, and the same are absent."""
    same: Flags = np.asarray(pattern.all(axis=1))
    same[0] = True
    for row, pivot in zip(e.rows, e.pivots, strict=True):
        others = row != 0
        others[pivot] = False
        if others.any():
            same[1:] &= weight[1:, pivot] <= weight[1:, others].min(axis=1)
    return same


def _group(
    batch: Batch, s: Structure, e: Elimination, n: Floats, members: Places, shift: Floats, fluid: Flags
) -> Group:
    scales = np.array([s.scales[r] for r in s.independent], dtype=float)
    return Group(
        np.array(e.pivots, dtype=np.intp),
        np.asarray(e.rows / e.denominator, dtype=float),
        np.asarray(e.combos / e.denominator, dtype=float),
        batch.ln_k[members][:, list(s.independent)] * scales,
        n[members],
        batch.n0[members],
        shift[members],
        fluid,
        1 if batch.kind in "PX" else 0,
    )


def _judge(g: Group) -> Flags:
    """Balance of the reactions, equilibrium of what is present, no drive of what is absent."""
    ok = _moves_fit(g)
    total = g.n[:, g.fluid].sum(axis=1)
    shift = g.shift - np.log(total) if g.per_total else g.shift
    there = g.fluid & (g.n[0] > 0.0)
    ln_n = np.zeros_like(g.n)
    ln_n[:, there] = np.log(g.n[:, there])
    growth = g.nu[:, g.fluid].sum(axis=1)
    residual = ln_n @ g.nu.T + shift[:, None] * growth - g.ln_k @ g.combos.T
    size = np.where(g.fluid, np.abs(ln_n) + np.abs(shift)[:, None] + 1.0, 0.0)
    floor = ROUNDING * (size @ np.abs(g.nu).T + np.abs(g.ln_k) @ np.abs(g.combos).T)
    present = g.n[0, g.pivots] > 0.0
    if present.any():
        ok &= _near(g, present, np.abs(residual[:, present]), floor[:, present], total)
    absent = g.n[0] == 0.0
    if (~present & g.fluid[g.pivots]).any():
        first = formable(g.nu[~present][:, absent], g.fluid[absent])
        if first is not None:
            return np.zeros_like(ok)
    phases = ~present & ~g.fluid[g.pivots]
    if phases.any():
        ok &= (residual[:, phases] >= -floor[:, phases]).all(axis=1)
    return ok


def _moves_fit(g: Group) -> Flags:
    """Whether what the pivots have changed accounts for the change of every other species."""
    others = np.ones(g.n.shape[1], dtype=bool)
    others[g.pivots] = False
    nu = g.nu[:, others]
    moved, gross = g.n - g.n0, g.n + g.n0
    off = np.abs(moved[:, others] - moved[:, g.pivots] @ nu)
    allowed = g.n[:, others] + g.n[:, g.pivots] @ np.abs(nu)
    blur = 4.0 * ROUNDING * (gross[:, others] + gross[:, g.pivots] @ np.abs(nu))
    return np.asarray(np.all(off + blur <= BALANCE_TOLERANCE * allowed, axis=1))


def _near(g: Group, present: Flags, residual: Floats, floor: Floats, total: Floats) -> Flags:
    """Whether the residuals move no amount by more than is allowed, as in the certificate of one problem."""
    there = g.fluid & (g.n[0] > 0.0)
    nu = g.nu[present]
    root = np.sqrt(g.n[:, there])
    slope = nu[None, :, there] / root[:, None, :]
    gross = np.abs(slope)
    if g.per_total:
        mean = nu[:, g.fluid].sum(axis=1)[None, :, None] * (root / total[:, None])[:, None, :]
        slope = slope - mean
        gross = gross + np.abs(mean)
    top = gross.max(axis=2)
    slope /= top[:, :, None]
    length = np.sqrt((slope * slope).sum(axis=2))
    clear = np.array((top > 0.0) & (length > 4.0 * ROUNDING)).all(axis=1)
    slope[clear] /= length[clear][:, :, None]
    slope[~clear] = np.eye(len(nu), slope.shape[2])
    try:
        inverse = np.linalg.inv(slope @ slope.transpose(0, 2, 1))
    except np.linalg.LinAlgError:
        return np.zeros(len(g.n), dtype=bool)
    scale = 1.0 / (top * length)
    alive = g.n[0] > 0.0
    shares = (nu[:, alive] * scale[:, :, None]) / g.n[:, None, alive]
    reach = np.abs(shares.transpose(0, 2, 1) @ inverse) * scale[:, None, :]
    beyond = np.maximum(residual - floor, 0.0)
    excess = (reach @ beyond[:, :, None])[:, :, 0].max(axis=1)
    blur = (reach @ floor[:, :, None])[:, :, 0].max(axis=1)
    ok: Flags = clear & (excess <= ERROR_TOLERANCE) & (blur <= ROUNDING_TOLERANCE)
    return ok


def _balances(batch: Batch, n: Floats, members: Places) -> Flags:
    """Element and charge balances, where the formulas are known."""
    n0 = batch.n0[members]
    if batch.formulas is None:
        return np.ones(len(n), dtype=bool)
    known = np.array([formula is not None for formula in batch.formulas])
    lumped = (n[:, ~known] != n0[:, ~known]).any(axis=1)
    elements = sorted({element for formula in batch.formulas if formula for element in formula})
    counts = np.array([[float((f or {}).get(element, 0)) for element in elements] for f in batch.formulas])
    off = np.abs((n - n0) @ counts)
    fits = (off <= BALANCE_TOLERANCE * (np.maximum(n, n0) @ np.abs(counts))).all(axis=1)
    ok: Flags = lumped | fits
    return ok


def _dependent_agree(batch: Batch, s: Structure, g: Group, members: Places) -> Flags:
    """Whether the constants of dependent reactions agree with the independent ones, as nearly as data can."""
    ok = np.ones(len(members), dtype=bool)
    for r, share in s.relations:
        implied = batch.ln_k[members] @ np.array([float(x) for x in share])
        given = batch.ln_k[members][:, r]
        ok &= np.abs(given - implied) <= LN_K_AGREEMENT * np.maximum(1.0, np.abs(given))
    return ok
