"""Cells as they are stored, with all the ways in which files write them."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest

from xleq.cells import DIV0, NA, error_named
from xleq.errors import DamagedBookError
from xleq.workbook import Area, FormulaKind, Sheet, open_book

BookMaker = Callable[..., Path]
STRINGS = {"links": {"x": ("sharedStrings", "sharedStrings.xml")}}
SST = 'xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main"'


def sheet_of(make_book: BookMaker, inside: str, **more: object) -> Sheet:
    return open_book(make_book({"Loop": f"<sheetData>{inside}</sheetData>"}, **more)).sheets[0]


def test_values_of_every_kind_are_read(make_book: BookMaker) -> None:
    sheet = sheet_of(
        make_book,
        '<row r="1"><c r="A1"><v>6</v></c><c r="B1" t="n"><v>1E-05</v></c><c r="C1" t="b"><v>1</v></c>'
        '<c r="D1" t="e"><v>#DIV/0!</v></c><c r="E1" t="str"><v>gas</v></c><c r="F1" t="s"><v>1</v></c>'
        '<c r="G1" t="inlineStr"><is><t>in</t></is></c><c r="H1" t="d"><v>2024-01-10</v></c>'
        '<c r="I1"/><c r="J1"><v/></c><c r="K1" t="str"><v></v></c><c r="L1" t="b"><v>false</v></c></row>',
        links=STRINGS["links"],
        parts={"xl/sharedStrings.xml": f"<sst {SST}><si><t>no</t></si><si><t>feed</t></si></sst>"},
    )
    assert sheet.stored == {
        (1, 1): 6.0,
        (1, 2): 1e-5,
        (1, 3): True,
        (1, 4): DIV0,
        (1, 5): "gas",
        (1, 6): "feed",
        (1, 7): "in",
        (1, 8): 45301.0,
        (1, 11): "",
        (1, 12): False,
    }
    assert isinstance(sheet.stored[1, 1], float)
    assert sheet.stored[1, 4] is DIV0
    assert sheet.used == Area(1, 1, 1, 12)


def test_runs_of_rich_text_join_without_phonetic_hints(make_book: BookMaker) -> None:
    strings = (
        f"<sst {SST}><si><r><rPr><b/></rPr><t>NH</t></r><r><t>3</t></r>"
        "<rPh sb='0' eb='1'><t>hint</t></rPh></si>"
        "<si><t xml:space='preserve'> _x0041__x000D_ </t></si><si/></sst>"
    )
    sheet = sheet_of(
        make_book,
        '<row r="1"><c r="A1" t="s"><v>0</v></c><c r="B1" t="s"><v>1</v></c><c r="C1" t="s"><v>2</v></c>'
        '<c r="D1" t="inlineStr"><is><r><t>a</t></r><r><t>b</t></r>'
        '<rPh sb="0" eb="1"><t>x</t></rPh></is></c></row>',
        links=STRINGS["links"],
        parts={"xl/sharedStrings.xml": strings},
    )
    assert sheet.stored == {(1, 1): "NH3", (1, 2): " A\r ", (1, 3): "", (1, 4): "ab"}


def test_rows_and_cells_without_a_place_follow_the_ones_before(make_book: BookMaker) -> None:
    sheet = sheet_of(
        make_book,
        '<row><c><v>1</v></c><c><v>2</v></c><c r="E1"><v>3</v></c><c><v>4</v></c></row>'
        '<row r="4"><c><v>5</v></c></row><row><c r="B5"><v>6</v></c></row>'
        '<row><c r="A9"><v>7</v></c><c r="B9"><v>8</v></c></row><row><c><v>9</v></c></row>',
    )
    assert sheet.stored == {
        (1, 1): 1.0,
        (1, 2): 2.0,
        (1, 5): 3.0,
        (1, 6): 4.0,
        (4, 1): 5.0,
        (5, 2): 6.0,
        (9, 1): 7.0,
        (9, 2): 8.0,
        (10, 1): 9.0,
    }


def test_shared_formulas_share_the_master_text_and_its_place(make_book: BookMaker) -> None:
    sheet = sheet_of(
        make_book,
        '<row r="1"><c r="A1"><f t="shared" ref="A1:A3" si="0">B1*2</f><v>1</v></c></row>'
        '<row r="2"><c r="A2"><f t="shared" si="0"/><v>2</v></c><c r="C2"><f t="shared" si="7"/></c></row>'
        '<row r="3"><c r="A3"><f t="shared" si="0"></f></c>'
        '<c r="C3"><f t="shared" ref="C3:C4" si="0">Z9</f></c>'
        '</row><row r="4"><c r="C4"><f t="shared" si="0"/></c><c r="D4"><f>=SUM(A1:A3)</f></c>'
        '<c r="E4"><f/></c></row>',
    )
    f = sheet.formulas
    assert [(f[k, 1].text, f[k, 1].origin) for k in (1, 2, 3)] == [("B1*2", (1, 1))] * 3
    assert f[1, 1].group == f[3, 1].group != f[3, 3].group == f[4, 3].group
    assert (f[4, 3].text, f[4, 3].origin) == ("Z9", (3, 3))
    assert f[2, 3].text is None
    assert f[4, 4].text == "SUM(A1:A3)"
    assert (4, 5) not in f


def test_a_shared_cell_before_its_master_is_given_its_formula(make_book: BookMaker) -> None:
    sheet = sheet_of(
        make_book,
        '<row r="1"><c r="A1"><f t="shared" si="3"/></c></row>'
        '<row r="2"><c r="A2"><f t="shared" ref="A1:A2" si="3">B2</f></c></row>',
    )
    assert (sheet.formulas[1, 1].text, sheet.formulas[1, 1].origin) == ("B2", (2, 1))


def test_array_formulas_and_data_tables_say_what_they_fill(make_book: BookMaker) -> None:
    sheet = sheet_of(
        make_book,
        '<row r="1"><c r="A1"><f t="array" ref="A1:B2">C1:D2*2</f><v>2</v></c><c r="B1"><v>4</v></c>'
        '<c r="F1"><f t="dataTable" ref="F1:G2" dt2D="1" dtr="1" r1="A9" r2="B9"/><v>1</v></c>'
        '<c r="H1"><f ca="1">NOW()</f></c></row>',
    )
    array, table = sheet.formulas[1, 1], sheet.formulas[1, 6]
    assert (array.kind, array.area, array.dynamic) == (FormulaKind.ARRAY, Area(1, 1, 2, 2), False)
    assert (table.kind, table.area, table.text) == (FormulaKind.DATA_TABLE, Area(1, 6, 2, 7), None)
    assert table.table is not None
    assert (table.table.two_way, table.table.first, table.table.second) == (True, "A9", "B9")
    assert sheet.formulas[1, 8].always
    assert (1, 2) not in sheet.formulas


def metadata_parts() -> dict[str, str]:
    dynamic = "http://schemas.microsoft.com/office/spreadsheetml/2017/dynamicarray"
    rich = "http://schemas.microsoft.com/office/spreadsheetml/2017/richdata"
    return {
        "xl/metadata.xml": (
            f'<metadata {SST} xmlns:xda="{dynamic}" xmlns:xlrd="{rich}"><metadataTypes count="2">'
            '<metadataType name="XLRICHVALUE"/><metadataType name="XLDAPR"/></metadataTypes>'
            '<futureMetadata name="XLDAPR"><bk><extLst><ext><xda:dynamicArrayProperties fDynamic="0"/></ext>'
            '</extLst></bk><bk><extLst><ext><xda:dynamicArrayProperties fDynamic="1"/></ext></extLst></bk>'
            '</futureMetadata><futureMetadata name="XLRICHVALUE"><bk><extLst><ext><xlrd:rvb i="1"/></ext>'
            "</extLst></bk></futureMetadata>"
            '<cellMetadata><bk><rc t="2" v="0"/></bk><bk><rc t="2" v="1"/></bk>'
            '</cellMetadata><valueMetadata><bk><rc t="1" v="0"/></bk></valueMetadata></metadata>'
        ),
        "xl/richData/rv.xml": (
            f'<rvData xmlns="{rich}"><rv s="1"><v>13</v></rv><rv s="0"><v>8</v><v>1</v></rv></rvData>'
        ),
        "xl/richData/rvs.xml": (
            f'<rvStructures xmlns="{rich}"><s t="_error"><k n="errorType" t="i"/><k n="subType" t="i"/></s>'
            '<s t="_image"><k n="errorType"/></s></rvStructures>'
        ),
    }


RICH = "http://schemas.microsoft.com/office/2017/06/relationships"
METADATA_LINKS = {
    "m": ("sheetMetadata", "metadata.xml"),
    "v": (f"{RICH}/rdRichValue", "richData/rv.xml"),
    "w": (f"{RICH}/rdRichValueStructure", "richData/rvs.xml"),
}


def test_only_marked_array_formulas_are_dynamic(make_book: BookMaker) -> None:
    sheet = sheet_of(
        make_book,
        '<row r="1"><c r="A1" cm="2"><f t="array" ref="A1:A2">X</f></c>'
        '<c r="B1" cm="1"><f t="array" ref="B1">X</f>'
        '</c><c r="C1"><f t="array" ref="C1">X</f></c><c r="D1" cm="9"><f>X</f></c></row>',
        links=METADATA_LINKS,
        parts=metadata_parts(),
    )
    assert [sheet.formulas[1, c].dynamic for c in (1, 2, 3, 4)] == [True, False, False, False]


def test_newer_errors_are_read_from_rich_data(make_book: BookMaker) -> None:
    sheet = sheet_of(
        make_book,
        '<row r="1"><c r="A1" t="e" vm="1"><v>#VALUE!</v></c><c r="B1" t="e"><v>#VALUE!</v></c></row>',
        links=METADATA_LINKS,
        parts=metadata_parts(),
    )
    assert sheet.stored == {(1, 1): error_named("#SPILL!"), (1, 2): error_named("#VALUE!")}


@pytest.mark.parametrize(("application", "value"), [("Microsoft Excel", "#N/A"), ("Sheets of others", NA)])
def test_error_text_of_a_formula_is_an_error_unless_excel_wrote_it(
    make_book: BookMaker, application: str, value: object
) -> None:
    sheet = sheet_of(
        make_book,
        '<row r="1"><c r="A1" t="str"><f>NA()</f><v>#N/A</v></c><c r="B1" t="str"><v>#N/A</v></c></row>',
        application=application,
    )
    assert sheet.stored[1, 1] == value
    assert sheet.stored[1, 2] == "#N/A"


def test_hidden_and_filtered_rows_and_hidden_columns_are_told(make_book: BookMaker) -> None:
    path = make_book(
        {
            "Loop": '<cols><col min="2" max="3" hidden="1"/><col min="5" max="5"/></cols><sheetData>'
            '<row r="2" hidden="1"/><row r="3"/><row r="9" hidden="true"/></sheetData>'
            '<autoFilter ref="A1:B5"><filterColumn colId="0"/></autoFilter>'
        }
    )
    sheet = open_book(path).sheets[0]
    assert sheet.hidden_rows == {2, 9}
    assert sheet.filtered_rows == {2}
    assert [sheet.column_is_hidden(c) for c in (1, 2, 3, 4, 5)] == [False, True, True, False, False]


@pytest.mark.parametrize(
    ("inside", "words"),
    [
        ('<row r="1"><c r="A1"><v>abc</v></c></row>', "'abc' in A1"),
        ('<row r="1"><c r="A1"><v>1_000</v></c></row>', "'1_000' in A1"),
        ('<row r="1"><c r="A1"><v>NaN</v></c></row>', "'NaN' in A1"),
        ('<row r="1"><c r="A1" t="s"><v>4</v></c></row>', "'4' in A1"),
        ('<row r="1"><c r="A1" t="s"><v>-1</v></c></row>', "'-1' in A1"),
        ('<row r="1"><c r="A1" t="q"><v>4</v></c></row>', "no 'q' value"),
        ('<row r="1"><c r="A1" t="d"><v>last week</v></c></row>', "no 'd' value"),
        ('<row r="1"><c r="A1"><v>1</v></c><c r="A1"><v>2</v></c></row>', "A1 twice"),
        ('<row r="1"><c r="A1"><f>1</f></c><c r="A1"><f>2</f></c></row>', "A1 twice"),
        ('<row r="0"><c r="A1"/></row>', "'0' as a row number"),
        ('<row r="1"><c r="XFE1"/></row>', "place cannot be read"),
        ('<row r="1048577"/>', "row number"),
        ('<row r="1"><c r="A1" s="x"/></row>', "style index"),
        ("<row>", "not well-formed"),
        ('<row r="1"><c r="A1" t="str"><v>&nbsp;</v></c></row>', "not well-formed"),
    ],
)
def test_a_cell_that_cannot_be_read_is_named_with_its_sheet(
    make_book: BookMaker, inside: str, words: str
) -> None:
    with pytest.raises(DamagedBookError, match="sheet 'Loop'") as caught:
        sheet_of(make_book, inside)
    assert words in str(caught.value)
    assert str(caught.value).startswith(str(caught.value).split("loop.xlsx")[0] + "loop.xlsx")
    assert "\n" not in str(caught.value)


def test_cells_with_a_prefix_or_in_another_encoding_are_the_same(make_book: BookMaker) -> None:
    main = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
    text = (
        f'<x:worksheet xmlns:x="{main}"><x:sheetData><x:row r="1">'
        '<x:c r="A1" t="str"><x:f>"é"</x:f><x:v>é</x:v></x:c>'
        "</x:row></x:sheetData></x:worksheet>"
    )
    as_utf16 = ('<?xml version="1.0" encoding="UTF-16"?>' + text).encode("utf-16")
    latin = ('<?xml version="1.0" encoding="ISO-8859-1"?>' + text).encode("latin-1")
    book = open_book(
        make_book({"A": text.encode(), "B": as_utf16, "C": latin, "D": b"\xef\xbb\xbf" + text.encode()})
    )
    assert [sheet.stored for sheet in book.sheets] == [{(1, 1): "é"}] * 4
    assert [sheet.formulas[1, 1].text for sheet in book.sheets] == ['"é"'] * 4


def test_cells_of_a_strict_workbook_are_read(make_book: BookMaker) -> None:
    text = (
        '<worksheet xmlns="http://purl.oclc.org/ooxml/spreadsheetml/main"><sheetData><row r="1">'
        '<c r="A1"><f>1+1</f><v>2</v></c></row></sheetData></worksheet>'
    )
    sheet = open_book(make_book({"Loop": text.encode()})).sheets[0]
    assert (sheet.stored, sheet.formulas[1, 1].text) == ({(1, 1): 2.0}, "1+1")
