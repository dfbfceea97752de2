"""The three hosts beside each other: headless, Excel (simulated) and LibreOffice Calc."""

from __future__ import annotations

import csv
from collections import Counter
from collections.abc import Callable
from functools import partial
from pathlib import Path
from typing import Any

import pytest

from tests.hosts import office
from tests.hosts.conformance import Case, alike, cases, saved_values, write_book
from tests.hosts.simulated_excel import SimulatedExcel
from xleq.cells import BLANK, CellError, Value
from xleq.functions import TABLE
from xleq.hosts.headless import worksheet_functions
from xleq.recalc import recalculate
from xleq.workbook import open_book

HERE = Path(__file__).parent
PAGE = HERE.parents[1] / "xleq" / "functions" / "differences_between_hosts.md"
Values = dict[tuple[int, int], Value]
Difference = tuple[str, str, str, str]


def published() -> dict[Difference, str]:
    """Host, odd value, what headless shows and what the host shows → reason."""
    with (HERE / "differences.tsv").open(encoding="utf-8", newline="") as file:
        rows = csv.DictReader(file, delimiter="\t")
        return {(r["host"], r["odd value"], r["headless"], r["host shows"]): r["reason"] for r in rows}


@pytest.fixture(scope="module")
def asked() -> list[Case]:
    return cases()


@pytest.fixture(scope="module")
def book(asked: list[Case], tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("conformance") / "cases.xlsx"
    write_book(path, asked)
    return path


def _recalculated(book: Path, functions: dict[str, Callable[[list[Any]], Any]]) -> Values:
    found = recalculate(open_book(book), functions)
    assert not found.kept
    return {(a.row, a.column): v for a, v in found.values.items() if a.sheet == "Cases"}


@pytest.fixture(scope="module")
def headless(book: Path) -> Values:
    return _recalculated(book, worksheet_functions())


def _kind(value: Value) -> str:
    return value.code if isinstance(value, CellError) else "value"


def _differences(host: str, asked: list[Case], headless: Values, shown: Values) -> Counter[Difference]:
    """How often each kind of difference occurs; fails over one that is not published."""
    known = published()
    found: Counter[Difference] = Counter()
    unknown = []
    for case in asked:
        for cell in case.cells():
            here, there = headless.get(cell, BLANK), shown.get(cell, BLANK)
            if alike(here, there):
                continue
            kind = (host, case.odd, _kind(here), _kind(there))
            found[kind] += 1
            if kind not in known or kind[2:] == ("value", "value"):
                unknown.append(f"{case.formula} ({case.odd}): headless {here!r}, {host} {there!r}")
    assert not unknown, "\n".join(unknown)
    stale = {kind for kind in known if kind[0] == host} - set(found)
    assert not stale, "published, yet not seen"
    return found


def test_the_cases_cover_every_function_and_argument(asked: list[Case]) -> None:
    assert {c.function for c in asked if c.odd == "example"} == set(TABLE)
    assert {(c.function, c.argument) for c in asked if c.argument} == {
        (f.name, a.name) for f in TABLE.values() for a in f.arguments
    }
    assert sum(c.odd != "example" for c in asked) >= 200


def test_excel_shows_what_headless_shows_but_for_the_published_differences(
    asked: list[Case], book: Path, headless: Values
) -> None:
    with SimulatedExcel() as excel:
        shown = _recalculated(book, {name: partial(excel.call, name) for name in TABLE})
    _differences("excel", asked, headless, shown)


@pytest.mark.office
@pytest.mark.skipif(not office.available(), reason="LibreOffice is not installed")
def test_calc_shows_what_headless_shows_but_for_the_published_differences(
    asked: list[Case], book: Path, headless: Values, tmp_path: Path
) -> None:
    shown = saved_values(office.recalculated(book, tmp_path))
    _differences("calc", asked, headless, shown)


def test_every_difference_has_its_reason_on_the_page() -> None:
    page = PAGE.read_text("utf-8")
    rows = {line.split("|")[1].strip() for line in page.splitlines() if line.startswith("| ")}
    assert set(published().values()) == rows - {"difference"}
