"""Worksheet functions about aqueous solutions: ionic strength, activity coefficients, pH."""

from __future__ import annotations

import math
from typing import Final

from xleq.activity import activity_coefficient, ionic_strength, p_kw, ph
from xleq.activity.aqueous import Model
from xleq.errors import InputError
from xleq.functions.conditions import ACTIVITY_MODELS, Options, chosen
from xleq.functions.table import Argument, Example, Function
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


def _read(species: Texts, concentrations: Numbers) -> list[Species]:
    if len(species) != len(concentrations):
        raise InputError(f"{len(species)} species but {len(concentrations)} concentrations; give one each")
    return [parse_species(text, "aq") for text in species]


def _ionic_strength(species: Texts, concentrations: Numbers) -> float:
    read = _read(species, concentrations)
    charges = [float(s.charge) if s.phase == "aq" else 0.0 for s in read]
    return ionic_strength(charges, concentrations)


def _activity_coefficient(species: str, ionic_strength: float, t: float, model: str) -> float:
    if ionic_strength < 0.0:
        raise InputError(f"the ionic strength is {ionic_strength:g}; it must not be negative")
    return _gamma(float(parse_species(species, "aq").charge), ionic_strength, t, model, 0.3)


def _gamma(charge: float, strength: float, t: float, model: str, coefficient: float) -> float:
    if model == "ideal":
        return 1.0
    known: Model = "davies" if model == "davies" else "debye-huckel"
    return activity_coefficient(charge, strength, t, known, coefficient)


def _ph(species: Texts, concentrations: Numbers, options: Options) -> float:
    read = _read(species, concentrations)
    amount = {s.name: c for s, c in zip(read, concentrations, strict=True) if s.phase == "aq"}
    t = read_quantity(options.get("t", "298.15"), "temperature")
    model = chosen(options, "activity", ACTIVITY_MODELS)
    coefficient = float(chosen(options, "davies", ("0.3", "0.2")))
    gamma = _gamma(1.0, _ionic_strength(species, concentrations), t, model, coefficient)
    if "H+" in amount:
        return ph(amount["H+"], gamma)
    ln_kw = -p_kw(t) * math.log(10.0)
    if "OH-" in amount:
        if not amount["OH-"] > 0.0:
            raise InputError("neither H+ nor OH- has a concentration above 0")
        return p_kw(t) + math.log10(gamma * amount["OH-"])
    # Electroneutrality gives h - Kw'/h = excess of negative charge, with Kw' on concentrations.
    kw = math.exp(ln_kw) / (gamma * gamma)
    excess = -math.fsum(s.charge * c for s, c in zip(read, concentrations, strict=True) if s.phase == "aq")
    root = math.hypot(excess, 2.0 * math.sqrt(kw))
    # Of the two forms of the positive root, the one that does not cancel.
    hydrogen = 0.5 * (excess + root) if excess >= 0.0 else 2.0 * kw / (root - excess)
    return ph(hydrogen, gamma)


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
        ("#VALUE! the species cannot be read; an unknown model; a negative ionic strength", _BEYOND),
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
        "pH: of H+ where it is listed, else of OH- by the ionization of water, else by charge balance",
        _ph,
        (_UNREADABLE, "#NUM! H+ or OH- without a concentration above 0", _BEYOND),
        f"pH = -log10 of the activity of H+; water: IAPWS R11-24; activity: {_MODELS}",
        (Example('=XLEQ_PH("H+; Cl-", "0.001; 0.001")', 3.0),),
    ),
)  # fmt: skip
