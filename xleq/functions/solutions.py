"""Worksheet functions about aqueous solutions: ionic strength, activity coefficients, pH."""

from __future__ import annotations

import math
from typing import Final

from xleq.activity import (
    activity_coefficient,
    check_neutral,
    ionic_strength,
    liquid_density,
    p_kw,
    ph,
    strength_notes,
)
from xleq.activity.aqueous import Model
from xleq.errors import InputError, OutOfRangeError
from xleq.functions.conditions import ACTIVITY_MODELS, Options, chosen
from xleq.functions.table import Argument, Example, Function, tell
from xleq.reactions import Species, parse_species
from xleq.units import read_quantity

Texts = tuple[str, ...]
Numbers = tuple[float, ...]

_SPECIES: Final = Argument("species", "texts", "solutes with their charges")
_CONCENTRATIONS: Final = Argument("concentrations", "concentrations", "concentration of each", unit="mol/L")
_MODELS: Final = (
    "Davies, Ion Association, Butterworths, 1962, p. 41 (coefficient 0.3; 0.2 in J. Chem. Soc. 1938, 2093); "
    "Debye-Hückel limiting law with A from the dielectric constant and density of water"
)
_UNREADABLE: Final = "#VALUE! a species cannot be read; lists of unequal length"
_BEYOND: Final = "#NUM! an ionic strength beyond the model's limit; a temperature at which water is no liquid"


#: Ions that neither take up nor give off protons in water, so that charge balance alone tells the pH.
#: F. A. Cotton and G. Wilkinson, Advanced Inorganic Chemistry, 5th ed., 1988, ch. 3 (from memory).
_INERT_IONS: Final = frozenset({"Li+", "Na+", "K+", "Rb+", "Cs+", "Cl-", "Br-", "I-", "NO3-", "ClO4-"})
#: Excess of charge, relative to all charge, that rounded concentrations in a sheet may show.
_ROUNDED: Final = 0.01
_PROTONS: Final = ("H+", "H3O+")


def _read(species: Texts, concentrations: Numbers) -> list[tuple[Species, float]]:
    """Each species with its concentration; pure phases are left out."""
    if len(concentrations) > len(species) and not any(concentrations[len(species) :]):
        concentrations = concentrations[: len(species)]
    if len(species) != len(concentrations):
        raise InputError(f"{len(species)} species but {len(concentrations)} concentrations; give one each")
    read = [parse_species(text, "aq") for text in species]
    for i, s in enumerate(read):
        if s in read[:i]:
            raise InputError(f"species {species[i]} is in the list twice")
        if s.electron:
            raise InputError("an electron has no concentration in water")
    return [(s, c) for s, c in zip(read, concentrations, strict=True) if s.phase == "aq"]


def _strength(solutes: list[tuple[Species, float]]) -> float:
    return ionic_strength([float(s.charge) for s, _ in solutes], [c for _, c in solutes])


def _ionic_strength(species: Texts, concentrations: Numbers) -> float:
    return _strength(_read(species, concentrations))


def _activity_coefficient(species: str, ionic_strength: float, t: float, model: str) -> float:
    return _gamma(float(parse_species(species, "aq").charge), ionic_strength, t, model, 0.3)


def _gamma(charge: float, strength: float, t: float, model: str, coefficient: float) -> float:
    if model == "ideal":
        return 1.0
    known: Model = "davies" if model == "davies" else "debye-huckel"
    tell(strength_notes(strength, known))
    return activity_coefficient(charge, strength, t, known, coefficient)


