"""Cached values put into a sheet: what the bytes become, and what is refused."""

from __future__ import annotations

import zipfile
from collections.abc import Callable
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from xleq.cells import BLANK, NA, Value, error_named
from xleq.errors import BookError, DamagedBookError, InputError, LockedBookError, SignedBookError
from xleq.workbook import Area, Place, SheetResults, open_book, write_book
from xleq.workbook.markup import escaped, unescaped
from xleq.workbook.writing.values import number_text

BookMaker = Callable[..., Path]


def sheet_after(
    path: Path,
    values: dict[Place, Value],
    areas: dict[Place, Area] | None = None,
    inputs: dict[Place, Value] | None = None,
) -> str:
    """What stands inside `worksheet` after writing, read back the same each time."""
    out = path.with_name("out.xlsx")
    results = SheetResults(values, areas or {}, inputs or {})
    write_book(open_book(path), {0: results}, out)
    again = open_book(out).sheets[0]
    for place, value in {**values, **results.inputs}.items():
        assert again.stored.get(place, BLANK) == value
    with zipfile.ZipFile(out) as archive:
        text = archive.read("xl/worksheets/sheet1.xml").decode()
    return text[text.index(">") + 1 : text.rindex("</")]


def data(inside: str) -> str:
    return f"<sheetData>{inside}</sheetData>"


@pytest.mark.parametrize(
    ("value", "cell"),
    [
        (2.5, '<c r="A1" s="3"><f>X</f><v>2.5</v></c>'),
        (1e-5, '<c r="A1" s="3"><f>X</f><v>1E-05</v></c>'),
        ("a<b", '<c r="A1" s="3" t="str"><f>X</f><v>a&lt;b</v></c>'),
        (" a\n", '<c r="A1" s="3" t="str"><f>X</f><v xml:space="preserve"> a\n</v></c>'),
        ("\r\x01", '<c r="A1" s="3" t="str"><f>X</f><v xml:space="preserve">_x000D__x0001_</v></c>'),
        (True, '<c r="A1" s="3" t="b"><f>X</f><v>1</v></c>'),
        (NA, '<c r="A1" s="3" t="e"><f>X</f><v>#N/A</v></c>'),
        (BLANK, '<c r="A1" s="3"><f>X</f></c>'),
    ],
)
def test_a_value_of_each_kind_replaces_the_cached_one(make_book: BookMaker, value: Value, cell: str) -> None:
    path = make_book({"Loop": data('<row r="1"><c r="A1" s="3" t="str"><f>X</f><v>old</v></c></row>')})
    assert sheet_after(path, {(1, 1): value}) == data(f'<row r="1">{cell}</row>')


def test_newer_errors_are_stored_as_the_format_has_them(make_book: BookMaker) -> None:
    path = make_book({"Loop": data('<row r="1"><c r="A1"><f>X</f><v>1</v></c></row>')})
    out = path.with_name("out.xlsx")
    write_book(open_book(path), {0: SheetResults({(1, 1): error_named("#SPILL!")})}, out)
    assert open_book(out).sheets[0].stored[1, 1] == error_named("#VALUE!")


@pytest.mark.parametrize(
    "cell",
    [
        "<c r='A1' t = 'str' cm=\"1\"><f>X</f><v>o</v></c>",
        '<c r="A1" vm="1" cm="1" t="e"\n><f>X</f><v>o</v></c>',
        '<c r="A1" cm="1"><f><![CDATA[X]]></f><v><![CDATA[7]]></v></c>',
        '<c r="A1" cm="1"><!-- > --><f a=">">X</f><v>7</v><extLst><ext uri="/>"><v/></ext></extLst></c>',
        '<c r="A1" cm="1"> <f>X</f> <v>&#55;</v> </c>',
        '<c r="A1" cm="1"><f>X</f></c>',
        '<c r="A1" cm="1"><f>X</f><v/></c>',
    ],
)
def test_cells_written_unusually_keep_all_but_their_value(make_book: BookMaker, cell: str) -> None:
    path = make_book({"Loop": data(f'<row r="1">{cell}</row>')})
    after = sheet_after(path, {(1, 1): "new"})
    assert after.count("<v>new</v>") == 1
    assert after.count('t="str"') == 1
    assert "vm=" not in after
    for kept in ('cm="1"', "<!-- > -->", '<extLst><ext uri="/>"><v/></ext></extLst>', "<![CDATA[X]]>"):
        assert (kept in after) == (kept in cell)
    assert after.index("</f>") < after.index("<v>new</v>")


