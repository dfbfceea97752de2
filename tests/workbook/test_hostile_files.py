"""Files that are refused: each with one clear line, whatever is wrong with it."""

from __future__ import annotations

import zipfile
from collections.abc import Callable
from pathlib import Path

import pytest

from xleq.errors import (
    BookError,
    DamagedBookError,
    EncryptedBookError,
    LimitError,
    MissingBookError,
)
from xleq.workbook import Limits, open_book

BookMaker = Callable[..., Path]
CELL = '<sheetData><row r="1"><c r="A1"><f>1+1</f><v>2</v></c></row></sheetData>'
OLE = bytes.fromhex("D0CF11E0A1B11AE1")


def refused(path: Path, kind: type[BookError], *words: str, limits: Limits | None = None) -> None:
    with pytest.raises(BookError) as caught:
        open_book(path, limits)
    message = str(caught.value)
    assert type(caught.value) is kind, message
    assert message.startswith(f"{path} ")
    assert "\n" not in message
    for word in words:
        assert word in message


def rezipped(path: Path, change: Callable[[zipfile.ZipFile, zipfile.ZipInfo, bytes], None]) -> Path:
    """The archive written again, each member as `change` writes it."""
    new = path.with_name("new.xlsx")
    with zipfile.ZipFile(path) as old, zipfile.ZipFile(new, "w", zipfile.ZIP_DEFLATED) as archive:
        for info in old.infolist():
            change(archive, info, old.read(info))
    return new


def test_a_missing_file_a_folder_and_an_empty_file_are_refused(tmp_path: Path) -> None:
    refused(tmp_path / "no.xlsx", MissingBookError, "no such file")
    refused(tmp_path, BookError, "folder")
    (tmp_path / "empty.xlsx").touch()
    refused(tmp_path / "empty.xlsx", DamagedBookError, "empty")


def test_files_of_other_formats_are_refused_with_what_to_do(tmp_path: Path) -> None:
    path = tmp_path / "book.xlsx"
    for data, kind, word in [
        (b"t,p\n1,2\n", DamagedBookError, "zip archive"),
        (OLE + "EncryptedPackage".encode("utf-16-le"), EncryptedBookError, "password"),
        (OLE + b"\0" * 512 + "Workbook".encode("utf-16-le"), DamagedBookError, "save it as .xlsx"),
        (OLE + b"\0" * 512, DamagedBookError, "compound file"),
    ]:
        path.write_bytes(data)
        refused(path, kind, word)


def test_a_zip_that_is_no_workbook_is_refused(tmp_path: Path, make_book: BookMaker) -> None:
    path = tmp_path / "other.xlsx"
    with zipfile.ZipFile(path, "w") as archive:
        archive.writestr("mimetype", "application/vnd.oasis.opendocument.spreadsheet")
    refused(path, DamagedBookError, "not an Excel workbook")
    book = make_book({"Loop": CELL}, parts={"xl/workbook.xml": "<document/>"})
    refused(book, DamagedBookError, "not an Excel workbook")


def test_a_binary_workbook_is_refused_with_what_to_do(make_book: BookMaker) -> None:
    path = make_book({"Loop": CELL})
    new = rezipped(path, lambda z, i, d: z.writestr(i.filename, d.replace(b"workbook.xml", b"workbook.bin")))
    refused(new, DamagedBookError, ".xlsb", "save it as .xlsx")


@pytest.mark.parametrize("part", [0.0, 0.3, 0.9, 0.99])
def test_a_truncated_archive_is_refused(make_book: BookMaker, part: float) -> None:
    path = make_book({"Loop": CELL})
    data = path.read_bytes()
    path.write_bytes(data[: max(4, int(part * len(data)))])
    refused(path, DamagedBookError)


@pytest.mark.parametrize(
    "name", ["xl/workbook.xml", "xl/_rels/workbook.xml.rels", "_rels/.rels", "xl/worksheets/sheet1.xml"]
)
def test_a_workbook_without_a_part_it_needs_is_refused(make_book: BookMaker, name: str) -> None:
    def drop(archive: zipfile.ZipFile, info: zipfile.ZipInfo, data: bytes) -> None:
        if info.filename != name:
            archive.writestr(info, data)

    refused(rezipped(make_book({"Loop": CELL}), drop), DamagedBookError)


@pytest.mark.filterwarnings("ignore:Duplicate name")
@pytest.mark.parametrize("name", ["XL/Workbook.xml", "xl\\workbook.xml", "xl/workbook.xml"])
def test_two_members_of_one_name_are_refused(make_book: BookMaker, name: str) -> None:
    path = make_book({"Loop": CELL})
    with zipfile.ZipFile(path, "a") as archive:
        archive.writestr(name, "<workbook/>")
    refused(path, DamagedBookError, "two members")