def _ph(species: Texts, concentrations: Numbers, options: Options) -> float:
    solutes = _read(species, concentrations)
    amount = {s.name: c for s, c in solutes}
    t = read_quantity(options.get("t", "298.15"), "temperature")
    model = chosen(options, "activity", ACTIVITY_MODELS)
    if "davies" in options and model != "davies":
        raise InputError("option davies is the coefficient of activity=davies; give that too")
    coefficient = float(chosen(options, "davies", ("0.3", "0.2")))
    listed = [name for name in _PROTONS if name in amount]
    if len(listed) > 1:
        raise InputError("H+ and H3O+ are the same ion; list one of them")
    if model != "ideal" and (listed or "OH-" in amount):
        check_neutral([float(s.charge) for s, _ in solutes], [c for _, c in solutes], _ROUNDED)
    gamma = _gamma(1.0, _strength(solutes), t, model, coefficient)
    if listed and amount[listed[0]] > 0.0:
        return ph(amount[listed[0]], gamma)
    # On mol/L, as the concentrations are: the ionic product is known on mol/kg.
    log_kw = -p_kw(t) + 2.0 * math.log10(liquid_density(t) / 1000.0)
    if amount.get("OH-", 0.0) > 0.0:
        return -log_kw + math.log10(gamma * amount["OH-"])
    if listed or "OH-" in amount:
        raise OutOfRangeError("neither H+ nor OH- has a concentration above 0")
    return ph(_hydrogen(solutes, 10.0**log_kw / (gamma * gamma)), gamma)


def _hydrogen(solutes: list[tuple[Species, float]], kw: float) -> float:
    """Concentration of H+ by charge balance [mol/L], with the ionic product on concentrations."""
    others = [s.text for s, c in solutes if c > 0.0 and s.name not in _INERT_IONS]
    if others:
        raise InputError(
            f"neither H+ nor OH- is listed, and {', '.join(others)} may take up or give off protons; "
            "list the H+ that XLEQ_COMPOSITION_C gives"
        )
    # Electroneutrality: h - kw/h = excess of negative charge.
    excess = -math.fsum(s.charge * c for s, c in solutes)
    root = math.hypot(excess, 2.0 * math.sqrt(kw))
    # Of the two forms of the positive root, the one that does not cancel.
    return 0.5 * (excess + root) if excess >= 0.0 else 2.0 * kw / (root - excess)


FUNCTIONS: Final = (
    Function(
        "XLEQ_IONIC_STRENGTH",
        "solutions",
        (_SPECIES, _CONCENTRATIONS),
        "ionic strength, half the sum of z²c [mol/L]",
        _ionic_strength,
        (_UNREADABLE, "#NUM! a negative concentration"),
        "Lewis and Randall, J. Am. Chem. Soc. 43 (1921) 1112 (from memory), the definition",
        (Example('=XLEQ_IONIC_STRENGTH("Ca+2; Cl-", "0.1; 0.2")', 0.3),),
    ),
    Function(
        "XLEQ_ACTIVITY_COEFFICIENT",
        "solutions",
        (
            Argument("species", "text", "a solute with its charge"),
            Argument("ionic_strength", "number", "ionic strength", unit="mol/L"),
            Argument("T", "temperature", "temperature", 298.15, unit="K"),
            Argument("model", "word", "model", "davies", known=("davies", "debye-huckel")),
        ),
        "activity coefficient on concentrations [-]",
        _activity_coefficient,
        ("#VALUE! the species cannot be read; an unknown model", "#NUM! a negative ionic strength", _BEYOND),
        _MODELS,
        (Example('=ROUND(XLEQ_ACTIVITY_COEFFICIENT("Na+", 0.1), 3)', 0.781),),
    ),
    Function(
        "XLEQ_PH",
        "solutions",
        (
            _SPECIES,
            _CONCENTRATIONS,
            Argument(
                "options", "options", "settings such as activity=davies; T=40 degC", "",
                known=("activity", "davies", "t"),
            ),
        ),
        "pH: of H+ where it is listed, else of OH- by the ionization of water, else by charge balance of the "
        "ions of strong acids and bases",
        _ph,
        (
            _UNREADABLE,
            "#VALUE! neither H+ nor OH- is listed, and not only ions of strong acids and bases",
            "#VALUE! with an activity model, a solution that is not electroneutral",
            "#NUM! H+ and OH- without a concentration above 0",
            _BEYOND,
        ),
        f"pH = -log10 of the activity of H+; water: IAPWS R11-24; activity: {_MODELS}",
        (Example('=XLEQ_PH("H+; Cl-", "0.001; 0.001")', 3.0),),
    ),
)  # fmt: skip