def test_a_prefix_and_an_encoding_are_kept_or_become_utf8(make_book: BookMaker) -> None:
    main = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
    text = (
        f'<x:worksheet xmlns:x="{main}"><x:sheetData><x:row r="1">'
        '<x:c r="A1"><x:f>"é"</x:f><x:v>1</x:v></x:c></x:row></x:sheetData></x:worksheet>'
    )
    declared = '<?xml version="1.0" encoding="{}" standalone="yes"?>' + text
    for raw in (
        text.encode(),
        b"\xef\xbb\xbf" + text.encode(),
        declared.format("UTF-16").encode("utf-16"),
        declared.format("ISO-8859-1").encode("latin-1"),
    ):
        path = make_book({"Loop": raw})
        out = path.with_name("out.xlsx")
        write_book(open_book(path), {0: SheetResults({(1, 1): "ü"})}, out)
        sheet = open_book(out).sheets[0]
        assert (sheet.stored[1, 1], sheet.formulas[1, 1].text) == ("ü", '"é"')
        with zipfile.ZipFile(out) as archive:
            assert '<x:c r="A1" t="str"><x:f>"é"</x:f><x:v>ü</x:v></x:c>' in archive.read(
                "xl/worksheets/sheet1.xml"
            ).decode("utf-8-sig")


def test_values_that_did_not_change_keep_their_bytes(make_book: BookMaker) -> None:
    number = '<c r="A1"><f>X</f><v>0.10000000000000001</v></c>'
    row = f'<row r="1">{number}<c r="B1" t="s"><f>Y</f><v>0</v></c></row>'
    path = make_book(
        {"Loop": data(row)},
        links={"x": ("sharedStrings", "s.xml")},
        parts={
            "xl/s.xml": '<sst xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main">'
            "<si><t>a</t></si></sst>"
        },
    )
    assert sheet_after(path, {(1, 1): 0.1, (1, 2): "a"}) == data(row)


DYNAMIC = {
    "links": {"m": ("sheetMetadata", "metadata.xml")},
    "parts": {
        "xl/metadata.xml": '<metadata xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main">'
        '<metadataTypes><metadataType name="XLDAPR"/></metadataTypes>'
        '<futureMetadata name="XLDAPR"><bk>'
        '<extLst><ext><x:dynamicArrayProperties xmlns:x="urn:x" fDynamic="1"/></ext></extLst></bk>'
        "</futureMetadata>"
        '<cellMetadata><bk><rc t="1" v="0"/></bk></cellMetadata></metadata>'
    },
}
SPILL = '<c r="B2" cm="1"><f t="array" ref="B2:B3">X</f><v>1</v></c>'


def test_a_spill_that_grows_makes_cells_and_rows_in_order(make_book: BookMaker) -> None:
    path = make_book(
        {
            "Loop": '<dimension ref="A1:C6"/><cols><col min="2" max="2" style="4"/></cols>'
            + data(
                f'<row r="1"/><row r="2" spans="1:2">{SPILL}</row><row r="3"><c r="B3"><v>2</v></c></row>'
                '<row r="4" s="5" customFormat="1"><c r="A4"><v>9</v></c><c r="C4"><v>9</v></c></row>'
                '<row r="6"><c r="B6" s="2"/></row>'
            )
        },
        **DYNAMIC,
    )
    areas = {(2, 2): Area(2, 2, 7, 3)}
    values: dict[Place, Value] = {(row, 2): float(row) for row in range(2, 8)}
    values |= {(2, 3): "x", (7, 3): True}
    assert sheet_after(path, values, areas) == (
        '<dimension ref="A1:C7"/><cols><col min="2" max="2" style="4"/></cols>'
        + data(
            '<row r="1"/><row r="2" spans="1:3"><c r="B2" cm="1"><f t="array" ref="B2:C7">X</f><v>2</v></c>'
            '<c r="C2" t="str"><v>x</v></c></row><row r="3"><c r="B3"><v>3</v></c></row>'
            '<row r="4" s="5" customFormat="1"><c r="A4"><v>9</v></c><c r="B4" s="5"><v>4</v></c>'
            '<c r="C4"><v>9</v></c></row><row r="5"><c r="B5" s="4"><v>5</v></c></row>'
            '<row r="6"><c r="B6" s="2"><v>6</v></c></row>'
            '<row r="7"><c r="B7" s="4"><v>7</v></c><c r="C7" t="b"><v>1</v></c></row>'
        )
    )


