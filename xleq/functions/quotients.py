"""Reaction quotients from the amounts that a sheet lists."""

from __future__ import annotations

import math
from collections.abc import Sequence

from xleq.constants import Basis, ln_factor_of, ln_quotient
from xleq.errors import InputError, OutOfRangeError
from xleq.reactions import (
    Phase,
    Reaction,
    Species,
    check_balance,
    dissolved_phases,
    liquids_mix,
    parse_reaction,
    parse_species,
    solvent_settled,
)
from xleq.units import P_STANDARD_BAR, R_L_BAR


def ln_q_of(
    reaction: str,
    species: Sequence[str],
    amounts: Sequence[float],
    p: float | None,
    t: float | None,
    basis: Basis,
) -> float:
    """Ln of a reaction quotient.

    Parameters
    ----------
    reaction : str
        Reaction text.
    species : sequence [n_species] of str
        Inert species count towards the total of the gas or the liquid mixture.
    amounts : sequence [n_species] of float
        With `p` moles of a gas mixture [mol]; on Kx without `p` moles of a liquid mixture [mol]; else
        concentrations [mol/L].
    p : float, optional
        Absolute pressure. [bar]
    t : float, optional
        Temperature. [K]
    basis : Basis
        Of the quotient.

    Returns
    -------
    float
        -inf where a product is absent. [-]

    Raises
    ------
    InputError
        If the reaction cannot be read or does not balance, a species is missing, doubled or of another
        phase, or T is needed and not given.
    OutOfRangeError
        If a reactant is absent, or there is nothing at all.

    Examples
    --------
    >>> round(math.exp(ln_q_of("N2O4 = 2 NO2", ("N2O4", "NO2"), (1.0, 1.0), 2.0, None, Basis("K"))), 12)
    1.0
    """
    if p is not None:
        return _of_gas(parse_reaction(reaction, "g"), species, amounts, p, t, basis)
    if basis.kind == "Kx":
        return _of_mixture(parse_reaction(reaction, "l"), species, amounts)
    return _of_concentrations(reaction, species, amounts, t, basis)


def _of_gas(
    reaction: Reaction,
    species: Sequence[str],
    amounts: Sequence[float],
    p: float,
    t: float | None,
    basis: Basis,
) -> float:
    check_balance(reaction)
    read = _read(species, "g")
    for s in (*read, *reaction.species):
        if s.phase == "aq":
            raise InputError(f"{s.key} does not belong here: amounts with a pressure are those of a gas")
    fractions = _ln_fractions(read, amounts, "g")
    ln_a = {s: x + math.log(p / P_STANDARD_BAR) for s, x in fractions.items()}
    return ln_quotient(reaction, ln_a) + ln_factor_of(basis, reaction, t, p)


def _of_mixture(reaction: Reaction, species: Sequence[str], amounts: Sequence[float]) -> float:
    check_balance(reaction)
    read = _read(species, "l")
    for s in (*read, *reaction.species):
        if s.phase in ("g", "aq"):
            raise InputError(f"{s.key} does not belong here: Kx without P is that of a liquid mixture")
    return ln_quotient(reaction, _ln_fractions(read, amounts, "l"), mixed_liquid=True)


def _of_concentrations(
    text: str, species: Sequence[str], amounts: Sequence[float], t: float | None, basis: Basis
) -> float:
    reaction = dissolved_phases(text)
    check_balance(reaction)
    if liquids_mix(reaction):
        raise InputError(
            f"{text!r}: every liquid is pure here, so the quotient is 1; for a liquid mixture ask for Kx"
        )
    ln_a: dict[Species, float] = {}
    for s, c in zip(map(solvent_settled, _read(species, "aq")), amounts, strict=True):
        ln_a[s] = math.log(c / basis.size if basis.kind == "Kc" else c) if c > 0.0 else -math.inf
        if s.phase == "g" and basis.kind != "Kc" and reaction.coefficient(s):
            if t is None:
                raise InputError(f"T is needed to turn the concentration of {s.text} into its activity")
            ln_a[s] += math.log(R_L_BAR * t / P_STANDARD_BAR)
    shift = 0.0 if basis.kind == "Kc" else ln_factor_of(basis, reaction, t)
    return ln_quotient(reaction, ln_a) + shift


def _read(species: Sequence[str], default_phase: Phase) -> list[Species]:
    read = [parse_species(text, default_phase) for text in species]
    for i, s in enumerate(read):
        if s in read[:i]:
            raise InputError(f"species {species[i]} is in the list twice")
    return read


def _ln_fractions(species: Sequence[Species], amounts: Sequence[float], phase: Phase) -> dict[Species, float]:
    """Ln of each mole fraction within one phase; -inf for what is absent."""
    mixed = [(s, n) for s, n in zip(species, amounts, strict=True) if s.phase == phase]
    total = math.fsum(n for _, n in mixed)
    if not 0.0 < total < math.inf:
        raise OutOfRangeError("the amounts add up to nothing, so there are no mole fractions")
    return {s: math.log(n / total) if n / total > 0.0 else -math.inf for s, n in mixed}
