"""Help texts of arguments, as every host's function wizard shows them."""

from __future__ import annotations

from xleq.functions import Argument


def argument_help(argument: Argument) -> str:
    """What an argument means, with its unit, known words and default.

    Examples
    --------
    >>> argument_help(Argument("T", "temperature", "temperature", 298.15, "K"))
    'temperature [K]; default 298.15'
    """
    unit = f" [{argument.unit}]" if argument.unit else ""
    known = f"; known: {', '.join(argument.known)}" if argument.known else ""
    return f"{argument.meaning}{unit}{known}{_default(argument)}"


def _default(argument: Argument) -> str:
    value = argument.default
    if not argument.optional or value is None or value == "":
        return "; optional" if argument.optional else ""
    return f"; default {value:g}" if isinstance(value, float) else f"; default {value}"
