"""Equilibria found from formation data alone: `XLEQ_COMPOSITION_DATA` and `XLEQ_ADIABATIC`."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import replace
from fractions import Fraction
from functools import lru_cache
from typing import Final

from xleq.cells import Grid
from xleq.equilibrium import State
from xleq.errors import InputError, MissingDataError, NoAnswerError
from xleq.functions.arguments import Want
from xleq.functions.composition import DATA, FEED, SPECIES, T, options_argument, want_argument
from xleq.functions.conditions import Options, certified, extrapolates, problem_maker, table_of
from xleq.functions.results import wanted
from xleq.functions.systems import System, system
from xleq.functions.table import Argument, Example, Function, Result
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
    texts = tuple(_marked(read, row) for row in _basis(read))
    if not texts:
        raise NoAnswerError("the elements allow no reaction among these species; nothing can change")
    return replace(system(texts, tuple(s.key for s in read), "g"), names=species)


def _basis(read: Sequence[Species]) -> list[list[Fraction]]:
    compositions = [s.composition() or {} for s in read]
    elements = sorted({element for c in compositions for element in c})
    rows = [[c.get(element, Fraction(0)) for c in compositions] for element in elements]
    return [smallest_integers(vector) for vector in null_space(rows, len(read))]


def _marked(read: Sequence[Species], row: Sequence[Fraction]) -> str:
    keyed = [parse_species(s.key) for s in read]
    return reaction_text(keyed, row)


def _composition_data(
    species: Texts, feed: Numbers, t: float, p: float, want: Want, options: Options, data: Grid | None
) -> Result:
    read = _all_reactions(species)
    problem_at = problem_maker(read, feed, "data", options, data, "g")
    return wanted(read, certified(problem_at(State("P", t, p=p))), want)


def _adiabatic(
    species: Texts, feed: Numbers, t_feed: float, p: float, want: Want, options: Options, data: Grid | None
) -> Result:
    read = _all_reactions(species)
    problem_at = problem_maker(read, feed, "data", options, data, "g")
    known = [table_of(data).find(s) for s in read.species]
    beyond = extrapolates(options)
    before = _enthalpy(known, feed, t_feed, beyond)
    low, high = max(d.t_min for d in known), min(d.t_max for d in known)

    def gain(t: float) -> float:
        return _enthalpy(known, certified(problem_at(State("P", t, p=p))).n, t, beyond) - before

    t = _root(gain, low, high)
    if want.word == "t":
        return t
    return wanted(read, certified(problem_at(State("P", t, p=p))), want)


def _enthalpy(known: Sequence[SpeciesData], n: Sequence[float], t: float, extrapolate: bool) -> float:
    """Enthalpy of amounts at a temperature. [kJ]."""
    return math.fsum(
        amount * data.h(t, extrapolate=extrapolate)
        for amount, data in zip(n, known, strict=True)
        if amount > 0.0
    )


def _root(gain: Callable[[float], float], low: float, high: float) -> float:
    """Where the enthalpy is that of the feed: it rises with T at equilibrium, so there is one place."""
    from scipy.optimize import brentq

    if low >= high:
        raise MissingDataError(f"the data of these species share no temperature ({low:g} to {high:g} K)")
    at_low, at_high = gain(low), gain(high)
    if at_low > 0.0 or at_high < 0.0:
        side = "below" if at_low > 0.0 else "above"
        raise NoAnswerError(
            f"the adiabatic temperature lies {side} the range of the data, {low:g} to {high:g} K"
        )
    return float(brentq(gain, low, high, xtol=1e-9, rtol=1e-13, maxiter=200))


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
        (*_ERRORS, "#NUM! the temperature lies outside the range of the data"),
        "enthalpy balance with Cp(T): Smith, Van Ness and Abbott, Introduction to Chemical Engineering "
        "Thermodynamics, 7th ed., 2005, section 4.7; ideal gas",
        (
            Example('=ROUND(XLEQ_ADIABATIC("CO; H2O; CO2; H2", "1; 3; 0; 0", "350 degC", 30), 1)', 844.2),
        ),
    ),
)  # fmt: skip
