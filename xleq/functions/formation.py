"""Equilibria found from formation data alone: `XLEQ_COMPOSITION_DATA` and `XLEQ_ADIABATIC`."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from fractions import Fraction
from functools import lru_cache
from typing import Final

from xleq.cells import Grid
from xleq.equilibrium import State
from xleq.errors import InputError, MissingDataError, NoAnswerError
from xleq.functions.arguments import Want
from xleq.functions.composition import DATA, FEED, SPECIES, T, options_argument, want_argument
from xleq.functions.conditions import Equilibrium, Options, equilibrium, extrapolates, table_of
from xleq.functions.results import wanted
from xleq.functions.systems import System, system
from xleq.functions.table import Argument, Example, Function, Result, tell
from xleq.reactions import Species, null_space, parse_species, reaction_text, smallest_integers
from xleq.thermo import SpeciesData

Texts = tuple[str, ...]
Numbers = tuple[float, ...]

_P: Final = Argument("P", "pressure", "total pressure, absolute unless its unit says gauge", unit="bar")
#: Factor by which the search for the adiabatic temperature goes on from that of the feed.
_STEP: Final = 1.3
#: A jump of the enthalpy is told from a slope by this relative step of T and this heat capacity [kJ/(mol K)].
_NEAR: Final = 1e-7
_STEEPEST: Final = 1000.0
_ERRORS: Final = (
    "#VALUE! a species cannot be read, has no formula or is doubled; lists of unequal length",
    "#N/A a species is not in the data, or T lies outside their range",
    "#NUM! nothing is fed; no answer that passes its certificate",
)


@lru_cache(maxsize=1024)
def _all_reactions(species: Texts) -> System:
    """Every independent reaction that the elements allow among the species."""
    read = [parse_species(text, "g") for text in species]
    for text, s in zip(species, read, strict=True):
        if s.composition() is None:
            raise InputError(f"{text} has no formula, so its elements are not known")
        if s.phase == "aq" or s.charge:
            raise InputError(f"{s.key} is not a gas or a pure phase")
    texts = tuple(_marked(read, row) for row in _basis(read))
    if not texts:
        raise NoAnswerError("the elements allow no reaction among these species; nothing can change")
    return replace(system(texts, tuple(s.key for s in read), "g"), names=species)


def _basis(read: Sequence[Species]) -> list[list[Fraction]]:
    compositions = [s.composition() or {} for s in read]
    elements = sorted({element for c in compositions for element in c})
    rows = [[c.get(element, Fraction(0)) for c in compositions] for element in elements]
    return [smallest_integers(vector) for vector in null_space(rows, len(read))]


def _marked(read: Sequence[Species], row: Sequence[Fraction]) -> str:
    keyed = [parse_species(s.key) for s in read]
    return reaction_text(keyed, row)


def _composition_data(
    species: Texts, feed: Numbers, t: float, p: float, want: Want, options: Options, data: Grid | None
) -> Result:
    read = _all_reactions(species)
    found = equilibrium(read, feed, "data", options, data)
    return wanted(read, found.solve_telling(State("P", t, p=p)), want)


def _adiabatic(
    species: Texts, feed: Numbers, t_feed: float, p: float, want: Want, options: Options, data: Grid | None
) -> Result:
    read = _all_reactions(species)
    found = equilibrium(read, feed, "data", options, data)
    balance = _Balance(found, [table_of(data).find(s) for s in read.species], p, extrapolates(options))
    t = balance.temperature(t_feed)
    if want.word == "t":
        if balance.jumps_at(t):
            tell([f"a phase is changing at {t:.6g} K, in part: the feed has not the enthalpy for all of it"])
        else:
            found.solve_telling(State("P", t, p=p))
        return t
    if balance.jumps_at(t):
        raise NoAnswerError(
            f"at the adiabatic temperature, {t:.6g} K, a phase is changing in part, and T and P do not tell "
            "how far; ask for T alone"
        )
    return wanted(read, found.solve_telling(State("P", t, p=p)), want)


class _Balance:
    """The enthalpy at equilibrium less that of the feed, as a function of temperature [kJ].

    At constant pressure the enthalpy at equilibrium rises with temperature (H. B. Callen, Thermodynamics,
    2nd ed., 1985, ch. 8: stability), so it meets that of the feed once, on a slope or in a jump.
    """

    def __init__(self, found: Equilibrium, known: Sequence[SpeciesData], p: float, extrapolate: bool) -> None:
        self.found, self.known, self.p, self.extrapolate = found, known, p, extrapolate
        self.seen: dict[float, float] = {}
        starts, ends = [d.t_min for d in known], [d.t_max for d in known]
        self.low, self.high = (min(starts), max(ends)) if extrapolate else (max(starts), min(ends))
        if not self.low < self.high:
            raise MissingDataError(f"the data of these species share no temperature: {self._ends()}")
        self.before = 0.0

    def _ends(self) -> str:
        first = max(self.known, key=lambda d: d.t_min)
        last = min(self.known, key=lambda d: d.t_max)
        return f"those of {first.key} begin at {first.t_min:g} K, those of {last.key} end at {last.t_max:g} K"

    def _enthalpy(self, n: Sequence[float], t: float) -> float:
        return math.fsum(
            amount * data.h(t, extrapolate=self.extrapolate)
            for amount, data in zip(n, self.known, strict=True)
            if amount > 0.0
        )

    def gain(self, t: float) -> float:
        """Enthalpy at equilibrium at T less that of the feed. [kJ]."""
        if t not in self.seen:
            n = self.found.solve(State("P", t, p=self.p)).n
            self.seen[t] = self._enthalpy(n, t) - self.before
        return self.seen[t]

    def temperature(self, t_feed: float) -> float:
        """Where the enthalpy is that of the feed. [K].

        Raises
        ------
        MissingDataError
            If that lies outside the range of the data.
        """
        from scipy.optimize import brentq

        self.before = self._enthalpy(self.found.feed, t_feed)
        below, above = self._bracket(min(max(t_feed, self.low), self.high))
        if below == above:
            return below
        try:
            return float(brentq(self.gain, below, above, xtol=1e-9, rtol=1e-13, maxiter=200))
        except NoAnswerError:
            return self._by_halves()

    def _bracket(self, t: float) -> tuple[float, float]:
        """Two temperatures between which the balance closes, from the feed's outwards."""
        gain = self.gain(t)
        rising = gain < 0.0
        while gain != 0.0:
            end = self.high if rising else self.low
            if t == end:
                side = "above" if rising else "below"
                raise MissingDataError(
                    f"the adiabatic temperature lies {side} {end:g} K, where the data end: {self._ends()}"
                )
            last, t = t, min(t * _STEP, end) if rising else max(t / _STEP, end)
            gain = self.gain(t)
            if (gain < 0.0) is not rising:
                return (last, t) if rising else (t, last)
        return t, t

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
        """Whether the enthalpy passes that of the feed in a jump there."""
        try:
            span = abs(self.gain(t * (1.0 + _NEAR)) - self.gain(t * (1.0 - _NEAR)))
        except (NoAnswerError, MissingDataError):
            return False
        # Between the two, Cp of the whole feed, with reaction, would have to be beyond any real one.
        scale = math.fsum(self.found.feed) * t * 2.0 * _NEAR
        return span > _STEEPEST * scale


