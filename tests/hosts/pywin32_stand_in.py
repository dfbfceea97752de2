"""The part of pywin32 that the real xlwings needs in order to serve worksheet functions, simulated.

`install` must run before xlwings is imported, in a process of its own: it changes `sys.modules`. What it
gives back calls a function just as Excel's VBA would, through xlwings' own server object.
"""

from __future__ import annotations

import ctypes
import datetime
import os
import sys
from collections.abc import Sequence
from types import ModuleType
from typing import Any
from unittest.mock import MagicMock

#: How pywin32 hands over an argument that a formula leaves out.
MISSING = -2147352572
ERRORS = {
    "#NULL!": -2146826288,
    "#DIV/0!": -2146826281,
    "#VALUE!": -2146826273,
    "#REF!": -2146826265,
    "#NAME?": -2146826259,
    "#NUM!": -2146826252,
    "#N/A": -2146826246,
}
_RANGE_ID = "{00020846-0000-0000-C000-000000000046}"


class Dispatched:
    """A COM object."""


class ComError(Exception):
    """A COM call that failed."""


class ExcelRange(Dispatched):
    """A range of cells, as far as reading its values goes."""

    def __init__(self, value: Any, n_rows: int = 1, n_columns: int = 1) -> None:
        info = MagicMock()
        info.GetTypeInfo.return_value.GetTypeAttr.return_value.iid = _RANGE_ID
        self._oleobj_ = info
        self.Value = value
        self.Row = self.Column = 1
        self.Count = n_rows * n_columns
        self.Rows = MagicMock(Count=n_rows)
        self.Columns = MagicMock(Count=n_columns)
        self.Worksheet = MagicMock()


def cells(*rows: Sequence[Any]) -> ExcelRange:
    """A range with these rows of values: one cell gives its value, as in Excel."""
    block = tuple(tuple(row) for row in rows)
    one = len(block) == 1 and len(block[0]) == 1
    return ExcelRange(block[0][0] if one else block, len(block), len(block[0]))


def _module(name: str, **members: Any) -> ModuleType:
    module = ModuleType(name)
    for key, value in members.items():
        setattr(module, key, value)
    sys.modules[name] = module
    parent, _, child = name.rpartition(".")
    if parent:
        setattr(sys.modules[parent], child, module)
    return module


def _not_ours(_: Any) -> Any:
    raise ComError("not one of our objects")


def install() -> Any:
    """Put the stand-in in place and import xlwings on top of it; gives xlwings' server object."""
    ctypes.windll = ctypes.oledll = MagicMock()  # type: ignore[attr-defined]
    os.environ.pop("XLWINGS_ON_SERVER", None)
    _module("pywintypes", com_error=ComError, TimeType=datetime.datetime, IID=str)
    _module(
        "pythoncom",
        __file__="",
        CoInitialize=lambda: None,
        TypeIIDs={"IDispatch": ComError},
        IID_IDispatch="IDispatch",
        IID_IEnumVARIANT="IEnumVARIANT",
        ole_error=ComError,
    )
    for name in ("win32api", "win32con", "win32event", "win32gui", "win32timezone"):
        _module(name)
    _module("win32process", GetWindowThreadProcessId=lambda _: (1, 1))
    _module("win32com")
    _module(
        "win32com.client",
        CDispatch=Dispatched,
        CoClassBaseClass=Dispatched,
        DispatchBaseClass=Dispatched,
        Dispatch=lambda given, **_: given,
        DispatchEx=lambda given, **_: given,
    )
    _module("win32com.server")
    _module("win32com.server.util", unwrap=_not_ours, wrap=lambda item, **_: item)
    _module("win32com.server.dispatcher")
    _module("win32com.server.policy")

    import xlwings as xw

    dll, ctypes.PyDLL = ctypes.PyDLL, MagicMock()  # type: ignore[misc]
    from xlwings import _xlwindows

    ctypes.PyDLL = dll  # type: ignore[misc]
    xw.engines.add(xw.main.Engine(impl=_xlwindows.engine))
    xw.engines.active = xw.engines["excel"]
    from xlwings import com_server, udfs

    xw.func, xw.arg, xw.ret = udfs.xlfunc, udfs.xlarg, udfs.xlret
    return com_server.XLPython()


def array(value: Any) -> Any:
    """A result as VBA gets it: tuples of tuples or one value; raises where Excel could not take it."""
    if isinstance(value, list | tuple):
        rows = [tuple(row) if isinstance(row, list | tuple) else row for row in value]
        if rows and isinstance(rows[0], tuple):
            assert len({len(row) for row in rows}) == 1, "a jagged block"
        for row in rows:
            for item in row if isinstance(row, tuple) else (row,):
                _allowed(item, in_array=True)
        return tuple(rows)
    _allowed(value, in_array=False)
    return value


def _allowed(item: Any, *, in_array: bool) -> None:
    assert type(item) in (float, str, bool), f"{item!r} is no cell value"
    if isinstance(item, str):
        assert len(item) <= (255 if in_array else 32767), "too long a text"
