"""Times the live hosts: a call through Excel's side (xlwings, simulated COM) and through LibreOffice Calc.

Run it with ``python -m tests.benchmarks.hosts``.
"""

from __future__ import annotations

import math
import tempfile
import time
from collections.abc import Callable
from pathlib import Path

from openpyxl import Workbook
from openpyxl.worksheet.worksheet import Worksheet

from tests.hosts import office
from tests.hosts.simulated_excel import SimulatedExcel
from xleq.functions import call

N = 10_000


def excel() -> None:
    """A call with the transport to the other process, beside the function alone."""
    with SimulatedExcel() as server:
        server.raw("XLEQ_K_SCALE", 16.0, 1.0)
        start = time.perf_counter()
        for i in range(2000):
            server.raw("XLEQ_K_SCALE", 16.0, float(i + 2))
        through = (time.perf_counter() - start) / 2000
        t = [[300.0 + 0.1 * i] for i in range(N)]
        k = [[math.exp(-10.0 + 6000.0 / row[0])] for row in t]
        start = time.perf_counter()
        fitted = server.raw("XLEQ_K_FIT", {"array": t}, {"array": k}, 2.0)
        whole = time.perf_counter() - start
        assert isinstance(fitted, list), fitted  # a refusal would be no measurement
    start = time.perf_counter()
    for i in range(2000):
        call("XLEQ_K_SCALE", [17.0, float(i + 2)])
    alone = (time.perf_counter() - start) / 2000
    print(f"Excel (simulated): {1e6 * through:.0f} us a call, of which the function {1e6 * alone:.0f} us")
    print(f"Excel (simulated): K fitted to {N} rows in {1e3 * whole:.0f} ms")


def _seconds(fill: Callable[[Worksheet], None]) -> float:
    with tempfile.TemporaryDirectory() as folder:
        book = Workbook()
        fill(book.worksheets[0])
        path = Path(folder) / "book.xlsx"
        book.save(path)
        start = time.perf_counter()
        office.recalculated(path, Path(folder) / "out", 300.0)
        return time.perf_counter() - start


def _calls(formula: str) -> Callable[[Worksheet], None]:
    def fill(sheet: Worksheet) -> None:
        for row in range(1, N + 1):
            sheet.cell(row, 1).value = formula.format(row=row)

    return fill


def _block(formula: str) -> Callable[[Worksheet], None]:
    def fill(sheet: Worksheet) -> None:
        for row in range(1, N + 1):
            sheet.cell(row, 1).value = 300.0 + 0.1 * row
            sheet.cell(row, 2).value = math.exp(-10.0 + 6000.0 / (300.0 + 0.1 * row))
        sheet["C1"] = formula

    return fill


def calc() -> None:
    """Whole runs of the office, with our functions and with its own."""
    own, ours = _seconds(_calls("=16^({row}+1)")), _seconds(_calls("=XLEQ_K_SCALE(16,{row}/1000)"))
    print(
        f"Calc: {N} cells in {ours:.1f} s, native cells {own:.1f} s: {1e6 * (ours - own) / N:.0f} us a call"
    )
    none, one = (
        _seconds(_block(f"=SUM(A1:A{N})")),
        _seconds(_block(f"=INDEX(XLEQ_K_FIT(A1:A{N},B1:B{N}),2,2)")),
    )
    print(f"Calc: K fitted to {N} rows in {1e3 * (one - none):.0f} ms, the add-in's start included")


if __name__ == "__main__":
    excel()
    if office.available():
        calc()
