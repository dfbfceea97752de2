"""Formulas parsed, compiled and evaluated as the spreadsheet would."""

from xleq.recalc.recalculation import (
    Change,
    Functions,
    Kept,
    Marked,
    Recalculation,
    evaluate_text,
    recalculate,
)

__all__ = ["Change", "Functions", "Kept", "Marked", "Recalculation", "evaluate_text", "recalculate"]
