"""The Excel side under the real xlwings, with pywin32 simulated."""

from __future__ import annotations

import re
from collections.abc import Iterator
from pathlib import Path
from types import SimpleNamespace
from typing import Any

import pytest

from tests.hosts.simulated_excel import SimulatedExcel, shown
from xleq.cells import BLANK, CellError
from xleq.errors import HostError
from xleq.functions import TABLE, Argument, Function, call
from xleq.hosts.excel import addin, smoke, vba
from xleq.hosts.excel.names import LONGEST_HELP, RESERVED, argument_description, description, vba_name
from xleq.hosts.excel.values import from_excel, to_excel

GOLDEN = Path(__file__).with_name("golden_functions.bas")
AMMONIA = "N2 + 3 H2 = 2 NH3"


@pytest.fixture(scope="module")
def excel() -> Iterator[SimulatedExcel]:
    with SimulatedExcel() as server:
        yield server


# what goes in


def test_scalars_ranges_and_arrays_of_one_cell_mean_the_same(excel: SimulatedExcel) -> None:
    plain = excel.raw("XLEQ_KP", 9.6, AMMONIA, 573.0, "atm")
    in_cells = excel.raw("XLEQ_KP", *({"range": [[v]]} for v in (9.6, AMMONIA, 573.0, "atm")))
    in_arrays = excel.raw("XLEQ_KP", *({"array": [[v]]} for v in (9.6, AMMONIA, 573.0, "atm")))
    assert plain == in_cells == in_arrays == call("XLEQ_KP", [9.6, AMMONIA, 573.0, "atm"])


def test_a_left_out_argument_and_an_empty_cell_take_the_default(excel: SimulatedExcel) -> None:
    full = excel.raw("XLEQ_KP", 9.6, AMMONIA, 573.0, "bar", "mol/L")
    missing = {"missing": 1}
    assert excel.raw("XLEQ_KP", 9.6, AMMONIA, 573.0, missing, missing) == full
    assert excel.raw("XLEQ_KP", 9.6, AMMONIA, 573.0, {"range": [[None]]}, missing) == full
    assert excel.raw("XLEQ_KP", 9.6, AMMONIA, 573.0, None, "") == full


def test_a_needed_argument_that_is_empty_is_an_error_with_its_reason(excel: SimulatedExcel) -> None:
    found = excel.raw("XLEQ_KP", {"range": [[None]]}, AMMONIA, 573.0)
    assert found.startswith("#VALUE! XLEQ_KP: argument Kc is missing or empty")


@pytest.mark.parametrize("code", ["#NULL!", "#DIV/0!", "#VALUE!", "#REF!", "#NAME?", "#NUM!", "#N/A"])
def test_an_error_comes_back_as_it_came_from_a_cell_a_range_and_an_array(
    excel: SimulatedExcel, code: str
) -> None:
    error = {"error": code}
    assert excel.raw("XLEQ_K_SCALE", error, 2.0) == code
    assert excel.raw("XLEQ_K_SCALE", {"range": [[error]]}, 2.0) == code
    for kind in ("range", "array"):
        found = excel.raw("XLEQ_IONIC_STRENGTH", {kind: [["Na+"], ["Cl-"]]}, {kind: [[0.1], [error]]})
        assert shown(found) == CellError(code)


def test_currency_cells_count_as_numbers(excel: SimulatedExcel) -> None:
    assert excel.raw("XLEQ_K_SCALE", {"range": [[{"decimal": "16.0000"}]]}, {"decimal": "-0.5"}) == 0.25


def test_a_date_cell_is_its_serial_number(excel: SimulatedExcel) -> None:
    dated = excel.raw("XLEQ_K_SCALE", {"range": [[{"date": "2026-12-01T12:00:00"}]]}, 1.0)
    assert dated == pytest.approx(46357.5, rel=1e-14)  # 1 December 2026, noon
    assert excel.raw("XLEQ_K_SCALE", {"range": [[{"date": "1900-01-01T00:00:00"}]]}, 1.0) == 1.0


