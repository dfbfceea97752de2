"""The module that xlwings serves to Excel: one function for each worksheet function.

xlwings reads names, arguments and help from the functions in this module. They carry no annotations, because
it would take those for conversions.
"""

from __future__ import annotations

from collections.abc import Callable
from inspect import Parameter, Signature
from typing import Any, Final

import xlwings as xw

from xleq.cells import MISSING
from xleq.functions import TABLE, Function, call
from xleq.hosts.excel.names import argument_description, description, vba_name
from xleq.hosts.excel.values import from_excel, to_excel

CATEGORY: Final = "xleq"


def _wrapper(function: Function) -> Callable[..., Any]:
    def wrapper(*given: Any) -> Any:
        return to_excel(call(function.name, [from_excel(item) for item in given]))

    parameters = [
        Parameter(
            vba_name(a),
            Parameter.POSITIONAL_OR_KEYWORD,
            default=MISSING if a.optional else Parameter.empty,
        )
        for a in function.arguments
    ]
    wrapper.__name__ = wrapper.__qualname__ = function.name
    wrapper.__doc__ = description(function)
    wrapper.__module__ = __name__
    wrapper.__annotations__ = {}
    wrapper.__signature__ = Signature(parameters)  # type: ignore[attr-defined]
    shaped: Any = wrapper
    for a in function.arguments:
        shaped = xw.arg(vba_name(a), ndim=2, err_to_str=True, doc=argument_description(a))(shaped)
    shaped = xw.ret(ndim=2)(shaped)
    # Outermost, because the others reset what it sets.
    return xw.func(category=CATEGORY, volatile=function.volatile)(shaped)  # type: ignore[no-any-return]


for _function in TABLE.values():
    globals()[_function.name] = _wrapper(_function)
