"""One reaction in an ideal fluid, with or without pure phases.

The extent is measured from the nearer of the two physical ends (where some species is used up), so that no
amount is a difference of nearly equal numbers, and the distance d from it is found by Newton's method in
ln d, kept inside a bracket. The affinity rises monotonically with d, so there is one root or none; with none,
the answer is the end itself: a pure phase used up, or the fluid gone. What the amounts are at the ends is
calculated in exact rationals where doubles would cancel, as with feeds near the stoichiometric ratio.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from math import exp, log
from typing import TYPE_CHECKING

from xleq.equilibrium.certificate import certify
from xleq.equilibrium.problem import SMALLEST_AMOUNT, Problem, Solution, Status, check
from xleq.errors import InputError

if TYPE_CHECKING:
    from collections.abc import Sequence
    from fractions import Fraction

#: Steps after which Newton's method is given up; bisection alone would need fewer than this.
MAX_STEPS = 200
METHOD = "bracketed Newton in the logarithm of the distance from the nearer end"
_EPS = 2.220446049250313e-16


@dataclass(slots=True)
class End:
    """One end of the range of the extent, seen from inside.

    Parameters
    ----------
    sign : int
        1 for the end where the reaction has run backward as far as it can, -1 for forward.
    width : float
        Extent from the feed to this end. [mol]  At least 0.
    amounts : list [n_species] of float
        Amounts at this end; exactly 0 for the species that set it. [mol]
    """

    sign: int
    width: float
    amounts: list[float]


@dataclass(slots=True)
class Fluid:
    """The reaction in its fluid.

    Parameters
    ----------
    reacting : list of (index, coefficient)
        Fluid species that take part.
    rest : float
        Fluid that does not. [mol]
    growth : float
        Moles of fluid made for each mole of extent.
    by_fraction : bool
        Whether activities follow fractions, not concentrations.
    constant : float
        What ln Q - ln K has besides the logarithms of amounts.
    """

    reacting: list[tuple[int, float]]
    rest: float
    growth: float
    by_fraction: bool
    constant: float


@dataclass(slots=True)
class Affinity:
    """Inward affinity near an end: sum of b ln(m + b d) over fluid species, less s B ln N, plus constants.

    Parameters
    ----------
    power : float
        Sum of b over the fluid species that are absent at the end: the slope at d -> 0 in ln d.
    offset : float
        Everything that does not depend on d.
    terms : list of (m, b)
        Fluid species that are present at the end and react.
    rest : float
        Fluid that does not react. [mol]
    growth : float
        B, moles of fluid made for each mole of d, times s; 0 where activities follow concentrations.
    """

    power: float
    offset: float
    terms: list[tuple[float, float]]
    rest: float
    growth: float

    def at(self, u: float) -> tuple[float, float]:
        """Value and slope with respect to u = ln d, at u."""
        d = exp(u) if u > -745.0 else 0.0
        value = self.offset + self.power * u
        slope = 0.0
        total = self.rest + self.power * d
        for m, b in self.terms:
            n = m + b * d
            total += n
            value += b * log(n)
            slope += b * b / n
        growth = self.growth
        if growth:
            value -= growth * log(total)
            slope -= growth * growth / total
        return value, self.power + slope * d

    def scale(self) -> float:
        """Size of the terms, which sets how far rounding lets the value be known."""
        return abs(self.offset) + sum(abs(b * log(m)) for m, b in self.terms) + 50.0


def solve(problem: Problem) -> Solution:
    """The equilibrium of one reaction in an ideal fluid.

    Parameters
    ----------
    problem : Problem
        With one reaction, and without a model.

    Returns
    -------
    Solution
        With status "indeterminate" and a certificate that fails where any extent would do.

    Raises
    ------
    InputError
        If amounts, the constant or the state mean nothing, or the reaction lacks a reactant or a product.
    """
    check(problem)
    nu = [c.numerator / c.denominator for c in problem.nu[0]]
    back = end_of(problem, nu, 1)
    ahead = end_of(problem, nu, -1)
    span = back.width + ahead.width
    if span == 0.0:
        return _finish(problem, list(problem.n0), 0.0, "frozen", (), 0)
    fluid = fluid_of(problem, nu)
    if not _varies(fluid, back, ahead):
        return _all_or_nothing(problem, fluid, nu, back, ahead)
    half = 0.5 * span
    end = back if _inward_at(fluid, back, half) >= 0.0 else ahead
    affinity = affinity_from(fluid, end)
    middle = log(half)
    start = _start(affinity, middle)
    if start is None:
        return _at_end(problem, nu, end)
    u, steps = _root(affinity, start, middle)
    d = exp(u) if u > -745.0 else 0.0
    step = end.sign * d
    amounts = [m + c * step for m, c in zip(end.amounts, nu, strict=True)]
    return _finish(problem, amounts, end.sign * (d - end.width), "equilibrium", (), steps)


def fluid_of(problem: Problem, nu: Sequence[float]) -> Fluid:
    """What of the problem concerns its fluid.

    Parameters
    ----------
    problem : Problem
    nu : sequence [n_species] of float
        Coefficients of the reaction.
    """
    reacting: list[tuple[int, float]] = []
    rest = growth = 0.0
    for i, phase in enumerate(problem.phases):
        if phase == "fluid":
            c = nu[i]
            if c:
                reacting.append((i, c))
                growth += c
            else:
                rest += problem.n0[i]
    state = problem.state
    constant = growth * state.shift - problem.ln_k[0]
    return Fluid(reacting, rest, growth, state.kind in "PX", constant)


def end_of(problem: Problem, nu: Sequence[float], sign: int) -> End:
    """The end that the reaction reaches running backward (sign 1) or forward (-1).

    Parameters
    ----------
    problem : Problem
    nu : sequence [n_species] of float
        Coefficients of the reaction.
    sign : {1, -1}

    Raises
    ------
    InputError
        If nothing is consumed in that direction.
    """
    n0 = problem.n0
    width, first = math.inf, -1
    used: list[int] = []
    for i, c in enumerate(nu):
        if sign * c > 0.0:
            used.append(i)
            ratio = n0[i] / abs(c)
            if ratio < width:
                width, first = ratio, i
    if not used:
        side = "product" if sign > 0 else "reactant"
        raise InputError(f"the reaction has no {side}, so nothing limits how far it runs")
    if width == 0.0:
        return End(sign, 0.0, list(n0))
    amounts = [m - sign * c * width for m, c in zip(n0, nu, strict=True)]
    if len(used) > 1:
        first = _exact_first(problem, nu, used, width, first)
        width = n0[first] / abs(nu[first])
        for i in used:
            if amounts[i] < 0.03 * n0[i]:
                amounts[i] = _exact_amount(problem, i, first)
    amounts[first] = 0.0
    return End(sign, width, amounts)


def _exact_first(problem: Problem, nu: Sequence[float], used: list[int], width: float, first: int) -> int:
    """Which of the species is used up first, by exact comparison where doubles cannot tell."""
    most = width * (1.0 + 1e-12)
    near = [i for i in used if problem.n0[i] <= most * abs(nu[i])]
    if len(near) < 2:
        return first
    row = problem.nu[0]
    first = near[0]
    for i in near[1:]:
        up, down = _ratio(problem.n0[i], row[i])
        least_up, least_down = _ratio(problem.n0[first], row[first])
        if up * least_down < least_up * down:
            first = i
    return first


def _ratio(amount: float, c: Fraction) -> tuple[int, int]:
    """Amount / |c| as numerator and denominator, in plain integers, which are faster than fractions."""
    up, down = amount.as_integer_ratio()
    return up * c.denominator, down * abs(c.numerator)


def _exact_amount(problem: Problem, i: int, first: int) -> float:
    """What is left of species i when species `first` is used up, rounded once."""
    if problem.n0[i] == 0.0:
        return 0.0
    row = problem.nu[0]
    up, down = _ratio(problem.n0[i], row[i])
    least_up, least_down = _ratio(problem.n0[first], row[first])
    size = abs(row[i])
    left = (up * least_down - least_up * down) * size.numerator
    return left / (down * least_down * size.denominator)


def _varies(fluid: Fluid, back: End, ahead: End) -> bool:
    """Whether the affinity depends on the extent.

    It does not where no fluid takes part, and where activities follow fractions and the reaction makes all of
    the fluid, so that it keeps one composition: then the fluid is gone at one of the ends.
    """
    if not fluid.reacting:
        return False
    if fluid.rest or not fluid.by_fraction:
        return True
    at_back = any(back.amounts[i] for i, _ in fluid.reacting)
    return at_back and any(ahead.amounts[i] for i, _ in fluid.reacting)


def _inward_at(fluid: Fluid, back: End, d: float) -> float:
    """Ln Q - ln K at the distance d from the backward end."""
    value = fluid.constant
    total = fluid.rest
    for i, c in fluid.reacting:
        n = back.amounts[i] + c * d
        total += n
        value += c * log(n)
    if fluid.by_fraction and fluid.growth:
        value -= fluid.growth * log(total)
    return value


def affinity_from(fluid: Fluid, end: End) -> Affinity:
    """The inward affinity seen from an end.

    Parameters
    ----------
    fluid : Fluid
    end : End
    """
    sign, amounts = end.sign, end.amounts
    power = 0.0
    offset = sign * fluid.constant
    terms: list[tuple[float, float]] = []
    for i, c in fluid.reacting:
        m = amounts[i]
        b = sign * c
        if m == 0.0:
            power += b
            offset += b * log(b)
        else:
            terms.append((m, b))
    return Affinity(power, offset, terms, fluid.rest, sign * fluid.growth if fluid.by_fraction else 0.0)


def _start(affinity: Affinity, middle: float) -> float | None:
    """Where to begin, as ln d; None when the end itself is the answer."""
    value = affinity.offset
    slope = 0.0
    total = affinity.rest
    for m, b in affinity.terms:
        value += b * log(m)
        slope += b * b / m
        total += m
    growth = affinity.growth
    if growth:
        value -= growth * log(total)
        slope -= growth * growth / total
    if affinity.power:
        return min(-value / affinity.power, middle)
    if value >= 0.0:
        return None
    return min(log(-value) - log(slope), middle) if slope > 0.0 else middle


def _root(affinity: Affinity, u: float, high: float) -> tuple[float, int]:
    """The root in u = ln d, at most `high`, and the steps it took."""
    low = -math.inf
    floor = _EPS * affinity.scale()
    at = affinity.at
    for steps in range(1, MAX_STEPS):
        value, slope = at(u)
        if value > 0.0:
            high = u
        else:
            low = u
        move = -value / slope if slope > 0.0 else math.copysign(math.inf, -value)
        if abs(move) < 1e-8:
            return u + move, steps
        if abs(value) < floor or high - low <= 4.0 * _EPS * abs(high):
            return u, steps
        u += move
        if not low < u < high or (steps > 40 and steps % 2):
            u = 0.5 * (low + high) if low > -math.inf else high - 4.0 * (1.0 + abs(high))
    return u, MAX_STEPS


def _at_end(problem: Problem, nu: Sequence[float], end: End) -> Solution:
    """The solution at an end, where pure phases are used up."""
    gone = tuple(
        name
        for name, n, c, phase in zip(problem.species, end.amounts, nu, problem.phases, strict=True)
        if n == 0.0 and c and phase == "pure"
    )
    return _finish(problem, end.amounts, -end.sign * end.width, "exhausted", gone, 0)


def _all_or_nothing(problem: Problem, fluid: Fluid, nu: Sequence[float], back: End, ahead: End) -> Solution:
    """The solution where the affinity is the same at every extent: one of the ends, unless it is zero."""
    made = [c for _, c in fluid.reacting]
    terms = [fluid.growth * problem.state.shift, -problem.ln_k[0], *(c * log(c / fluid.growth) for c in made)]
    value = math.fsum(terms)
    if abs(value) <= 8.0 * _EPS * (1.0 + math.fsum(map(abs, terms))):
        return _finish(problem, list(problem.n0), 0.0, "indeterminate", (), 0)
    end = back if value > 0.0 else ahead
    left = any(n for n, phase in zip(end.amounts, problem.phases, strict=True) if phase == "fluid")
    if left or not made:
        return _at_end(problem, nu, end)
    return _finish(problem, end.amounts, -end.sign * end.width, "fluid vanished", (), 0)


def _finish(
    problem: Problem, amounts: list[float], xi: float, status: Status, gone: tuple[str, ...], steps: int
) -> Solution:
    """The record, certified; amounts too small for a double become 0 and are noted."""
    notes: tuple[str, ...] = ()
    if status == "equilibrium" and min(amounts) < SMALLEST_AMOUNT:
        row = problem.nu[0]
        small = [i for i, n in enumerate(amounts) if row[i] and n < SMALLEST_AMOUNT]
        for i in small:
            amounts[i] = 0.0
        notes = tuple(f"{problem.species[i]} is below {SMALLEST_AMOUNT:g} mol, given as 0" for i in small)
    elif status == "frozen":
        notes = ("nothing can react: a species is missing on both sides",)
    n = tuple(amounts)
    return Solution(problem, n, (xi,), status, gone, certify(problem, n), steps, METHOD, notes)
