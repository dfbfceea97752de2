"""Properties of a reaction from the formation data of its species: ΔH°, ΔS°, ΔG°, ΔCp°, ln K°."""

from __future__ import annotations

import math
from bisect import bisect_right
from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from xleq.errors import InputError, MissingDataError
from xleq.reactions import Phase, Reaction
from xleq.thermo.records import Array, Interval, SpeciesData, out_of_range
from xleq.thermo.table import Table, standard_table
from xleq.units import R

_LN10 = math.log(10.0)


@dataclass(frozen=True, eq=False)
class ReactionData:
    """The formation data of a reaction, summed once: K° is on p° = 1 bar, c° = 1 mol/L, pure phases 1.

    Parameters
    ----------
    text : str
        The reaction.
    terms : tuple of (SpeciesData, float)
        Species with their coefficients, products positive.
    intervals : tuple of Interval
        ΔCp and its integrals between all breaks of the species.
    t_min, t_max : float
        The range that all species share. [K]  Empty (t_min > t_max) if they share none.
    """

    text: str
    terms: tuple[tuple[SpeciesData, float], ...]
    intervals: tuple[Interval, ...]
    breaks: tuple[float, ...]
    t_min: float
    t_max: float

    def _part(self, t: float, extrapolate: bool) -> Interval:
        if not (self.t_min <= t <= self.t_max) and not extrapolate:
            raise MissingDataError(self._range_text(t))
        return self.intervals[bisect_right(self.breaks, t)]

    def _range_text(self, t: float) -> str:
        if not math.isfinite(t):
            return f"{self.text}: {t:g} K is no temperature"
        short = [d for d, _ in self.terms if not d.t_min <= t <= d.t_max]
        return "; ".join(out_of_range(d.key, t, d.t_min, d.t_max) for d in short)

    def dh(self, t: float, *, extrapolate: bool = False) -> float:
        """ΔH° at t [K] [kJ/mol].

        Raises
        ------
        MissingDataError
            Outside the range of the data of a species, unless `extrapolate`.
        """
        return self._part(t, extrapolate).h(t)

    def ds(self, t: float, *, extrapolate: bool = False) -> float:
        """ΔS° at t [K] [J/(mol K)]."""
        return self._part(t, extrapolate).s(t)

    def dg(self, t: float, *, extrapolate: bool = False) -> float:
        """ΔG° at t [K] [kJ/mol]."""
        part = self._part(t, extrapolate)
        return part.h(t) - t * part.s(t) / 1000.0

    def dcp(self, t: float, *, extrapolate: bool = False) -> float:
        """ΔCp° at t [K] [J/(mol K)].

        Raises
        ------
        MissingDataError
            Also where the Cp of a species is unknown.
        """
        for data, _ in self.terms:
            if not data.cp_known:
                data.cp(t)
        return self._part(t, extrapolate).cp(t)

    def ln_k(self, t: float, *, extrapolate: bool = False) -> float:
        """Ln K° at t [K], −ΔG°/(R T).

        Examples
        --------
        >>> from xleq.reactions import parse_reaction
        >>> shift = reaction_data(parse_reaction("CO + H2O = CO2 + H2", "g"))
        >>> round(shift.ln_k(1000.0) / math.log(10), 3)
        0.155
        """
        part = self._part(t, extrapolate)
        return (part.s(t) - 1000.0 * part.h(t) / t) / R

    def dln_k_dt(self, t: float, *, extrapolate: bool = False) -> float:
        """Slope d ln K°/dT at t [K], ΔH°/(R T²) [1/K]."""
        return self._part(t, extrapolate).h(t) * 1000.0 / (R * t * t)

    def log10_k(self, t: float, *, extrapolate: bool = False) -> float:
        """Log10 K° at t [K]."""
        return self.ln_k(t, extrapolate=extrapolate) / _LN10

    def ln_k_many(self, t: Array, *, extrapolate: bool = False) -> Array:
        """Ln K° at temperatures t [n] K.

        Parameters
        ----------
        t : array [n]

        Raises
        ------
        MissingDataError
            If one of them lies outside the range, unless `extrapolate`.
        """
        if not extrapolate and t.size and not (self.t_min <= t.min() and t.max() <= self.t_max):
            worst = float(t.min()) if not self.t_min <= t.min() else float(t.max())
            raise MissingDataError(self._range_text(worst))
        which = np.searchsorted(self.breaks, t, side="right")
        x = t / 1000.0
        a, b, c, d, e, f, g = np.array([i[2:] for i in self.intervals])[which].T
        s = a * np.log(x) + x * (b + x * (c / 2 + x * d / 3)) - e / (2 * x * x) + g
        h = x * (a + x * (b / 2 + x * (c / 3 + x * d / 4))) - e / x + f
        result: Array = (s - h / x) / R
        return result

    def notes(self, t: float) -> tuple[str, ...]:
        """What a checker should know at t [K]: extrapolation, and the notes of the species."""
        found = [
            f"{d.key} extrapolated to {t:g} K: its data hold from {d.t_min:g} to {d.t_max:g} K"
            for d, _ in self.terms
            if not d.t_min <= t <= d.t_max
        ]
        return (*found, *(f"{d.key}: {d.note}" for d, _ in self.terms if d.note))

    def sources(self) -> tuple[str, ...]:
        """One line for each species: the source codes of its ΔfH°, S° and Cp."""
        return tuple(
            f"{d.key}: dHf {d.sources.dhf}, S {d.sources.s}, Cp {d.sources.cp or 'unknown'}"
            for d, _ in self.terms
        )


@lru_cache(maxsize=4096)
def reaction_data(reaction: Reaction, table: Table | None = None, default_phase: Phase = "g") -> ReactionData:
    """The formation data of a reaction, ready to be asked at any temperature.

    Parameters
    ----------
    reaction : Reaction
        As ``xleq.reactions.parse_reaction`` gives it.
    table : Table, optional
        The built-in one by default.
    default_phase : {"g", "l", "s", "aq"}
        Of species without a phase.

    Raises
    ------
    MissingDataError
        If a species is not in the table.
    InputError
        If electrons take part: a half reaction has no K of its own from these data.
    """
    table = table or standard_table()
    terms: list[tuple[SpeciesData, float]] = []
    for species, nu in zip(reaction.species, reaction.nu, strict=True):
        if species.electron:
            raise InputError(
                f"{reaction.text!r}: a half reaction; combine it with another, so that e- cancels"
            )
        if nu:
            terms.append((table.find(species, default_phase), float(nu)))
    return _summed(reaction.text, tuple(terms))


def _summed(text: str, terms: tuple[tuple[SpeciesData, float], ...]) -> ReactionData:
    t_min = max(d.t_min for d, _ in terms)
    t_max = min(d.t_max for d, _ in terms)
    breaks = sorted({i.t_min for d, _ in terms for i in d.intervals[1:]})
    intervals = []
    for low, high in zip([-math.inf, *breaks], [*breaks, math.inf], strict=True):
        inside = low if math.isfinite(low) else (breaks[0] - 1.0 if breaks else 298.15)
        rows = [(d.interval(inside, extrapolate=True), nu) for d, nu in terms]
        sums = [math.fsum(nu * row[k] for row, nu in rows) for k in range(2, 9)]
        intervals.append(Interval(low, high, *sums))
    return ReactionData(text, terms, tuple(intervals), tuple(breaks), t_min, t_max)
