"""Names, tables, formats, settings and links of a workbook; openpyxl's reader as the second opinion."""

from __future__ import annotations

import os
import subprocess
import sys
from collections.abc import Callable
from datetime import datetime, time, timedelta
from pathlib import Path
from typing import Any

import openpyxl
import pytest
from openpyxl.cell import MergedCell

from xleq.cells import DIV0, CellError, Value, address_text
from xleq.errors import BookError, DamagedBookError
from xleq.workbook import (
    Area,
    Calculation,
    DefinedName,
    ExternalBook,
    SheetKind,
    SheetState,
    Table,
    open_book,
)

BookMaker = Callable[..., Path]
CORPUS = Path(__file__).resolve().parents[2].parent / "shared" / "corpus"
FILES = sorted(CORPUS.rglob("*.xlsx"))
STRICT = {"SampleSS.strict.xlsx", "sample.strict.xlsx"}
MAIN = 'xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main"'
REL = 'xmlns:r="http://schemas.openxmlformats.org/officeDocument/2006/relationships"'
CASES = [
    pytest.param(p, id=str(p.relative_to(CORPUS)), marks=() if n % 10 == 0 else pytest.mark.slow)
    for n, p in enumerate(FILES)
    if p.name not in STRICT
] or [pytest.param(None, marks=pytest.mark.skip(reason="no corpus of workbooks beside the project"))]


def agree(ours: Value, theirs: Any) -> bool:
    """Whether openpyxl gives the same value, where it does not turn it into something else."""
    if isinstance(theirs, datetime | time | timedelta):
        return isinstance(ours, float)
    if isinstance(ours, CellError):
        return theirs == ("#VALUE!" if ours.code == "#CALC!" else ours.code)
    if isinstance(ours, str):
        return "_x" in str(theirs) or (theirs or "") == ours
    return isinstance(theirs, bool) == isinstance(ours, bool) and theirs == ours


@pytest.mark.filterwarnings("ignore")
@pytest.mark.parametrize("path", CASES)
def test_structure_and_values_are_those_that_openpyxl_finds(path: Path) -> None:
    try:
        ours = open_book(path)
    except BookError:
        pytest.skip("refused, as another test shows")
    theirs = openpyxl.load_workbook(path, data_only=True)
    kinds = {s.name: s for s in ours.sheets if s.kind is SheetKind.WORKSHEET}
    assert list(kinds) == [ws.title for ws in theirs.worksheets]
    assert (theirs.epoch.year == 1904) == ours.date_1904
    names = {(n, None): d.attr_text for n, d in theirs.defined_names.items()}
    for ws in theirs.worksheets:
        names |= {(n, kinds[ws.title].index): d.attr_text for n, d in ws.defined_names.items()}
    own = {(n.name, n.scope): n.text for n in ours.names if not n.name.startswith("_xlnm.")}
    assert own == {key: text for key, text in names.items() if not key[0].startswith("_xlnm.")}
    tables = {t.displayName: (t.ref, [c.name for c in t.tableColumns]) for ws in theirs.worksheets
              for t in ws.tables.values()}  # fmt: skip
    assert {t.name: (ref(t.area), list(t.columns)) for t in ours.tables} == tables
    for name, sheet in kinds.items():
        ws = theirs[name]
        assert ws.sheet_state == sheet.state.value
        for (row, column), value in list(sheet.stored.items())[:2000]:
            cell = ws.cell(row, column)
            assert cell.number_format == sheet.format_of(row, column)
            hidden_by_merge = isinstance(cell, MergedCell)  # openpyxl blanks these
            assert hidden_by_merge or agree(value, cell.value), address_text(row, column)


def ref(area: Area) -> str:
    first = address_text(area.top, area.left)
    return f"{first}:{address_text(area.bottom, area.right)}"


def test_sheets_come_in_the_order_of_their_tabs_with_kind_and_state(make_book: BookMaker) -> None:
    path = make_book(
        {"Loop": "<sheetData/>", "Map &amp; K": "<sheetData/>", "Old": "<sheetData/>"},
        states={"Old": "veryHidden", "Loop": "hidden"},
    )
    book = open_book(path)
    assert [(s.name, s.index, s.state) for s in book.sheets] == [
        ("Loop", 0, SheetState.HIDDEN),
        ("Map & K", 1, SheetState.VISIBLE),
        ("Old", 2, SheetState.VERY_HIDDEN),
    ]
    assert book.sheet_named("map & k") is book.sheets[1]
    assert book.sheet_named("none") is None


