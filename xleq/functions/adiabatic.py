"""The temperature at which an equilibrium has the enthalpy of its feed."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from typing import Final

from xleq.equilibrium import Solution, State
from xleq.errors import MissingDataError, NoAnswerError
from xleq.functions.conditions import Constants, Equilibrium
from xleq.thermo import SpeciesData

#: Factor by which the search goes on from the temperature of the feed.
_STEP: Final = 1.3
#: A jump of a phase is told from a slope by this relative step of T and this part of its amount.
_NEAR: Final = 1e-7
_AT_ONCE: Final = 1e-3
#: What is added to G/(R T) of a species that is to stay away; whether it does is looked at.
_NEVER: Final = 300.0
#: A species of less than this part of all moles does not count in the enthalpy.
_TRACE: Final = 1e-7


class EnthalpyBalance:
    """The enthalpy at equilibrium less that of the feed, as a function of temperature [kJ].

    At constant pressure the enthalpy at equilibrium rises with temperature (H. B. Callen, Thermodynamics,
    2nd ed., 1985, ch. 8: stability), so it meets that of the feed once, on a slope or in a jump. Where the
    data of a species end, a fuel or a liquid of the feed, it is left out beyond, provided that no more than a
    trace of it is there at that end.

    Parameters
    ----------
    found : Equilibrium
        With constants from formation data.
    beyond : Constants
        The same constants outside the range of the data too.
    known : sequence [n_species] of SpeciesData
    p : float
        Pressure. [bar]
    extrapolate : bool
        Whether data may be used outside their range; then no species is left out.
    """

    def __init__(
        self,
        found: Equilibrium,
        beyond: Constants,
        known: Sequence[SpeciesData],
        p: float,
        *,
        extrapolate: bool,
    ) -> None:
        self.found, self.beyond, self.known, self.p, self.extrapolate = found, beyond, known, p, extrapolate
        self.low, self.high = min(d.t_min for d in known), max(d.t_max for d in known)
        self.before = 0.0
        self.seen: dict[float, float] = {}

    def solution(self, t: float) -> Solution:
        """The equilibrium at a temperature, without the species that have no data there.

        Raises
        ------
        MissingDataError
            If one of them cannot be absent.
        NoAnswerError
            If there is no certified equilibrium.
        """
        away = [i for i, d in enumerate(self.known) if not d.t_min <= t <= d.t_max]
        if not away or self.extrapolate:
            return self.found.solve(State("P", t, p=self.p))
        solution = self._without(t, away)
        for i in away:
            if self._is_there(solution, i):
                self.known[i].h(t)  # raises, with the range
        # Its trace would be of the penalty's making.
        return replace(solution, n=tuple(0.0 if i in away else n for i, n in enumerate(solution.n)))

    def _without(self, t: float, away: list[int]) -> Solution:
        """The equilibrium with the data used beyond their ends, and with what must not form."""
        state, read = State("P", t, p=self.p), self.found.read
        ln_k = tuple(
            value - _NEVER * float(sum(row[i] for i in away))
            for value, row in zip(self.beyond.at(state), read.nu, strict=True)
        )
        return replace(self.found, constants=Constants(lambda _: ln_k)).solve(state)

    @staticmethod
    def _is_there(solution: Solution, i: int) -> bool:
        return solution.n[i] > _TRACE * math.fsum(solution.n)

    def _enthalpy(self, n: Sequence[float], t: float) -> float:
        trace = _TRACE * math.fsum(n)
        return math.fsum(
            amount * data.h(t, extrapolate=self.extrapolate or amount <= trace)
            for amount, data in zip(n, self.known, strict=True)
            if amount > 0.0
        )

    def gain(self, t: float) -> float:
        """Enthalpy at equilibrium at a temperature less that of the feed [kJ]."""
        if t not in self.seen:
            self.seen[t] = self._enthalpy(self.solution(t).n, t) - self.before
        return self.seen[t]

    def temperature(self, t_feed: float) -> float:
        """Where the enthalpy is that of the feed [K].

        Parameters
        ----------
        t_feed : float
            Temperature of the feed. [K]

        Raises
        ------
        MissingDataError
            If it lies outside the range of the data, or a species whose data end before is still there.
        NoAnswerError
            If there is no certified equilibrium on the way.
        """
        from scipy.optimize import brentq

        self.before = self._enthalpy(self.found.feed, t_feed)
        below, above = self._bracket(min(max(t_feed, self.low), self.high))
        if below == above:
            return below
        try:
            t = float(brentq(self.gain, below, above, xtol=1e-9, rtol=1e-13, maxiter=200))
        except NoAnswerError:
            t = self._by_halves()
        self._check_left_out(t)
        return t

    def _bracket(self, t: float) -> tuple[float, float]:
        """Two temperatures between which the balance closes, from the feed's outwards."""
        gain = self.gain(t)
        rising = gain < 0.0
        while gain != 0.0:
            end = self.high if rising else self.low
            if t == end:
                side = "above" if rising else "below"
                raise MissingDataError(f"the adiabatic temperature lies {side} {end:g} K, where the data end")
            last, t = t, self._next(t, rising)
            gain = self.gain(t)
            if (gain < 0.0) is not rising:
                return (last, t) if rising else (t, last)
        return t, t

    def _next(self, t: float, rising: bool) -> float:
        """The next temperature of the search; it stops where the data of a species end."""
        ends = [] if self.extrapolate else [end for d in self.known for end in (d.t_min, d.t_max)]
        if rising:
            return min(t * _STEP, self.high, *(end for end in ends if end > t))
        return max(t / _STEP, self.low, *(end for end in ends if end < t))

    def _by_halves(self) -> float:
        """The same where a pure phase changes: at that temperature itself there may be no answer."""
        below = max(t for t, gain in self.seen.items() if gain < 0.0)
        above = min(t for t, gain in self.seen.items() if gain >= 0.0)
        while above - below > 1e-12 * above:
            middle = 0.5 * (below + above)
            try:
                if self.gain(middle) < 0.0:
                    below = middle
                else:
                    above = middle
            except NoAnswerError:
                return middle
        return 0.5 * (below + above)

    def jumps_at(self, t: float) -> bool:
        """Whether a pure phase comes or goes at once there, as where it melts."""
        try:
            above, below = self.solution(t * (1.0 + _NEAR)).n, self.solution(t * (1.0 - _NEAR)).n
        except (NoAnswerError, MissingDataError):
            return False  # at the very end of the data
        least = _TRACE * math.fsum(above)
        return any(
            phase == "pure" and abs(x - y) > max(least, _AT_ONCE * max(x, y))
            for phase, x, y in zip(self.found.read.phases, above, below, strict=True)
        )

    def _beyond_end(self, t: float) -> list[tuple[SpeciesData, int, float]]:
        """Species that are without data at a temperature or end there, with their place and the end."""
        found: list[tuple[SpeciesData, int, float]] = []
        for i, data in enumerate(() if self.extrapolate else self.known):
            if t > data.t_max * (1.0 - _NEAR):
                found.append((data, i, data.t_max))
            elif t < data.t_min * (1.0 + _NEAR):
                found.append((data, i, data.t_min))
        return found

    def _check_left_out(self, t: float) -> None:
        for data, i, end in self._beyond_end(t):
            # Just beyond: data often end where a phase melts or begins to.
            outside = end * (1.0 + _NEAR) if end == data.t_max else end * (1.0 - _NEAR)
            others = [
                j
                for j, d in enumerate(self.known)
                if j != i and not d.t_min * (1.0 - _NEAR) <= outside <= d.t_max * (1.0 + _NEAR)
            ]
            if self._is_there(self._without(outside, others), i):
                raise MissingDataError(
                    f"{data.key} is still there at {end:g} K, where its data end; the adiabatic temperature "
                    "lies beyond: give data for it, or allow extrapolation (extrapolate=yes)"
                )

    def notes(self, t: float) -> list[str]:
        """What a checker should know of the data at a temperature: species left out for lack of them."""
        left_out = self._beyond_end(t)
        ended = "left out, given as 0: no more than a trace of it is there where its data end"
        said = [f"{d.key} {ended}, at {end:g} K" for d, _, end in left_out]
        kept = [d.key for d, _, _ in left_out]
        return said + [n for n in self.found.constants.notes(t) if n.split(" ")[0] not in kept]
