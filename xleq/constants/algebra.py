"""Constants scaled, summed, moved in temperature; Gibbs energy, quotient and affinity. All in ln K."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from fractions import Fraction

from xleq.errors import InputError, OutOfRangeError
from xleq.reactions import Reaction, Species
from xleq.units import R


def ln_k_scaled(ln_k: float, factor: float) -> float:
    """Ln K of a reaction times a factor.

    Parameters
    ----------
    ln_k : float
        Of the reaction as written. [-]
    factor : float
        -1 reverses the reaction, 0.5 halves it. Finite, not 0. [-]

    Raises
    ------
    InputError
        If the factor is 0 or not finite.

    Examples
    --------
    >>> ln_k_scaled(2.0, -0.5)
    -1.0
    """
    if not math.isfinite(factor) or factor == 0.0:
        raise InputError(f"the factor is {factor:g}; it must be finite and not 0")
    return ln_k * factor


def ln_k_combined(ln_ks: Sequence[float], multipliers: Sequence[Fraction]) -> float:
    """Ln K of a sum of reactions, each times its multiplier.

    Parameters
    ----------
    ln_ks : sequence [n_reactions] of float
    multipliers : sequence [n_reactions] of Fraction

    Raises
    ------
    InputError
        If the lengths differ.

    Examples
    --------
    >>> ln_k_combined([2.0, 3.0], [Fraction(1), Fraction(-1, 2)])
    0.5
    """
    if len(ln_ks) != len(multipliers):
        raise InputError(f"reactions: {len(multipliers)}, constants: {len(ln_ks)}; one is needed for each")
    return math.fsum(float(m) * ln_k for m, ln_k in zip(multipliers, ln_ks, strict=True) if m)


def ln_k_at(ln_k: float, t_of_k: float, t: float, dh: float, dcp: float = 0.0) -> float:
    """Ln K° at another temperature: van 't Hoff's equation with ΔH, or ΔCp, constant.

    d ln K/dT = ΔH(T)/(R T²) with ΔH(T) = ΔH + ΔCp (T - T_K), integrated from T_K to T (IUPAC, Quantities,
    Units and Symbols in Physical Chemistry, 3rd ed., 2007, section 2.11.1).

    Parameters
    ----------
    ln_k : float
        At `t_of_k`. [-]
    t_of_k, t : float
        Absolute temperatures. [K]  Must be > 0.
    dh : float
        Enthalpy of reaction at `t_of_k`. [kJ/mol]
    dcp : float
        Heat capacity of reaction. [J/(mol K)]

    Raises
    ------
    OutOfRangeError
        If a temperature is not above 0.

    Examples
    --------
    >>> round(ln_k_at(0.0, 300.0, 310.0, 50.0), 6)
    0.646626
    """
    _check_temperature(t_of_k)
    _check_temperature(t)
    by_enthalpy = 1000.0 * dh / R * ((t - t_of_k) / (t * t_of_k))
    # ln(T/T_K) - (1 - T_K/T), through x = (T - T_K)/T, whose error vanishes as T nears T_K.
    x = (t - t_of_k) / t
    by_capacity = dcp / R * (-math.log1p(-x) - x) if dcp else 0.0
    return ln_k + by_enthalpy + by_capacity


def ln_k_from_dg(dg: float, t: float) -> float:
    """Ln K° from the standard Gibbs energy of reaction, -ΔG°/(R T).

    Parameters
    ----------
    dg : float
        [kJ/mol]
    t : float
        Absolute temperature. [K]  Must be > 0.

    Raises
    ------
    OutOfRangeError
        If the temperature is not above 0.

    Examples
    --------
    >>> round(ln_k_from_dg(-5.708010, 298.15) / math.log(10), 6)
    1.0
    """
    _check_temperature(t)
    return -1000.0 * dg / (R * t)


def dg_from_ln_k(ln_k: float, t: float) -> float:
    """Standard Gibbs energy of reaction from ln K°, -R T ln K° [kJ/mol].

    Parameters
    ----------
    ln_k : float
        [-]
    t : float
        Absolute temperature. [K]  Must be > 0.

    Raises
    ------
    OutOfRangeError
        If the temperature is not above 0.

    Examples
    --------
    >>> round(dg_from_ln_k(math.log(10), 298.15), 6)
    -5.70801
    """
    _check_temperature(t)
    return -R * t * ln_k / 1000.0


def affinity(ln_k: float, ln_q: float, t: float) -> float:
    """Affinity R T (ln K - ln Q) [kJ/mol]; positive where the reaction runs forward.

    Parameters
    ----------
    ln_k, ln_q : float
        Of constant and quotient on the same basis. [-]
    t : float
        Absolute temperature. [K]  Must be > 0.

    Raises
    ------
    OutOfRangeError
        If the temperature is not above 0.

    Examples
    --------
    >>> round(affinity(math.log(10), 0.0, 298.15), 6)
    5.70801
    """
    _check_temperature(t)
    return R * t * (ln_k - ln_q) / 1000.0


def ln_quotient(
    reaction: Reaction, ln_activities: Mapping[Species, float], mixed_liquid: bool = False
) -> float:
    """Ln of the reaction quotient; pure phases and electrons are left out.

    Parameters
    ----------
    reaction : Reaction
        With the phase of every species known.
    ln_activities : mapping of Species to float
        ln a of every species that counts; -inf for one that is absent. [-]
    mixed_liquid : bool
        Whether the liquids are one mixture, and so not pure.

    Returns
    -------
    float
        ln Q, -inf where only products are absent. [-]

    Raises
    ------
    InputError
        If the activity of a species is not given.
    OutOfRangeError
        If a reactant is absent, so that Q has no bound or no value.

    Examples
    --------
    >>> from xleq.reactions import parse_reaction
    >>> reaction = parse_reaction("N2O4 = 2 NO2", "g")
    >>> n2o4, no2 = reaction.species
    >>> round(math.exp(ln_quotient(reaction, {n2o4: math.log(0.25), no2: math.log(0.5)})), 12)
    1.0
    """
    terms: list[float] = []
    absent: list[Species] = []
    for species, nu in zip(reaction.species, reaction.nu, strict=True):
        if not nu or species.electron or (species.pure and not (mixed_liquid and species.phase == "l")):
            continue
        if species not in ln_activities:
            raise InputError(f"{species.text} takes part in {reaction.text!r}, but its amount is not given")
        ln_a = ln_activities[species]
        if ln_a == -math.inf:
            absent.append(species)
            if nu < 0:
                raise OutOfRangeError(
                    f"{species.text} is absent and a reactant, so the quotient has no bound"
                )
        else:
            terms.append(float(nu) * ln_a)
    return -math.inf if absent else math.fsum(terms)


def _check_temperature(t: float) -> None:
    if not (t > 0.0 and math.isfinite(t)):
        raise OutOfRangeError(f"the temperature is {t:g} K; it must be above 0 K")
