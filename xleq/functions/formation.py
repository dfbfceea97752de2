"""Equilibria found from formation data alone: `XLEQ_COMPOSITION_DATA` and `XLEQ_ADIABATIC`."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from fractions import Fraction
from functools import lru_cache
from typing import Final

from xleq.cells import Grid
from xleq.equilibrium import State
from xleq.errors import InputError, NoAnswerError
from xleq.functions.adiabatic import EnthalpyBalance
from xleq.functions.arguments import Want
from xleq.functions.composition import DATA, FEED, SPECIES, T, options_argument, want_argument
from xleq.functions.conditions import Options, equilibrium, extrapolates, table_of
from xleq.functions.results import wanted
from xleq.functions.systems import System, system
from xleq.functions.table import Argument, Example, Function, Result, tell
from xleq.reactions import Species, null_space, parse_species, reaction_text, smallest_integers
from xleq.thermo import SpeciesData

Texts = tuple[str, ...]
Numbers = tuple[float, ...]

_P: Final = Argument("P", "pressure", "total pressure, absolute unless its unit says gauge", unit="bar")
_ERRORS: Final = (
    "#VALUE! a species cannot be read, has no formula or is doubled; lists of unequal length",
    "#N/A a species is not in the data, or T lies outside their range",
    "#NUM! nothing is fed; no answer that passes its certificate",
)


@lru_cache(maxsize=1024)
def _all_reactions(species: Texts) -> System:
    """Every independent reaction that the elements allow among the species."""
    read = [parse_species(text, "g") for text in species]
    for text, s in zip(species, read, strict=True):
        if s.composition() is None:
            raise InputError(f"{text} has no formula, so its elements are not known")
        if s.phase == "aq" or s.charge:
            raise InputError(f"{s.key} is not a gas or a pure phase")
        if read.count(s) > 1:
            raise InputError(f"species {text} is in the list twice")
    texts = tuple(_marked(read, row) for row in _basis(read))
    if not texts:
        raise NoAnswerError("the elements allow no reaction among these species; nothing can change")
    return replace(system(texts, tuple(s.key for s in read), "g"), names=species, derived=True)


def _basis(read: Sequence[Species]) -> list[list[Fraction]]:
    compositions = [s.composition() or {} for s in read]
    elements = sorted({element for c in compositions for element in c})
    rows = [[c.get(element, Fraction(0)) for c in compositions] for element in elements]
    return [smallest_integers(vector) for vector in null_space(rows, len(read))]


def _marked(read: Sequence[Species], row: Sequence[Fraction]) -> str:
    keyed = [parse_species(s.key) for s in read]
    return reaction_text(keyed, row)


def _data_of(species: Texts, data: Grid | None) -> list[SpeciesData]:
    """Data of each species as it is written: an element without a phase is refused, not taken for a gas."""
    table = table_of(data)
    return [table.find(parse_species(text, "g")) for text in species]


def _composition_data(
    species: Texts, feed: Numbers, t: float, p: float, want: Want, options: Options, data: Grid | None
) -> Result:
    read = _all_reactions(species)
    _data_of(species, data)
    found = equilibrium(read, feed, "data", options, data)
    return wanted(read, found.solve_telling(State("P", t, p=p)), want)


def _adiabatic(
    species: Texts, feed: Numbers, t_feed: float, p: float, want: Want, options: Options, data: Grid | None
) -> Result:
    read = _all_reactions(species)
    found = equilibrium(read, feed, "data", options, data)
    beyond = equilibrium(read, feed, "data", {"extrapolate": "yes"}, data).constants
    known = _data_of(species, data)
    balance = EnthalpyBalance(found, beyond, known, p, extrapolate=extrapolates(options))
    t = balance.temperature(t_feed)
    if balance.jumps_at(t):
        if want.word != "t":
            raise NoAnswerError(
                f"at the adiabatic temperature, {t:.6g} K, a phase is changing in part, and T and P do not "
                "tell how far; ask for T alone"
            )
        tell([f"a phase is changing at {t:.6g} K, in part: the feed has not the enthalpy for all of it"])
        return t
    solution = balance.solution(t)
    tell((solution.method, *balance.notes(t), *solution.notes))
    return t if want.word == "t" else wanted(read, solution, want)


FUNCTIONS: Final = (
    Function(
        "XLEQ_COMPOSITION_DATA",
        "composition",
        (
            SPECIES,
            FEED,
            T,
            _P,
            want_argument("moles"),
            options_argument("gas", "extrapolate"),
            DATA,
        ),
        "gas and pure phases at equilibrium, by every reaction that the elements allow: what `want` names",
        _composition_data,
        _ERRORS,
        "as XLEQ_COMPOSITION_P; the reactions span the null space of the element matrix, K is from the data",
        (
            Example(
                '=ROUND(XLEQ_COMPOSITION_DATA("CO; H2O; CO2; H2", "1; 1; 0; 0", 1000, 1, "moles H2"), 3)',
                0.545,
            ),
        ),
    ),
    Function(
        "XLEQ_ADIABATIC",
        "composition",
        (
            SPECIES,
            FEED,
            Argument("T_feed", "temperature", "temperature of the feed", unit="K"),
            _P,
            Argument(
                "want", "want", "T for the temperature, else as XLEQ_COMPOSITION_P at that temperature", "T",
                known=("T",),
            ),
            options_argument("extrapolate"),
            DATA,
        ),
        "temperature [K] at which the equilibrium has the enthalpy of the feed, or what `want` names",
        _adiabatic,
        (
            *_ERRORS,
            "#N/A the adiabatic temperature lies outside the range of the data",
            "#NUM! a composition is asked for where a phase changes in part",
        ),
        "enthalpy balance with Cp(T): Smith, Van Ness and Abbott, Introduction to Chemical Engineering "
        "Thermodynamics, 7th ed., 2005, section 4.7; ideal gas",
        (
            Example('=ROUND(XLEQ_ADIABATIC("CO; H2O; CO2; H2", "1; 3; 0; 0", "350 degC", 30), 1)', 844.2),
        ),
    ),
)  # fmt: skip
