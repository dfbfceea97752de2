"""Equilibrium compositions: `XLEQ_COMPOSITION_P`, `_V`, `_C` and `_X`."""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import Final, Literal

from xleq.cells import Grid, Value
from xleq.equilibrium import State
from xleq.functions.arguments import Want
from xleq.functions.conditions import Options, equilibrium
from xleq.functions.results import wanted
from xleq.functions.systems import Fluid, system
from xleq.functions.table import Argument, Example, Function, Result

Texts = tuple[str, ...]
Numbers = tuple[float, ...]
Given = Value | Grid

_SOURCE: Final = (
    "equilibrium conditions: Smith, Van Ness and Abbott, Introduction to Chemical Engineering "
    "Thermodynamics, 7th ed., 2005, ch. 13; solved by Newton's method on the logarithms of the amounts, "
    "every answer certified by its affinities and element balances"
)
_ERRORS: Final = (
    (
        "#VALUE! a reaction cannot be read or does not balance; a species is missing, doubled, or in no "
        "reaction and not fed; lists of unequal length; an unknown option, result or unit"
    ),
    "#N/A a species or its critical constants are not in the data, or T lies outside their range",
    (
        "#NUM! K not above 0; a negative amount; a temperature or pressure not above 0; dependent reactions "
        "whose K contradict each other; no answer that passes its certificate"
    ),
)

REACTIONS: Final = Argument("reactions", "texts", "reactions, one a cell or with semicolons between them")
K: Final = Argument(
    "K", "constants", "constant of each reaction, on p° = 1 bar or as option basis says; or data"
)
SPECIES: Final = Argument(
    "species", "texts", "every species of the reactions, and those that only pass through"
)
FEED: Final = Argument("feed", "amounts", "amount of each species fed; an empty cell is 0", unit="mol")
T: Final = Argument("T", "temperature", "temperature", unit="K")
DATA: Final = Argument(
    "data", "block", "formation data with a header row, in place of the built-in or beside them", None
)


def want_argument(word: str) -> Argument:
    """The argument `want` with its default."""
    meaning = (
        "moles, fractions, pressures, concentrations, change, conversion, extents, total, state, residual or "
        "table; with a species, such as fractions NH3, for one cell"
    )
    return Argument("want", "want", meaning, word)


_OPTIONS: Final = {
    "basis": "basis=Kp[atm]",
    "gas": "gas=PR or virial",
    "activity": "activity=davies or debye-huckel",
    "davies": "davies=0.2",
    "open": "open=CO2 0.0004 atm",
    "extrapolate": "extrapolate=yes",
}


def options_argument(*known: str) -> Argument:
    """The argument `options` with the names that it knows."""
    meaning = f"settings with ; between them: {', '.join(_OPTIONS[name] for name in known)}"
    return Argument("options", "options", meaning, "", known=known)


def composition_p(
    reactions: Texts,
    k: Given,
    species: Texts,
    feed: Numbers,
    t: float,
    p: float,
    want: Want,
    options: Options,
    data: Grid | None,
) -> Result:
    """Gas, with pure solids and liquids, at given temperature and pressure."""
    return _composition(reactions, k, species, feed, State("P", t, p=p), want, options, data, "g")


def composition_v(
    reactions: Texts,
    k: Given,
    species: Texts,
    feed: Numbers,
    t: float,
    v: float,
    want: Want,
    options: Options,
    data: Grid | None,
) -> Result:
    """Gas, with pure solids and liquids, at given temperature and volume."""
    return _composition(reactions, k, species, feed, State("V", t, v=v), want, options, data, "g")


def composition_c(
    reactions: Texts, k: Given, species: Texts, initial: Numbers, want: Want, options: Options, t: float
) -> Result:
    """Solution of given concentrations, with pure solids and liquids."""
    return _composition(reactions, k, species, initial, State("C", t, v=1.0), want, options, None, "aq")


def composition_x(
    reactions: Texts,
    k: Given,
    species: Texts,
    feed: Numbers,
    want: Want,
    options: Options,
    t: float,
    data: Grid | None,
) -> Result:
    """Ideal mixture of liquids, with pure solids."""
    return _composition(reactions, k, species, feed, State("X", t), want, options, data, "l")


def _composition(
    reactions: Texts,
    k: Given,
    species: Texts,
    feed: Numbers,
    state: State,
    want: Want,
    options: Options,
    data: Grid | None,
    fluid: Fluid,
) -> Result:
    read = system(reactions, species, fluid)
    return wanted(read, equilibrium(read, feed, k, options, data).solve_telling(state), want)


