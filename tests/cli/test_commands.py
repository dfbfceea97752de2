"""The command line: what it prints, and its exit codes."""

from __future__ import annotations

import json
import shutil
import subprocess
import sys
from pathlib import Path

import pytest

EXAMPLE = Path(__file__).parents[2] / "workbooks" / "nitrogen_loop.xlsx"


def xleq(*arguments: str | Path) -> subprocess.CompletedProcess[str]:
    command = [sys.executable, "-m", "xleq.cli", *map(str, arguments)]
    return subprocess.run(command, capture_output=True, text=True, timeout=120, encoding="utf-8")


@pytest.fixture
def book(tmp_path: Path) -> Path:
    return Path(shutil.copy(EXAMPLE, tmp_path / "loop.xlsx"))


def test_help_loads_nothing_heavy() -> None:
    code = (
        "import sys; sys.argv = ['xleq', '--help']\n"
        "from xleq.cli import main\n"
        "try: main()\n"
        "except SystemExit: pass\n"
        "heavy = {'numpy', 'scipy', 'pint', 'openpyxl', 'formualizer', 'lxml'} & set(sys.modules)\n"
        "assert not heavy, heavy"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, timeout=60)
    assert done.returncode == 0, done.stderr
    assert "recalc" in done.stdout


def test_eval_prints_a_value_a_block_or_an_error_with_its_reason() -> None:
    done = xleq("eval", '=XLEQ_GAS_CHANGE("N2 + 3 H2 = 2 NH3")')
    assert (done.returncode, done.stdout, done.stderr) == (0, "-2\n", "")
    done = xleq("eval", '=XLEQ_BALANCE("CH4 + O2 = CO2 + H2O")&{"";"!"}')
    assert done.stdout.splitlines() == ["CH4 + 2 O2 = CO2 + 2 H2O", "CH4 + 2 O2 = CO2 + 2 H2O!"]
    done = xleq("eval", '=XLEQ_MOLAR_MASS("Xx")')
    assert done.returncode == 2
    assert done.stdout == "#VALUE!\n"
    assert "the symbol of an element at position 1" in done.stderr


def test_eval_tells_where_a_formula_breaks_off() -> None:
    done = xleq("eval", "=SUM(1,")
    assert done.returncode == 2
    assert "position 8" in done.stderr
    assert "Traceback" not in done.stderr


def test_eval_as_json_carries_the_reason() -> None:
    done = xleq("eval", "--json", "=XLEQ_K_SCALE(-1, 2)")
    value = json.loads(done.stdout)["value"]
    assert value["error"] == "#NUM!"
    assert "must be above 0" in value["reason"]


def test_recalc_writes_a_copy_and_says_what_changed(book: Path, tmp_path: Path) -> None:
    out = tmp_path / "new" / "out.xlsx"
    done = xleq("recalc", book, "-o", out, "--set", "Loop!B15=470")
    assert done.returncode == 0, done.stderr
    assert "Loop!E33" in done.stdout
    assert out.exists()
    assert xleq("check", out).returncode == 0


def test_recalc_as_json_lists_every_change(book: Path, tmp_path: Path) -> None:
    done = xleq("recalc", book, "-o", tmp_path / "out.xlsx", "--set", "Loop!C16=barr", "--json")
    report = json.loads(done.stdout)
    assert report["formulas"] > 100
    assert {"cell", "stored", "fresh"} == set(report["changed"][0])
    reasons = {e["cell"]: e["reason"] for e in report["errors"]}
    assert "'barr' is not a unit of pressure" in reasons["Loop!E33"]


def test_recalc_needs_to_know_where_the_result_goes(book: Path) -> None:
    done = xleq("recalc", book)
    assert done.returncode == 2
    assert "--in-place" in done.stderr


def test_check_tells_a_workbook_whose_values_are_stale(book: Path, tmp_path: Path) -> None:
    import openpyxl

    assert xleq("check", book).returncode == 0
    opened = openpyxl.load_workbook(book)  # its stored values are lost, so every cell is stale
    opened.save(tmp_path / "stale.xlsx")
    done = xleq("check", tmp_path / "stale.xlsx")
    assert done.returncode == 1
    assert not list(tmp_path.glob("*backup*"))


