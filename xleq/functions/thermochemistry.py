"""Worksheet functions about formation data: species, reactions, constants, fugacity coefficients."""

from __future__ import annotations

import math
from typing import Final

import numpy as np

from xleq.cells import Grid, Value
from xleq.constants import write_k
from xleq.errors import InputError
from xleq.functions.composition import DATA, SPECIES, T
from xleq.functions.conditions import table_of
from xleq.functions.reactions import REACTION, balanced_reaction
from xleq.functions.table import Argument, Example, Function, tell
from xleq.reactions import molar_mass, parse_species
from xleq.thermo import ReactionData, SpeciesData, citations, reaction_data

_SOURCE: Final = (
    "formation enthalpies, entropies and heat capacities of the built-in table, a source for each number "
    "(property `source`); integrals of Cp as in Smith, Van Ness and Abbott, Introduction to Chemical "
    "Engineering Thermodynamics, 7th ed., 2005, ch. 4 and 13"
)
_MISSING: Final = "#N/A a species is not in the data, or T lies outside their range"
_T_STANDARD: Final = Argument("T", "temperature", "temperature", 298.15, unit="K")
_SPECIES_PROPERTIES: Final = ("dHf", "S", "Cp", "H", "G", "molar_mass", "T_min", "T_max", "source")
_REACTION_PROPERTIES: Final = ("dH", "dS", "dG", "dCp", "lnK", "log10K")


def _data_of(reaction: str, data: Grid | None) -> ReactionData:
    return reaction_data(balanced_reaction(reaction), table_of(data))


def _k_data(reaction: str, t: float, data: Grid | None) -> float | str:
    found = _data_of(reaction, data)
    tell((*found.sources(), *found.notes(t)))
    return write_k(found.ln_k(t))


def _reaction(reaction: str, property: str, t: float, data: Grid | None) -> float:  # noqa: A002 - its name in cells
    found = _data_of(reaction, data)
    tell((*found.sources(), *found.notes(t)))
    if property == "dH":
        return found.dh(t)
    if property == "dS":
        return found.ds(t)
    if property == "dG":
        return found.dg(t)
    if property == "dCp":
        return found.dcp(t)
    return found.ln_k(t) if property == "lnK" else found.log10_k(t)


def _species(species: str, property: str, t: float, data: Grid | None) -> float | str:  # noqa: A002
    read = parse_species(species)
    if property == "molar_mass":
        return molar_mass(read.name)
    # An ion without a phase is dissolved, here as in reactions.
    found = table_of(data).find(species, "aq" if read.charge else "g")
    tell([f"{found.key}: {found.note}"] if found.note else [])
    if property == "source":
        return _source_of(found)
    fixed = {"dHf": found.dhf, "T_min": found.t_min, "T_max": found.t_max}
    if property in fixed:
        return fixed[property]
    at_t = {"S": found.s, "Cp": found.cp, "H": found.h, "G": found.g}
    return at_t[property](t)


def _source_of(found: SpeciesData) -> str:
    known = citations()
    parts = (("dHf", found.sources.dhf), ("S", found.sources.s), ("Cp", found.sources.cp))
    said = "; ".join(f"{what}: {known.get(code, code)}" for what, code in parts if code)
    return f"{said}; note: {found.note}" if found.note else said


def _fugacity_coefficient(
    species: tuple[str, ...], fractions: tuple[float, ...], t: float, p: float, data: Grid | None
) -> list[Value]:
    from xleq.activity import FluidState, peng_robinson

    if len(fractions) > len(species) and not any(fractions[len(species) :]):
        fractions = fractions[: len(species)]
    if len(fractions) != len(species):
        raise InputError(
            f"{len(species)} species but {len(fractions)} fractions; give one fraction a species"
        )
    total = math.fsum(fractions)
    if abs(total - 1.0) > 1e-6:
        raise InputError(f"the fractions sum to {total:.8g}; they must sum to 1")
    read = [parse_species(s, "g") for s in species]
    for s in read:
        if s.phase != "g":
            raise InputError(f"{s.key} is not a gas")
    model = peng_robinson([s.key for s in read], [True] * len(read), table_of(data))
    n, state = np.array(fractions), FluidState("P", t, p)
    tell(model.notes(n, state))
    return [float(x) for x in np.exp(model.ln_gamma(n, state))]


FUNCTIONS: Final = (
    Function(
        "XLEQ_K_DATA",
        "thermochemistry",
        (REACTION, T, DATA),
        "K on p° = 1 bar and c° = 1 mol/L [-]",
        _k_data,
        ("#VALUE! the reaction cannot be read or does not balance", _MISSING),
        _SOURCE,
        (Example('=ROUND(LOG10(XLEQ_K_DATA("CO + H2O = CO2 + H2", 1000)), 3)', 0.155),),
    ),
    Function(
        "XLEQ_REACTION",
        "thermochemistry",
        (
            REACTION,
            Argument("property", "word", "what is wanted", known=_REACTION_PROPERTIES),
            _T_STANDARD,
            DATA,
        ),
        "dH, dG [kJ/mol], dS, dCp [J/(mol K)], lnK or log10K [-] at T",
        _reaction,
        ("#VALUE! the reaction cannot be read or does not balance; an unknown property", _MISSING),
        _SOURCE,
        (Example('=XLEQ_REACTION("N2 + 3 H2 = 2 NH3", "dH")', -91.116),),
    ),
    Function(
        "XLEQ_SPECIES",
        "thermochemistry",
        (
            Argument("species", "text", "formula with its phase; without one a gas, or an ion in water"),
            Argument("property", "word", "what is wanted", known=_SPECIES_PROPERTIES),
            _T_STANDARD,
            DATA,
        ),
        "dHf (298.15 K), H, G [kJ/mol], S, Cp [J/(mol K)] at T, molar_mass [g/mol], T_min, T_max or source",
        _species,
        ("#VALUE! the species cannot be read; an unknown property", _MISSING),
        _SOURCE,
        (Example('=XLEQ_SPECIES("CO2", "dHf")', -393.474),),
    ),
    Function(
        "XLEQ_FUGACITY_COEFFICIENT",
        "thermochemistry",
        (
            SPECIES,
            Argument("fractions", "fractions", "mole fraction of each, summing to 1; an empty cell is 0"),
            T,
            Argument("P", "pressure", "pressure", unit="bar"),
            DATA,
        ),
        "fugacity coefficient of each species in the mixture [-]",
        _fugacity_coefficient,
        (
            "#VALUE! lists of unequal length; fractions that do not sum to 1",
            "#N/A a species has no critical constants in the data",
        ),
        "Peng and Robinson, Ind. Eng. Chem. Fundam. 15 (1976) 59; the vapour-like root",
        (Example('=ROUND(XLEQ_FUGACITY_COEFFICIENT("NH3", 1, "400 degC", 200), 3)', 0.921),),
    ),
)
