"""The spreadsheet's own functions, by topic, each declared with the kinds of its arguments."""

from __future__ import annotations

import importlib
import pkgutil
from functools import cache
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from xleq.recalc.natives.table import Native


@cache
def natives() -> dict[str, Native]:
    """Every native function by its name in capitals; the modules are imported at the first call.

    Examples
    --------
    >>> natives()["SUM"].repeated[0].kind
    'list'
    """
    from xleq.recalc.natives.table import NATIVES

    for module in pkgutil.walk_packages(__path__, __name__ + "."):
        importlib.import_module(module.name)
    return NATIVES
