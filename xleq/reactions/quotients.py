"""What a reaction's constant is made of: phases that count, the change of gas, the expression as text."""

from __future__ import annotations

import re
from dataclasses import replace
from fractions import Fraction
from functools import lru_cache
from typing import Final

from xleq.errors import InputError
from xleq.reactions.equations import Reaction, parse_reaction, with_species
from xleq.reactions.species import Phase, Species

_LABEL: Final = re.compile(r"\s*(K°?|Kp|Kc|Kx)\s*(\[[^\[\]]*\])?\s*")


@lru_cache(maxsize=16384)
def natural_phases(text: str) -> Reaction:
    """A reaction whose species without a phase are gases, or solutes if an ion takes part (water: solvent).

    For functions that are neither of gases nor of solutions. Where a dissolved species is marked `(aq)`, a
    neutral one without a phase could be either, and is refused.

    Parameters
    ----------
    text : str
        Reaction text.

    Raises
    ------
    ParseError
        If the text cannot be read.
    InputError
        If the phase of a species is open.

    Examples
    --------
    >>> [s.key for s in natural_phases("N2 + 3 H2 = 2 NH3").species]
    ['N2(g)', 'H2(g)', 'NH3(g)']
    >>> [s.key for s in natural_phases("AgCl(s) = Ag+ + Cl-").species]
    ['AgCl(s)', 'Ag+(aq)', 'Cl-(aq)']
    """
    bare = parse_reaction(text)
    ions = any(s.charge and not s.electron and s.phase != "g" for s in bare.species)
    dissolved = any(s.phase == "aq" for s in bare.species)
    open_phase = [s.name for s in bare.species if s.phase is None and not s.charge and s.name != "H2O"]
    if dissolved and open_phase:
        raise InputError(
            f"{text!r}: {open_phase[0]} has no phase while others are dissolved; "
            f"write {open_phase[0]}(g), {open_phase[0]}(l) or {open_phase[0]}(aq)"
        )
    return dissolved_phases(text) if ions or dissolved else parse_reaction(text, "g")


def dissolved_phases(text: str) -> Reaction:
    """A reaction in solution: species without a phase are solutes, but water is the pure solvent.

    Parameters
    ----------
    text : str
        Reaction text.

    Raises
    ------
    ParseError
        If the text cannot be read.

    Examples
    --------
    >>> [s.key for s in dissolved_phases("NH3 + H2O = NH4+ + OH-").species]
    ['NH3(aq)', 'H2O(l)', 'NH4+(aq)', 'OH-(aq)']
    """
    return with_species(parse_reaction(text, "aq"), solvent_settled)


def solvent_settled(species: Species) -> Species:
    """Water that is a solute only by default is the solvent; any other species is returned as it came.

    Examples
    --------
    >>> from xleq.reactions.species import parse_species
    >>> solvent_settled(parse_species("H2O", "aq")).key, solvent_settled(parse_species("H2O(aq)")).key
    ('H2O(l)', 'H2O(aq)')
    """
    if species.name == "H2O" and not species.marked:
        return replace(species, phase="l")
    return species


def phase_change(reaction: Reaction, phase: Phase) -> Fraction:
    """Sum of the coefficients of the species of one phase.

    Parameters
    ----------
    reaction : Reaction
        With the phase of every species known.
    phase : {"g", "l", "s", "aq"}

    Examples
    --------
    >>> phase_change(natural_phases("AgCl(s) = Ag+ + Cl-"), "aq")
    Fraction(2, 1)
    """
    pairs = zip(reaction.species, reaction.nu, strict=True)
    return sum((nu for s, nu in pairs if s.phase == phase), Fraction(0))


def gas_change(reaction: Reaction) -> Fraction:
    """Moles of gas made minus moles of gas used [-].

    Examples
    --------
    >>> gas_change(natural_phases("CaCO3(s) = CaO(s) + CO2")), gas_change(natural_phases("N2+3H2=2NH3"))
    (Fraction(1, 1), Fraction(-2, 1))
    """
    return phase_change(reaction, "g")