def test_parts_are_found_by_their_relationships_wherever_they_are(make_book: BookMaker) -> None:
    strings = f"<sst {MAIN}><si><t>here</t></si></sst>"
    for target, part in [
        ("/elsewhere/Texts.xml", "elsewhere/texts.xml"),
        ("../top.xml", "top.xml"),
        ("./a%20b.xml", "xl/a b.xml"),
        ("sub\\s.xml", "xl/sub/s.xml"),
    ]:
        path = make_book(
            {"Loop": '<sheetData><row r="1"><c r="A1" t="s"><v>0</v></c></row></sheetData>'},
            links={"x": ("sharedStrings", target)},
            parts={part: strings},
        )
        assert open_book(path).sheets[0].stored == {(1, 1): "here"}


def test_names_are_read_with_scope_visibility_and_kind(make_book: BookMaker) -> None:
    text = (
        '<definedNames><definedName name="Bara">=Loop!$B$2</definedName>'
        '<definedName name="Tref" localSheetId="0" hidden="1">298.15</definedName>'
        '<definedName name="Run" function="1" xlm="1" localSheetId="9">#REF!</definedName>'
        '<definedName name="Macro" vbProcedure="1">#REF!</definedName></definedNames>'
    )
    book = open_book(make_book({"Loop": "<sheetData/>"}, after_sheets=text))
    assert book.names == (
        DefinedName("Bara", "Loop!$B$2"),
        DefinedName("Tref", "298.15", 0, hidden=True),
        DefinedName("Macro", "#REF!", is_macro=True),
    )


def test_settings_are_read_with_the_defaults_of_the_format(make_book: BookMaker) -> None:
    path = make_book(
        {"Loop": "<sheetData/>"},
        before_sheets='<workbookPr date1904="1"/>',
        after_sheets='<calcPr calcMode="manual" iterate="1" iterateCount="7" iterateDelta="1E-4" '
        'fullCalcOnLoad="1"/>',
    )
    book = open_book(path)
    assert book.date_1904
    assert book.calculation == Calculation(True, 7, 1e-4, True, True)
    plain_book = open_book(make_book({"Loop": "<sheetData/>"}))
    assert not plain_book.date_1904
    assert plain_book.calculation == Calculation(False, 100, 0.001)
    bad = make_book({"Loop": "<sheetData/>"}, after_sheets='<calcPr iterateCount="many"/>')
    with pytest.raises(DamagedBookError, match="calculation settings"):
        open_book(bad)


def test_a_table_is_read_with_its_rows_columns_and_filter(make_book: BookMaker) -> None:
    rows = "".join(f'<row r="{n}" hidden="1"/>' for n in (3, 5, 9))
    path = make_book(
        {"Loop": f"<sheetData>{rows}</sheetData>"},
        parts={
            "xl/worksheets/_rels/sheet1.xml.rels": (
                '<Relationships xmlns="http://schemas.openxmlformats.org/package/2006/relationships">'
                '<Relationship Id="t" '
                'Type="http://schemas.openxmlformats.org/officeDocument/2006/relationships/table" '
                'Target="../tables/table1.xml"/></Relationships>'
            ),
            "xl/tables/table1.xml": (
                f'<table {MAIN} id="1" name="x" displayName="Feeds" ref="B2:C5" totalsRowCount="1">'
                '<autoFilter ref="B2:C4">'
                '<filterColumn colId="0"/></autoFilter><tableColumns count="2">'
                '<tableColumn id="1" name="mol_x000a_1"/>'
                '<tableColumn id="2" name="gas [#]"/></tableColumns></table>'
            ),
        },
    )
    book = open_book(path)
    assert book.tables == (Table("Feeds", 0, Area(2, 2, 5, 3), 1, 1, ("mol\n1", "gas [#]")),)
    assert book.sheets[0].hidden_rows == {3, 5, 9}
    assert book.sheets[0].filtered_rows == {3}


