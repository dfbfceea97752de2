"""Worksheet functions that ask backwards: the temperature or pressure for a result, the approach."""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import Final

from xleq.cells import Grid, Value
from xleq.constants import STANDARD
from xleq.equilibrium import Solution, State
from xleq.equilibrium.inverse import approach, pressure_for, temperature_for
from xleq.errors import InputError, MissingDataError, NoAnswerError
from xleq.functions.arguments import Want
from xleq.functions.composition import DATA, FEED, REACTIONS, SPECIES, K, T
from xleq.functions.conditions import Equilibrium, equilibrium, is_data, is_fit, table_of
from xleq.functions.quotients import ln_q_of
from xleq.functions.reactions import REACTION
from xleq.functions.results import wanted
from xleq.functions.systems import System, system
from xleq.functions.table import Argument, Example, Function, tell
from xleq.reactions import check_balance, parse_reaction
from xleq.thermo import reaction_data

Texts = tuple[str, ...]
Numbers = tuple[float, ...]

_SOURCE: Final = (
    "the equilibrium of XLEQ_COMPOSITION_P inside a search that samples the whole interval, follows every "
    "change of sign and every dip, and closes in by Brent's method (Brent, Algorithms for Minimization "
    "without Derivatives, 1973, ch. 4)"
)
_ERRORS: Final = (
    "#VALUE! as XLEQ_COMPOSITION_P; a target that is not one number; for T, a K that is a plain number",
    "#N/A as XLEQ_COMPOSITION_P",
    "#NUM! nothing in the interval gives the value (the range reached is told), or several places do",
)
#: Where XLEQ_APPROACH looks for the temperature of equilibrium, within the data. [K]
_SEARCHED: Final = (200.0, 3000.0)
_P: Final = Argument("P", "pressure", "total pressure, absolute unless its unit says gauge", unit="bar")
_TARGET: Final = Argument("target", "want", "the result, as want for one cell, such as fractions NH3")
_VALUE: Final = Argument("value", "number", "the value that it is to have")


def _one_number(read: System, target: Want) -> Callable[[Solution], float]:
    def of(solution: Solution) -> float:
        found = wanted(read, solution, target)
        if isinstance(found, list) and len(found) == 1 and isinstance(found[0], float):
            return found[0]
        if isinstance(found, float) and not isinstance(found, bool):
            return found
        raise InputError(f"target {target.word} is not one number; name a species, such as fractions NH3")

    return of


def _t_for(
    reactions: Texts,
    k: Value | Grid,
    species: Texts,
    feed: Numbers,
    p: float,
    target: Want,
    value: float,
    t_low: float,
    t_high: float,
    data: Grid | None,
) -> float:
    read = system(reactions, species, "g")
    if not (is_data(k) or is_fit(k, len(read.reactions))):
        raise InputError("K is a plain number, whose change with T is not known; give data or coefficients")
    found = equilibrium(read, feed, k, {}, data, fits=True)
    low, high = _known_part(found, t_low, t_high)
    of = _one_number(read, target)
    t = temperature_for(lambda t: found.problem(State("P", t, p=p)), of, value, low, high)
    found.solve_telling(State("P", t, p=p))
    return t


def _known_part(found: Equilibrium, t_low: float, t_high: float) -> tuple[float, float]:
    """The part of the interval in which the constants are known."""
    known = found.constants
    low, high = max(t_low, known.t_min), min(t_high, known.t_max)
    if t_low < t_high and not low < high:
        raise MissingDataError(
            f"K is known from {known.t_min:g} to {known.t_max:g} K, nowhere from {t_low:g} to {t_high:g} K"
        )
    if (low, high) != (t_low, t_high) and t_low < t_high:
        tell([f"searched from {low:g} to {high:g} K only, where K is known"])
        return low, high
    return t_low, t_high


