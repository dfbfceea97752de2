"""Times reading and writing of a workbook of 100,000 formula cells: ``python -m tests.benchmarks.workbook``.

Beside it, in the same run, the same file is loaded and saved by openpyxl, as one would write it by hand.
"""

from __future__ import annotations

import subprocess
import sys
import tempfile
from pathlib import Path

import xlsxwriter

N_ROWS = 10_000
OURS = """
import resource, sys, time
from xleq.workbook import SheetResults, open_book, write_book
begun = time.process_time()
book = open_book(sys.argv[1])
read = time.process_time()
sheet = book.sheets[0]
results = {0: SheetResults({place: sheet.stored[place] * 1.1 + 0.3 for place in sheet.formulas})}
start = time.process_time()
write_book(book, results, sys.argv[2])
print(read - begun, time.process_time() - start, resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024)
"""
BY_HAND = """
import resource, sys, time
import openpyxl
begun = time.process_time()
book = openpyxl.load_workbook(sys.argv[1])
read = time.process_time()
book.save(sys.argv[2])
print(read - begun, time.process_time() - read, resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024)
"""


def main() -> None:
    """Print processor times and peak memory of both."""
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "large.xlsx"
        with xlsxwriter.Workbook(path) as book:
            sheet = book.add_worksheet("Loop")
            for row in range(N_ROWS):
                sheet.write_number(row, 0, 1 + row * 0.37)
                for column in range(1, 11):
                    formula = f"=A{row + 1}*{column}+SIN(A{row + 1})/{column + 1}"
                    sheet.write_formula(row, column, formula, None, row * 1.1 + column / 7)
        print(f"{10 * N_ROWS} formula cells   read [s]  write [s]  memory [MB]")
        for name, code in (("xleq", OURS), ("openpyxl", BY_HAND)):
            command = [sys.executable, "-c", code, str(path), str(Path(folder) / "new.xlsx")]
            done = subprocess.run(command, capture_output=True, text=True, check=True)
            read, written, memory = map(float, done.stdout.split())
            print(f"{name:20} {read:10.2f} {written:10.2f} {memory:12.0f}")


if __name__ == "__main__":
    main()
