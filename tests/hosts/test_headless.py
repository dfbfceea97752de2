"""Workbooks and formulas without a spreadsheet program."""

from __future__ import annotations

import shutil
from pathlib import Path
from zipfile import ZipFile

import pytest

from xleq.cells import CellAddress, CellError
from xleq.errors import BookError, InputError
from xleq.hosts.headless import evaluate_formula, read_settings, recalculate_file
from xleq.workbook import open_book

EXAMPLE = Path(__file__).parents[2] / "workbooks" / "nitrogen_loop.xlsx"


@pytest.fixture
def book(tmp_path: Path) -> Path:
    return Path(shutil.copy(EXAMPLE, tmp_path / "loop.xlsx"))


def test_the_example_workbook_holds_the_values_that_are_computed() -> None:
    report = recalculate_file(EXAMPLE)
    assert report.found.n_formulas > 100
    assert report.complete
    assert not report.found.changed
    assert not report.errors()
    assert report.written is None


def test_a_changed_input_changes_what_depends_on_it_and_nothing_else(book: Path, tmp_path: Path) -> None:
    out = tmp_path / "out.xlsx"
    report = recalculate_file(book, out, settings=["Loop!B15=470"])
    changed = {str(c.address) for c in report.found.changed}
    assert {"Loop!B21", "Loop!B25", "Loop!E33", "Loop!B41"} <= changed
    assert not any(name.startswith("Checks!") for name in changed)
    fresh = open_book(out)
    loop = fresh.sheet_named("Loop")
    assert loop is not None
    assert loop.stored[(15, 2)] == 470.0
    assert loop.stored[(33, 5)] == report.found.values[CellAddress("Loop", 33, 5)]
    # Warmer, so less ammonia at equilibrium: Le Chatelier, the reaction is exothermic.
    before = open_book(EXAMPLE).sheet_named("Loop")
    assert before is not None
    assert loop.stored[(33, 5)] < before.stored[(33, 5)]


def test_only_the_sheets_of_the_copy_differ(book: Path, tmp_path: Path) -> None:
    out = tmp_path / "out.xlsx"
    recalculate_file(book, out, settings=["Loop!B15=470"])
    with ZipFile(book) as old, ZipFile(out) as new:
        assert old.namelist() == new.namelist()
        different = [n for n in old.namelist() if old.read(n) != new.read(n)]
    assert different
    assert all(n.startswith("xl/worksheets/sheet") for n in different), different


def test_in_place_keeps_a_backup(book: Path) -> None:
    before = book.read_bytes()
    report = recalculate_file(book, in_place=True, settings=["Loop!B15=460"])
    assert report.written is not None
    assert report.written.backup is not None
    assert report.written.backup.read_bytes() == before
    assert book.read_bytes() != before


def test_settings_name_cells_in_every_way(book: Path) -> None:
    read = open_book(book)
    found = read_settings(read, ["B15=1", "'Loop'!$C$15=K", "Map!A11=TRUE", 'Loop!B42="0.2"', "loop!B16="])
    assert list(map(str, found)) == ["Loop!B15", "Loop!C15", "Map!A11", "Loop!B42", "Loop!B16"]
    values = list(found.values())
    assert values[:4] == [1.0, "K", True, "0.2"]
    assert str(values[4]) == "BLANK"


@pytest.mark.parametrize(
    ("setting", "says"),
    [
        ("B15", "ADDRESS=VALUE"),
        ("Nowhere!B15=1", "there is no sheet"),
        ("Loop!Temperature=1", "neither the address"),
        ("Loop!B21=700", "holds a formula"),
        ("T_outlet=700", "holds a formula"),
    ],
)
def test_a_setting_that_means_nothing_is_refused(book: Path, setting: str, says: str) -> None:
    before = book.read_bytes()
    with pytest.raises(InputError, match=says):
        recalculate_file(book, in_place=True, settings=[setting])
    assert book.read_bytes() == before


def test_an_unphysical_input_gives_an_error_with_its_reason_where_it_arises(book: Path) -> None:
    report = recalculate_file(book, settings=["Loop!B16=-2"])
    where = {str(address): error for address, error in report.errors()}
    assert where["Loop!E33"].code == "#NUM!"
    assert "bar absolute; it must be above 0" in where["Loop!E33"].reason
    # What follows from it shows the same error, but is not told again.
    assert report.found.values[CellAddress("Loop", 39, 2)] == CellError("#NUM!")
    assert "Loop!B39" not in where