def test_a_function_of_somebody_else_keeps_its_value_and_is_listed(tmp_path: Path) -> None:
    import xlsxwriter

    path = tmp_path / "foreign.xlsx"
    with xlsxwriter.Workbook(str(path)) as made:
        sheet = made.add_worksheet("S")
        sheet.write_formula("A1", "=SOMEBODYS_FUNCTION(1)", None, 42)
        sheet.write_formula("A2", "=A1+1", None, 43)
        sheet.write_formula("A3", "=1+1", None, 2)
    done = xleq("recalc", path, "--in-place", "--json")
    assert done.returncode == 3
    report = json.loads(done.stdout)
    assert [k["cell"] for k in report["kept"]] == ["S!A1", "S!A2"]
    assert "SOMEBODYS_FUNCTION" in report["kept"][0]["reason"]


@pytest.mark.parametrize("name", ["missing.xlsx", "text.xlsx", "old.xls"])
def test_a_bad_file_is_told_in_one_line_and_does_not_stop_the_others(
    name: str, book: Path, tmp_path: Path
) -> None:
    bad = tmp_path / name
    if name == "text.xlsx":
        bad.write_text("no workbook")
    if name == "old.xls":
        bad.write_bytes(b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1" + bytes(600))
    done = xleq("check", bad, book)
    assert done.returncode == 2
    assert len(done.stderr.strip().splitlines()) == 1
    assert "loop.xlsx: 1" in done.stdout


def test_functions_lists_all_and_shows_one() -> None:
    listed = xleq("functions").stdout
    assert "XLEQ_COMPOSITION_P(reactions, K, species, feed, T, P, [want], [options], [data])" in listed
    one = xleq("functions", "kp").stdout
    assert "mol/L" in one
    assert "example" in one
    wrong = xleq("functions", "XLEQ_COMPOSITON_P")
    assert wrong.returncode == 2
    assert "XLEQ_COMPOSITION_P" in wrong.stderr
    assert json.loads(xleq("functions", "XLEQ_KP", "--json").stdout)["name"] == "XLEQ_KP"


def test_a_usage_error_exits_with_2() -> None:
    assert xleq("recalc").returncode == 2
    assert xleq("nothing").returncode == 2


def test_limits_can_be_set_and_refuse_what_is_over_them(book: Path, tmp_path: Path) -> None:
    before = book.read_bytes()
    done = xleq("recalc", book, "--in-place", "--limit", "cells=10")
    assert done.returncode == 2
    assert done.stderr.startswith(f"xleq: {book} ")
    assert "over 10 cells (cells)" in done.stderr
    done = xleq("check", book, "--limit", "seconds=1E-9", "--json")
    assert done.returncode == 2
    refused = json.loads(done.stdout)
    assert refused["code"] == "book-limit"
    assert "the limit (seconds) is 1e-09" in refused["refused"]
    assert str(book) in refused["refused"]
    assert book.read_bytes() == before
    done = xleq("check", book, "--limit", "cells=100000", "--limit", "seconds=60", "--limit", "entries=500")
    assert done.returncode == 0, done.stderr


@pytest.mark.parametrize(
    ("text", "told"),
    [
        ("size=5", "'size' is not a limit; the limits are file_size, entries, "),
        ("cells", "'cells': a limit is written NAME=VALUE"),
        ("cells=many", "the limit cells must be a whole number above 0, not 'many'"),
        ("cells=1.5", "the limit cells must be a whole number above 0"),
        ("seconds=0", "the limit seconds must be a number above 0"),
    ],
)
def test_a_limit_that_is_none_is_told(book: Path, text: str, told: str) -> None:
    for command in (["check"], ["recalc", "--in-place"]):
        done = xleq(*command, book, "--limit", text)
        assert done.returncode == 2
        assert told in done.stderr
        assert "Traceback" not in done.stderr


def test_the_help_names_every_limit() -> None:
    from dataclasses import fields

    from xleq.cli.commands import Limit
    from xleq.workbook import Limits

    (option,) = Limit.__metadata__
    assert all(f.name in option.help for f in fields(Limits))
    assert "seconds" in option.help
