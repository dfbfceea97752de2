"""Writing into workbooks that hold every feature XlsxWriter can write, and LibreOffice opening the result."""

from __future__ import annotations

import io
import os
import shutil
import struct
import subprocess
import zipfile
import zlib
from pathlib import Path

import pytest
import xlsxwriter
from lxml import etree
from xlsxwriter.worksheet import Worksheet

from xleq.cells import BLANK
from xleq.errors import BookError
from xleq.workbook import Book, FormulaKind, Results, SheetResults, open_book, write_book

CORPUS = Path(__file__).resolve().parents[2].parent / "shared" / "corpus"
FILES = sorted(CORPUS.rglob("*.xlsx"))
PARSER = etree.XMLParser(resolve_entities=False, no_network=True)


def png() -> io.BytesIO:
    """A grey picture of 8 by 8 points."""

    def chunk(kind: bytes, data: bytes) -> bytes:
        return struct.pack(">I", len(data)) + kind + data + struct.pack(">I", zlib.crc32(kind + data))

    rows = zlib.compress(b"".join(b"\0" + b"\x80" * 8 for _ in range(8)))
    head = struct.pack(">IIBBBBB", 8, 8, 8, 0, 0, 0, 0)
    return io.BytesIO(
        b"\x89PNG\r\n\x1a\n" + chunk(b"IHDR", head) + chunk(b"IDAT", rows) + chunk(b"IEND", b"")
    )


def fill_inputs(book: xlsxwriter.Workbook, sheet: Worksheet) -> None:
    percent = book.add_format({"num_format": "0.00%", "bold": True})
    sheet.write_row("A1", ["t / degC", "p / bar", "x NH3", "note"])
    for row in range(1, 11):
        sheet.write_row(row, 0, [400 + 10 * row, 100 + row])
        sheet.write_formula(row, 2, f"=A{row + 1}/B{row + 1}/100", percent, 0.04)
        sheet.write_formula(row, 3, f'="row "&{row}', None, f"row {row}")
    sheet.write_rich_string("F1", "N", book.add_format({"font_script": 2}), "2", " feed")
    sheet.write_dynamic_array_formula("H2:H4", "=ROW(A2:A6)", None, 2)
    sheet.write("H3", 3)
    sheet.write("H4", 4)
    sheet.write_array_formula("I2:I4", "{=B2:B4*2}", percent, 202)
    sheet.write_formula("J2", "=LET(a,A2,a*2)", None, 820)
    sheet.write_boolean("J3", True)
    sheet.write_url("J4", "internal:Map!A1", string="map")
    sheet.write_comment("A2", "set point")


def fill_features(book: xlsxwriter.Workbook, sheet: Worksheet) -> None:
    sheet.add_table("L1:M4", {"name": "Feeds", "columns": [{"header": "gas"}, {"header": "mol"}]})
    sheet.data_validation("B2", {"validate": "decimal", "criteria": ">", "value": 0})
    sheet.conditional_format("A2:A11", {"type": "data_bar", "data_bar_2010": True})
    sheet.conditional_format("B2:B11", {"type": "icon_set", "icon_style": "3_arrows"})
    sheet.conditional_format("C2:C11", {"type": "3_color_scale"})
    sheet.add_sparkline("K2", {"range": "Loop!A2:A11"})
    sheet.insert_image("N2", "grey.png", {"image_data": png()})
    sheet.embed_image("N9", "grey.png", {"image_data": png()})
    sheet.insert_textbox("N12", "Hallow Fen Works", {"width": 100})
    sheet.insert_button("N16", {"macro": "Recalculate", "caption": "Recalculate"})
    sheet.insert_checkbox("N20", True)
    sheet.autofilter("A1:D11")
    sheet.filter_column("A", "x > 420")
    sheet.set_row(2, None, None, {"hidden": True})
    sheet.set_column("E:E", 5, None, {"hidden": True, "level": 1})
    sheet.freeze_panes(1, 0)
    sheet.set_header("&C&G", {"image_center": "grey.png", "image_data_center": png()})
    sheet.set_background(png())
    sheet.protect("", {"sort": True})
    sheet.ignore_errors({"number_stored_as_text": "A1:B2"})
    sheet.print_area("A1:D11")
    sheet.set_h_pagebreaks([5])
    chart = book.add_chart({"type": "scatter", "subtype": "smooth"})
    chart.add_series(
        {"categories": "=Loop!$A$2:$A$11", "values": "=Loop!$C$2:$C$11", "trendline": {"type": "linear"}}
    )
    sheet.insert_chart("F14", chart)


def make_rich_book(path: Path) -> Path:
    """A workbook with every feature; with macros when its name asks for them."""
    with xlsxwriter.Workbook(path, {"use_future_functions": True}) as book:
        loop, chart_map = book.add_worksheet("Loop"), book.add_worksheet("Map")
        fill_inputs(book, loop)
        fill_features(book, loop)
        chart_map.write_formula("A1", "=SUM(Loop!C2:C11)", None, 0.4)
        chart_map.hide()
        tab = book.add_chartsheet("Chart")
        plot = book.add_chart({"type": "column"})
        plot.add_series({"values": "=Loop!$A$2:$A$11"})
        tab.set_chart(plot)
        book.define_name("Bara", "=Loop!$B$2")
        book.define_name("Map!Local", "=Map!$A$1")
        book.set_properties({"title": "Ammonia loop", "author": "Hallow Fen Works"})
        book.set_custom_property("Rev", 3)
        if path.suffix == ".xlsm":
            book.add_vba_project(io.BytesIO(bytes(range(256)) * 8), is_stream=True)
            book.set_vba_name("ThisWorkbook")
    return path


