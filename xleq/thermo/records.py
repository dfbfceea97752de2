"""Formation data of one species, and its Cp, H, S and G at a temperature."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field
from fractions import Fraction
from typing import Final, NamedTuple

import numpy as np
from numpy.typing import NDArray

from xleq.errors import MissingDataError

#: Temperature of formation data. [K]
T_STANDARD: Final = 298.15

Array = NDArray[np.float64]


class Interval(NamedTuple):
    """Cp = A + B x + C x² + D x³ + E/x² with x = T/1000 K, and the constants of its integrals.

    H = A x + B x²/2 + C x³/3 + D x⁴/4 − E/x + F [kJ/mol], counted from the elements at 298.15 K;
    S = A ln x + B x + C x²/2 + D x³/3 − E/(2x²) + G [J/(mol K)]. The form is Shomate's, as the NIST
    Chemistry WebBook (SRD 69) uses it.
    """

    t_min: float
    t_max: float
    a: float
    b: float
    c: float
    d: float
    e: float
    f: float
    g: float

    def cp(self, t: float) -> float:
        """Heat capacity [J/(mol K)]."""
        x = t / 1000.0
        return self.a + x * (self.b + x * (self.c + x * self.d)) + self.e / (x * x)

    def h(self, t: float) -> float:
        """Enthalpy [kJ/mol]."""
        x = t / 1000.0
        return x * (self.a + x * (self.b / 2 + x * (self.c / 3 + x * self.d / 4))) - self.e / x + self.f

    def s(self, t: float) -> float:
        """Entropy [J/(mol K)]."""
        x = t / 1000.0
        powers = x * (self.b + x * (self.c / 2 + x * self.d / 3))
        return self.a * math.log(x) + powers - self.e / (2 * x * x) + self.g


class CpPart(NamedTuple):
    """Cp on one interval as a table gives it; `dh_tr` is the enthalpy of transition on entering [kJ/mol]."""

    t_min: float
    t_max: float
    coefficients: tuple[float, float, float, float, float]
    dh_tr: float = 0.0


def integrated(dhf: float, s: float, parts: tuple[CpPart, ...]) -> tuple[Interval, ...]:
    """Intervals whose H and S pass through ΔfH° and S° at 298.15 K and are joined at the breaks.

    Where the lowest part begins above 298.15 K its Cp is continued down to 298.15 K for the integration.

    Parameters
    ----------
    dhf : float
        ΔfH°(298.15 K). [kJ/mol]
    s : float
        S°(298.15 K). [J/(mol K)]
    parts : tuple of CpPart
        In rising order, each beginning where the one before ends.
    """
    start = 0
    while start + 1 < len(parts) and parts[start + 1].t_min <= T_STANDARD:
        start += 1
    bare = [Interval(p.t_min, p.t_max, *p.coefficients, 0.0, 0.0) for p in parts]
    first = bare[start]
    done = {start: first._replace(f=dhf - first.h(T_STANDARD), g=s - first.s(T_STANDARD))}
    for i in range(start + 1, len(parts)):
        t, below, jump = parts[i].t_min, done[i - 1], parts[i].dh_tr
        f = below.h(t) + jump - bare[i].h(t)
        done[i] = bare[i]._replace(f=f, g=below.s(t) + jump * 1000.0 / t - bare[i].s(t))
    for i in range(start - 1, -1, -1):
        t, above, jump = parts[i + 1].t_min, done[i + 1], parts[i + 1].dh_tr
        f = above.h(t) - jump - bare[i].h(t)
        done[i] = bare[i]._replace(f=f, g=above.s(t) - jump * 1000.0 / t - bare[i].s(t))
    return tuple(done[i] for i in range(len(parts)))


@dataclass(frozen=True, slots=True)
class Sources:
    """Codes of the sources of each number, as ``sources.csv`` explains them, or a user's own words."""

    dhf: str = ""
    s: str = ""
    cp: str = ""
    critical: str = ""


