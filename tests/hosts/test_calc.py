"""The add-in under a real LibreOffice, and what surrounds it."""

from __future__ import annotations

import re
import sys
from pathlib import Path
from xml.etree import ElementTree
from zipfile import ZipFile

import pytest
from openpyxl import Workbook, load_workbook

from tests.hosts import office
from xleq.cells import BLANK, CellError
from xleq.errors import HostError
from xleq.functions import TABLE
from xleq.hosts.headless import recalculate_file
from xleq.hosts.libreoffice import OfficeState, build_extension, extension_members, install, remove, state
from xleq.hosts.libreoffice.calls import call, error_number
from xleq.hosts.libreoffice.extension import method_name

ROOT = Path(__file__).parents[2]
BOOKS = sorted((ROOT / "workbooks").glob("*.xlsx"))
#: Cells in which Calc sets the difference of nearly equal numbers to 0.
ROUNDED_TO_ZERO = 1e-9

needs_office = pytest.mark.skipif(not office.available(), reason="LibreOffice is not installed")


# what crosses


def test_a_block_of_cells_goes_in_and_a_block_comes_out() -> None:
    reactions = (("C(s) + O2 = CO2",), ("CO + 1/2 O2 = CO2",))
    assert call("XLEQ_MULTIPLIERS", ("C(s) + CO2 = 2 CO", reactions)) == ((1.0,), (-2.0,))


def test_arguments_left_out_and_text_arguments_that_are_empty_cells_take_their_default() -> None:
    full = call("XLEQ_KP", (9.6, "N2 + 3 H2 = 2 NH3", 573.0, "bar", "mol/L"))
    assert call("XLEQ_KP", (9.6, "N2 + 3 H2 = 2 NH3", 573.0, None, None)) == full
    assert call("XLEQ_KP", (9.6, "N2 + 3 H2 = 2 NH3", 573.0, 0.0, "")) == full


def test_a_zero_for_a_needed_number_is_refused_since_it_may_be_an_empty_cell() -> None:
    ((found,),) = call("XLEQ_K_FROM_DG", (0.0, 298.15))
    assert isinstance(found, float)
    assert found != found
    assert call("XLEQ_K_FROM_DG", ("0", 298.15)) == ((1.0,),)


def test_a_zero_for_an_optional_temperature_is_no_default() -> None:
    ((found,),) = call("XLEQ_REACTION", ("N2 + 3 H2 = 2 NH3", "dH", 0.0, None))
    assert isinstance(found, float)
    assert found != found  # an error, as Calc reads it


def test_an_error_that_calc_hands_over_comes_back() -> None:
    ((found,),) = call("XLEQ_K_SCALE", (error_number("#DIV/0!"), 2.0))
    assert found != found


# the extension


def test_the_extension_is_the_same_for_the_same_table_and_well_formed(tmp_path: Path) -> None:
    data = build_extension()
    assert data == build_extension()
    path = tmp_path / "xleq.oxt"
    path.write_bytes(data)
    with ZipFile(path) as archive:
        assert archive.testzip() is None
        for name in archive.namelist():
            if name.endswith((".xml", ".xcu")):
                ElementTree.fromstring(archive.read(name))


def test_every_function_has_its_type_its_names_and_its_help() -> None:
    members = extension_members()
    configuration = ElementTree.fromstring(members["CalcAddIns.xcu"])
    texts = [v.text for v in configuration.iter("value")]
    methods = [method_name(f) for f in TABLE.values()]
    assert len(set(methods)) == len(methods)
    for function in TABLE.values():
        name = method_name(function)
        match = re.search(rf" {name}\((.*)\);", members["functions.idl"])
        assert match
        assert match[1].count("[in] any") == len(function.arguments)
        assert texts.count(function.name) == 2  # as shown, and as written to files
        assert function.gives in texts
        for argument in function.arguments:
            assert any(text and text.startswith(argument.meaning) for text in texts)


# installing


def _office(version: str = "25.2.3.2", python: str = "") -> OfficeState:
    mine = f"{sys.version_info[0]}.{sys.version_info[1]}"
    return OfficeState(Path("soffice"), version, python or mine, "", False)


def test_an_office_that_is_too_old_or_has_another_python_is_told_apart() -> None:
    assert _office().why_unfit() == ""
    assert "25.2" in _office(version="7.4.7.2").why_unfit()
    assert "3.8" in _office(python="3.8").why_unfit()
    without = OfficeState(Path("soffice"), "25.2.3.2", "", "", False)
    assert "no Python" in without.why_unfit()


def test_an_office_that_is_not_there_is_refused(tmp_path: Path) -> None:
    with pytest.raises(HostError, match="there is no"):
        state(tmp_path / "soffice")


@pytest.mark.office
@pytest.mark.slow
@needs_office
def test_installing_can_be_repeated_and_undone(tmp_path: Path) -> None:
    before = state(profile=tmp_path)
    if before.add_in:
        pytest.skip("the add-in is installed on this machine; it stays as it is")
    try:
        for _ in range(2):
            assert install(profile=tmp_path).add_in
    finally:
        assert remove(profile=tmp_path)
    assert not state(profile=tmp_path).add_in
    assert not remove(profile=tmp_path)


# whole workbooks


@pytest.mark.office
@needs_office
@pytest.mark.parametrize("book", BOOKS, ids=lambda p: p.name)
def test_an_example_workbook_recalculated_by_calc_shows_the_headless_values(
    book: Path, tmp_path: Path
) -> None:
    saved = office.recalculated(book, tmp_path)
    fresh = recalculate_file(book).found
    assert not fresh.kept
    shown = load_workbook(saved, data_only=True)
    formulas = load_workbook(saved)
    different = []
    for cell, here in fresh.values.items():
        there = shown[cell.sheet].cell(cell.row, cell.column).value
        if not _alike(here, there):
            different.append(f"{cell}: headless {here!r}, Calc {there!r}")
        text = formulas[cell.sheet].cell(cell.row, cell.column).value
        assert "NAME?" not in str(text)
    assert not different, "\n".join(different)


def _alike(here: object, there: object) -> bool:
    if isinstance(here, CellError):
        return there == here.code
    if here is BLANK or here == "":
        return there in (None, "")
    if isinstance(here, float) and isinstance(there, int | float):
        if there == 0:
            return abs(here) < ROUNDED_TO_ZERO
        return abs(here - there) <= 1e-11 * max(abs(here), abs(there))
    return here == there


# formulas as each host writes them


@pytest.mark.parametrize("prefix", ["", "_xll.", "_xldudf_", "_xlfn.", "_xludf.", "[1]!"])
def test_a_formula_as_another_host_wrote_it_recalculates_headless(prefix: str, tmp_path: Path) -> None:
    path = tmp_path / "book.xlsx"
    book = Workbook()
    book.active["A1"] = f"={prefix}XLEQ_K_SCALE(16,-0.5)"
    book.save(path)
    found = recalculate_file(path).found
    assert not found.kept, found.kept
    assert list(found.values.values()) == [0.25]


@pytest.mark.office
@needs_office
def test_what_calc_saved_recalculates_headless_to_the_same_values(tmp_path: Path) -> None:
    path = tmp_path / "book.xlsx"
    book = Workbook()
    for row, function in enumerate(TABLE.values(), 1):
        book.active.cell(row, 1).value = function.examples[0].formula
    book.save(path)
    saved = office.recalculated(path, tmp_path)
    again = recalculate_file(saved).found
    assert not again.kept
    assert not again.disagreements
    for change in again.changed:  # Calc saves 15 digits
        assert change.fresh == pytest.approx(change.stored, rel=2e-14)
