"""Formulas parsed, compiled and evaluated as the spreadsheet would."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from xleq.recalc.recalculation import (
    Change,
    Functions,
    Kept,
    Marked,
    Recalculation,
    evaluate_text,
    recalculate,
)

if TYPE_CHECKING:
    from xleq.recalc.precedents import Precedents

__all__ = [
    "Change",
    "Functions",
    "Kept",
    "Marked",
    "Precedents",
    "Recalculation",
    "evaluate_text",
    "recalculate",
]


def __getattr__(name: str) -> Any:
    # the evaluator needs numpy, which a command that only prints help must not wait for
    if name == "Precedents":
        from xleq.recalc.precedents import Precedents

        return Precedents
    raise AttributeError(name)
