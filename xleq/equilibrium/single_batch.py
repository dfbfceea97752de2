"""One reaction, many instances: the method of `single` carried out in arrays.

Instances whose ends need exact arithmetic, or whose result is not certified in arrays, are solved one by one.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from xleq.equilibrium.certificate.batch import accept
from xleq.equilibrium.problem import SMALLEST_AMOUNT, Batch, BatchSolution, Status, shifts, sound
from xleq.equilibrium.single import solve as solve_one
from xleq.errors import XleqError

Floats = NDArray[np.float64]
Flags = NDArray[np.bool_]
Places = NDArray[np.intp]

MAX_STEPS = 60
_CLOSE = 1e-8
_EPS = 2.220446049250313e-16
#: 2**27 + 1, which splits a double into halves (T. J. Dekker, Numer. Math. 18 (1971) 224).
_SPLITTER = 134217729.0


@dataclass(slots=True)
class Ends:
    """One end of each instance's range of the extent.

    Parameters
    ----------
    width : array [n_instances]
        Extent from the feed to the end. [mol]
    amounts : array [n_instances, n_species]
        Amounts at the end; exactly 0 for the species that set it. [mol]
    sure : array [n_instances] of bool
        Whether doubles are enough for it.
    """

    width: Floats
    amounts: Floats
    sure: Flags

    def of(self, places: Flags) -> Ends:
        """Those of some of the instances."""
        return Ends(self.width[places], self.amounts[places], self.sure[places])


@dataclass(slots=True)
class Affinities:
    """The inward affinities seen from the nearer ends, as in `single.Affinity`, one row an instance.

    Parameters
    ----------
    m, b : array [n, n_reacting]
        Amounts at the end and change per distance of the fluid species that react.
    lim : array [n, n_reacting] of bool
        Those that are absent at the end.
    offset, power, rest, growth : array [n]
    """

    m: Floats
    b: Floats
    lim: Flags
    offset: Floats
    power: Floats
    rest: Floats
    growth: Floats

    def at(self, u: Floats, rows: Places) -> tuple[Floats, Floats]:
        """Values and slopes with respect to u = ln d of some of the instances."""
        d = np.exp(u)
        b, lim = self.b[rows], self.lim[rows]
        n = self.m[rows] + b * d[:, None]
        ln_n = np.log(np.where(lim, 1.0, n))
        total = self.rest[rows] + n.sum(axis=1)
        growth, power = self.growth[rows], self.power[rows]
        total[growth == 0.0] = 1.0
        value = self.offset[rows] + power * u + (b * ln_n).sum(axis=1) - growth * np.log(total)
        slope = np.where(lim, 0.0, b * b / n).sum(axis=1) - growth * growth / total
        return value, power + slope * d


@dataclass(slots=True)
class Found:
    """What the arrays made of some of the instances.

    Parameters
    ----------
    places : array [n_found] of int
        Their places in the batch.
    n : array [n_found, n_species]
    xi : array [n_found]
    steps : array [n_found] of int
    at_end : array [n_found] of bool
    """

    places: Places
    n: Floats
    xi: Floats
    steps: NDArray[np.int_]
    at_end: Flags


def solve_batch(batch: Batch) -> BatchSolution:
    """The equilibria of many instances of one reaction in an ideal fluid.

    Parameters
    ----------
    batch : Batch
        With one reaction.

    Returns
    -------
    BatchSolution
        The same amounts as `single.solve` gives for each.
    """
    n_instances = len(batch)
    n = np.full(batch.n0.shape, np.nan)
    xi = np.full((n_instances, 1), np.nan)
    steps = np.zeros(n_instances, dtype=int)
    ok = np.zeros(n_instances, dtype=bool)
    status: list[Status | Literal[""]] = [""] * n_instances
    found = _in_arrays(batch)
    if found is not None:
        passed = accept(_part(batch, found.places), found.n)
        places = found.places[passed]
        ok[places] = True
        n[places], xi[places, 0], steps[places] = found.n[passed], found.xi[passed], found.steps[passed]
        for i, at_end in zip(places.tolist(), found.at_end[passed].tolist(), strict=True):
            status[i] = "exhausted" if at_end else "equilibrium"
    reasons = [""] * n_instances
    for i in np.flatnonzero(~ok).tolist():
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


def _part(batch: Batch, places: Places) -> Batch:
    return replace(
        batch,
        n0=batch.n0[places],
        ln_k=batch.ln_k[places],
        t=batch.t[places],
        p=batch.p[places],
        v=batch.v[places],
    )


def _in_arrays(batch: Batch) -> Found | None:
    """The instances that can be solved in doubles alone; None if there are none."""
    nu = np.array([c.numerator / c.denominator for c in batch.nu[0]])
    reacting = np.array([phase == "fluid" for phase in batch.phases]) & (nu != 0.0)
    if not ((nu > 0.0).any() and (nu < 0.0).any() and reacting.any()):
        return None
    with np.errstate(all="ignore"):
        places = np.flatnonzero(sound(batch))
        back, ahead = _ends(batch, places, nu, 1), _ends(batch, places, nu, -1)
        rest = batch.n0[places][:, _inert(batch, nu)].sum(axis=1)
        usable = back.sure & ahead.sure & (back.width + ahead.width > 0.0)
        if batch.kind in "PX":
            left = back.amounts[:, reacting].any(axis=1) & ahead.amounts[:, reacting].any(axis=1)
            usable &= left | (rest > 0.0)
        if not usable.any():
            return None
        places, rest = places[usable], rest[usable]
        back, ahead = back.of(usable), ahead.of(usable)
        return _from_nearer(batch, places, nu, reacting, rest, back, ahead)


def _inert(batch: Batch, nu: Floats) -> Flags:
    inert: Flags = np.array([phase == "fluid" for phase in batch.phases]) & (nu == 0.0)
    return inert


def _from_nearer(
    batch: Batch, places: Places, nu: Floats, reacting: Flags, rest: Floats, back: Ends, ahead: Ends
) -> Found:
    """Solves each instance from the nearer of its ends."""
    half = 0.5 * (back.width + ahead.width)
    change = nu[reacting]
    growth = float(change.sum())
    by_fraction = batch.kind in "PX"
    constant = growth * shifts(_part(batch, places)) - batch.ln_k[places, 0]
    n = back.amounts[:, reacting] + change * half[:, None]
    value = constant + np.log(n) @ change
    if by_fraction and growth:
        value -= growth * np.log(rest + n.sum(axis=1))
    near_back = value >= 0.0
    sign = np.where(near_back, 1.0, -1.0)
    amounts = np.where(near_back[:, None], back.amounts, ahead.amounts)
    width = np.where(near_back, back.width, ahead.width)
    b = sign[:, None] * change
    m = amounts[:, reacting]
    lim = m == 0.0
    offset = sign * constant + np.where(lim, b * np.log(np.abs(b)), 0.0).sum(axis=1)
    power = np.where(lim, b, 0.0).sum(axis=1)
    affinities = Affinities(m, b, lim, offset, power, rest, sign * growth * by_fraction)
    middle = np.log(half)
    start = _starts(affinities, middle)
    at_end = np.isnan(start)
    u, steps = _roots(affinities, start, middle)
    d = np.where(at_end, 0.0, np.exp(u))
    n = amounts + nu * (sign * d)[:, None]
    n[(n < SMALLEST_AMOUNT) & (nu != 0.0)] = 0.0
    xi = sign * (d - width)
    done = steps < MAX_STEPS
    return Found(places[done], n[done], xi[done], steps[done], at_end[done])


def _ends(batch: Batch, places: Places, nu: Floats, sign: int) -> Ends:
    """The ends that the instances reach running backward (sign 1) or forward (-1)."""
    n0 = batch.n0[places]
    used = sign * nu > 0.0
    size = np.abs(nu)
    ratio = np.where(used, n0 / np.where(used, size, 1.0), np.inf)
    first = ratio.argmin(axis=1)
    every = np.arange(len(places))
    width = ratio[every, first]
    amounts = n0 - sign * nu * width[:, None]
    amounts[:, ~used & (nu == 0.0)] = n0[:, ~used & (nu == 0.0)]
    scale = float(np.lcm.reduce([c.denominator for c in batch.nu[0]]))
    whole = np.array([float(abs(c) * int(scale)) for c in batch.nu[0]])
    exact, sure = _left_over(n0, n0[every, first], whole, whole[first])
    amounts[:, used] = exact[:, used]
    sure = sure[:, used].all(axis=1) & ((width > 0.0) | (n0[every, first] == 0.0))
    return Ends(width, amounts, sure)


def _left_over(n0: Floats, n0_first: Floats, whole: Floats, whole_first: Floats) -> tuple[Floats, Flags]:
    """What is left of each species when the first is used up, n0 - n0_first whole / whole_first.

    Both products are taken exactly, as a double and its rounding error, so that the difference keeps its
    digits; where even that is in doubt, or the first was not the first, it is flagged.
    """
    p, p_error = _product(n0, whole_first[:, None])
    q, q_error = _product(n0_first[:, None], whole[None, :])
    error = p_error - q_error
    left = (p - q) + error
    doubt = np.abs(p_error) + np.abs(q_error)
    sure = (left >= 0.0) & ((left == 0.0) & (error == 0.0) & (p == q) | (left >= 1e-3 * doubt))
    return left / whole_first[:, None], np.asarray(sure)


def _product(x: Floats, a: Floats) -> tuple[Floats, Floats]:
    """X a for whole a below 2**26, as the rounded product and its exact error."""
    big = _SPLITTER * x
    high = big - (big - x)
    product = x * a
    return product, (high * a - product) + (x - high) * a


def _starts(a: Affinities, middle: Floats) -> Floats:
    """Where to begin, as ln d; nan where the end itself is the answer."""
    value = a.offset + np.where(a.lim, 0.0, a.b * np.log(np.where(a.lim, 1.0, a.m))).sum(axis=1)
    slope = np.where(a.lim, 0.0, a.b * a.b / np.where(a.lim, 1.0, a.m)).sum(axis=1)
    total = np.where(a.growth == 0.0, 1.0, a.rest + a.m.sum(axis=1))
    value -= a.growth * np.log(total)
    slope -= a.growth * a.growth / total
    linear = np.where(slope > 0.0, np.log(-value) - np.log(slope), middle)
    start = np.minimum(np.where(a.power > 0.0, -value / a.power, linear), middle)
    return np.where((a.power == 0.0) & (value >= 0.0), np.nan, start)


def _roots(a: Affinities, start: Floats, middle: Floats) -> tuple[Floats, NDArray[np.int_]]:
    """The roots in u = ln d, and the steps each took; `MAX_STEPS` where there is none yet."""
    u, high = start.copy(), middle.copy()
    low = np.full(len(u), -np.inf)
    steps = np.zeros(len(u), dtype=int)
    rows = np.flatnonzero(~np.isnan(u))
    for step in range(1, MAX_STEPS):
        if not len(rows):
            break
        here = u[rows]
        value, slope = a.at(here, rows)
        high[rows] = np.where(value > 0.0, here, high[rows])
        low[rows] = np.where(value > 0.0, low[rows], here)
        move = np.where(slope > 0.0, -value / slope, -np.inf * np.sign(value))
        tight = high[rows] - low[rows] <= 4.0 * _EPS * np.abs(high[rows])
        close = np.abs(move) < _CLOSE
        after = here + np.where(tight & ~close, 0.0, move)
        stop = close | tight
        outside = ~stop & ~((low[rows] < after) & (after < high[rows]))
        bottom = np.where(np.isinf(low[rows]), high[rows] - 8.0 * (1.0 + np.abs(high[rows])), low[rows])
        u[rows] = np.where(outside, 0.5 * (bottom + high[rows]), after)
        steps[rows] = step
        rows = rows[~stop]
    steps[rows] = MAX_STEPS
    return u, steps