FUNCTIONS: Final = (
    Function(
        "XLEQ_COMPOSITION_DATA",
        "composition",
        (
            SPECIES,
            FEED,
            T,
            _P,
            want_argument("moles"),
            options_argument("gas", "extrapolate"),
            DATA,
        ),
        "gas and pure phases at equilibrium, by every reaction that the elements allow: what `want` names",
        _composition_data,
        _ERRORS,
        "as XLEQ_COMPOSITION_P; the reactions span the null space of the element matrix, K is from the data",
        (
            Example(
                '=ROUND(XLEQ_COMPOSITION_DATA("CO; H2O; CO2; H2", "1; 1; 0; 0", 1000, 1, "moles H2"), 3)',
                0.545,
            ),
        ),
    ),
    Function(
        "XLEQ_ADIABATIC",
        "composition",
        (
            SPECIES,
            FEED,
            Argument("T_feed", "temperature", "temperature of the feed", unit="K"),
            _P,
            Argument(
                "want", "want", "T for the temperature, else as XLEQ_COMPOSITION_P at that temperature", "T",
                known=("T",),
            ),
            options_argument("extrapolate"),
            DATA,
        ),
        "temperature [K] at which the equilibrium has the enthalpy of the feed, or what `want` names",
        _adiabatic,
        (
            *_ERRORS,
            "#N/A the adiabatic temperature lies outside the range of the data",
            "#NUM! a composition is asked for where a phase changes in part",
        ),
        "enthalpy balance with Cp(T): Smith, Van Ness and Abbott, Introduction to Chemical Engineering "
        "Thermodynamics, 7th ed., 2005, section 4.7; ideal gas",
        (
            Example('=ROUND(XLEQ_ADIABATIC("CO; H2O; CO2; H2", "1; 3; 0; 0", "350 degC", 30), 1)', 844.2),
        ),
    ),
)  # fmt: skip