def test_a_misspelt_unit_in_a_cell_is_told(book: Path) -> None:
    report = recalculate_file(book, settings=["Loop!C16=barr"])
    where = {str(address): error for address, error in report.errors()}
    assert where["Loop!E33"].code == "#VALUE!"
    assert "'barr' is not a unit of pressure" in where["Loop!E33"].reason


@pytest.mark.parametrize("make", ["missing", "text", "truncated", "locked"])
def test_a_workbook_that_cannot_be_used_is_refused_and_nothing_written(
    book: Path, tmp_path: Path, make: str
) -> None:
    if make == "missing":
        book.unlink()
    elif make == "text":
        book.write_text("not a workbook")
    elif make == "truncated":
        book.write_bytes(book.read_bytes()[:5000])
    else:
        (tmp_path / "~$loop.xlsx").write_bytes(b"J. Marl")
    before = sorted(p.name for p in tmp_path.iterdir())
    with pytest.raises(BookError) as refused:
        recalculate_file(book, in_place=True, settings=["Loop!B15=460"])
    assert "\n" not in str(refused.value)
    assert sorted(p.name for p in tmp_path.iterdir()) == before


def test_a_formula_is_evaluated_alone() -> None:
    assert evaluate_formula("=1+1") == 2.0
    assert evaluate_formula('XLEQ_GAS_CHANGE("N2 + 3 H2 = 2 NH3")') == -2.0
    block = evaluate_formula('=XLEQ_COMPOSITION_P("N2 + 3 H2 = 2 NH3", 1, "N2; H2; NH3", "1; 3; 0", 700, 10)')
    assert isinstance(block, list)
    assert [len(row) for row in block] == [1, 1, 1]
    across = evaluate_formula(
        '=XLEQ_COMPOSITION_P("N2 + 3 H2 = 2 NH3", 1, {"N2","H2","NH3"}, {1,3,0}, 700, 10, "fractions")'
    )
    assert isinstance(across, list)
    assert len(across) == 1
    assert sum(v for v in across[0] if isinstance(v, float)) == pytest.approx(1.0, rel=1e-12)


NITROGEN = '"N2 + 3 H2 = 2 NH3", {k}, {species}, {feed}, {t}, {p}'


@pytest.mark.parametrize(
    ("changes", "code", "says"),
    [
        ({"reaction": '"N2 + 2 H2 = 2 NH3"'}, "#VALUE!", "does not balance: H 4 on the left, 6 on the right"),
        ({"reaction": '"N2 + 3 Hx = 2 NH3"'}, "#VALUE!", "expected"),
        ({"t": '"450 degX"'}, "#VALUE!", "'degX' is not a unit of temperature"),
        ({"t": '"-300 degC"'}, "#NUM!", "must be above 0 K"),
        ({"k": "0"}, "#NUM!", "must be above 0"),
        ({"k": "-1"}, "#NUM!", "must be above 0"),
        ({"feed": '"1; -3; 0"'}, "#NUM!", "must not be negative"),
        ({"species": '"N2; H2; NH3; Ar"', "feed": '"1; 3; 0; 0"'}, "#VALUE!", "takes part in no reaction"),
        ({"feed": '"1; 3"'}, "#VALUE!", "3 species but 2 amounts"),
        ({"feed": '{1,3,"none"}'}, "#VALUE!", "item 3"),
        ({"p": '"high"'}, "#VALUE!", "expected a number"),
        ({"p": "1/0"}, "#DIV/0!", ""),
        ({"feed": '"0; 0; 0"'}, "#VALUE!", "nothing is fed"),
        ({"species": '""'}, "#VALUE!", "species"),
        ({"p": '"30 barg'}, "formula", ""),
    ],
    ids=lambda x: str(x)[:40],
)
def test_bad_input_is_told_in_words_that_a_chemist_understands(
    changes: dict[str, str], code: str, says: str
) -> None:
    given = {
        "reaction": '"N2 + 3 H2 = 2 NH3"',
        "k": "6.6E-5",
        "species": '"N2; H2; NH3"',
        "feed": '"1; 3; 0"',
        "t": '"450 degC"',
        "p": '"100 atm"',
    } | changes
    formula = f"=XLEQ_COMPOSITION_P({', '.join(given.values())})"
    if code == "formula":
        from xleq.errors import XleqError

        with pytest.raises(XleqError):
            evaluate_formula(formula)
        return
    found = evaluate_formula(formula)
    assert isinstance(found, CellError)
    assert found.code == code
    assert says in found.reason