def liquids_mix(reaction: Reaction) -> bool:
    """Whether the liquids are all the fluid there is, so that a constant on fractions is of their mixture.

    Examples
    --------
    >>> liquids_mix(parse_reaction("CH3COOH(l) + C2H5OH(l) = CH3COOC2H5(l) + H2O(l)"))
    True
    """
    phases = {s.phase for s, nu in zip(reaction.species, reaction.nu, strict=True) if nu}
    return "l" in phases and phases <= {"l", "s"}


def expression(reaction: Reaction, basis: str = "K", mixed_liquid: bool = False) -> str:
    """The equilibrium-constant expression as text; pure solids and liquids and electrons are left out.

    Parameters
    ----------
    reaction : Reaction
        With the phase of every species known.
    basis : str
        ``K`` (activities), ``Kp`` (pressures of gases, concentrations of solutes), ``Kc`` or ``Kx``, with a
        unit or without: it is what stands on the left.
    mixed_liquid : bool
        Whether the liquids are one mixture, and so not pure.

    Raises
    ------
    InputError
        If the basis is none of these.

    Examples
    --------
    >>> expression(parse_reaction("N2 + 3 H2 = 2 NH3", "g"))
    'K = a(NH3)^2 / (a(N2) a(H2)^3)'
    >>> expression(parse_reaction("CaCO3(s) = CaO(s) + CO2", "g"), "Kp[bar]")
    'Kp[bar] = p(CO2)'
    >>> expression(parse_reaction("H2 + 1/2 O2 = H2O", "g"), "Kc")
    'Kc = [H2O] / ([H2] [O2]^(1/2))'
    """
    match = _LABEL.fullmatch(basis)
    if match is None or (match[1] in ("K", "K°", "Kx") and match[2]):
        raise InputError(f"{basis!r} is not a basis; known are K, Kp[bar], Kp[atm], Kc[mol/L], Kx")
    names = [s.name for s in reaction.species]
    above: list[str] = []
    below: list[str] = []
    for species, nu in zip(reaction.species, reaction.nu, strict=True):
        if not nu or species.electron or (species.pure and not (mixed_liquid and species.phase == "l")):
            continue
        name = species.name if names.count(species.name) == 1 else species.key
        factor = _factor(match[1], species, name) + _power(abs(nu))
        (above if nu > 0 else below).append(factor)
    label = basis.strip()
    top = " ".join(above) or "1"
    if not below:
        return f"{label} = {top}"
    bottom = " ".join(below)
    return f"{label} = {top} / ({bottom})" if len(below) > 1 else f"{label} = {top} / {bottom}"


def _factor(kind: str, species: Species, name: str) -> str:
    if kind == "Kp":
        return f"p({name})" if species.phase != "aq" else f"[{name}]"
    if kind == "Kc":
        return f"[{name}]"
    return f"{'x' if kind == 'Kx' else 'a'}({name})"


def _power(exponent: Fraction) -> str:
    if exponent == 1:
        return ""
    return f"^{exponent}" if exponent.denominator == 1 else f"^({exponent})"


def find_species(reaction: Reaction, wanted: Species) -> Species:
    """The species of a reaction that a name means; a phase may be left out where only one fits.

    Parameters
    ----------
    reaction : Reaction
    wanted : Species
        Read without a default phase.

    Raises
    ------
    InputError
        If it does not occur, or in several phases.

    Examples
    --------
    >>> reaction = natural_phases("CaCO3(s) = CaO(s) + CO2")
    >>> find_species(reaction, parse_reaction("CO2 = CaO(s)").species[0]).key
    'CO2(g)'
    """
    fits = [s for s in reaction.species if s.name == wanted.name and wanted.phase in (None, s.phase)]
    if not fits:
        known = ", ".join(s.text for s in reaction.species)
        raise InputError(f"{wanted.text} is not in {reaction.text!r}; its species are {known}")
    if len(fits) > 1:
        raise InputError(f"{wanted.text} is in {reaction.text!r} in {len(fits)} phases; write its phase")
    return fits[0]