@dataclass(frozen=True, slots=True)
class SpeciesData:
    """Formation data of a species in one phase, at p° = 1 bar (solutes: c° = 1 mol/L, taken for 1 mol/kg).

    Parameters
    ----------
    key : str
        Formula and phase, as ``xleq.reactions`` spells them: ``"CO2(g)"``, ``"Ca+2(aq)"``.
    name : str
    dhf : float
        ΔfH° at 298.15 K. [kJ/mol]
    s298 : float
        S° at 298.15 K. [J/(mol K)]
    intervals : tuple of Interval
    cp_known : bool
        False where no source gives Cp: H and S are then constant on a narrow range.
    tc, pc, omega : float
        Critical temperature [K], critical pressure [bar], acentric factor [-]; nan where unknown.
    sources : Sources
    note : str
        What a checker should know: what other sources say, what was assumed.
    formula : mapping of str to Fraction, or None
        Atoms of each element.
    charge : int
    parts : tuple of CpPart
        Cp as given.
    """

    key: str
    name: str
    dhf: float
    s298: float
    intervals: tuple[Interval, ...]
    cp_known: bool = True
    tc: float = math.nan
    pc: float = math.nan
    omega: float = math.nan
    sources: Sources = field(default=Sources())
    note: str = ""
    formula: Mapping[str, Fraction] | None = field(default=None, compare=False)
    charge: int = 0
    parts: tuple[CpPart, ...] = field(default=(), compare=False)

    @property
    def t_min(self) -> float:
        """Lowest temperature of the data [K]."""
        return self.intervals[0].t_min

    @property
    def t_max(self) -> float:
        """Highest temperature of the data [K]."""
        return self.intervals[-1].t_max

    def interval(self, t: float, *, extrapolate: bool = False) -> Interval:
        """The interval that holds a temperature; the upper one at a break.

        Raises
        ------
        MissingDataError
            Outside the range of the data, unless `extrapolate`; then the nearest interval is continued.
        """
        if not (self.t_min <= t <= self.t_max) and not extrapolate:
            raise MissingDataError(out_of_range(self.key, t, self.t_min, self.t_max))
        found = self.intervals[0]
        for part in self.intervals[1:]:
            if t < part.t_min:
                break
            found = part
        return found

    def cp(self, t: float, *, extrapolate: bool = False) -> float:
        """Heat capacity at constant pressure [J/(mol K)].

        Raises
        ------
        MissingDataError
            Outside the range of the data, or where no source gives Cp.
        """
        if not self.cp_known:
            raise MissingDataError(
                f"{self.key}: no source gives its heat capacity; give it in the data range"
            )
        return self.interval(t, extrapolate=extrapolate).cp(t)

    def h(self, t: float, *, extrapolate: bool = False) -> float:
        """Enthalpy, counted from the elements at 298.15 K [kJ/mol]."""
        return self.interval(t, extrapolate=extrapolate).h(t)

    def s(self, t: float, *, extrapolate: bool = False) -> float:
        """Entropy [J/(mol K)]."""
        return self.interval(t, extrapolate=extrapolate).s(t)

    def g(self, t: float, *, extrapolate: bool = False) -> float:
        """Gibbs energy H − T S, with H counted from the elements at 298.15 K [kJ/mol].

        Examples
        --------
        >>> from xleq.thermo import standard_table
        >>> water = standard_table().find("H2O(g)")
        >>> round(water.h(298.15), 3), round(water.g(1000.0), 2)
        (-241.822, -448.56)
        """
        part = self.interval(t, extrapolate=extrapolate)
        return part.h(t) - t * part.s(t) / 1000.0

    def h_many(self, t: Array, *, extrapolate: bool = False) -> Array:
        """Enthalpies at many temperatures t [n] K [n, kJ/mol]."""
        if not extrapolate and t.size:
            for edge in (float(np.min(t)), float(np.max(t))):
                self.interval(edge)
        x = t / 1000.0
        which = np.searchsorted([i.t_min for i in self.intervals[1:]], t, side="right")
        a, b, c, d, e, f = np.array([i[2:8] for i in self.intervals])[which].T
        result: Array = x * (a + x * (b / 2 + x * (c / 3 + x * d / 4))) - e / x + f
        return result


def out_of_range(what: str, t: float, t_min: float, t_max: float) -> str:
    """The message for a temperature outside the range of data."""
    return (
        f"{what}: the data hold from {t_min:g} to {t_max:g} K, not at {t:g} K; "
        "give data for it, or allow extrapolation (extrapolate=yes)"
    )