def test_an_empty_cell_among_amounts_is_0_and_a_range_may_be_drawn_longer_than_its_list(
    excel: SimulatedExcel,
) -> None:
    species = {"range": [["Na+"], ["Cl-"]]}
    assert excel.raw("XLEQ_IONIC_STRENGTH", species, {"range": [[0.1], [None]]}) == pytest.approx(0.05)


# what comes out


def test_a_list_spills_in_the_direction_of_its_range(excel: SimulatedExcel) -> None:
    target, reactions = "C(s) + CO2 = 2 CO", ("C(s) + O2 = CO2", "CO + 1/2 O2 = CO2")
    column = excel.raw("XLEQ_MULTIPLIERS", target, {"range": [[r] for r in reactions]})
    row = excel.raw("XLEQ_MULTIPLIERS", target, {"range": [list(reactions)]})
    assert column == [[1.0], [-2.0]]
    assert row == [1.0, -2.0]


def test_every_example_of_the_table_gives_its_headless_value(excel: SimulatedExcel) -> None:
    from xleq.hosts.headless import evaluate_formula
    from xleq.recalc import evaluate_text

    calls = {name: _through(excel, name) for name in TABLE}
    for function in TABLE.values():
        for example in function.examples:
            found = evaluate_text(example.formula, None, calls)
            found = found.rows() if hasattr(found, "rows") else found
            assert found == evaluate_formula(example.formula), example.formula


def _through(excel: SimulatedExcel, name: str) -> Any:
    return lambda given: excel.call(name, given)


@pytest.mark.parametrize("name", TABLE)
def test_no_argument_however_odd_makes_an_exception_or_a_jagged_block(
    excel: SimulatedExcel, name: str
) -> None:
    n = len(TABLE[name].arguments)
    odd: tuple[Any, ...] = (
        None, "", True, -1.0, 1e308, "nonsense", {"error": "#N/A"}, {"decimal": "1.5"},
        {"date": "2026-01-01T00:00:00"}, {"missing": 1}, {"range": [[None], [None]]},
        {"range": [[1.0, "a"], [None, {"error": "#REF!"}]]}, {"array": [[True, False]]}, 7, -2146826243,
    )  # fmt: skip
    for item in odd:
        found = excel.raw(name, *[item] * n)  # the server raises over anything that Excel could not take
        if n:
            assert isinstance(found, list | str | float | bool)


def test_an_error_in_a_block_is_cut_to_what_an_array_can_carry() -> None:
    block = to_excel([[CellError("#NUM!", "x" * 300), "y" * 300, BLANK, 1.0]])
    assert isinstance(block[0][0], str)
    assert len(block[0][0]) == 255
    assert shown(block[0][1]) == CellError("#VALUE!")
    assert block[0][2:] == ["", 1.0]


def test_an_error_number_without_a_name_is_an_error_still() -> None:
    assert from_excel([[-2146826243]]) == CellError("#VALUE!")


# names and help


def test_what_xlwings_itself_would_write_has_our_names_and_help(excel: SimulatedExcel) -> None:
    found = excel.ask("import")
    for function in TABLE.values():
        arguments = [f"Optional {vba_name(a)}" if a.optional else vba_name(a) for a in function.arguments]
        assert f"Function {function.name}({', '.join(arguments)})" in found["vba"]
    options = {o["macro"].rpartition("!")[2]: o for o in found["options"]}
    assert set(options) == set(TABLE)
    for name, told in options.items():
        assert told["help"] == description(TABLE[name])
        assert told["category"] == "xleq"
        assert (told["arguments"] or []) == [argument_description(a) for a in TABLE[name].arguments]


@pytest.mark.parametrize("function", TABLE.values(), ids=lambda f: f.name)
def test_names_are_legal_and_help_fits(function: Function) -> None:
    assert re.fullmatch(r"XLEQ_[A-Z_]+", function.name)
    names = [vba_name(a).lower() for a in function.arguments]
    assert len(set(names)) == len(names) <= 60
    for name in names:
        assert re.fullmatch(r"[a-z][a-z0-9_]*", name)
        assert name not in RESERVED
        assert not re.fullmatch(r"[a-z]{1,3}\d+", name)
    assert 0 < len(description(function)) <= LONGEST_HELP
    for a in function.arguments:
        assert 0 < len(argument_description(a)) <= LONGEST_HELP


