"""Which temperature or pressure gives a wanted result: all answers in an interval, or why there is not one.

A result of an equilibrium need not rise or fall steadily with temperature, has a kink where a phase appears,
and may jump. So the interval is sampled, more densely where the result bends, every change of sign is
followed down, every dip towards the wanted value is looked into, and a jump across it is told from an answer.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from itertools import pairwise

from xleq.equilibrium.problem import Problem, Solution
from xleq.errors import AmbiguousError, InputError, NoAnswerError

#: Samples before refinement, and the most there may be of them after it.
FIRST_SAMPLES = 33
MOST_SAMPLES = 400
#: Times the rise of its flanks that a dip's lowest sample may lie above the value and still be followed. [-]
FLAT_DIP = 20.0
#: A bend of more than this part of the range seen is sampled more densely.
BEND = 0.01
#: What counts as equal to the wanted value, as a part of the largest value seen.
EQUAL = 1e-9
#: A change of sign that is still more than this part of the largest value at its narrowest is a jump.
JUMP = 1e-6
#: Samples equal to the value over more than this part of their place are a plateau, not a root.
WIDE = 1e-4


@dataclass(frozen=True, slots=True)
class Search:
    """What was found in an interval.

    Parameters
    ----------
    roots : tuple of float
        Where the value is reached, rising.
    plateaus : tuple of (float, float)
        Stretches over which the value is held.
    jumps : tuple of (float, float, float)
        Where the function jumps across the value: the place, and what it is just below and just above.
    gaps : tuple of (float, str)
        Samples at which the function has no answer, and why.
    lowest, highest : float
        The range of the function over the samples.
    """

    roots: tuple[float, ...]
    plateaus: tuple[tuple[float, float], ...]
    jumps: tuple[tuple[float, float, float], ...]
    gaps: tuple[tuple[float, str], ...]
    lowest: float
    highest: float


class _Sampler:
    """The function less the wanted value, on a scale of its own, remembered."""

    def __init__(self, f: Callable[[float], float], value: float, by_logarithm: bool) -> None:
        self.f, self.value, self.by_logarithm = f, value, by_logarithm
        self.seen: dict[float, float] = {}
        self.gaps: dict[float, str] = {}

    def place(self, s: float) -> float:
        """The argument of the function at the place s of the scale."""
        return math.exp(s) if self.by_logarithm else s

    def at(self, s: float) -> float:
        """The function less the value; nan where it has no answer."""
        if s not in self.seen:
            try:
                self.seen[s] = self.f(self.place(s)) - self.value
            except NoAnswerError as error:
                self.gaps[self.place(s)] = str(error)
                self.seen[s] = math.nan
        return self.seen[s]

    def known(self) -> list[tuple[float, float]]:
        """Samples with an answer, in order."""
        return sorted((s, g) for s, g in self.seen.items() if not math.isnan(g))

    def size(self) -> float:
        """The largest value seen, for what counts as equal."""
        return max([abs(self.value)] + [abs(g + self.value) for _, g in self.known()])


def search(
    f: Callable[[float], float], value: float, low: float, high: float, *, by_logarithm: bool = False
) -> Search:
    """All places in an interval at which a function has a value.

    Parameters
    ----------
    f : callable
        May raise NoAnswerError where it has none.
    value : float
        Wanted.
    low, high : float
        The interval; both above 0 if it is sampled by logarithm.
    by_logarithm : bool
        Whether samples are spaced evenly in the logarithm, as suits pressures.

    Returns
    -------
    Search

    Raises
    ------
    InputError
        If the interval or the value means nothing.
    NoAnswerError
        If the function has no answer anywhere in it.

    Examples
    --------
    >>> search(lambda x: x * x, 2.0, -5.0, 5.0).roots
    (-1.4142135623730951, 1.4142135623730951)
    >>> search(lambda x: math.copysign(1.0, x - 0.3), 0.0, 0.0, 1.0).roots
    ()
    """
    if not (math.isfinite(low) and math.isfinite(high) and low < high):
        raise InputError(
            f"from {low:g} to {high:g} is not an interval: the lower end must be below the upper"
        )
    if by_logarithm and low <= 0.0:
        raise InputError(f"the lower end is {low:g}: it must be above 0")
    if not math.isfinite(value):
        raise InputError(f"the wanted value is {value}: it must be a number")
    ends = (math.log(low), math.log(high)) if by_logarithm else (low, high)
    sampler = _Sampler(f, value, by_logarithm)
    for k in range(FIRST_SAMPLES):
        sampler.at(ends[0] + (ends[1] - ends[0]) * (k / (FIRST_SAMPLES - 1)))
    if not sampler.known():
        place, why = min(sampler.gaps.items())
        raise NoAnswerError(f"there is no answer anywhere from {low:g} to {high:g}; at {place:g}: {why}")
    _refine(sampler)
    _look_into_dips(sampler)
    return _collect(sampler)


def _refine(sampler: _Sampler) -> None:
    """More samples where the function bends or stops having answers."""
    for _ in range(6):
        known = sampler.known()
        values = [g for _, g in known]
        range_seen = max(values) - min(values)
        wanted: list[float] = []
        for (a, ga), (b, gb), (c, gc) in zip(known, known[1:], known[2:], strict=False):
            straight = ga + (gc - ga) * (b - a) / (c - a)
            if abs(gb - straight) > BEND * range_seen:
                wanted += [0.5 * (a + b), 0.5 * (b + c)]
        places = sorted(sampler.seen)
        for a, b in pairwise(places):
            if math.isnan(sampler.seen[a]) != math.isnan(sampler.seen[b]):
                wanted.append(0.5 * (a + b))
        fresh = [s for s in dict.fromkeys(wanted) if s not in sampler.seen]
        if not fresh or len(sampler.seen) + len(fresh) > MOST_SAMPLES:
            return
        for s in fresh:
            sampler.at(s)


def _look_into_dips(sampler: _Sampler) -> None:
    """Follows each dip towards the value to its bottom, which may reach it or pass it."""
    known = sampler.known()
    for (a, ga), (b, gb), (c, gc) in zip(known, known[1:], known[2:], strict=False):
        side = math.copysign(1.0, gb)
        if side * ga <= 0.0 or side * gc <= 0.0 or not (side * gb <= side * ga and side * gb <= side * gc):
            continue
        _golden(sampler, a, b, c, side)


def _golden(sampler: _Sampler, a: float, b: float, c: float, side: float) -> None:
    """Golden-section search of a dip; each sample is kept, so that a crossing is seen afterwards.

    It is given up where the dip is too flat to reach the value: what lies below its lowest sample is of the
    order of what its flanks have risen above it. Rounding on a plateau looks like a dip, and ends here too.
    """
    ratio = 0.5 * (3.0 - math.sqrt(5.0))
    for _ in range(60):
        here = side * sampler.at(b)
        rise = max(side * sampler.at(a), side * sampler.at(c)) - here
        if here > FLAT_DIP * rise:
            return
        s = b + ratio * (c - b) if c - b > b - a else b - ratio * (b - a)
        g = side * sampler.at(s)
        if not math.isfinite(g) or g <= 0.0 or c - a <= 1e-9 * max(abs(a), abs(c)):
            return
        if g < here:
            a, b, c = (b, s, c) if s > b else (a, s, b)
        else:
            a, c = (a, s) if s > b else (s, c)


def _collect(sampler: _Sampler) -> Search:
    """Roots, plateaus and jumps from the samples.

    Neighbouring samples that equal the value are taken together: as a plateau if they lie far apart, as one
    root if not, for the last digits of a function may change sign many times.
    """
    known = sampler.known()
    equal = EQUAL * sampler.size()
    roots: list[float] = []
    plateaus: list[tuple[float, float]] = []
    jumps: list[tuple[float, float, float]] = []
    away: tuple[float, float] | None = None
    run: list[tuple[float, float]] = []
    for s, g in [*known, (math.inf, math.inf)]:
        if abs(g) <= equal:
            run.append((s, g))
            continue
        last = math.isinf(s)
        if run and _is_wide(run):
            plateaus.append((sampler.place(run[0][0]), sampler.place(run[-1][0])))
        elif away is not None and not last and away[1] * g < 0.0:
            _cross(sampler, away[0], s, roots, jumps)
        elif run:
            roots.append(sampler.place(min(run, key=lambda sample: abs(sample[1]))[0]))
        away, run = (s, g), []
    values = [g + sampler.value for _, g in known]
    gaps = tuple(sorted(sampler.gaps.items()))
    return Search(tuple(roots), tuple(plateaus), tuple(jumps), gaps, min(values), max(values))


def _is_wide(run: list[tuple[float, float]]) -> bool:
    first, last = run[0][0], run[-1][0]
    return last - first > WIDE * max(abs(first), abs(last), 1e-300)


def _cross(
    sampler: _Sampler, a: float, b: float, roots: list[float], jumps: list[tuple[float, float, float]]
) -> None:
    """Follows a change of sign between two samples to a root, or to a jump."""
    from scipy.optimize import brentq

    def g(s: float) -> float:
        found = sampler.at(s)
        if math.isnan(found):
            raise NoAnswerError(sampler.gaps[sampler.place(s)])
        return found

    try:
        s = float(brentq(g, a, b, xtol=1e-300, rtol=1e-15, maxiter=300))
        if abs(sampler.at(s)) <= JUMP * sampler.size():
            roots.append(sampler.place(s))
            return
    except NoAnswerError:
        # The change of sign lies where there is no answer; how far it can be narrowed is told below.
        pass
    sign = math.copysign(1.0, sampler.at(a))
    between = [(x, y) for x, y in sampler.known() if a <= x <= b]
    below = max((x, y) for x, y in between if y * sign > 0.0)
    above = min((x, y) for x, y in between if y * sign < 0.0)
    place = sampler.place(0.5 * (below[0] + above[0]))
    jumps.append((place, below[1] + sampler.value, above[1] + sampler.value))


def only_root(found: Search, value: float, low: float, high: float, what: str, unit: str) -> float:
    """The one place found, or the reason why there is not just one.

    Parameters
    ----------
    found : Search
    value, low, high : float
        As they were searched for.
    what, unit : str
        Name and unit of the argument, for the reason: "temperature", "K".

    Raises
    ------
    NoAnswerError
        If there is none: the range that is reached is given, and jumps are named.
    AmbiguousError
        If there are several: they are listed.

    Examples
    --------
    >>> square = search(lambda x: x * x, 30.0, 0.0, 5.0)
    >>> only_root(square, 30.0, 0.0, 5.0, "temperature", "K")
    Traceback (most recent call last):
    xleq.errors.NoAnswerError: no temperature from 0 to 5 K gives 30: the values there run from 0 to 25
    """
    if len(found.roots) == 1 and not found.plateaus:
        return found.roots[0]
    if found.roots or found.plateaus:
        places = [f"{x:.10g} {unit}" for x in found.roots]
        places += [f"all from {a:.10g} to {b:.10g} {unit}" for a, b in found.plateaus]
        raise AmbiguousError(
            f"more than one {what} from {low:g} to {high:g} {unit} gives {value:g}: {'; '.join(places)}; "
            "narrow the interval"
        )
    reason = f"no {what} from {low:g} to {high:g} {unit} gives {value:g}: "
    if found.jumps:
        jumped = [f"from {a:.6g} to {b:.6g} at {x:.8g} {unit}" for x, a, b in found.jumps]
        reason += f"the value jumps across it, {'; '.join(jumped)}"
    else:
        reason += f"the values there run from {found.lowest:.6g} to {found.highest:.6g}"
    if found.gaps:
        place, why = found.gaps[0]
        reason += f"; at {place:.8g} {unit} there is none: {why}"
    raise NoAnswerError(reason)


def temperature_for(
    problem_at: Callable[[float], Problem],
    target: Callable[[Solution], float],
    value: float,
    low: float,
    high: float,
) -> float:
    """The temperature at which a result of the equilibrium has a value.

    Parameters
    ----------
    problem_at : callable
        The problem at a temperature [K], its constants with it.
    target : callable
        The result, from a certified solution.
    value : float
        Wanted.
    low, high : float
        The interval of temperatures. [K]

    Returns
    -------
    float
        [K]

    Raises
    ------
    NoAnswerError
        If no temperature in the interval gives it.
    AmbiguousError
        If several do.
    """
    if not low > 0.0:
        raise InputError(f"the lowest temperature is {low:g} K: it must be above 0")
    found = search(_result(problem_at, target), value, low, high)
    return only_root(found, value, low, high, "temperature", "K")


def pressure_for(
    problem_at: Callable[[float], Problem],
    target: Callable[[Solution], float],
    value: float,
    low: float,
    high: float,
) -> float:
    """The pressure at which a result of the equilibrium has a value.

    Parameters
    ----------
    problem_at : callable
        The problem at a pressure. [bar]
    target : callable
        The result, from a certified solution.
    value : float
        Wanted.
    low, high : float
        The interval of pressures. [bar]

    Returns
    -------
    float
        [bar]

    Raises
    ------
    NoAnswerError
        If no pressure in the interval gives it.
    AmbiguousError
        If several do.
    """
    found = search(_result(problem_at, target), value, low, high, by_logarithm=True)
    return only_root(found, value, low, high, "pressure", "bar")


def _result(
    problem_at: Callable[[float], Problem], target: Callable[[Solution], float]
) -> Callable[[float], float]:
    from xleq.equilibrium import solve

    return lambda x: target(solve(problem_at(x)).require())


def approach(
    ln_k: Callable[[float], float], ln_q: float, t: float, low: float = 200.0, high: float = 3000.0
) -> float:
    """Approach to equilibrium: the temperature less that at which K equals the reaction quotient.

    The sign is as written: an exothermic reaction that has not come to equilibrium has a negative approach.

    Parameters
    ----------
    ln_k : callable
        ln K° of the reaction at a temperature [K]; may raise NoAnswerError outside its range.
    ln_q : float
        ln of the reaction quotient, on the same basis. [-]
    t : float
        Temperature. [K]
    low, high : float
        The interval in which the temperature of equilibrium is sought. [K]

    Returns
    -------
    float
        [K]

    Raises
    ------
    NoAnswerError
        If K equals the quotient nowhere in the interval.
    AmbiguousError
        If it does at several temperatures.

    Examples
    --------
    >>> round(approach(lambda t: 1000.0 / t - 2.0, 0.0, 510.0), 6)
    10.0
    """
    if not t > 0.0:
        raise InputError(f"the temperature is {t:g} K: it must be above 0")
    found = search(ln_k, ln_q, low, high)
    return t - only_root(found, ln_q, low, high, "temperature", "K")
