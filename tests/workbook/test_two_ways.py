"""The quick way to read and scan a sheet and the parser's way give the same, on every workbook there is."""

from __future__ import annotations

import random
from collections.abc import Callable
from pathlib import Path
from typing import NoReturn

import pytest

from xleq.errors import BookError
from xleq.workbook import Book, SheetKind, open_book
from xleq.workbook.limits import Limits
from xleq.workbook.package import Package
from xleq.workbook.reading import sheets
from xleq.workbook.reading.quick import NotUsualError
from xleq.workbook.tokens import usual_region
from xleq.workbook.writing import scanning
from xleq.workbook.writing.patching import in_utf8

CORPUS = Path(__file__).resolve().parents[2].parent / "shared" / "corpus"
FILES = sorted(CORPUS.rglob("*.xlsx"))
HEAD = '<worksheet xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main"><sheetData>'
CELLS = (
    '<row r="1" spans="1:4"><c r="A1"><v>1.5</v></c>'
    '<c r="B1" s="1" t="str"><f>"a"&amp;"&#233;"</f><v>a\u00e9</v></c>'
    '<c r="C1" t="inlineStr"><is><t>x &lt; y</t></is></c><c r="D1" t="b"><f>TRUE()</f><v>1</v></c></row>\n'
    '<row r="3" hidden="1"><c r="A3"><f t="shared" ref="A3:B3" si="0">A1*2</f><v>3</v></c>'
    '<c r="B3"><f t="shared" si="0"/><v>4</v></c><c r="D3" t="e"><v>#N/A</v></c></row><row r="4"/>'
    '<row r="5"><c r="A5" s="2"/><c r="B5"><f>SUM(A1:A3)</f></c>'
    '<c r="C5" t="str"><f>""</f><v/></c><c r="D5" t="str"><f>""</f></c><c r="E5"><f>Z9</f><v/></c></row>'
)
TAIL = '</sheetData><autoFilter ref="A1:B3"><filterColumn colId="0"/></autoFilter></worksheet>'
SHEET = (HEAD + CELLS + TAIL).encode()


def refuse(*_: object) -> NoReturn:
    raise NotUsualError


def by_parser(path: Path, monkeypatch: pytest.MonkeyPatch) -> Book:
    with monkeypatch.context() as patch:
        patch.setattr(sheets, "read_quickly", refuse)
        return open_book(path)


def outcome(way: Callable[[Path], Book], path: Path) -> Book | tuple[type, str]:
    """The book, or how it is refused."""
    try:
        return way(path)
    except BookError as error:
        return type(error), str(error)


@pytest.mark.skipif(not FILES, reason="no corpus of workbooks beside the project")
def test_both_ways_read_and_scan_the_corpus_alike(monkeypatch: pytest.MonkeyPatch) -> None:
    n_sheets = n_usual = 0
    for path in FILES:
        book, same = outcome(open_book, path), outcome(lambda p: by_parser(p, monkeypatch), path)
        if not (isinstance(book, Book) and isinstance(same, Book)):
            assert book == same
            continue
        with Package(path, Limits()) as package:
            for one, other in zip(book.sheets, same.sheets, strict=True):
                one.formats = other.formats = ()
                assert one == other, f"{path} {one.name}"
                assert list(one.formulas) == list(other.formulas)
                if one.kind is SheetKind.WORKSHEET and one.stored:
                    data = in_utf8(package.read(one.part))
                    n_sheets += 1
                    n_usual += scanned_alike(data, {row for row, _ in one.formulas}, monkeypatch)
    assert n_usual > 0.9 * n_sheets


def scanned_alike(data: bytes, rows: set[int], monkeypatch: pytest.MonkeyPatch) -> bool:
    """Check that both ways to scan agree; whether the quick one was taken."""
    quick = scanning._scan_quickly(data, rows, "sheet")
    with monkeypatch.context() as patch:
        patch.setattr(scanning, "_scan_quickly", lambda *_: None)
        if quick is not None:
            assert quick == scanning.scan(data, rows, "sheet")
    return quick is not None


def test_a_sheet_as_programs_write_it_is_usual(monkeypatch: pytest.MonkeyPatch) -> None:
    assert usual_region(SHEET) is not None
    assert scanned_alike(SHEET, {1, 3, 5}, monkeypatch)


def test_both_ways_agree_on_a_thousand_bent_sheets(make_book, monkeypatch: pytest.MonkeyPatch) -> None:  # type: ignore[no-untyped-def]
    chance = random.Random(3)
    text = SHEET.decode()
    marks = [at for at, letter in enumerate(text) if letter in '<>"&;= ']
    pieces = [
        "<",
        ">",
        '"',
        "&",
        " ",
        "/",
        "=",
        "\r\n",
        "\t",
        "1",
        "A",
        "&amp;",
        "&#0;",
        "&x;",
        "<v/>",
        "]]>",
        "<!---->",
    ]
    n_read = n_usual = 0
    for _ in range(1000):
        at = chance.choice(marks) + chance.randrange(3)
        bent = (text[:at] + chance.choice(pieces) + text[at + chance.randrange(3) :]).encode()
        path = make_book({"Loop": bent})
        book, same = outcome(open_book, path), outcome(lambda p: by_parser(p, monkeypatch), path)
        if not (isinstance(book, Book) and isinstance(same, Book)):
            assert book == same, bent
        else:
            book.sheets[0].formats = same.sheets[0].formats = ()
            assert book.sheets[0] == same.sheets[0], bent
            n_read += 1
            n_usual += scanned_alike(bent, {1, 3, 5}, monkeypatch)
    assert n_read > 100
    assert n_usual > 50
