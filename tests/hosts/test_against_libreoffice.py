"""Native formulas give what LibreOffice's own recalculation gives: a second opinion from outside."""

from __future__ import annotations

import datetime as dt
import math
import os
import re
import shutil
import subprocess
from pathlib import Path

import openpyxl
import pytest
from openpyxl.worksheet.worksheet import Worksheet

from xleq.cells import CellAddress, CellError, Value
from xleq.hosts.headless import recalculate_file
from xleq.workbook import open_book

pytestmark = pytest.mark.office

EXAMPLE = Path(__file__).parents[2] / "workbooks" / "nitrogen_loop.xlsx"
FORMULAS = [
    line
    for line in Path(__file__).with_name("ordinary_formulas.txt").read_text("utf-8").splitlines()
    if line.startswith("=")
]
# LibreOffice and Excel differ here; xleq follows Excel, whose answer its documentation tells.
DIFFERENT = {
    "=ERROR.TYPE(1/0)": "LibreOffice numbers its errors differently",
    "=LN(-1)": "LibreOffice saves its invalid-argument error as #VALUE!",
    '=CONVERT(1,"atm","Pa")': "LibreOffice's factor is rounded; 101325 Pa is exact (CGPM, 1954)",
    '=CONVERT(1,"cal","J")': "LibreOffice's factor is rounded; 4.1868 J is exact (IT calorie)",
}


def office() -> str:
    found = shutil.which("soffice")
    if found is None:
        if os.environ.get("CI"):
            pytest.fail("LibreOffice is missing")
        pytest.skip("LibreOffice is not installed")
    return found


def recalculated_by_office(path: Path, folder: Path) -> Path:
    """The workbook as LibreOffice computes and saves it; files without stored values are computed on load."""
    out = folder / "office"
    command = [office(), f"-env:UserInstallation=file://{folder}/profile", "--headless"]
    command += ["--convert-to", "xlsx", "--outdir", str(out), str(path)]
    subprocess.run(command, check=True, capture_output=True, timeout=180)
    return out / path.name


def values_of(path: Path) -> dict[CellAddress, Value]:
    book = open_book(path)
    return {CellAddress(s.name, *place): value for s in book.sheets for place, value in s.stored.items()}


def same(a: Value, b: Value) -> bool:
    if isinstance(a, float) and isinstance(b, float):
        return math.isclose(a, b, rel_tol=1e-9, abs_tol=1e-10)
    return type(a) is type(b) and a == b


def prefixed(formula: str) -> str:
    """The formula as files spell it: functions newer than the format carry a prefix."""
    return re.sub(r"\b(XOR|DAYS)\(", r"_xlfn.\1(", formula)


def lay_out_inputs(sheet: Worksheet) -> None:
    for row, number in enumerate((1.5, 2, 3.25, 7, 5, 4, 8, 6, 9.5, 10), 1):
        sheet.cell(row, 1, number)
    for row, value in enumerate((2, 4, None, "n/a", 6, 8, 10, 12, 14, 16), 1):
        sheet.cell(row, 2, value)
    for row, text in enumerate(("N2", "H2", "NH3", "CH4", "Ar", "CO", "CO2", "H2O", "O2", "no2"), 1):
        sheet.cell(row, 3, text)
    for row in range(1, 6):
        sheet.cell(row, 4, dt.datetime(2026, 10, 1) + dt.timedelta(days=23 * (row - 1)))
    for row, logical in enumerate((True, True, False, True), 1):
        sheet.cell(row, 5, logical)
    for row in range(1, 11):
        sheet.cell(row, 6, row)
        sheet.cell(row, 7, row * row + 0.5)


def test_two_hundred_ordinary_formulas_agree_with_libreoffice(tmp_path: Path) -> None:
    assert len(set(FORMULAS)) >= 150
    book = openpyxl.Workbook()
    sheet = book.active
    assert isinstance(sheet, Worksheet)
    lay_out_inputs(sheet)
    for row, formula in enumerate(FORMULAS, 1):
        sheet.cell(row, 9, prefixed(formula))
    path = tmp_path / "ordinary.xlsx"
    book.save(path)
    ours = recalculate_file(path).found
    theirs = values_of(recalculated_by_office(path, tmp_path))
    assert not ours.kept, ours.kept
    wrong = []
    for row, formula in enumerate(FORMULAS, 1):
        address = CellAddress("Sheet", row, 9)
        if not same(ours.values[address], theirs.get(address, "")) and formula not in DIFFERENT:
            wrong.append((formula, ours.values[address], theirs.get(address)))
    assert not wrong


def test_native_cells_of_the_example_workbook_agree_with_libreoffice(tmp_path: Path) -> None:
    ours = values_of(EXAMPLE)
    book = openpyxl.load_workbook(EXAMPLE)
    native = []
    for sheet in book.worksheets:
        for row in sheet.iter_rows():
            for cell in row:
                if isinstance(cell.value, str) and cell.value.startswith("="):
                    address = CellAddress(sheet.title, cell.row, cell.column)
                    if "XLEQ_" in cell.value:
                        value = ours[address]
                        assert not isinstance(value, CellError)
                        cell.value = value  # type: ignore[assignment]
                    else:
                        native.append(address)
    path = tmp_path / "native.xlsx"
    book.save(path)
    theirs = values_of(recalculated_by_office(path, tmp_path))
    assert len(native) > 30
    assert not [a for a in native if not same(ours[a], theirs[a])]


def test_a_recalculated_workbook_opens_and_renders(tmp_path: Path) -> None:
    out = tmp_path / "loop.xlsx"
    recalculate_file(EXAMPLE, out, settings=["Loop!B15=470"])
    command = [office(), f"-env:UserInstallation=file://{tmp_path}/profile", "--headless"]
    command += ["--convert-to", "pdf", "--outdir", str(tmp_path), str(out)]
    subprocess.run(command, check=True, capture_output=True, timeout=180)
    text = subprocess.run(
        ["pdftotext", "-layout", str(tmp_path / "loop.pdf"), "-"], check=True, capture_output=True, text=True
    ).stdout
    assert "Hallow Fen Works" in text
    assert "Ammonia at equilibrium" in text  # the chart's title, and a label
    fresh = values_of(out)[CellAddress("Loop", 33, 5)]
    assert isinstance(fresh, float)
    assert f"{100 * fresh:.2f}%" in text
    assert "#NAME?" not in text
    assert "Err:" not in text