def test_number_formats_are_those_of_the_cell_styles(make_book: BookMaker) -> None:
    styles = (
        f'<styleSheet {MAIN}><numFmts><numFmt numFmtId="164" formatCode="0.0&quot; bar&quot;"/></numFmts>'
        '<cellXfs><xf numFmtId="0"/><xf numFmtId="164"/><xf numFmtId="10"/><xf numFmtId="31"/>'
        "<xf/></cellXfs></styleSheet>"
    )
    cells = "".join(f'<c r="{c}1" s="{n}"><v>1</v></c>' for n, c in enumerate("ABCDEF"))
    path = make_book(
        {"Loop": f'<sheetData><row r="1">{cells}</row></sheetData>'},
        links={"s": ("styles", "styles.xml")},
        parts={"xl/styles.xml": styles},
    )
    sheet = open_book(path).sheets[0]
    assert [sheet.format_of(1, c) for c in range(1, 8)] == [
        "General", '0.0" bar"', "0.00%", "mm-dd-yy", "General", "General", "General",
    ]  # fmt: skip
    assert sheet.cell(1, 2).style == 1
    assert list(sheet.formats) == ["General", '0.0" bar"', "0.00%", "mm-dd-yy", "General"]


def test_external_books_are_remembered_and_never_opened(make_book: BookMaker, tmp_path: Path) -> None:
    link = (
        f'<externalLink {MAIN} {REL}><externalBook r:id="r1"><sheetNames><sheetName val="Rates"/>'
        '<sheetName val="K"/></sheetNames><definedNames><definedName name="Kp" refersTo="=Rates!$A$1"/>'
        '<definedName name="XLEQ_KP"/>'
        '</definedNames><sheetDataSet><sheetData sheetId="1"><row r="2"><cell r="B2"><v>3</v></cell>'
        '<cell r="C2" t="str"><v>x</v></cell><cell r="D2" t="e"><v>#DIV/0!</v></cell>'
        '<cell r="E2" t="b"><v>1</v></cell>'
        '<cell r="F2"/></row></sheetData></sheetDataSet></externalBook></externalLink>'
    )
    rels = (
        '<Relationships xmlns="http://schemas.openxmlformats.org/package/2006/relationships">'
        '<Relationship Id="r1" '
        'Type="http://schemas.openxmlformats.org/officeDocument/2006/relationships/externalLinkPath" '
        'Target="file:///Z:/rates.xlsx" TargetMode="External"/></Relationships>'
    )
    path = make_book(
        {"Loop": "<sheetData/>"},
        after_sheets='<externalReferences><externalReference r:id="d"/>'
        '<externalReference r:id="e"/></externalReferences>',
        links={"d": ("externalLink", "externalLinks/d.xml"), "e": ("externalLink", "externalLinks/e.xml")},
        parts={
            "xl/externalLinks/d.xml": f"<externalLink {MAIN}><ddeLink/></externalLink>",
            "xl/externalLinks/e.xml": link,
            "xl/externalLinks/_rels/e.xml.rels": rels,
        },
    )
    values = {("K", 2, 2): 3.0, ("K", 2, 3): "x", ("K", 2, 4): DIV0, ("K", 2, 5): True}
    names = {"Kp": "Rates!$A$1", "XLEQ_KP": ""}
    assert open_book(path).links == (
        ExternalBook(1, ""),
        ExternalBook(2, "file:///Z:/rates.xlsx", ("Rates", "K"), values, names),
    )


def test_macros_signatures_and_the_program_are_told(make_book: BookMaker) -> None:
    plain_book = open_book(make_book({"Loop": "<sheetData/>"}))
    assert (plain_book.has_macros, plain_book.is_signed, plain_book.application) == (
        False,
        False,
        "Microsoft Excel",
    )
    link = {"v": ("http://schemas.microsoft.com/office/2006/relationships/vbaProject", "vbaProject.bin")}
    parts = {"xl/vbaProject.bin": b"\0", "_xmlsignatures/sig1.xml": "<s/>"}
    book = open_book(make_book({"Loop": "<sheetData/>"}, links=link, parts=parts))
    assert (book.has_macros, book.is_signed) == (True, True)


def test_opening_a_book_does_not_import_openpyxl(make_book: BookMaker) -> None:
    path = make_book({"Loop": "<sheetData/>"})
    code = "import sys, xleq.workbook as w; w.open_book(sys.argv[1]); sys.exit('openpyxl' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", code, os.fspath(path)], check=False).returncode == 0
