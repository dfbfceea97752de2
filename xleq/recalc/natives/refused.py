"""Functions that are not computed on purpose: their cells keep the stored value, with the reason."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from xleq.recalc.natives.table import native
from xleq.recalc.sheets.columns import Unsupported

_REFUSED = {
    "it would fetch something from the network": "WEBSERVICE IMAGE STOCKHISTORY TRANSLATE DETECTLANGUAGE",
    "it would run code outside the workbook": "CALL REGISTER.ID RTD SQL.REQUEST",
    "it asks a pivot table, which is not computed here": "GETPIVOTDATA",
    "it asks a data cube": (
        "CUBEKPIMEMBER CUBEMEMBER CUBEMEMBERPROPERTY CUBERANKEDMEMBER CUBESET CUBESETCOUNT CUBEVALUE"
    ),
}


def _refusal(name: str, reason: str) -> Callable[..., Any]:
    def refuse(*_: Any) -> Any:
        raise Unsupported(f"{name} is not computed: {reason}")

    return refuse


for _reason, _names in _REFUSED.items():
    for _name in _names.split():
        native(_name, "lazy*")(_refusal(_name, _reason))
