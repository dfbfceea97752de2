"""Number formats against the texts that Excel stored."""

from pathlib import Path

import pytest

from xleq.cells import BLANK, NA
from xleq.errors import FormulaError, InputError
from xleq.recalc.formats import format_value, general_text

CORPUS = Path(__file__).resolve().parents[3] / "shared" / "corpus"
#: Workbook, sheet, and the cell of each row's number, format and text.
BOOKS = {
    "poi/FormatChoiceTests.xlsx": "Tests",
    "poi/ElapsedFormatTests.xlsx": "Tests",
    "ironcalc/TEXT/TEXT.xlsx": None,
}


def stored_texts(path: Path, sheet: str | None):
    """Value, code and stored text of every formula `=TEXT(value, code)` of a workbook."""
    from xleq.workbook import open_book

    book = open_book(path)
    for tab in book.sheets:
        if sheet not in (None, tab.name):
            continue
        for (row, column), formula in tab.formulas.items():
            if sheet is not None:
                if column != 1:
                    continue
                value, code = tab.stored.get((row, 3)), tab.stored.get((row, 2))
            elif formula.text is None or "TEXT(" not in formula.text:
                continue
            else:
                heading = 2 if tab.name == "NUMBERS" else 1
                value, code = tab.stored.get((row, 1)), tab.stored.get((heading, column))
            if value is not None and code is not None:
                yield value, code, tab.stored[(row, column)]


@pytest.mark.parametrize("name", BOOKS)
def test_every_stored_text_of_a_format_comes_out(name):
    path = CORPUS / name
    if not path.exists():
        pytest.skip(f"{path} is not there")
    n = 0
    for value, code, text in stored_texts(path, BOOKS[name]):
        try:
            fresh = format_value(value, code)
        except InputError:
            fresh = "#VALUE!"
        assert fresh == str(text), (value, code)
        n += 1
    assert n >= 20


@pytest.mark.parametrize(
    ("value", "code", "text"),
    [
        # what ECMA-376-1:2016, 18.8.31 says of placeholders, percent, exponents and sections
        (1.005, "0.00", "1.01"),
        (-0.4, "0", "0"),
        (-0.4, "0;-0", "-0"),
        (12345.678, "#,##0.0", "12,345.7"),
        (0.5, "#%", "50%"),
        (12345.0, "##0.0E+0", "12.3E+3"),
        (0.00012, "0.0E-0", "1.2E-4"),
        (9.99e9, "0.0E+00", "1.0E+10"),
        (0.0, "0.00E+00", "0.00E+00"),
        (5.0, "# ?/?", "5    "),
        (0.0, "# ?/?", "0    "),
        (1.5, "?/?", "3/2"),
        (2.3125, "# ??/16", "2  5/16"),
        (-2.25, "# ?/4", "-2 1/4"),
        (3.0, ";;;", ""),
        ("x", ";;;", ""),
        ("x", "0.00", "x"),
        ("x", '0;-0;0;"text "@', "text x"),
        (-5.0, "[>100]0.0;0", "-5"),
        (-5.0, "[<0]0;0", "5"),
        (7.0, "0_)", "7 "),
        (7.0, "* 0", "7"),
        (7.0, "\\x0", "x7"),
        (7.0, "[$€-2] 0.00", "€ 7.00"),
        (0.999999, "[h]:mm", "24:00"),
        (0.999999, "h:mm:ss", "0:00:00"),
        (43831.999999, "yyyy-mm-dd", "2020-01-01"),
        (43831.75, "m/d/yyyy h:mm AM/PM", "1/1/2020 6:00 PM"),
        (43831.75, "h a/p", "6 p"),
        (60.0, "d mmm yyyy", "29 Feb 1900"),
        (True, "0", "TRUE"),
        (BLANK, "0", ""),
        (NA, "0", "#N/A"),
    ],
)
def test_a_value_shows_as_its_format_says(value, code, text):
    assert format_value(value, code) == text


def test_a_date_follows_the_date_system():
    assert format_value(0.0, "yyyy-mm-dd", date_1904=True) == "1904-01-01"


@pytest.mark.parametrize("code", ['"open', "[nothing]0", "0;0;0;0;0", "yyyy0", "0 bar", "\\"])
def test_a_code_that_is_no_format_is_refused(code):
    with pytest.raises(InputError):
        format_value(1.0, code)


@pytest.mark.parametrize("value", [-1.0, 2958466.0, 1e300])
def test_a_number_that_is_no_date_is_refused(value):
    with pytest.raises(InputError):
        format_value(value, "yyyy")


def test_names_of_months_in_another_language_are_refused():
    with pytest.raises(FormulaError):
        format_value(43831.0, "[$-407]mmmm")
    assert format_value(43831.0, "[$-809]mmmm") == "January"


@pytest.mark.parametrize(
    ("number", "text"),
    [
        (12345678901.0, "12345678901"),
        (123456.789012345, "123456.789"),
        (0.00012345678, "0.000123457"),
        (1.234567e-5, "1.23457E-05"),
        (99999999999.9, "1E+11"),
        (-0.1, "-0.1"),
    ],
)
def test_general_takes_eleven_characters(number, text):
    assert general_text(number) == text