@pytest.mark.parametrize("told", [{}, {(3, 2): BLANK}])
def test_a_spill_that_shrinks_empties_the_cells_it_leaves(
    make_book: BookMaker, told: dict[Place, Value]
) -> None:
    path = make_book(
        {"Loop": data(f'<row r="2">{SPILL}</row><row r="3"><c r="B3" s="1"><v>2</v></c></row>')}, **DYNAMIC
    )
    assert sheet_after(path, {(2, 2): NA, **told}, {(2, 2): Area(2, 2, 2, 2)}) == data(
        '<row r="2"><c r="B2" cm="1" t="e"><f t="array" ref="B2">X</f><v>#N/A</v></c></row>'
        '<row r="3"><c r="B3" s="1"/></row>'
    )


def test_only_the_area_of_an_array_formula_may_change(make_book: BookMaker) -> None:
    path = make_book(
        {"Loop": data(f'<row r="2">{SPILL}</row><row r="3"><c r="B3"><v>2</v></c></row>')}, **DYNAMIC
    )
    assert sheet_after(path, {(2, 2): 1.0, (2, 3): 8.0}, {(2, 2): Area(2, 2, 3, 3)}) == data(
        '<row r="2"><c r="B2" cm="1"><f t="array" ref="B2:C3">X</f><v>1</v></c><c r="C2"><v>8</v></c></row>'
        '<row r="3"><c r="B3"><v>2</v></c></row>'
    )


@pytest.mark.parametrize("empty", ["<sheetData/>", '<sheetData ><row r="1" /></sheetData>'])
def test_an_input_is_put_where_there_was_nothing(make_book: BookMaker, empty: str) -> None:
    path = make_book({"Loop": empty})
    after = sheet_after(path, {}, inputs={(1, 2): "30 barg", (1, 1): 450.0})
    assert (
        '<row r="1"><c r="A1"><v>450</v></c><c r="B1" t="inlineStr"><is><t>30 barg</t></is></c></row>'
        in after
    )


def test_an_input_replaces_a_constant_and_keeps_its_format(make_book: BookMaker) -> None:
    path = make_book({"Loop": data('<row r="1"><c r="A1" s="7" t="inlineStr"><is><t>a</t></is></c></row>')})
    assert sheet_after(path, {}, inputs={(1, 1): 3.0}) == data(
        '<row r="1"><c r="A1" s="7"><v>3</v></c></row>'
    )


@pytest.mark.parametrize(
    ("results", "words"),
    [
        (SheetResults({(9, 9): 1.0}), "I9 has a result, but no formula fills it"),
        (SheetResults({(1, 1): 5.0}), "A1 has a result, but no formula fills it"),
        (SheetResults({(2, 2): float("nan")}), "nan is no value"),
        (SheetResults({(2, 2): "x" * 32768}), "32768 characters"),
        (SheetResults({(4, 2): 1.0}, {(2, 2): Area(2, 2, 4, 2)}), "B4 is a constant"),
        (SheetResults({}, {(1, 1): Area(1, 1, 2, 1)}), "A1 holds no array formula"),
        (SheetResults({}, {(2, 2): Area(3, 2, 4, 2)}), "begins elsewhere"),
        (SheetResults({}, {(4, 3): Area(4, 3, 5, 4)}), "C4 holds an array formula that cannot spill"),
        (SheetResults(inputs={(2, 2): 1.0}), "B2 is computed"),
    ],
)
def test_results_that_belong_nowhere_are_refused_and_nothing_is_written(
    make_book: BookMaker, results: SheetResults, words: str
) -> None:
    path = make_book(
        {
            "Loop": data(
                f'<row r="1"><c r="A1"><v>1</v></c></row><row r="2">{SPILL}</row>'
                '<row r="4"><c r="B4"><v>7</v></c><c r="C4"><f t="array" ref="C4:D4">X</f></c></row>'
            )
        },
        **DYNAMIC,
    )
    before = sorted(path.parent.iterdir())
    with pytest.raises(InputError, match=words):
        write_book(open_book(path), {0: results}, path.with_name("out.xlsx"))
    assert sorted(path.parent.iterdir()) == before


