"""What the arguments K, options and data say of an equilibrium: its constants and its fluid, at any state."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from typing import Final, TypeAlias

import numpy as np

from xleq.cells import Grid, Value
from xleq.constants import Fit, dh_from_fit, ln_factor_of, ln_k_from_fit, parse_basis
from xleq.equilibrium import Problem, Solution, State, solve
from xleq.equilibrium.problem import Nonideality
from xleq.errors import InputError
from xleq.functions.arguments import READERS
from xleq.functions.constants import read_fit
from xleq.functions.systems import Fluid, System
from xleq.thermo import ReactionData, Table, reaction_data, read_data, standard_table
from xleq.units import R

Numbers: TypeAlias = tuple[float, ...]
Options: TypeAlias = Mapping[str, str]
#: Ln K° of each reaction at a state.
Constants: TypeAlias = Callable[[State], Numbers]

GAS_MODELS: Final = ("ideal", "PR", "virial")
ACTIVITY_MODELS: Final = ("ideal", "davies", "debye-huckel")


def table_of(data: Grid | None, fluid: Fluid = "g") -> Table:
    """Formation data: the built-in table, extended by a data range where one is given."""
    return standard_table() if data is None else read_data(data, fluid)


def extrapolates(options: Options) -> bool:
    """Whether the option allows data to be used outside their range of temperature."""
    return chosen(options, "extrapolate", ("no", "yes")) == "yes"


def chosen(options: Options, name: str, known: tuple[str, ...]) -> str:
    """The setting of an option in its own spelling; the first known one where it is not given.

    Raises
    ------
    InputError
        If it is none of the known ones.
    """
    text = options.get(name, known[0])
    for word in known:
        if word.lower() == text.lower():
            return word
    raise InputError(f"option {name}={text} is not known; known are {', '.join(known)}")


def constants_of(
    read: System, k: Value | Grid, options: Options, table: Table, *, fits: bool = False
) -> Constants:
    """Ln K° of each reaction as a function of the state.

    Parameters
    ----------
    read : System
    k : Value or Grid
        A constant for each reaction; or the text ``data``: from formation data at T; or, with `fits`, the 2
        to 4 coefficients of ln K = a + b/T + c ln T + d T, a row for each reaction.
    options : mapping
        ``basis`` and ``extrapolate`` are read.
    table : Table
    fits : bool
        Whether coefficients are understood.

    Raises
    ------
    InputError
        If constants and reactions do not fit, or the basis is unknown.
    MissingDataError
        If a species is not in the table.
    """
    if isinstance(k, str) and k.strip().lower() == "data":
        if "basis" in options:
            raise InputError("constants from formation data are K°; leave the option basis away")
        return _from_data(read, table, extrapolate=extrapolates(options))
    basis = options.get("basis")
    if fits and _is_fit(k, len(read.reactions)):
        correlations = fits_of(k, len(read.reactions))
        from_fits = lambda state: tuple(ln_k_from_fit(fit, state.t) for fit in correlations)  # noqa: E731
        return _on_basis(read, from_fits, basis)
    values: Numbers = READERS["Ks"](k, ())
    return _on_basis(read, lambda state: values, basis)


def _from_data(read: System, table: Table, *, extrapolate: bool) -> Constants:
    data: list[ReactionData] = [reaction_data(r, table) for r in read.reactions]
    return lambda state: tuple(d.ln_k(state.t, extrapolate=extrapolate) for d in data)


def _is_fit(k: Value | Grid, n_reactions: int) -> bool:
    if isinstance(k, str):
        return k.count(";") + 1 > n_reactions
    return isinstance(k, list) and sum(len(row) for row in k) > n_reactions


def fits_of(k: Value | Grid, n_reactions: int) -> list[Fit]:
    """The correlation of each reaction, from coefficients or from a block of XLEQ_K_FIT.

    Raises
    ------
    InputError
        If there is not one for each reaction.
    """
    blocks: list[Grid]
    if n_reactions == 1 or not isinstance(k, list):
        blocks = [k if isinstance(k, list) else [[k]]]
    else:
        blocks = [[row] for row in k]
    if len(blocks) != n_reactions:
        raise InputError(
            f"{n_reactions} reactions but {len(blocks)} rows of coefficients; give one row a reaction"
        )
    return [read_fit(block) for block in blocks]


def _on_basis(read: System, given: Constants, basis: str | None) -> Constants:
    if basis is None:
        return given
    on = parse_basis(basis)

    def standard(state: State) -> Numbers:
        if state.kind == "X" and on.kind not in ("K", "Kx"):
            raise InputError(
                f"{on} is for gases and solutes; constants of a liquid mixture are on mole fractions"
            )
        p = state.p if state.kind == "P" else None
        values = given(state)
        if len(values) != len(read.reactions):
            return values  # the problem says how many there must be
        pairs = zip(values, read.reactions, strict=True)
        return tuple(value - ln_factor_of(on, reaction, state.t, p) for value, reaction in pairs)

    return standard


def slopes_of(read: System, k: Value | Grid, table: Table, t: float) -> Numbers | None:
    """Slope d ln K°/dT of each reaction [1/K]; None where K is a number, whose slope is not known.

    Raises
    ------
    MissingDataError
        If T lies outside the range of the data.
    """
    if isinstance(k, str) and k.strip().lower() == "data":
        return tuple(reaction_data(r, table).dln_k_dt(t) for r in read.reactions)
    if _is_fit(k, len(read.reactions)):
        fits = fits_of(k, len(read.reactions))
        return tuple(1000.0 * dh_from_fit(fit, t) / (R * t * t) for fit in fits)
    return None


def model_of(read: System, options: Options, table: Table, fluid: Fluid) -> Nonideality | None:
    """The departure from ideal that the options ask for; None for an ideal fluid.

    Raises
    ------
    InputError
        If the model is unknown.
    MissingDataError
        If a gas has no critical constants.
    """
    if fluid == "g":
        name = chosen(options, "gas", GAS_MODELS)
        if name == "ideal":
            return None
        from xleq.activity import peng_robinson, virial

        keys = [s.key for s in read.species]
        gases = [s.phase == "g" for s in read.species]
        return peng_robinson(keys, gases, table) if name == "PR" else virial(keys, gases, table)
    name = chosen(options, "activity", ACTIVITY_MODELS) if fluid == "aq" else "ideal"
    if name == "ideal":
        if "davies" in options:
            raise InputError("option davies is the coefficient of activity=davies; give that too")
        return None
    from xleq.activity import Aqueous

    charges = [float(s.charge) if s.phase == "aq" else 0.0 for s in read.species]
    if name == "debye-huckel":
        return Aqueous(charges, "debye-huckel")
    return Aqueous(charges, "davies", float(chosen(options, "davies", ("0.3", "0.2"))))


def problem_maker(
    read: System,
    feed: Numbers,
    k: Value | Grid,
    options: Options,
    data: Grid | None,
    fluid: Fluid,
    *,
    fits: bool = False,
) -> Callable[[State], Problem]:
    """The problem at any state, from the arguments of a worksheet function.

    Raises
    ------
    InputError
        If the arguments do not fit together; in a solution with an activity model also if it is not neutral.
    MissingDataError
        If formation data or critical constants are missing.
    """
    table = table_of(data, fluid)
    constants = constants_of(read, k, options, table, fits=fits)
    model = model_of(read, options, table, fluid)
    if model is not None and fluid == "aq":
        from xleq.activity import check_neutral

        check_neutral([float(s.charge) for s in read.species[: read.n_listed]], feed)
    return lambda state: read.problem(feed, constants(state), state, model)


def certified(problem: Problem) -> Solution:
    """The certified solution, within the range of its model.

    Raises
    ------
    NoAnswerError
        If there is none, or the model does not reach so far.
    """
    solution = solve(problem).require()
    notes = getattr(problem.model, "notes", None)
    if notes is not None and math.fsum(solution.n) > 0.0:
        notes(np.array(solution.n), problem.state)  # raises beyond the hard limit of the model
    return solution
