"""Bases on which a constant may be written, and the way from one to another. All in ln K.

K° is on activities: gases on p/p° with p° = 1 bar, solutes on c/c° with c° = 1 mol/L, pure solids and liquids
1. With Δν the change in moles of gas and Δν_aq that of solutes:

- ``Kp[u]``: gases as partial pressures in u, solutes as on c°:   Kp = K° (p°/u)^Δν
- ``Kc[u]``: gases and solutes as concentrations in u:            Kc = K° (p°/(R T u))^Δν (c°/u)^Δν_aq
- ``Kx``: gases as mole fractions at total pressure P:            Kx = K° (p°/P)^Δν

(IUPAC, Quantities, Units and Symbols in Physical Chemistry, 3rd ed., 2007, section 2.11.1, for the
quotients; the factors follow from p = c R T and p = x P of ideal gases.)
"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass
from functools import lru_cache
from typing import Final, Literal

from xleq.errors import InputError, UnitError
from xleq.reactions import Reaction, phase_change
from xleq.units import C_STANDARD, P_STANDARD_BAR, R_L_BAR, to_default

BasisKind = Literal["K", "Kp", "Kc", "Kx"]

_BASIS: Final = re.compile(r"\s*(K°?|Kp|Kc|Kx)\s*(?:\[\s*([^\[\]]*?)\s*\])?\s*", re.IGNORECASE)
_KINDS: Final[dict[str, BasisKind]] = {"k": "K", "k°": "K", "kp": "Kp", "kc": "Kc", "kx": "Kx"}
_KNOWN: Final = "K, Kp[bar], Kp[atm], Kp[kPa], Kc[mol/L], Kc[mol/m3], Kx"


@dataclass(frozen=True, slots=True)
class Basis:
    """A basis of equilibrium constants.

    Parameters
    ----------
    kind : {"K", "Kp", "Kc", "Kx"}
    unit : str
        Unit of Kp or Kc; empty for the others.
    size : float
        The unit in bar or in mol/L; 1 for the others.
    """

    kind: BasisKind
    unit: str = ""
    size: float = 1.0

    def __str__(self) -> str:
        return f"{self.kind}[{self.unit}]" if self.unit else self.kind


STANDARD: Final = Basis("K")


@lru_cache(maxsize=1024)
def parse_basis(text: str) -> Basis:
    """A basis from its text.

    Parameters
    ----------
    text : str
        ``K``, ``Kp[unit]`` with an absolute pressure unit, ``Kc[unit]`` or ``Kx``.

    Raises
    ------
    InputError
        If it is none of these, or lacks its unit.
    UnitError
        If the unit is unknown, or counts from atmospheric pressure.

    Examples
    --------
    >>> parse_basis("Kp[atm]")
    Basis(kind='Kp', unit='atm', size=1.01325)
    """
    match = _BASIS.fullmatch(text)
    if match is None:
        raise InputError(f"{text!r} is not a basis; known are {_KNOWN}")
    kind, unit = _KINDS[match[1].lower()], match[2]
    if kind in ("K", "Kx"):
        if unit is not None:
            raise InputError(f"{text!r}: {kind} has no unit; known bases are {_KNOWN}")
        return Basis(kind)
    if not unit:
        raise InputError(f"{text!r} lacks its unit; write {kind}[{'bar' if kind == 'Kp' else 'mol/L'}]")
    return Basis(kind, unit, pressure_size(unit) if kind == "Kp" else concentration_size(unit))


def pressure_size(unit: str) -> float:
    """One absolute pressure unit in bar.

    Raises
    ------
    UnitError
        If the unit is unknown, or counts from atmospheric pressure.

    Examples
    --------
    >>> pressure_size("atm"), pressure_size("kPa")
    (1.01325, 0.01)
    """
    zero = to_default(0.0, unit, "pressure")
    if zero != 0.0:
        raise UnitError(f"{unit!r} counts from atmospheric pressure; a constant needs an absolute unit")
    return to_default(1.0, unit, "pressure")


def concentration_size(unit: str) -> float:
    """One concentration unit in mol/L.

    Raises
    ------
    UnitError
        If the unit is unknown.

    Examples
    --------
    >>> round(concentration_size("mol/m3"), 12)
    0.001
    """
    return to_default(1.0, unit, "concentration")


def ln_factor(
    basis: Basis, gas: float, solutes: float = 0.0, t: float | None = None, p: float | None = None
) -> float:
    """Ln of the constant on a basis minus ln K°.

    Parameters
    ----------
    basis : Basis
    gas : float
        Change in moles of gas. [-]
    solutes : float
        Change in moles of solutes. [-]
    t : float, optional
        Temperature; needed for Kc where gas changes. [K]
    p : float, optional
        Absolute pressure; needed for Kx where gas changes. [bar]

    Raises
    ------
    InputError
        If T or P is needed and not given, or if Kx is wanted where solutes change.

    Examples
    --------
    >>> round(ln_factor(parse_basis("Kp[atm]"), 1.0), 8)
    -0.01316299
    """
    if basis.kind == "Kp":
        return gas * math.log(P_STANDARD_BAR / basis.size) if gas else 0.0
    if basis.kind == "Kc":
        shift = solutes * math.log(C_STANDARD / basis.size) if solutes else 0.0
        if gas:
            if t is None:
                raise InputError(f"T is needed to convert {basis}, as the moles of gas change by {gas:g}")
            shift += gas * math.log(P_STANDARD_BAR / (R_L_BAR * t * basis.size))
        return shift
    if basis.kind == "Kx":
        if solutes:
            raise InputError(
                "Kx cannot be converted for solutes: their mole fractions depend on the solvent, which the "
                "reaction does not tell"
            )
        if gas:
            if p is None:
                raise InputError(f"P is needed to convert Kx, as the moles of gas change by {gas:g}")
            return gas * math.log(P_STANDARD_BAR / p)
    return 0.0


def ln_factor_of(basis: Basis, reaction: Reaction, t: float | None = None, p: float | None = None) -> float:
    """Ln of a reaction's constant on a basis minus its ln K°.

    Parameters
    ----------
    basis : Basis
    reaction : Reaction
        With the phase of every species known.
    t : float, optional
        Temperature. [K]
    p : float, optional
        Absolute pressure. [bar]

    Raises
    ------
    InputError
        As `ln_factor`.

    Examples
    --------
    >>> from xleq.reactions import parse_reaction
    >>> round(ln_factor_of(parse_basis("Kx"), parse_reaction("N2O4 = 2 NO2", "g"), p=10.0), 6)
    -2.302585
    """
    gas, solutes = phase_change(reaction, "g"), phase_change(reaction, "aq")
    return ln_factor(basis, float(gas), float(solutes), t, p)


def ln_k_converted(
    ln_k: float,
    reaction: Reaction,
    from_basis: Basis,
    to_basis: Basis,
    t: float | None = None,
    p: float | None = None,
) -> float:
    """Ln of a constant on another basis.

    Parameters
    ----------
    ln_k : float
        On `from_basis`. [-]
    reaction : Reaction
        With the phase of every species known.
    from_basis, to_basis : Basis
    t : float, optional
        Temperature. [K]
    p : float, optional
        Absolute pressure. [bar]

    Raises
    ------
    InputError
        As `ln_factor`.

    Examples
    --------
    >>> from xleq.reactions import parse_reaction
    >>> ammonia = parse_reaction("N2 + 3 H2 = 2 NH3", "g")
    >>> kc, kp = parse_basis("Kc[mol/L]"), parse_basis("Kp[atm]")
    >>> round(math.exp(ln_k_converted(math.log(9.6), ammonia, kc, kp, 573.0)), 5)
    0.00434
    """
    if from_basis == to_basis:
        return ln_k
    down = ln_factor_of(from_basis, reaction, t, p)
    return ln_k + (ln_factor_of(to_basis, reaction, t, p) - down)
