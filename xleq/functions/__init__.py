"""The table of worksheet functions and their definitions by topic."""

from __future__ import annotations

import difflib
from collections.abc import Sequence
from typing import Final

from xleq.cells import NAME, CellError, Grid, Value
from xleq.functions import (
    composition,
    constants,
    formation,
    inverse,
    program,
    reactions,
    sensitivities,
    solutions,
    thermochemistry,
)
from xleq.functions.table import Argument, Example, Function, Given, Memory, evaluate_with_notes

_TOPICS: Final = (
    reactions,
    constants,
    thermochemistry,
    composition,
    formation,
    inverse,
    sensitivities,
    solutions,
    program,
)
#: Every worksheet function by name, in the order of the reference.
TABLE: Final[dict[str, Function]] = {f.name: f for topic in _TOPICS for f in topic.FUNCTIONS}

_MEMORY: Final = Memory()

__all__ = ["TABLE", "Argument", "Example", "Function", "call", "call_with_notes"]


def call(name: str, given: Sequence[Given]) -> Value | Grid:
    """Value or block of a worksheet function, as a host calls it.

    Parameters
    ----------
    name : str
        In any case.
    given : sequence
        Cell values, blocks (lists of rows) or `MISSING`, as many as the formula has arguments.

    Returns
    -------
    Value or Grid
        A cell error with its reason wherever the function gives none.

    Examples
    --------
    >>> call("XLEQ_COMPOSITION_V", ["2 HI = H2 + I2", 0.25, "HI; H2; I2", "1; 0; 0", 700.0, 1.0, "moles H2"])
    0.25
    """
    function = _named(name)
    return function if isinstance(function, CellError) else _MEMORY.evaluate(function, given)


def call_with_notes(name: str, given: Sequence[Given]) -> tuple[Value | Grid, tuple[str, ...]]:
    """As `call`, computed afresh, with what a checker should know of the result.

    Parameters
    ----------
    name : str
        In any case.
    given : sequence
        As for `call`.

    Returns
    -------
    Value or Grid
    tuple of str
        Method, model and its range, data that were extrapolated, species that cannot form.

    Examples
    --------
    >>> call_with_notes("XLEQ_ACTIVITY_COEFFICIENT", ["Na+", 0.6])[1]
    ('ionic strength 0.6 mol/L: davies is meant for up to 0.5 mol/L',)
    """
    function = _named(name)
    return (function, ()) if isinstance(function, CellError) else evaluate_with_notes(function, given)


def _named(name: str) -> Function | CellError:
    function = TABLE.get(name) or TABLE.get(name.upper())
    if function is not None:
        return function
    near = difflib.get_close_matches(name.upper(), TABLE, 3, 0.6)
    hint = f"; near it: {', '.join(near)}" if near else ""
    return CellError(NAME.code, f"there is no function {name}{hint}")
