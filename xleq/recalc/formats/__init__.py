"""Number formats: a value as a cell shows it, or as TEXT gives it.

A code has up to four sections between semicolons: numbers above zero, below zero, zero, and text; or each
with a condition of its own. `format_value` is all that other rooms need.
(source: ECMA-376-1:2016, 18.8.31 numFmts; Microsoft, "Number format codes")
"""

from xleq.recalc.formats.numbers import general_text
from xleq.recalc.formats.values import format_value

__all__ = ["format_value", "general_text"]