def _function(
    letter: Literal["P", "V", "C", "X"],
    arguments: tuple[Argument, ...],
    gives: str,
    examples: tuple[Example, ...],
) -> Function:
    calls: dict[str, Callable[..., Result]] = {
        "P": composition_p, "V": composition_v, "C": composition_c, "X": composition_x,
    }  # fmt: skip
    return Function(
        f"XLEQ_COMPOSITION_{letter}",
        "composition",
        arguments,
        gives,
        calls[letter],
        _ERRORS,
        _SOURCE,
        examples,
    )


_GIVES: Final = (
    "what `want` names: a column or row over the species, or one cell; moles in the unit of the feed"
)
_WATER_GAS: Final = '"CO + H2O = CO2 + H2", 1, "CO; H2O; CO2; H2", "1; 1; 0; 0"'

FUNCTIONS: Final = (
    _function(
        "P",
        (
            REACTIONS, K, SPECIES, FEED, T,
            Argument("P", "pressure", "total pressure, absolute unless its unit says gauge", unit="bar"),
            want_argument("moles"), options_argument("basis", "gas", "extrapolate"), DATA,
        ),
        f"gas and pure phases at equilibrium at T and P: {_GIVES}",
        (
            Example(f'=XLEQ_COMPOSITION_P({_WATER_GAS}, 1100, 1, "conversion CO")', 0.5),
            Example(
                '=XLEQ_COMPOSITION_P("N2O4 = 2 NO2", 0.1426, "N2O4; NO2", "1; 0", 298.15, "1 atm", '
                '"conversion N2O4", "basis=Kp[atm]")',
                math.sqrt(0.1426 / 4.1426),
            ),
        ),
    ),
    _function(
        "V",
        (
            REACTIONS, K, SPECIES, FEED, T,
            Argument("V", "volume", "volume of the gas", unit="L"),
            want_argument("moles"), options_argument("basis", "gas", "extrapolate"), DATA,
        ),
        f"gas and pure phases at equilibrium at T and volume: {_GIVES}",
        (Example(f'=XLEQ_COMPOSITION_V({_WATER_GAS}, 1100, 10, "moles H2")', 0.5),),
    ),
    _function(
        "C",
        (
            REACTIONS,
            Argument("K", "constants", "constant of each, on c° = 1 mol/L or as basis says; or data"),
            Argument(
                "species", "texts", "every solute, pure phase and open gas; solvent water may be left out"
            ),
            Argument(
                "initial", "concentrations",
                "concentration of each before reaction; empty for solvent water and open gases", unit="mol/L",
            ),
            want_argument("concentrations"),
            options_argument("basis", "activity", "davies", "open", "extrapolate"),
            Argument("T", "temperature", "temperature", 298.15, unit="K"),
        ),
        "solutes at equilibrium at constant volume: what `want` names; pure phases in moles per litre; a gas "
        "above the solution stays at the partial pressure that option open gives it",
        (
            Example(
                '=XLEQ_COMPOSITION_C("CO2(g) = CO2(aq)", 0.034, "CO2(g); CO2(aq)", "0; 0", '
                '"concentrations CO2(aq)", "open=CO2 0.5 bar")',
                0.017,
            ),
            Example(
                '=XLEQ_COMPOSITION_C("CH3COOH = CH3COO- + H+", 1.75E-5, "CH3COOH; CH3COO-; H+", "0.1; 0; 0", '
                '"concentrations H+")',
                0.0013141545931207586,
            ),
        ),
    ),
    _function(
        "X",
        (
            REACTIONS,
            Argument("K", "constants", "constant of each reaction on mole fractions; or data"),
            SPECIES, FEED, want_argument("moles"), options_argument("basis", "extrapolate"),
            Argument("T", "temperature", "temperature", 298.15, unit="K"),
            DATA,
        ),
        f"ideal mixture of liquids at equilibrium: {_GIVES}",
        (
            Example(
                '=XLEQ_COMPOSITION_X("CH3COOH + C2H5OH = CH3COOC2H5 + H2O", 4, '
                '"CH3COOH; C2H5OH; CH3COOC2H5; H2O", "1; 1; 0; 0", "conversion CH3COOH")',
                2 / 3,
            ),
        ),
    ),
)  # fmt: skip
