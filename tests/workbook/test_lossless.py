"""Writing changes cached values and nothing else: on workbooks by Excel, and with every feature there is."""

from __future__ import annotations

import io
import zipfile
from pathlib import Path

import pytest
from lxml import etree

from xleq.cells import BLANK, CALC, NUM, VALUE, Value
from xleq.errors import BookError
from xleq.workbook import Book, FormulaKind, Limits, Results, SheetResults, open_book, write_book

CORPUS = Path(__file__).resolve().parents[2].parent / "shared" / "corpus"
FILES = sorted(CORPUS.rglob("*.xlsx"))
CASES = [pytest.param(p, id=str(p.relative_to(CORPUS))) for p in FILES] or [
    pytest.param(None, marks=pytest.mark.skip(reason="no corpus of workbooks beside the project"))
]
PARSER = etree.XMLParser(resolve_entities=False, no_network=True, huge_tree=True)
FRESH: list[Value] = [1 / 3, "fresh <&> \r_x0041_ text ", True, NUM, BLANK, -1e-300, ""]


def fresh_results(book: Book) -> Results:
    """Another value for every formula cell, and for the cells that its array formulas fill."""
    results: Results = {}
    for sheet in book.sheets:
        found = SheetResults()
        for n, (place, formula) in enumerate(sheet.formulas.items()):
            value = FRESH[n % len(FRESH)]
            found.values[place] = value if sheet.stored.get(place, BLANK) != value else 7.25
            if formula.kind is FormulaKind.ARRAY and formula.area and formula.area.n_cells < 10_000:
                for child in formula.area.places():
                    if child not in sheet.formulas and child in sheet.stored:
                        found.values[child] = 2.5
        results[sheet.index] = found
    return results


def members(path: Path) -> list[tuple[object, ...]]:
    """Everything that the archive says of each member, but not its content."""
    with zipfile.ZipFile(path) as archive:
        return [
            (i.filename, i.date_time, i.compress_type, i.comment, i.create_system, i.external_attr)
            for i in archive.infolist()
        ]


def contents(path: Path) -> dict[str, bytes]:
    with zipfile.ZipFile(path) as archive:
        return {name: archive.read(name) for name in archive.namelist()}


def without_values(data: bytes) -> bytes:
    """Canonical XML of a sheet without the values of its cells."""
    root = etree.parse(io.BytesIO(data), PARSER).getroot()
    for cell in root.iter("{*}c"):
        for name in ("t", "vm"):
            cell.attrib.pop(name, None)
        for value in [child for child in cell if etree.QName(child).localname in {"v", "is"}]:
            before = value.getprevious()
            if before is None:
                cell.text = (cell.text or "") + (value.tail or "")
            else:
                before.tail = (before.tail or "") + (value.tail or "")
            cell.remove(value)
        cell.text = cell.text or None
    return etree.tostring(root, method="c14n")


def assert_lossless(old: Path, new: Path, book: Book, parts: tuple[str, ...]) -> None:
    before, after = contents(old), contents(new)
    assert members(old) == members(new)
    with zipfile.ZipFile(old) as a, zipfile.ZipFile(new) as b:
        assert a.comment == b.comment
        assert b.testzip() is None
    assert {name for name in before if before[name] != after[name]} <= set(parts)
    for sheet in book.sheets:
        if sheet.part in parts:
            assert without_values(before[sheet.part]) == without_values(after[sheet.part])


def assert_values(new: Path, results: Results, limits: Limits) -> None:
    again = open_book(new, limits)
    for index, found in results.items():
        for place, value in found.values.items():
            stored = again.sheets[index].stored.get(place, BLANK)
            assert (type(stored), stored) == (type(value), value), (index, place)


@pytest.mark.parametrize("path", CASES)
def test_a_book_of_the_corpus_loses_nothing_or_is_refused_in_one_line(path: Path, tmp_path: Path) -> None:
    new = tmp_path / "new.xlsx"
    refusal = ""
    try:
        book = open_book(path)
        results = fresh_results(book)
        written = write_book(book, results, new)
    except BookError as error:
        refusal = str(error)
    if refusal:
        assert refusal.startswith(str(path))
        assert "\n" not in refusal
        assert not list(tmp_path.iterdir())
        return
    assert_lossless(path, new, book, written.parts)
    assert_values(new, results, Limits())
    again = open_book(new)
    for old_sheet, new_sheet in zip(book.sheets, again.sheets, strict=True):
        assert old_sheet.formulas == new_sheet.formulas
        constants = old_sheet.stored.keys() - results[old_sheet.index].values.keys()
        assert all(new_sheet.stored[place] == old_sheet.stored[place] for place in constants)


@pytest.mark.parametrize("path", CASES)
def test_a_book_of_the_corpus_written_without_changes_is_the_same_bytes(path: Path, tmp_path: Path) -> None:
    try:
        book = open_book(path)
    except BookError:
        pytest.skip("refused, as another test shows")
    stored: Results = {
        s.index: SheetResults(values={p: s.stored.get(p, BLANK) for p in s.formulas}) for s in book.sheets
    }
    written = write_book(book, stored, tmp_path / "same.xlsx")
    assert (written.parts, written.n_cells) == ((), 0)
    assert contents(path) == contents(tmp_path / "same.xlsx")
    assert members(path) == members(tmp_path / "same.xlsx")


def grown(book: Book) -> Results:
    """Each dynamic array one row and one column larger, where nothing stands in its way."""
    results: Results = {}
    for sheet in book.sheets:
        taken = sheet.stored.keys() | sheet.formulas.keys()
        found = results[sheet.index] = SheetResults()
        for place, formula in sheet.formulas.items():
            if formula.kind is FormulaKind.ARRAY and formula.dynamic and formula.area is not None:
                area = formula.area._replace(bottom=formula.area.bottom + 1, right=formula.area.right + 1)
                fresh = [cell for cell in area.places() if not formula.area.holds(*cell)]
                if not any(cell in taken or cell in found.values for cell in fresh):
                    found.areas[place] = area
                    found.values |= dict.fromkeys(area.places(), 0.5)
    return results


@pytest.mark.skipif(not FILES, reason="no corpus of workbooks beside the project")
def test_spills_of_the_corpus_grow_and_shrink_back(tmp_path: Path) -> None:
    n_spills = 0
    for path in FILES:
        try:
            book = open_book(path)
        except BookError:
            continue
        larger = grown(book)
        if not any(found.areas for found in larger.values()):
            continue
        new, back = tmp_path / "new.xlsx", tmp_path / "back.xlsx"
        write_book(book, larger, new)
        again = open_book(new)
        smaller: Results = {}
        for sheet, old in zip(again.sheets, book.sheets, strict=True):
            found = larger[sheet.index]
            n_spills += len(found.areas)
            assert {p: sheet.formulas[p].area for p in found.areas} == found.areas
            assert sheet.stored == {**old.stored, **found.values}
            areas = {p: area for p in found.areas if (area := old.formulas[p].area) is not None}
            values = {cell: old.stored.get(cell, BLANK) for area in areas.values() for cell in area.places()}
            smaller[sheet.index] = SheetResults(values, areas)
        write_book(again, smaller, back)
        for sheet, old in zip(open_book(back).sheets, book.sheets, strict=True):
            as_stored = {place: VALUE if value == CALC else value for place, value in old.stored.items()}
            assert (sheet.stored, sheet.formulas) == (as_stored, old.formulas)
    assert n_spills > 100