def test_help_that_is_too_long_is_cut() -> None:
    long = Argument("x", "text", "m" * 400)
    assert len(argument_description(long)) == 255
    assert argument_description(Argument("x", "word", "m" * 200, known=("w" * 100,))) == "m" * 200


# the VBA


def test_the_vba_is_the_golden_text() -> None:
    chosen = [TABLE[n] for n in ("XLEQ_KP", "XLEQ_REACTION", "XLEQ_VERSION")]
    text = vba.module_text(chosen)
    version = re.compile(r"xleq \d[\w.]*")
    assert version.sub("xleq", text) == version.sub("xleq", GOLDEN.read_text("ascii"))


def test_the_vba_holds_every_function_and_stays_within_the_languages_limits() -> None:
    text = vba.module_text()
    assert text.isascii()
    lines = text.splitlines()
    assert max(map(len, lines)) < 1023  # the longest line that VBA takes
    for name in TABLE:
        assert sum(line.startswith(f"Public Function {name}(") for line in lines) == 1
    continued = re.findall(r"(?:[^\n]* _\n)+", text)
    assert max(block.count("\n") for block in continued) <= 24  # continuations of one statement
    assert vba.pasted_text() == text.partition("\n")[2]


def test_blocks_of_the_vba_are_closed() -> None:
    text = re.sub(r"'.*|\"[^\"]*\"", "", vba.module_text())
    for word in ("Function", "Sub", "If", "With", "Select"):
        opened = {
            "If": r"^\s*If .* Then\s*$",
            "With": r"^\s*With ",
            "Select": r"^\s*Select Case",
            "Function": r"^\s*(Public|Private) Function ",
            "Sub": r"^\s*(Public|Private) Sub ",
        }[word]
        n = len(re.findall(opened, text, re.MULTILINE))
        assert n == len(re.findall(rf"^\s*End {word}\s*$", text, re.MULTILINE)) > 0
    assert len(re.findall(r"^\s*For ", text, re.MULTILINE)) == len(
        re.findall(r"^\s*Next ", text, re.MULTILINE)
    )


# the add-in, with an Excel that only remembers what it is told


class Recorder:
    """An Application object that remembers."""

    def __init__(self, folder: Path) -> None:
        self.OperatingSystem, self.Version = "Windows (64-bit) NT 10.00", "16.0"
        self.UserLibraryPath = str(folder)
        self.imported: dict[str, str] = {}
        self.config: dict[tuple[int, int], SimpleNamespace] = {}
        self.help: list[str] = []
        self.entries: list[SimpleNamespace] = []
        self.AddIns = self
        self.Workbooks = SimpleNamespace(Add=self._book)

    def _book(self) -> Any:
        sheet = SimpleNamespace(Name="", Cells=lambda r, c: self.config.setdefault((r, c), SimpleNamespace()))
        components = SimpleNamespace(Import=self._import)
        return SimpleNamespace(
            Name="Book1",
            VBProject=SimpleNamespace(VBComponents=components),
            Worksheets=lambda _: sheet,
            SaveAs=lambda path, form: Path(path).write_text(str(form)),
            Close=lambda save: None,
        )

    def _import(self, path: str) -> None:
        self.imported[Path(path).name] = Path(path).read_text("ascii")

    def MacroOptions(self, macro: str, **_: Any) -> None:  # noqa: N802
        self.help.append(macro)

    def __iter__(self) -> Iterator[SimpleNamespace]:
        return iter(self.entries)

    def Add(self, path: str, copy: bool) -> SimpleNamespace:  # noqa: N802
        if not self.entries:
            self.entries.append(SimpleNamespace(Name=Path(path).name, Installed=False))
        return self.entries[0]


@pytest.fixture
def recorder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Recorder:
    import xlwings

    for name in ("pythonw", f"xlwings64-{xlwings.__version__}.dll"):
        (tmp_path / name).touch()
    monkeypatch.setattr(addin.sys, "prefix", str(tmp_path))
    monkeypatch.setattr(addin.sys, "executable", str(tmp_path / "python"))
    monkeypatch.setitem(addin.sys.modules, "pywintypes", SimpleNamespace(com_error=RuntimeError))  # type: ignore[arg-type]
    return Recorder(tmp_path / "AddIns")


