"""Times recalculation of native cells: whole processes beside LibreOffice, and ranges as they grow.

Run from the project's folder: `python -m tests.benchmarks.recalculation`. Processor time of the whole
process, its children included, is told beside the wall clock, for the machine may be busy.
"""

from __future__ import annotations

import os
import resource
import shutil
import subprocess
import sys
import tempfile
import time
from pathlib import Path

import xlsxwriter

from xleq.recalc import recalculate
from xleq.workbook import open_book

#: Ten different formulas a row, as an engineer's sheet has them.
ORDINARY = (
    "A{r}*B{r}+2", "EXP(-A{r}/1000)*$B$1", "IF(D{r}>500,D{r}/2,E{r}*3)", "ROUND(F{r},2)",
    'C{r}&"-"&TEXT(G{r},"0.0")', "SUM(D{r}:G{r})", "MAX(D{r}:G{r})-MIN(D{r}:G{r})", "LN(A{r})^2-SQRT(B{r})",
    "VLOOKUP(C{r},$C$1:$D$3,2,FALSE)", "AND(A{r}>310,B{r}<5)",
)  # fmt: skip
#: One formula a row over all rows, n of them.
RANGES = {
    "running SUM": "SUM($A$1:A{r})",
    "SUMIF by text": "SUMIF($B$1:$B${n},B{r},$A$1:$A${n})",
    "COUNTIF by order": 'COUNTIF($A$1:$A${n},">"&A{r})',
    "exact VLOOKUP": "VLOOKUP(A{r},$A$1:$C${n},3,FALSE)",
    "approximate MATCH": "MATCH(C{r},$C$1:$C${n},1)",
    "INDEX and MATCH by text": "INDEX($C$1:$C${n},MATCH(B{r},$B$1:$B${n},0))",
    "SUMPRODUCT with conditions": "SUMPRODUCT(($A$1:$A${n}>A{r})*($B$1:$B${n}=B{r})*$C$1:$C${n})",
    "AVERAGE of everything": "AVERAGE($A$1:$A${n})",
}


def ordinary(path: Path, n_cells: int) -> None:
    """A workbook of ordinary formulas."""
    with xlsxwriter.Workbook(path) as book:
        sheet = book.add_worksheet("Data")
        for r in range(n_cells // len(ORDINARY)):
            sheet.write_row(r, 0, [300 + r * 0.01, 1 + (r % 50) * 0.5, "abc"[r % 3]])
            for c, formula in enumerate(ORDINARY):
                sheet.write_formula(r, 3 + c, "=" + formula.format(r=r + 1))


def ranges(path: Path, formula: str, n: int) -> None:
    """A workbook whose formulas each look at a column of n rows."""
    with xlsxwriter.Workbook(path) as book:
        sheet = book.add_worksheet("Data")
        for r in range(n):
            sheet.write_row(r, 0, [(r * 7919) % n + 0.5, f"k{(r * 31) % 997}", r])
            sheet.write_formula(r, 3, "=" + formula.format(r=r + 1, n=n))


def profile(folder: Path) -> Path:
    """An office profile that recalculates every file on load, with its first start done."""
    user = folder / "profile" / "user"
    user.mkdir(parents=True, exist_ok=True)
    settings = user / "registrymodifications.xcu"
    if not settings.exists():
        settings.write_text(
            '<?xml version="1.0" encoding="UTF-8"?>'
            '<oor:items xmlns:oor="http://openoffice.org/2001/registry">'
            '<item oor:path="/org.openoffice.Office.Calc/Formula/Load"><prop oor:name="OOXMLRecalcMode" '
            'oor:op="fuse"><value>0</value></prop></item></oor:items>'
        )
    return user.parent


def process(command: list[str]) -> tuple[float, float, float]:
    """Wall clock [s], processor time [s] and peak memory [MB] of a process and its children."""
    start = time.perf_counter()
    child = subprocess.Popen(command, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
    _, status, usage = os.wait4(child.pid, 0)
    if os.waitstatus_to_exitcode(status) not in (0, 3):
        raise SystemExit(f"{command} failed")
    return time.perf_counter() - start, usage.ru_utime + usage.ru_stime, usage.ru_maxrss / 1024


def beside_office(folder: Path, n_cells: int) -> None:
    """Recalculate a file and let LibreOffice convert the same one."""
    path = folder / f"{n_cells}.xlsx"
    ordinary(path, n_cells)
    wall, cpu, memory = process(
        [sys.executable, "-m", "xleq.cli", "recalc", str(path), "-o", str(folder / "out.xlsx")]
    )
    print(f"{n_cells:>7} cells  here         {wall:6.2f} s, {cpu:6.2f} s of processor, {memory:4.0f} MB")
    if shutil.which("soffice") is None:
        print("               LibreOffice is not installed")
        return
    # soffice starts the office proper as a child, whose time and memory only the children's sum tells
    before = resource.getrusage(resource.RUSAGE_CHILDREN)
    start = time.perf_counter()
    subprocess.run(
        ["soffice", f"-env:UserInstallation=file://{profile(folder)}", "--headless", "--convert-to", "xlsx",
         "--outdir", str(folder / "office"), str(path)],
        check=True, capture_output=True, timeout=300,
    )  # fmt: skip
    after = resource.getrusage(resource.RUSAGE_CHILDREN)
    cpu = after.ru_utime + after.ru_stime - before.ru_utime - before.ru_stime
    print(f"               LibreOffice  {time.perf_counter() - start:6.2f} s, {cpu:6.2f} s of processor, "
          f"{after.ru_maxrss / 1024:4.0f} MB at most")  # fmt: skip


def growing(folder: Path) -> None:
    """Time a cell of range-heavy columns of 2,500 and of 10,000 rows."""
    path = folder / "ranges.xlsx"
    for title, formula in RANGES.items():
        told = []
        for n in (2_500, 10_000):
            ranges(path, formula, n)
            book = open_book(path)
            start = time.process_time()
            done = recalculate(book, {})
            told.append(1e6 * (time.process_time() - start) / done.n_formulas)
        print(f"{title:28} {told[0]:6.0f} µs a cell at 2,500 rows, {told[1]:6.0f} at 10,000")


def main() -> None:
    """Print all figures."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        for n_cells in (100, 10_000, 100_000):
            beside_office(folder, n_cells)
        growing(folder)


if __name__ == "__main__":
    main()