@pytest.mark.parametrize(
    "rows",
    [
        f'<row r="5"><c r="A5"><v>1</v></c></row><row r="2">{SPILL}</row>',
        f'<row r="2"><c r="D2"><v>1</v></c>{SPILL}</row>',
        f'<row r="2">{SPILL}</row><row r="2"><c r="D2"><v>1</v></c></row>',
        f'<row r="9">{SPILL}</row>',
    ],
)
def test_a_sheet_out_of_order_is_refused_rather_than_made_worse(make_book: BookMaker, rows: str) -> None:
    path = make_book({"Loop": data(rows)}, **DYNAMIC)
    book = open_book(path)
    results = SheetResults({(2, 2): 5.0, (2, 3): 1.0, (4, 2): 1.0}, {(2, 2): Area(2, 2, 4, 3)})
    with pytest.raises(DamagedBookError, match=r"loop\.xlsx sheet 'Loop'"):
        write_book(book, {0: results}, path.with_name("out.xlsx"))
    assert list(path.parent.iterdir()) == [path]


def test_a_signed_a_changed_and_a_misnamed_workbook_are_refused(make_book: BookMaker) -> None:
    row = data('<row r="1"><c r="A1"><f>X</f><v>1</v></c></row>')
    results = {0: SheetResults({(1, 1): 2.0})}
    signed = make_book({"Loop": row}, name="signed.xlsx", parts={"_xmlsignatures/origin.sigs": ""})
    out = signed.with_name("out.xlsx")
    with pytest.raises(SignedBookError, match="signed"):
        write_book(open_book(signed), results, out)
    path = make_book({"Loop": row})
    book = open_book(path)
    for bad, words in [
        ({"out": path}, "itself"),
        ({}, "one of the two"),
        ({"out": out, "in_place": True}, "one of the two"),
        ({"out": path.with_name("out.xlsm")}, "must end in '.xlsx'"),
    ]:
        with pytest.raises(BookError, match=words):
            write_book(book, results, **bad)  # type: ignore[arg-type]
    make_book({"Loop": row, "More": row})
    with pytest.raises(LockedBookError, match="changed since it was read"):
        write_book(book, results, out)
    assert not out.exists()


@pytest.mark.parametrize(
    ("settings", "wanted", "after"),
    [
        ("", True, '<calcPr fullCalcOnLoad="1"/>'),
        ("", False, ""),
        ('<calcPr calcId="1"/>', True, '<calcPr calcId="1" fullCalcOnLoad="1"/>'),
        ('<calcPr fullCalcOnLoad="1" calcId="1"/>', False, '<calcPr calcId="1"/>'),
        ('<calcPr fullCalcOnLoad="1" calcId="1"/>', None, '<calcPr fullCalcOnLoad="1" calcId="1"/>'),
        ("<calcPr fullCalcOnLoad='0'></calcPr>", True, '<calcPr fullCalcOnLoad="1"></calcPr>'),
    ],
)
def test_the_file_asks_to_be_calculated_on_load_only_when_told(
    make_book: BookMaker, settings: str, wanted: bool | None, after: str
) -> None:
    path = make_book({"Loop": "<sheetData/>"}, after_sheets=f"{settings}<extLst/>")
    out = path.with_name("out.xlsx")
    write_book(open_book(path), {}, out, recalculate_on_load=wanted)
    with zipfile.ZipFile(out) as archive:
        assert f"</sheets>{after}<extLst/></workbook>" in archive.read("xl/workbook.xml").decode()
    assert open_book(out).calculation.full_calc_on_load == (wanted if wanted is not None else "1" in settings)


@given(st.floats(allow_nan=False, allow_infinity=False))
def test_a_number_reads_back_the_same(number: float) -> None:
    assert float(number_text(number)) == number
    assert len(number_text(number)) <= 24


@given(st.text(st.characters(exclude_categories=["Cs"])))
def test_text_reads_back_the_same(text: str) -> None:
    plain = escaped(text).replace("&lt;", "<").replace("&gt;", ">").replace("&amp;", "&")
    assert unescaped(plain) == text
