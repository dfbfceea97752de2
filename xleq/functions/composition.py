"""Equilibrium compositions: `XLEQ_COMPOSITION_P`, `_V`, `_C` and `_X`."""

from __future__ import annotations

from collections.abc import Callable
from typing import Final, Literal

from xleq.constants import ln_factor_of, parse_basis
from xleq.equilibrium import Solution, State, solve
from xleq.errors import InputError
from xleq.functions.arguments import Want
from xleq.functions.results import wanted
from xleq.functions.systems import Fluid, System, system
from xleq.functions.table import Argument, Example, Function, Result

Texts = tuple[str, ...]
Numbers = tuple[float, ...]

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
    (
        "#NUM! K not above 0; a negative amount; a temperature or pressure not above 0; dependent reactions "
        "whose K contradict each other; no answer that passes its certificate"
    ),
)

_REACTIONS: Final = Argument("reactions", "texts", "reactions, one a cell or with semicolons between them")
_K: Final = Argument("K", "Ks", "constant of each reaction, on p° = 1 bar or as option basis says")
_SPECIES: Final = Argument(
    "species", "texts", "every species of the reactions, and those that only pass through"
)
_FEED: Final = Argument("feed", "amounts", "amount of each species fed; an empty cell is 0", unit="mol")
_T: Final = Argument("T", "temperature", "temperature", unit="K")


def _want(word: str) -> Argument:
    meaning = (
        "moles, fractions, pressures, concentrations, change, conversion, extents, total, state, residual or "
        "table; with a species, such as fractions NH3, for one cell"
    )
    return Argument("want", "want", meaning, word)


def _options(*known: str) -> Argument:
    return Argument("options", "options", "settings such as basis=Kp[atm]", "", known=known)


def composition_p(
    reactions: Texts,
    k: Numbers,
    species: Texts,
    feed: Numbers,
    t: float,
    p: float,
    want: Want,
    options: dict[str, str],
) -> Result:
    """Gas, with pure solids and liquids, at given temperature and pressure."""
    return _composition(reactions, k, species, feed, State("P", t, p=p), want, options, "g")


def composition_v(
    reactions: Texts,
    k: Numbers,
    species: Texts,
    feed: Numbers,
    t: float,
    v: float,
    want: Want,
    options: dict[str, str],
) -> Result:
    """Gas, with pure solids and liquids, at given temperature and volume."""
    return _composition(reactions, k, species, feed, State("V", t, v=v), want, options, "g")


def composition_c(
    reactions: Texts,
    k: Numbers,
    species: Texts,
    initial: Numbers,
    want: Want,
    options: dict[str, str],
    t: float,
) -> Result:
    """Solution of given concentrations, with pure solids and liquids."""
    return _composition(reactions, k, species, initial, State("C", t, v=1.0), want, options, "aq")


def composition_x(
    reactions: Texts, k: Numbers, species: Texts, feed: Numbers, want: Want, options: dict[str, str], t: float
) -> Result:
    """Ideal mixture of liquids, with pure solids."""
    return _composition(reactions, k, species, feed, State("X", t), want, options, "l")


def _composition(
    reactions: Texts,
    k: Numbers,
    species: Texts,
    feed: Numbers,
    state: State,
    want: Want,
    options: dict[str, str],
    fluid: Fluid,
) -> Result:
    read = system(reactions, species, fluid)
    ln_k = standard_constants(read, k, options.get("basis"), state)
    return wanted(read, equilibrium(read, feed, ln_k, state), want)


def equilibrium(read: System, feed: Numbers, ln_k: Numbers, state: State) -> Solution:
    """The certified equilibrium of a system."""
    return solve(read.problem(feed, ln_k, state)).require()


def standard_constants(read: System, ln_k: Numbers, basis: str | None, state: State) -> Numbers:
    """Ln K° of each reaction from ln K on the basis that an option names.

    Raises
    ------
    InputError
        If the basis is unknown, or needs a pressure that the state does not fix.
    """
    if basis is None or len(ln_k) != len(read.reactions):
        return ln_k
    on = parse_basis(basis)
    if state.kind == "X" and on.kind not in ("K", "Kx"):
        raise InputError(
            f"{on} is a basis for gases and solutes; constants of liquid mixtures are on mole fractions"
        )
    p = state.p if state.kind == "P" else None
    pairs = zip(ln_k, read.reactions, strict=True)
    return tuple(value - ln_factor_of(on, reaction, state.t, p) for value, reaction in pairs)


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
            _REACTIONS, _K, _SPECIES, _FEED, _T,
            Argument("P", "pressure", "total pressure, absolute unless its unit says gauge", unit="bar"),
            _want("moles"), _options("basis"),
        ),
        f"gas and pure phases at equilibrium at T and P: {_GIVES}",
        (
            Example(f'=XLEQ_COMPOSITION_P({_WATER_GAS}, 1100, 1, "conversion CO")', 0.5),
            Example(
                '=XLEQ_COMPOSITION_P("N2O4 = 2 NO2", 0.1426, "N2O4; NO2", "1; 0", 298.15, "1 atm", '
                '"conversion N2O4", "basis=Kp[atm]")',
                0.185534110721279,
            ),
        ),
    ),
    _function(
        "V",
        (
            _REACTIONS, _K, _SPECIES, _FEED, _T,
            Argument("V", "volume", "volume of the gas", unit="L"),
            _want("moles"), _options("basis"),
        ),
        f"gas and pure phases at equilibrium at T and volume: {_GIVES}",
        (Example(f'=XLEQ_COMPOSITION_V({_WATER_GAS}, 1100, 10, "moles H2")', 0.5),),
    ),
    _function(
        "C",
        (
            _REACTIONS,
            Argument("K", "Ks", "constant of each reaction, on c° = 1 mol/L or as option basis says"),
            Argument("species", "texts", "every solute and pure phase; solvent water may be left out"),
            Argument("initial", "concentrations", "concentration of each before reaction", unit="mol/L"),
            _want("concentrations"), _options("basis"),
            Argument("T", "temperature", "temperature", 298.15, unit="K"),
        ),
        "solutes at equilibrium at constant volume: what `want` names; pure phases in moles per litre",
        (
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
            _REACTIONS,
            Argument("K", "Ks", "constant of each reaction, on mole fractions"),
            _SPECIES, _FEED, _want("moles"), _options("basis"),
            Argument("T", "temperature", "temperature", 298.15, unit="K"),
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
