"""What the arguments K, options and data say of an equilibrium: its constants and its fluid, at any state."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace
from fractions import Fraction
from functools import lru_cache
from typing import Final, TypeAlias

from xleq.cells import BLANK, Grid, Value
from xleq.constants import Basis, Fit, dh_from_fit, ln_factor_of, ln_k_from_fit, parse_basis
from xleq.equilibrium import Problem, Solution, State, solve
from xleq.equilibrium.problem import Nonideality
from xleq.errors import InputError
from xleq.functions.arguments import READERS
from xleq.functions.constants import read_fit
from xleq.functions.systems import Fluid, System
from xleq.functions.table import tell
from xleq.reactions import parse_species
from xleq.thermo import ReactionData, Table, reaction_data, read_data, standard_table
from xleq.units import P_STANDARD_BAR, R, read_quantity

Numbers: TypeAlias = tuple[float, ...]
Options: TypeAlias = Mapping[str, str]

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


@dataclass(frozen=True)
class Constants:
    """Ln K of each reaction at any state, and where they come from.

    Parameters
    ----------
    at : callable
        Ln K [n_reactions] at a state: ln K° with the pressures of open gases in them.
    data : tuple of ReactionData
        Where they follow from formation data.
    t_min, t_max : float
        Range of temperature for which they are known. [K]
    """

    at: Callable[[State], Numbers]
    data: tuple[ReactionData, ...] = ()
    t_min: float = 0.0
    t_max: float = math.inf

    def notes(self, t: float) -> tuple[str, ...]:
        """What a checker should know of them at a temperature [K]."""
        return tuple(note for d in self.data for note in d.notes(t))

    def with_open(self, nu: tuple[tuple[Fraction, ...], ...], pressures: Mapping[int, float]) -> Constants:
        """The same for reactions in which gases of given pressures [bar] count as pure phases."""
        shifts = tuple(
            math.fsum(float(row[i]) * math.log(p / P_STANDARD_BAR) for i, p in pressures.items())
            for row in nu
        )

        def at(state: State) -> Numbers:
            values = self.at(state)
            if len(values) != len(shifts):
                return values
            return tuple(value - shift for value, shift in zip(values, shifts, strict=True))

        return replace(self, at=at)


def is_data(k: Value | Grid) -> bool:
    """Whether the argument K is the word data, in one cell or in all."""
    if isinstance(k, list):
        words = [v for row in k for v in row if v is not BLANK]
        return bool(words) and all(isinstance(v, str) and v.strip().lower() == "data" for v in words)
    return isinstance(k, str) and k.strip().lower() == "data"


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
    extrapolate = extrapolates(options)
    if is_data(k):
        if "basis" in options:
            raise InputError("constants from formation data are K°; leave the option basis away")
        return _from_data(read, table, extrapolate=extrapolate)
    if extrapolate:
        raise InputError("option extrapolate is about formation data; K is not data here")
    basis = parse_basis(options["basis"]) if "basis" in options else None
    if fits and is_fit(k, len(read.reactions)):
        correlations = fits_of(k, len(read.reactions))
        return Constants(
            lambda state: tuple(ln_k_from_fit(fit, state.t) for fit in correlations),
            t_min=max(fit.t_min for fit in correlations),
            t_max=min(fit.t_max for fit in correlations),
        )
    values: Numbers = READERS["Ks"](k, ())
    if basis is None:
        return Constants(lambda state: values)
    return Constants(lambda state: _standard(read, values, basis, state))


def _from_data(read: System, table: Table, *, extrapolate: bool) -> Constants:
    data = data_of(read, table)
    at: Callable[[State], Numbers] = lambda state: tuple(  # noqa: E731
        [d.ln_k(state.t, extrapolate=extrapolate) for d in data]
    )
    return Constants(at, data, max(d.t_min for d in data), min(d.t_max for d in data))


@lru_cache(maxsize=512)
def data_of(read: System, table: Table) -> tuple[ReactionData, ...]:
    """Formation data of each reaction of a system."""
    return tuple(reaction_data(r, table) for r in read.reactions)


def is_fit(k: Value | Grid, n_reactions: int) -> bool:
    """Whether the argument K holds more numbers than reactions: coefficients of correlations."""
    if isinstance(k, str):
        return k.count(";") + 1 > n_reactions
    return isinstance(k, list) and sum(v is not BLANK for row in k for v in row) > n_reactions


def fits_of(k: Value | Grid, n_reactions: int) -> list[Fit]:
    """The correlation of each reaction, from coefficients or from blocks of XLEQ_K_FIT, one below the other.

    Raises
    ------
    InputError
        If there is not one for each reaction.
    """
    blocks: list[Grid]
    if not isinstance(k, list):
        blocks = [[[k]]]
    elif k[0][0] == "term":
        starts = [i for i, row in enumerate(k) if row[0] == "term"]
        blocks = [_block(k[a:b]) for a, b in zip(starts, [*starts[1:], len(k)], strict=True)]
    elif n_reactions == 1:
        blocks = [k]
    else:
        blocks = [[row] for row in k if any(v is not BLANK for v in row)]
    if len(blocks) != n_reactions:
        raise InputError(
            f"{n_reactions} reactions but {len(blocks)} rows of coefficients; give one row a reaction"
        )
    return [read_fit(block) for block in blocks]


def _block(rows: Grid) -> Grid:
    """A block of XLEQ_K_FIT without the empty rows and columns that a larger range around it has."""
    width = next((i for i, v in enumerate(rows[0]) if v is BLANK), len(rows[0]))
    return [row[:width] for row in rows if row[0] is not BLANK]


def _standard(read: System, values: Numbers, on: Basis, state: State) -> Numbers:
    """Ln K° from constants on another basis."""
    if state.kind == "X" and on.kind not in ("K", "Kx"):
        raise InputError(
            f"{on} is for gases and solutes; constants of a liquid mixture are on mole fractions"
        )
    if len(values) != len(read.reactions):
        return values  # the problem says how many there must be
    if state.kind == "X":
        return values
    p = state.p if state.kind == "P" else None
    pairs = zip(values, read.reactions, strict=True)
    return tuple(value - ln_factor_of(on, reaction, state.t, p) for value, reaction in pairs)


def slopes_of(read: System, k: Value | Grid, table: Table, t: float) -> Numbers | None:
    """Slope d ln K°/dT of each reaction [1/K]; None where K is a number, whose slope is not known.

    Raises
    ------
    MissingDataError
        If T lies outside the range of the data.
    """
    if is_data(k):
        return tuple(d.dln_k_dt(t) for d in data_of(read, table))
    if is_fit(k, len(read.reactions)):
        fits = fits_of(k, len(read.reactions))
        return tuple(1000.0 * dh_from_fit(fit, t) / (R * t * t) for fit in fits)
    return None


def model_of(read: System, options: Options, table: Table) -> Nonideality | None:
    """The departure from ideal that the options ask for; None for an ideal fluid.

    Raises
    ------
    InputError
        If the model is unknown.
    MissingDataError
        If a gas has no critical constants.
    """
    if read.fluid == "g":
        name = chosen(options, "gas", GAS_MODELS)
        if name == "ideal":
            return None
        from xleq.activity import peng_robinson, virial

        keys = [s.key for s in read.species]
        gases = [s.phase == "g" for s in read.species]
        return peng_robinson(keys, gases, table) if name == "PR" else virial(keys, gases, table)
    name = chosen(options, "activity", ACTIVITY_MODELS) if read.fluid == "aq" else "ideal"
    if name == "ideal":
        if "davies" in options:
            raise InputError("option davies is the coefficient of activity=davies; give that too")
        return None
    from xleq.activity import Aqueous

    charges = _charges(read)
    if name == "debye-huckel":
        if "davies" in options:
            raise InputError("option davies is the coefficient of activity=davies, not of debye-huckel")
        return Aqueous(charges, "debye-huckel")
    return Aqueous(charges, "davies", float(chosen(options, "davies", ("0.3", "0.2"))))


def _charges(read: System) -> list[float]:
    return [float(s.charge) if s.phase == "aq" else 0.0 for s in read.species]


def _open_pressures(read: System, options: Options) -> dict[int, float]:
    """Partial pressure of each open gas by its place [bar]: ``open=CO2 0.0004 atm, O2 0.21 bar``."""
    pressures: dict[int, float] = {}
    for part in filter(None, map(str.strip, options.get("open", "").split(","))):
        name, _, quantity = part.partition(" ")
        if not quantity:
            raise InputError(f"option open={part}: write a gas and its pressure: open=CO2 0.0004 atm")
        gas = parse_species(name, "g")
        place = next((i for i in read.open_gases if read.species[i] == gas), None)
        if place is None:
            raise InputError(f"option open: {gas.key} takes part in no reaction, or is not in the list")
        if place in pressures:
            raise InputError(f"option open: {gas.key} is given twice")
        pressures[place] = read_quantity(quantity, "pressure")
    for i in read.open_gases:
        if i not in pressures:
            s = read.species[i]
            raise InputError(
                f"{s.key} is a gas above the solution; give its partial pressure in the options, such as "
                f"open={s.name} 0.0004 atm"
            )
    return pressures


@dataclass(frozen=True)
class Equilibrium:
    """What the arguments of a worksheet function say of an equilibrium, ready for any state.

    Parameters
    ----------
    read : System
    feed : tuple [n_species] of float
        With solvent and open gases. [mol]
    constants : Constants
    model : Nonideality or None
    remarks : tuple of str
        What a checker should know at any state.
    """

    read: System
    feed: Numbers
    constants: Constants
    model: Nonideality | None
    remarks: tuple[str, ...] = ()

    def problem(self, state: State) -> Problem:
        """The problem at a state.

        Raises
        ------
        InputError
            If there is not one constant for each reaction.
        MissingDataError
            If the temperature lies outside the range of the data.
        """
        read, ln_k = self.read, self.constants.at(state)
        if len(ln_k) != len(read.nu):
            raise InputError(f"{len(read.nu)} reactions but {len(ln_k)} constants; give one K a reaction")
        return Problem(read.names, read.phases, read.nu, self.feed, ln_k, state, read.formulas, self.model)

    def solve(self, state: State) -> Solution:
        """The certified solution at a state.

        Raises
        ------
        NoAnswerError
            If there is none, or the model does not reach so far.
        """
        return solve(self.problem(state)).require()

    def solve_telling(self, state: State) -> Solution:
        """The same for the result of a cell: with notes for whoever checks it."""
        solution = self.solve(state)
        self.remark(solution)
        return solution

    def remark(self, solution: Solution) -> None:
        """Tell what a checker should know of a solution."""
        constants = self.constants.notes(solution.problem.state.t)
        tell((solution.method, *self.remarks, *self.read.notes, *constants, *solution.notes))


def equilibrium(
    read: System,
    feed: Numbers,
    k: Value | Grid,
    options: Options,
    data: Grid | None,
    *,
    fits: bool = False,
) -> Equilibrium:
    """The equilibrium that the arguments of a worksheet function describe.

    Parameters
    ----------
    read : System
    feed : tuple of float
        As the user lists them. [mol]
    k, options, data
        As the arguments of these names.
    fits : bool
        Whether K may be coefficients of correlations.

    Raises
    ------
    InputError
        If the arguments do not fit together; in a solution with an activity model also if it is not neutral.
    MissingDataError
        If formation data or critical constants are missing.
    """
    table = table_of(data, read.fluid)
    full = read.fed(feed)
    constants = constants_of(read, k, options, table, fits=fits)
    model = model_of(read, options, table)
    if model is not None and read.fluid == "aq":
        from xleq.activity import check_neutral

        check_neutral(_charges(read), full)
    if read.fluid != "aq":
        return Equilibrium(read, full, constants, model)
    pressures = _open_pressures(read, options)
    if not pressures:
        return Equilibrium(read, full, constants, model)
    said = tuple(f"{read.species[i].key} held at {p:.6g} bar, without an end" for i, p in pressures.items())
    return Equilibrium(read, full, constants.with_open(read.nu, pressures), model, said)
