"""What is absent must be unable to form, or have no drive to, or be too little for a double."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from xleq.equilibrium.certificate.verdict import LN_SMALLEST
from xleq.equilibrium.problem import Problem

Floats = NDArray[np.float64]
Flags = NDArray[np.bool_]


@dataclass(slots=True)
class Rows:
    """The reactions rewritten, with what each has at the amounts claimed.

    Parameters
    ----------
    pivots : array [rank] of int
        The species that each row makes.
    nu : array [rank, n_species]
        Coefficients; 1 at the row's own pivot, 0 at the pivots of others.
    residual : array [rank]
        Sum of nu ln a over what is present, less ln K. [-]
    floor : array [rank]
        How far rounding lets the residual be known. [-]
    """

    pivots: NDArray[np.intp]
    nu: Floats
    residual: Floats
    floor: Floats


def absent_species(problem: Problem, rows: Rows, amounts: Floats, fluid: Flags) -> str:
    """Why some absent fluid species should be there; empty if none should.

    Parameters
    ----------
    problem : Problem
    rows : Rows
    amounts : array [n_species]
        Amounts claimed. [mol]
    fluid : array [n_species] of bool
    """
    absent = amounts == 0.0
    gone = absent & fluid
    makes = gone[rows.pivots]
    if not makes.any():
        return ""
    if problem.state.per_total and not amounts[fluid].any():
        return _vanished(problem, rows, absent, fluid)
    nu = rows.nu[makes]
    columns = np.flatnonzero(absent)
    parts = nu[:, columns]
    unsettled: list[int] = []
    for k, part in enumerate(parts):
        used = part != 0.0
        # A row shares no absent species with another row, and makes all of its own: they form together.
        if (part >= 0.0).all() and not (parts[np.arange(len(parts)) != k][:, used] != 0.0).any():
            made = columns[used & fluid[columns]]
            share = nu[k, made]
            ln_d = -(rows.residual[makes][k] + float(share @ np.log(share))) / float(share.sum())
            highest = int(np.argmax(share))
            if ln_d + math.log(share[highest]) > LN_SMALLEST:
                return f"{problem.species[made[highest]]} would form, yet its amount is 0"
        else:
            unsettled.append(k)
    if unsettled:
        phases = rows.nu[absent[rows.pivots] & ~makes][:, columns]
        first = formable(np.vstack([parts[unsettled], phases]), fluid[columns])
        if first is not None:
            return f"{problem.species[columns[first]]} could form, yet its amount is 0"
    return ""


def absent_phases(problem: Problem, rows: Rows, amounts: Floats, fluid: Flags) -> str:
    """Why some absent pure phase should be there; empty if none should.

    Parameters
    ----------
    problem : Problem
    rows : Rows
    amounts : array [n_species]
        Amounts claimed. [mol]
    fluid : array [n_species] of bool
    """
    absent = (amounts == 0.0) & ~fluid
    makes = absent[rows.pivots]
    if not makes.any():
        return ""
    cost, floor = rows.residual[makes], rows.floor[makes]
    low = cost < -floor
    if not low.any():
        return ""
    parts = rows.nu[makes][:, absent]
    names = [problem.species[i] for i in rows.pivots[makes]]
    alone = (np.count_nonzero(parts, axis=1) == 1) | (parts >= 0.0).all(axis=1)
    for k in np.flatnonzero(low & alone):
        return f"{names[k]} would form: ln K - ln Q = {-cost[k]:.3g} for it"
    return _joint_drive(parts, cost, floor, names)


def _joint_drive(parts: Floats, cost: Floats, floor: Floats, names: list[str]) -> str:
    """Whether absent phases that can only form together have a drive to."""
    from scipy.optimize import linprog

    r = len(cost)
    found = linprog(
        cost,
        A_ub=np.vstack([-parts.T, np.ones((1, r))]),
        b_ub=[0.0] * parts.shape[1] + [1.0],
        bounds=[(0.0, None)] * r,
    )
    if found.status != 0 or found.fun is None:
        return "whether the absent phases would form together cannot be decided"
    if found.fun < -1e-9 - float(floor.max()):
        return f"{', '.join(names)} would form together: ln K - ln Q = {-found.fun:.3g}"
    return ""


def formable(parts: Floats, wanted: Flags) -> int | None:
    """The first wanted species that some combination of reactions makes without consuming an absent one.

    Parameters
    ----------
    parts : array [n_rows, n_absent]
        Coefficients of the absent species in the reactions that make absent ones.
    wanted : array [n_absent] of bool
        The species that it is asked for.

    Returns
    -------
    int or None
        Its column, or None if there is none.

    Examples
    --------
    Neither A nor B can form where the one is made from the other:

    >>> both = np.array([True, True])
    >>> formable(np.array([[1.0, -1.0]]), both) is None
    True
    >>> formable(np.array([[1.0, 1.0]]), both)
    0
    """
    for part in parts:
        if (part >= 0.0).all() and part[wanted].any():
            return int(np.flatnonzero(wanted & (part > 0.0))[0])
    from scipy.optimize import linprog

    r, width = parts.shape
    # Unknowns: multipliers of the rows, then what is made of each absent species, at most 1 of each.
    found = linprog(
        [0.0] * r + [-float(flag) for flag in wanted],
        A_ub=np.hstack([-parts.T, np.eye(width)]),
        b_ub=[0.0] * width,
        bounds=[(None, None)] * r + [(0.0, 1.0)] * width,
    )
    if found.status != 0 or found.x is None:
        return int(np.flatnonzero(wanted)[0])
    made = np.flatnonzero(wanted & (found.x[r:] > 0.5))
    return int(made[0]) if len(made) else None


def _vanished(problem: Problem, rows: Rows, absent: Flags, fluid: Flags) -> str:
    """Why there should be a fluid where all of it is absent; empty if there should not.

    No fluid is stable where the fractions that its species would need, each in equilibrium with what is
    present, sum to less than 1; or where the one reaction that makes them, in its own ratio, has no drive.
    """
    makes = (absent & fluid)[rows.pivots]
    parts, phases = rows.nu[makes][:, absent], rows.nu[~makes][:, absent]
    residual, floor = rows.residual[makes], rows.floor[makes]
    if (np.count_nonzero(parts, axis=1) == 1).all():
        needed = float(np.exp(np.minimum(-residual, 700.0)).sum())
        if needed > 1.0 + float(floor.max()):
            return f"a fluid would form: its fractions would sum to {needed:.6g}"
        return ""
    apart = not (phases[:, parts[0] != 0.0] != 0.0).any()
    if len(parts) == 1 and (parts >= 0.0).all() and apart:
        share = rows.nu[makes][0, absent & fluid]
        share = share[share > 0.0]
        drive = -float(residual[0]) - float(share @ np.log(share / share.sum()))
        return f"a fluid would form: ln K - ln Q = {drive:.3g}" if drive > floor[0] else ""
    if formable(np.vstack([parts, phases]), fluid[absent]) is None:
        return ""
    return "whether a fluid would form from several coupled reactions cannot be certified"