def test_installing_builds_registers_and_can_be_repeated_and_undone(recorder: Recorder) -> None:
    assert not addin.state(recorder).installed
    for _ in range(2):
        done = addin.install(recorder)
        assert done.installed
        assert done.add_in.read_text() == "55"
    assert set(recorder.imported) == {"xlwings.bas", "xleq_functions.bas"}
    assert 'PROJECT_NAME As String = "xleq"' in recorder.imported["xlwings.bas"]
    assert recorder.imported["xleq_functions.bas"] == vba.module_text()
    config = {recorder.config[r, 1].Value: recorder.config[r, 2].Value for r in (1, 2, 3, 4)}
    assert config["UDF MODULES"] == "xleq.hosts.excel.udf"
    assert config["Interpreter_Win"].endswith("pythonw")
    assert {h.rpartition("!")[2] for h in recorder.help} == set(TABLE)
    assert addin.remove(recorder)
    assert not addin.state(recorder).installed
    assert not done.add_in.exists()
    assert not addin.remove(recorder)


@pytest.mark.parametrize(
    ("change", "words"),
    [
        ({"Version": "12.0"}, "too old"),
        ({"OperatingSystem": "Windows (32-bit) NT 10.00"}, "32-bit"),
    ],
)
def test_an_unfit_excel_is_refused_and_nothing_is_built(
    recorder: Recorder, change: dict[str, str], words: str
) -> None:
    for key, value in change.items():
        setattr(recorder, key, value)
    with pytest.raises(HostError, match=words):
        addin.install(recorder)
    assert not recorder.imported


def test_an_excel_that_guards_its_macros_is_told_how_to_allow_it(recorder: Recorder) -> None:
    class Guarded:
        Name = "Book1"

        @property
        def VBProject(self) -> Any:  # noqa: N802
            raise RuntimeError("programmatic access is not trusted")

        def Close(self, save: bool) -> None:  # noqa: N802
            pass

    recorder.Workbooks = SimpleNamespace(Add=Guarded)
    with pytest.raises(HostError, match="Trust access to the VBA project object model"):
        addin.install(recorder)


def test_elsewhere_than_on_windows_one_line_says_why_not() -> None:
    with pytest.raises(HostError, match="Excel for Windows"), addin.running_excel():
        pass


# the smoke script


def test_the_smoke_script_reports_cells_that_differ(tmp_path: Path) -> None:
    from openpyxl import Workbook

    book = Workbook()
    book.active["A1"] = "=XLEQ_K_SCALE(16,-0.5)"
    book.active["A2"] = "=1+1"
    path = tmp_path / "two.xlsx"
    book.save(path)
    values = {(1, 1): -2146826259, (2, 1): 3.0}
    typed = []

    class Cell:
        HasFormula = True

        def __init__(self, at: tuple[int, int]) -> None:
            self.at = at
            self.Value2 = values[at]

        @property
        def Formula2(self) -> str:  # noqa: N802
            return "=f"

        @Formula2.setter
        def Formula2(self, _: str) -> None:  # noqa: N802
            typed.append(self.at)
            values[self.at] = 0.25  # type: ignore[assignment]

    sheet = SimpleNamespace(Cells=lambda r, c: Cell((r, c)))
    opened = SimpleNamespace(Worksheets=lambda _: sheet, Close=lambda save: None)
    app = SimpleNamespace(
        Workbooks=SimpleNamespace(Open=lambda *_: opened),
        CalculateFullRebuild=lambda: None,
        CalculateFull=lambda: None,
    )
    found = smoke.compare(app, path)
    assert (found.n_cells, found.typed_again, typed) == (2, 1, [(1, 1)])
    assert [str(d.cell) for d in found.differences] == ["Sheet!A2"]
    text = smoke.report([found], "heading")
    assert "two.xlsx: 2 cells compared, 1 differ" in text
    assert "Sheet!A2: headless 2.0, Excel 3.0" in text
