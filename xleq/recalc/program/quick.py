"""Infix operators compiled with a short way for two numbers, which is what they nearly always meet."""

from __future__ import annotations

from xleq.cells import CellError
from xleq.recalc.coerce import near
from xleq.recalc.context import Context
from xleq.recalc.operands import Operand
from xleq.recalc.program.operators import apply, snapped
from xleq.recalc.program.references import Run

# the operands are values or arrays here: `Compiler.scalar` has read every reference
# mypy: disable-error-code="arg-type"


def arithmetic(operator: str, left: Run, right: Run) -> Run:
    """``+ - * / ^`` between two expressions."""
    return {"+": _sum, "-": _gap, "*": _product, "/": _quotient, "^": _power}[operator](left, right)


def _sum(left: Run, right: Run) -> Run:
    def run(at: Context) -> Operand:
        a, b = left(at), right(at)
        if type(a) is float and type(b) is float:
            result = a + b
            if result - result == 0.0:
                return result
        return apply("+", a, b)

    return run


def _gap(left: Run, right: Run) -> Run:
    def run(at: Context) -> Operand:
        a, b = left(at), right(at)
        if type(a) is float and type(b) is float:
            result = a - b
            if result - result == 0.0:
                return result
        return apply("-", a, b)

    return run


def _product(left: Run, right: Run) -> Run:
    def run(at: Context) -> Operand:
        a, b = left(at), right(at)
        if type(a) is float and type(b) is float:
            result = a * b
            if result - result == 0.0:
                return result
        return apply("*", a, b)

    return run


def _quotient(left: Run, right: Run) -> Run:
    def run(at: Context) -> Operand:
        a, b = left(at), right(at)
        if type(a) is float and type(b) is float and b != 0.0:
            result = a / b
            if result - result == 0.0:
                return result
        return apply("/", a, b)

    return run


def _power(left: Run, right: Run) -> Run:
    def run(at: Context) -> Operand:
        a, b = left(at), right(at)
        if type(a) is float and type(b) is float and a > 0.0:
            try:
                return float(a**b)
            except OverflowError:
                return CellError("#NUM!", "the result is too large")
        return apply("^", a, b)

    return run


def total(left: Run, right: Run) -> Run:
    """A sum at the top of a formula: what cancels in all of 15 digits is zero."""

    def run(at: Context) -> Operand:
        a, b = left(at), right(at)
        if type(a) is float and type(b) is float:
            result = a + b
            if result - result == 0.0:
                return snapped(result, a, b) if abs(result) < abs(a) * 1e-13 else result
        return apply("+", a, b)

    return run


def difference(left: Run, right: Run) -> Run:
    """A difference at the top of a formula: what cancels in all of 15 digits is zero."""

    def run(at: Context) -> Operand:
        a, b = left(at), right(at)
        if type(a) is float and type(b) is float:
            result = a - b
            if result - result == 0.0:
                return snapped(result, a, -b) if abs(result) < abs(a) * 1e-13 else result
        return apply("-", a, b)

    return run


def comparison(operator: str, left: Run, right: Run) -> Run:
    """``= <> < > <= >=`` between two expressions."""
    if_less, if_equal, if_greater = "<" in operator, "=" in operator, ">" in operator

    def run(at: Context) -> Operand:
        a, b = left(at), right(at)
        if type(a) is float and type(b) is float:
            if a == b or near(a, b):
                return if_equal
            return if_less if a < b else if_greater
        return apply(operator, a, b)

    return run
