"""Excel without Excel: calls go to the real xlwings in another process, and come back as our VBA has them."""

from __future__ import annotations

import contextlib
import json
import subprocess
import sys
from collections.abc import Sequence
from pathlib import Path
from typing import Any

from xleq.cells import BLANK, MISSING, CellError, Grid, Value

_SERVER = Path(__file__).with_name("excel_server.py")
_CODES = ("#NULL!", "#DIV/0!", "#VALUE!", "#REF!", "#NAME?", "#NUM!", "#N/A")


class SimulatedExcel:
    """One Python process that serves worksheet functions through xlwings."""

    def __enter__(self) -> SimulatedExcel:
        self._process = subprocess.Popen(
            [sys.executable, str(_SERVER)], stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True
        )
        if self._read() != "ready\n":
            self.__exit__()
            raise AssertionError("the server did not start")
        return self

    def __exit__(self, *_: object) -> None:
        assert self._process.stdin is not None
        assert self._process.stdout is not None
        with contextlib.suppress(BrokenPipeError):  # it has ended over a call, which was told there
            self._process.stdin.close()
        self._process.wait(timeout=30)
        self._process.stdout.close()

    def _read(self) -> str:
        assert self._process.stdout is not None
        return self._process.stdout.readline()

    def ask(self, what: Any) -> Any:
        """The server's answer; an exception in it ends the process, and so the test."""
        assert self._process.stdin is not None
        self._process.stdin.write(json.dumps(what) + "\n")
        self._process.stdin.flush()
        line = self._read()
        assert line, f"the server ended over {what}"
        return json.loads(line)

    def raw(self, name: str, *arguments: Any) -> Any:
        """What leaves Python: errors are text still."""
        return self.ask([name, list(arguments)])

    def call(self, name: str, given: Sequence[Any]) -> Value | Grid:
        """Value or block that the cell shows, for arguments as the evaluator has them."""
        return shown(self.raw(name, *map(passed, given)))


def passed(item: Any) -> Any:
    """An argument as our VBA passes it: blocks as arrays of plain values."""
    if item is MISSING:
        return {"missing": 1}
    if isinstance(item, list):
        return {"array": [[passed(v) for v in row] for row in item]}
    if item is BLANK:
        return None
    return {"error": item.code} if isinstance(item, CellError) else item


def shown(found: Any) -> Value | Grid:
    """A result after our VBA: error texts are errors, one row is a row."""
    if not isinstance(found, list):
        return _cell(found)
    rows = found if isinstance(found[0], list) else [found]
    return [[_cell(v) for v in row] for row in rows]


def _cell(value: Any) -> Value:
    if isinstance(value, str) and value.partition(" ")[0] in _CODES:
        code, _, reason = value.partition(" ")
        return CellError(code, reason)
    return float(value) if isinstance(value, int) and not isinstance(value, bool) else value
