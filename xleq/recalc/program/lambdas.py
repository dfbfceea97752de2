"""Functions as values: what LAMBDA makes and its helpers call."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

from xleq.cells import MISSING, CellError, Missing
from xleq.recalc.context import Context
from xleq.recalc.depth import LAMBDA_LEVELS
from xleq.recalc.operands import Fail, Operand


@dataclass(frozen=True, slots=True, eq=False)
class Lambda:
    """The value of a LAMBDA expression.

    Parameters
    ----------
    n_parameters : int
        Number of its parameters.
    n_optional : int
        How many of the last ones may be left out.
    body : callable
        Takes a `Context` whose `locals` hold the captured values and the arguments.
    context : Context
        Place in which the body is evaluated.
    captured : tuple
        Values of the names around the expression.
    """

    n_parameters: int
    n_optional: int
    body: Callable[[Context], Operand]
    context: Context
    captured: tuple[Operand | Missing, ...]


def call_lambda(function: object, args: Sequence[Operand | Missing]) -> Operand:
    """Call the value of a LAMBDA expression.

    Raises
    ------
    Fail
        #VALUE! if it is not a function or takes another number of arguments.
    """
    if type(function) is CellError:
        raise Fail(function)
    if not isinstance(function, Lambda):
        raise Fail(CellError("#VALUE!", "a LAMBDA is wanted"))
    n = function.n_parameters
    if not n - function.n_optional <= len(args) <= n:
        raise Fail(CellError("#VALUE!", f"the LAMBDA takes {n} arguments, not {len(args)}"))
    at = function.context
    if at.depth * (n + 1) > LAMBDA_LEVELS:
        raise Fail(CellError("#NUM!", "a LAMBDA calls itself too deeply"))
    before = at.locals
    at.depth += 1
    at.locals = function.captured + tuple(args) + (MISSING,) * (n - len(args))
    try:
        return function.body(at)
    finally:
        at.locals = before
        at.depth -= 1
