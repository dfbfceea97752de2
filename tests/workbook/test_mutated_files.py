"""Workbooks with bytes flipped, members dropped and XML bent: opened and written, or refused in one line."""

from __future__ import annotations

import io
import random
import re
import time
import zipfile
from collections.abc import Callable
from pathlib import Path

import pytest
import xlsxwriter

from xleq.cells import BLANK
from xleq.errors import BookError
from xleq.workbook import Results, SheetResults, open_book, write_book

CORPUS = Path(__file__).resolve().parents[2].parent / "shared" / "corpus"
FILES = sorted(CORPUS.rglob("*.xlsx"))
#: No file may take longer. [s]
PATIENCE = 10.0
TOKENS = [
    b"<c>", b"</c>", b"<row>", b'r="A1"', b'r=""', b't="s"', b't="e"', b"<v>1e999</v>", b"<v>-5</v>", b"&x;",
    b"<!DOCTYPE a>", b"<!--", b"]]>", b"\xff\xfe", b'si="0"', b'ref="A1:XFD1048576"', b't="array"', b"\0",
    b't="shared"', b'cm="1"', b'vm="1"', b"<f>", b"</f>", b'min="99999999999"', b"<si/>", b'count="-1"',
    b"_x0041_", b"<is><t/></is>", b"<v>NaN</v>", b"<extLst>", b'xmlns="urn:x"', b'xmlns:x="urn:y"', b"<x:c/>",
]  # fmt: skip


def seed_book(folder: Path) -> bytes:
    path = folder / "seed.xlsx"
    with xlsxwriter.Workbook(path) as book:
        sheet = book.add_worksheet("Loop")
        sheet.write_row("A1", ["t", "p", True, 3.5])
        for row in range(1, 30):
            sheet.write_formula(row, 0, f"=B{row}+1", None, row)
        sheet.write_dynamic_array_formula("C3:C5", "=ROW(A1:A3)", None, 1)
        sheet.write_array_formula("D3:D5", "{=A3:A5*2}", None, 1)
        sheet.add_table("F1:G4", {"columns": [{"header": "gas"}, {"header": "mol"}]})
        book.add_worksheet("Map").write_formula("A1", "=Loop!A1", None, "x")
        book.define_name("Bara", "=Loop!$B$2")
    return path.read_bytes()


def flipped(data: bytes, chance: random.Random) -> bytes:
    """Some bytes of the file changed."""
    new = bytearray(data)
    for _ in range(chance.choice((1, 3, 20))):
        new[chance.randrange(len(new))] = chance.randrange(256)
    return bytes(new)


def cut(data: bytes, chance: random.Random) -> bytes:
    """A stretch of the file lost, or the end of it."""
    start = chance.randrange(len(data))
    stop = len(data) if chance.random() < 0.5 else start + chance.randrange(200)
    return data[:start] + data[stop:]


def rewritten(data: bytes, change: Callable[[str, bytes], bytes | None]) -> bytes:
    out = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(data)) as old, zipfile.ZipFile(out, "w", zipfile.ZIP_DEFLATED) as new:
        for name in old.namelist():
            content = change(name, old.read(name))
            if content is not None:
                new.writestr(name, content)
    return out.getvalue()


def dropped(data: bytes, chance: random.Random) -> bytes:
    """A member gone, or emptied."""
    with zipfile.ZipFile(io.BytesIO(data)) as archive:
        lost = chance.choice(archive.namelist())
    left = chance.choice((None, b"", b"<a/>"))
    return rewritten(data, lambda name, content: left if name == lost else content)


def bent(data: bytes, chance: random.Random) -> bytes:
    """The XML of a member bent: tokens put in, tags and attributes lost, doubled or swapped."""
    with zipfile.ZipFile(io.BytesIO(data)) as archive:
        names = [
            n for n in archive.namelist() if "sheet" in n or "workbook" in n or "table" in n or "rels" in n
        ]
        target = chance.choice([*names, *(n for n in names if "worksheets/sheet" in n and "rels" not in n)])

    def bend(name: str, content: bytes) -> bytes:
        for _ in range(chance.choice((1, 2, 6)) if name == target else 0):
            pieces = re.split(rb"(<[^>]*>|[\w:]+=\"[^\"]*\")", content)
            at = chance.randrange(len(pieces))
            pieces[at] = chance.choice((b"", pieces[at] * 2, chance.choice(TOKENS), chance.choice(pieces)))
            content = b"".join(pieces)
        return content

    return rewritten(data, bend)


MUTATIONS = (flipped, cut, dropped, bent, bent, bent)


def try_all(folder: Path, originals: list[bytes], n: int, seed: int) -> tuple[int, int]:
    """Open and write `n` mutated books; how many were written, how many refused."""
    chance = random.Random(seed)
    path, out = folder / "mutated.xlsx", folder / "out.xlsx"
    written = 0
    for number in range(n):
        path.write_bytes(chance.choice(MUTATIONS)(chance.choice(originals), chance))
        begun, message = time.monotonic(), ""
        try:
            book = open_book(path)
            results: Results = {
                s.index: SheetResults(
                    {p: 0.125 if s.stored.get(p, BLANK) != 0.125 else 0.5 for p in s.formulas}
                )
                for s in book.sheets
            }
            write_book(book, results, out)
        except BookError as error:
            message = str(error)
        assert time.monotonic() - begun < PATIENCE, f"mutation {number} of seed {seed} hangs"
        if message:
            assert message.startswith(str(path)), f"mutation {number} of seed {seed}"
            assert "\n" not in message
            assert not out.exists()
            continue
        written += 1
        again = open_book(out)
        for index, found in results.items():
            assert all(again.sheets[index].stored[p] == v for p, v in found.values.items())
            assert again.sheets[index].formulas == book.sheets[index].formulas
        out.unlink()
    assert {p.name for p in folder.iterdir()} <= {"seed.xlsx", "mutated.xlsx"}
    return written, n - written


def test_a_hundred_mutated_books_are_written_or_refused(tmp_path: Path) -> None:
    written, refused = try_all(tmp_path, [seed_book(tmp_path)], 100, seed=1)
    assert written > 10
    assert refused > 10


@pytest.mark.slow
def test_a_thousand_mutated_books_are_written_or_refused(tmp_path: Path) -> None:
    written, refused = try_all(tmp_path, [seed_book(tmp_path)], 1000, seed=2)
    assert written > 100
    assert refused > 100


def opens(path: Path) -> bool:
    try:
        return bool(open_book(path).sheets)
    except BookError:
        return False


@pytest.mark.slow
@pytest.mark.skipif(not FILES, reason="no corpus of workbooks beside the project")
def test_a_thousand_mutated_books_of_the_corpus_are_written_or_refused(tmp_path: Path) -> None:
    small = [data for path in FILES if len(data := path.read_bytes()) < 60_000 and opens(path)]
    written, refused = try_all(tmp_path, small, 1000, seed=3)
    assert written > 100
    assert refused > 100


def test_a_list_of_members_that_runs_past_its_end_is_refused(tmp_path: Path) -> None:
    data = bytearray(seed_book(tmp_path))
    path = tmp_path / "mutated.xlsx"
    last = data.rindex(b"PK\x01\x02")
    data[last + 30] = 17  # length of an extra field that would lie in the end record
    path.write_bytes(data)
    with pytest.raises(BookError, match=r"damaged list of members|zip archive"):
        write_book(open_book(path), {}, tmp_path / "out.xlsx")
    assert not (tmp_path / "out.xlsx").exists()