def grown_results(book: Book) -> Results:
    """New numbers everywhere; the spill grows by two rows and the array formula stays."""
    loop = SheetResults(values=dict.fromkeys(book.sheets[0].formulas, 1.5))
    spill = next(p for p, f in book.sheets[0].formulas.items() if f.dynamic and f.kind is FormulaKind.ARRAY)
    loop.values |= {(row, spill[1]): float(row) for row in range(2, 7)}
    loop.areas[spill] = book.sheets[0].formulas[spill].area._replace(bottom=6)  # type: ignore[union-attr]
    return {0: loop, 1: SheetResults(values={(1, 1): 15.0})}


@pytest.fixture(params=["loop.xlsx", "loop.xlsm"])
def rich(request: pytest.FixtureRequest, tmp_path: Path) -> Path:
    return make_rich_book(tmp_path / request.param)


def canonical(data: bytes) -> bytes:
    """Canonical XML of a sheet without cached values, and without the spill that was made to grow."""
    root = etree.parse(io.BytesIO(data), PARSER).getroot()
    for cell in list(root.iter("{*}c")):
        for child in list(cell):
            if etree.QName(child).localname == "v":
                cell.remove(child)
        cell.attrib.pop("t", None)
        if cell.get("r", "").startswith("H") and len(cell) == 0:
            cell.getparent().remove(cell)
    for formula in root.iter("{*}f"):
        formula.attrib.pop("ref", None)
    return etree.tostring(root, method="c14n")


def test_a_book_with_every_feature_keeps_all_of_them(rich: Path) -> None:
    book = open_book(rich)
    assert book.has_macros == (rich.suffix == ".xlsm")
    new = rich.with_name("new" + rich.suffix)
    results = grown_results(book)
    written = write_book(book, results, new, recalculate_on_load=False)
    with zipfile.ZipFile(rich) as a, zipfile.ZipFile(new) as b:
        assert a.namelist() == b.namelist()
        differing = {name for name in a.namelist() if a.read(name) != b.read(name)}
        assert differing == set(written.parts) == {s.part for s in book.sheets[:2]} | {book.workbook_part}
        for sheet in book.sheets[:2]:
            assert canonical(a.read(sheet.part)) == canonical(b.read(sheet.part))
        changed = b.read(book.workbook_part)
        assert changed == a.read(book.workbook_part).replace(b' fullCalcOnLoad="1"', b"")
        assert len(b.namelist()) > 35
    again = open_book(new)
    for index, found in results.items():
        assert {p: again.sheets[index].stored.get(p, BLANK) for p in found.values} == found.values
    assert not again.calculation.full_calc_on_load
    assert again.sheets[0].formulas.keys() == book.sheets[0].formulas.keys()


def converted(files: list[Path], folder: Path, patience: float) -> list[Path]:
    """What LibreOffice makes of workbooks as text, without calculating them anew; skips without it."""
    office = shutil.which("soffice") or shutil.which("libreoffice")
    if office is None:
        assert "CI" not in os.environ, "LibreOffice must be there in CI"
        pytest.skip("LibreOffice is not installed")
    user = folder / "profile" / "user"
    user.mkdir(parents=True)
    (user / "registrymodifications.xcu").write_text(
        '<?xml version="1.0" encoding="UTF-8"?><oor:items xmlns:oor="http://openoffice.org/2001/registry" '
        'xmlns:xs="http://www.w3.org/2001/XMLSchema">'
        '<item oor:path="/org.openoffice.Office.Calc/Formula/Load">'
        '<prop oor:name="OOXMLRecalcMode" oor:op="fuse"><value>1</value></prop></item></oor:items>'
    )
    command = [
        office,
        f"-env:UserInstallation={user.parent.as_uri()}",
        "--headless",
        "--convert-to",
        "csv:Text - txt - csv (StarCalc):44,34,76,1,,0,false,true,false,false,false,1",
        "--outdir",
        str(folder / "out"),
    ]
    for at in range(0, len(files), 100):  # it silently leaves out what comes after some 250 arguments
        batch = [*command, *map(str, files[at : at + 100])]
        done = subprocess.run(batch, timeout=patience, capture_output=True, text=True, check=False)
        assert done.returncode == 0, done.stderr
    return sorted((folder / "out").glob("*.csv"))


@pytest.mark.office
@pytest.mark.parametrize("name", ["loop.xlsx", "loop.xlsm"])
def test_libreoffice_opens_a_written_book_with_its_new_values(name: str, tmp_path: Path) -> None:
    old = make_rich_book(tmp_path / name)
    book = open_book(old)
    new = tmp_path / f"new{old.suffix}"
    write_book(book, grown_results(book), new, recalculate_on_load=False)
    lines = converted([new], tmp_path, 120)[0].read_text("utf-8").splitlines()
    assert lines[0].startswith("t / degC,p / bar,x NH3")
    assert lines[1].split(",")[2:4] == ["150%", "1.5"]
    assert [line.split(",")[7] for line in lines[1:6]] == ["2", "3", "4", "5", "6"]


@pytest.mark.office
@pytest.mark.slow
@pytest.mark.skipif(not FILES, reason="no corpus of workbooks beside the project")
def test_libreoffice_opens_every_book_of_the_corpus_after_writing(tmp_path: Path) -> None:
    (tmp_path / "new").mkdir()
    written = []
    for number, path in enumerate(FILES):
        try:
            book = open_book(path)
        except BookError:
            continue
        results: Results = {s.index: SheetResults(dict.fromkeys(s.formulas, 0.125)) for s in book.sheets}
        written.append(write_book(book, results, tmp_path / "new" / f"book{number}.xlsx").path)
    opened = {path.name.split(".")[0].split("-")[0] for path in converted(written, tmp_path, 900)}
    assert {path.stem for path in written} == opened