def _p_for(
    reactions: Texts,
    k: Value | Grid,
    species: Texts,
    feed: Numbers,
    t: float,
    target: Want,
    value: float,
    p_low: float,
    p_high: float,
) -> float:
    read = system(reactions, species, "g")
    found = equilibrium(read, feed, k, {}, None, fits=True)
    of = _one_number(read, target)
    p = pressure_for(lambda p: found.problem(State("P", t, p=p)), of, value, p_low, p_high)
    found.solve_telling(State("P", t, p=p))
    return p


def _approach(
    reaction: str, species: Texts, amounts: Numbers, t: float, p: float, data: Grid | None
) -> float:
    read = parse_reaction(reaction, "g")
    check_balance(read)
    known = reaction_data(read, table_of(data))
    if len(amounts) > len(species) and not any(amounts[len(species) :]):
        amounts = amounts[: len(species)]
    if len(amounts) != len(species):
        raise InputError(f"{len(species)} species but {len(amounts)} amounts; give one amount a species")
    ln_q = ln_q_of(reaction, species, amounts, p, t, STANDARD)
    if ln_q == -math.inf:
        raise NoAnswerError("a product has no amount, so no temperature makes K equal to the quotient")
    low, high = max(known.t_min, _SEARCHED[0]), min(known.t_max, _SEARCHED[1])
    if not low < high:
        raise MissingDataError(f"the data of {reaction} share no temperature from 200 to 3000 K")
    tell(known.notes(t))
    return approach(known.ln_k, ln_q, t, low, high)


FUNCTIONS: Final = (
    Function(
        "XLEQ_T_FOR",
        "composition",
        (
            REACTIONS,
            Argument(
                "K", "constants", "data, or coefficients of ln K = a + b/T + c ln T + d T, a row a reaction"
            ),
            SPECIES,
            FEED,
            _P,
            _TARGET,
            _VALUE,
            Argument(
                "T_low", "temperature", "lowest temperature of the search, within data", 300.0, unit="K"
            ),
            Argument(
                "T_high", "temperature", "highest temperature of the search, within data", 1500.0, unit="K"
            ),
            DATA,
        ),
        "the temperature at which the target has the value [K]",
        _t_for,
        _ERRORS,
        _SOURCE,
        (
            Example(
                '=XLEQ_T_FOR("N2O4 = 2 NO2", "20.5; -6700", "N2O4; NO2", "1; 0", 1, "conversion N2O4", 0.5)',
                6700 / (20.5 - math.log(4 / 3)),
            ),
        ),
    ),
    Function(
        "XLEQ_P_FOR",
        "composition",
        (
            REACTIONS,
            K,
            SPECIES,
            FEED,
            T,
            _TARGET,
            _VALUE,
            Argument("P_low", "pressure", "lowest pressure of the search", 0.01, unit="bar"),
            Argument("P_high", "pressure", "highest pressure of the search", 1000.0, unit="bar"),
        ),
        "the pressure at which the target has the value [bar]",
        _p_for,
        _ERRORS,
        _SOURCE,
        (
            Example(
                '=XLEQ_P_FOR("N2O4 = 2 NO2", 0.15, "N2O4; NO2", "1; 0", 298.15, "conversion N2O4", 0.5)',
                0.1125,
            ),
        ),
    ),
    Function(
        "XLEQ_APPROACH",
        "composition",
        (
            REACTION,
            SPECIES,
            Argument(
                "amounts", "amounts", "measured amount of each species, on any common basis", unit="mol"
            ),
            T,
            _P,
            DATA,
        ),
        "T minus the temperature at which K equals the quotient of the amounts [K], the sign as written: "
        "negative for an exothermic reaction not yet at equilibrium, positive for an endothermic one",
        _approach,
        (
            "#VALUE! the reaction cannot be read or does not balance; a species is missing or doubled",
            "#N/A a species is not in the data",
            "#NUM! a species of the reaction has no amount; nowhere from 200 to 3000 K is K the quotient",
        ),
        "definition; ideal gas; common practice, no source, for the sign",
        (
            Example(
                '=ROUND(XLEQ_APPROACH("CO + H2O = CO2 + H2", "CO; H2O; CO2; H2", "1; 1; 1; 1", 1100, 1), 1)',
                5.1,
            ),
        ),
    ),
)
