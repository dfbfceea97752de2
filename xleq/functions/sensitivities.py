"""Worksheet functions about how far an equilibrium follows its inputs: sensitivities, uncertainties."""

from __future__ import annotations

import math
from typing import Final

import numpy as np
from numpy.typing import NDArray

from xleq.cells import Grid, Value
from xleq.constants import u_ln_k_from_fit
from xleq.equilibrium import State
from xleq.equilibrium.sensitivity import sensitivities, uncertainty
from xleq.errors import InputError, OutOfRangeError
from xleq.functions.arguments import READERS
from xleq.functions.composition import FEED, REACTIONS, SPECIES, T
from xleq.functions.conditions import equilibrium, fits_of, is_data, is_fit, slopes_of, table_of
from xleq.functions.systems import System, system
from xleq.functions.table import Argument, Example, Function, Result

Texts = tuple[str, ...]
Numbers = tuple[float, ...]

#: Standard uncertainty of ln K, T [K] or P [bar] beyond which first order means nothing at all.
_TOO_UNCERTAIN: Final = 1e6

_K: Final = Argument(
    "K", "constants", "constant of each reaction on p° = 1 bar; or data; or coefficients of ln K"
)
_P: Final = Argument("P", "pressure", "total pressure, absolute unless its unit says gauge", unit="bar")
_ERRORS: Final = (
    "#VALUE! as XLEQ_COMPOSITION_P; the slope with T is asked and K is a plain number",
    "#N/A as XLEQ_COMPOSITION_P",
    "#NUM! as XLEQ_COMPOSITION_P; a negative uncertainty",
)


def _slopes(read: System, k: Value | Grid, t: float) -> Numbers:
    found = slopes_of(read, k, table_of(None), t)
    if found is None:
        raise InputError("K is a plain number, whose change with T is not known; give data or coefficients")
    return found


def _sensitivity(
    reactions: Texts, k: Value | Grid, species: Texts, feed: Numbers, t: float, p: float, to: str
) -> Result:
    read = system(reactions, species, "g")
    solution = equilibrium(read, feed, k, {}, None, fits=True).solve_telling(State("P", t, p=p))
    found = sensitivities(solution, _slopes(read, k, t) if to == "T" else None)
    if to in ("T", "P"):
        by = found.by_t if to == "T" else found.by_p
        assert by is not None
        return _listed(by)
    block = found.by_ln_k if to == "lnK" else found.by_feed
    return [_listed(row) for row in block]


def _listed(numbers: NDArray[np.float64]) -> list[Value]:
    # Not a number: the derivative does not exist, as for a first trace of what opens a closed reaction.
    return ["" if math.isnan(x) else float(x) for x in numbers]


def _uncertainty(
    reactions: Texts,
    k: Value | Grid,
    u_lnk: Value | Grid,
    species: Texts,
    feed: Numbers,
    t: float,
    p: float,
    u_t: float,
    u_p: float,
) -> list[Value]:
    read = system(reactions, species, "g")
    solution = equilibrium(read, feed, k, {}, None, fits=True).solve_telling(State("P", t, p=p))
    slopes = _slopes(read, k, t) if u_t else None
    spread = _spread(read, k, u_lnk, t)
    if max(*spread, u_t, u_p) > _TOO_UNCERTAIN:
        raise OutOfRangeError(f"an uncertainty of more than {_TOO_UNCERTAIN:g} says nothing")
    return _listed(uncertainty(solution, spread, u_t, u_p, slopes))


def _spread(read: System, k: Value | Grid, given: Value | Grid, t: float) -> Numbers:
    """Standard uncertainty of each ln K: as given, or from the covariance of the fits."""
    if isinstance(given, str) and given.strip().lower() == "fit":
        if is_data(k) or not is_fit(k, len(read.reactions)):
            raise InputError("u_lnK is fit, but K holds no fit; refer to the block of XLEQ_K_FIT in K")
        return tuple(u_ln_k_from_fit(fit, t) for fit in fits_of(k, len(read.reactions)))
    numbers: Numbers = READERS["numbers"](given, ())
    if len(numbers) != len(read.reactions):
        raise InputError(f"{len(read.reactions)} reactions but {len(numbers)} values of u_lnK; give one each")
    return numbers


FUNCTIONS: Final = (
    Function(
        "XLEQ_SENSITIVITY",
        "composition",
        (
            REACTIONS,
            _K,
            SPECIES,
            FEED,
            T,
            _P,
            Argument("to", "word", "what changes", "lnK", known=("lnK", "T", "P", "feed")),
        ),
        "change of each amount with lnK [mol] or feed [-], a block with a row a species; with T [mol/K] or P "
        "[mol/bar], a list; empty where there is no derivative",
        _sensitivity,
        _ERRORS,
        "implicit differentiation of the equilibrium conditions at the certified solution",
        (
            Example(
                '=XLEQ_SENSITIVITY("CO + H2O = CO2 + H2", 1, "CO; H2O; CO2; H2", "1; 1; 0; 0", 1100, 1)',
                [[-0.125], [-0.125], [0.125], [0.125]],
            ),
        ),
    ),
    Function(
        "XLEQ_UNCERTAINTY",
        "composition",
        (
            REACTIONS,
            _K,
            Argument("u_lnK", "constants", "standard uncertainty of each ln K; or fit: from the blocks in K"),
            SPECIES,
            FEED,
            T,
            _P,
            Argument("u_T", "temperature difference", "standard uncertainty of T", 0.0, unit="K"),
            Argument("u_P", "pressure difference", "standard uncertainty of P", 0.0, unit="bar"),
        ),
        "standard uncertainty of each amount, first order [mol]",
        _uncertainty,
        _ERRORS,
        "JCGM 100:2008 (GUM), equation (10)",
        (
            Example(
                '=XLEQ_UNCERTAINTY("CO + H2O = CO2 + H2", 1, 0.08, "CO; H2O; CO2; H2", "1; 1; 0; 0", 1100, '
                "1)",
                [[0.01], [0.01], [0.01], [0.01]],
            ),
        ),
    ),
)