@pytest.mark.parametrize("name", ["../evil.xml", "/etc/evil", "xl/../../evil", "C:/evil", "xl\\..\\..\\evil"])
def test_a_member_outside_the_archive_is_refused(make_book: BookMaker, name: str) -> None:
    path = make_book({"Loop": CELL})
    with zipfile.ZipFile(path, "a") as archive:
        archive.writestr(name, "x")
    refused(path, DamagedBookError, "outside the archive")


def test_a_relationship_that_leads_outside_the_archive_is_refused(make_book: BookMaker) -> None:
    path = make_book({"Loop": CELL}, links={"x": ("sharedStrings", "../../../etc/passwd")})
    refused(path, DamagedBookError, "outside the archive")


BOMB = (
    '<!DOCTYPE x [<!ENTITY a "aaaaaaaaaa"><!ENTITY b "&a;&a;&a;&a;&a;&a;"><!ENTITY c "&b;&b;&b;&b;&b;">'
    "]><worksheet><x>&c;</x></worksheet>"
)
OUTSIDE = '<!DOCTYPE x [<!ENTITY a SYSTEM "file:///etc/passwd">]><worksheet>&a;</worksheet>'


@pytest.mark.parametrize(
    "text", [BOMB, OUTSIDE, '<!DOCTYPE x SYSTEM "http://localhost:9/x.dtd"><worksheet/>']
)
@pytest.mark.parametrize(
    "part", ["xl/worksheets/sheet1.xml", "xl/workbook.xml", "_rels/.rels", "docProps/app.xml"]
)
@pytest.mark.parametrize("encoding", ["utf-8", "utf-16"])
def test_document_types_and_entities_are_refused_in_every_part(
    make_book: BookMaker, text: str, part: str, encoding: str
) -> None:
    path = make_book({"Loop": CELL}, parts={part: text.encode(encoding)})
    refused(path, DamagedBookError, "document type")


def test_an_encrypted_member_is_refused(make_book: BookMaker) -> None:
    path = make_book({"Loop": CELL})
    data = bytearray(path.read_bytes())
    at = data.index(b"PK\x01\x02")
    data[at + 8] |= 1
    path.write_bytes(data)
    refused(path, EncryptedBookError, "encrypted member")


def test_a_method_of_packing_that_workbooks_do_not_use_is_refused(make_book: BookMaker) -> None:
    def pack(archive: zipfile.ZipFile, info: zipfile.ZipInfo, data: bytes) -> None:
        archive.writestr(info.filename, data, zipfile.ZIP_BZIP2)

    refused(rezipped(make_book({"Loop": CELL}), pack), DamagedBookError, "method")


def test_a_wrong_checksum_is_refused(make_book: BookMaker) -> None:
    path = rezipped(make_book({"Loop": CELL}), lambda z, i, d: z.writestr(i.filename, d, zipfile.ZIP_STORED))
    data = path.read_bytes()
    path.write_bytes(data.replace(b"<v>2</v>", b"<v>3</v>"))
    refused(path, DamagedBookError, "damaged member")


@pytest.mark.parametrize(
    ("limits", "word"),
    [
        (Limits(file_size=100), "file_size"),
        (Limits(entries=3), "entries"),
        (Limits(total_size=500), "total_size"),
        (Limits(ratio=1.5, ratio_from=1000), "ratio"),
        (Limits(cells=199), "cells"),
        (Limits(formula_length=3000), "formula_length"),
        (Limits(xml_depth=3), "elements inside one another"),
    ],
)
def test_every_limit_refuses_what_is_over_it_and_can_be_raised(
    make_book: BookMaker, limits: Limits, word: str
) -> None:
    rows = "".join(f'<row r="{n}"><c r="A{n}"><v>1</v></c></row>' for n in range(1, 200))
    path = make_book(
        {"Loop": f'<sheetData>{rows}<row r="200"><c r="A200"><f>{"1+" * 2000}1</f></c></row></sheetData>'}
    )
    refused(path, LimitError, word, limits=limits)
    assert len(open_book(path).sheets[0].stored) == 199


def test_a_decompression_bomb_is_refused_before_it_is_unpacked(make_book: BookMaker) -> None:
    path = make_book({"Loop": CELL}, parts={"xl/media/picture.png": b"\0" * (40 * 2**20)})
    refused(path, LimitError, "times smaller")


def test_endless_nesting_is_refused(make_book: BookMaker) -> None:
    deep = "<c>" * 100_000
    refused(make_book({"Loop": f'<sheetData><row r="1">{deep}'}), LimitError, "inside one another")
    strings = {"xl/sharedStrings.xml": "<sst>" + "<si>" * 100_000}
    links = {"x": ("sharedStrings", "sharedStrings.xml")}
    refused(make_book({"Loop": CELL}, links=links, parts=strings), LimitError, "inside one another")
