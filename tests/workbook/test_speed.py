"""A hundred thousand formula cells are read and written in the time and memory that were promised."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest
import xlsxwriter

N_ROWS = 10_000
MEASURED = """
import resource, sys, time
from xleq.workbook import SheetResults, open_book, write_book
begun = time.process_time()
book = open_book(sys.argv[1])
read = time.process_time()
sheet = book.sheets[0]
results = {0: SheetResults({place: sheet.stored[place] * 1.1 + 0.3 for place in sheet.formulas})}
start = time.process_time()
write_book(book, results, sys.argv[2])
written = time.process_time()
memory = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
print(len(sheet.formulas), read - begun, written - start, memory)
"""


@pytest.mark.slow
def test_a_hundred_thousand_cells_are_read_and_written_quickly(tmp_path: Path) -> None:
    pytest.importorskip("resource")
    path = tmp_path / "large.xlsx"
    with xlsxwriter.Workbook(path) as book:
        sheet = book.add_worksheet("Loop")
        for row in range(N_ROWS):
            sheet.write_number(row, 0, 1 + row * 0.37)
            for column in range(1, 11):
                formula = f"=A{row + 1}*{column}+SIN(A{row + 1})/{column + 1}"
                sheet.write_formula(row, column, formula, None, row * 1.1 + column / 7)
    command = [sys.executable, "-c", MEASURED, str(path), str(tmp_path / "new.xlsx")]
    done = subprocess.run(command, capture_output=True, text=True, check=True)
    n_formulas, read, written, memory = map(float, done.stdout.split())
    assert n_formulas == 10 * N_ROWS
    assert read < 1.2  # s of processor time
    assert written < 2.0  # s of processor time
    assert memory < 200  # MB at most
