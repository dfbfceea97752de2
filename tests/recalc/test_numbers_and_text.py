"""Numbers as text, text as numbers, and day numbers."""

import csv
import struct
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from xleq.recalc.days import LAST_DAY, day_number, day_parts, weekday
from xleq.recalc.texts import number_text, parse_number, reading_dates

TABLE = Path(__file__).parents[1] / "reference" / "number_text.tsv"


def observed():
    with TABLE.open(encoding="utf-8", newline="") as file:
        lines = (line for line in file if not line.startswith("#"))
        return [
            (struct.unpack(">d", bytes.fromhex(row["bits"]))[0], row["text"])
            for row in csv.DictReader(lines, delimiter="\t")
        ]


@pytest.mark.parametrize(("number", "text"), observed(), ids=repr)
def test_a_number_has_the_text_that_excel_gave_it(number, text):
    assert number_text(number) == text


@given(st.floats(-1e308, 1e308).filter(lambda x: x == 0 or abs(x) > 3e-308))
def test_the_text_of_a_number_reads_back_to_fourteen_digits(x):
    assert parse_number(number_text(x)) == pytest.approx(x, rel=6e-14, abs=0)


@pytest.mark.parametrize(
    ("text", "number"),
    [
        ("1,234", 1234.0),
        ("$1,234.50", 1234.5),
        ("-$5", -5.0),
        ("(12.5)", -12.5),
        ("12€", 12.0),
        ("10 %", 0.1),
        ("(5%)", -0.05),
        (" 12 ", 12.0),
        ("1e-5", 1e-5),
        (".5", 0.5),
        ("5.", 5.0),
        ("1 1/2", 1.5),
        ("-0 3/4", -0.75),
        ("123456789012345678", 123456789012345000.0),
        ("2/29/1900", 60.0),
        ("2-Jan-2020", 43832.0),
        ("January 2, 2020", 43832.0),
        ("2020-01-02 18:00", 43832.75),
        ("1/2/2020 6:00 PM", 43832.75),
        ("1/2/29", 47120.0),
        ("1/2/30", 10960.0),
        ("10:30", 0.4375),
        ("10:30 p", 0.9375),
        ("0:00:01.5", 1.5 / 86400),
        ("12:00 AM", 0.0),
        ("30:00", 1.25),
    ],
)
def test_text_is_read_as_the_number_it_shows(text, number):
    assert parse_number(text) == pytest.approx(number, rel=1e-15, abs=0)


@pytest.mark.parametrize(
    "text",
    [
        *(
            "",
            " ",
            "1,2",
            "12,34",
            "1 2",
            "--1",
            "(-1)",
            "1%%",
            "$5$",
            "1e",
            "1e999",
            "nan",
            "inf",
            "1_0",
            "٣",
        ),
        *("2/30/2020", "13/1/2020", "1/1/1899", "10:75", "13:00 PM", "5/0", "1 1/0", "TRUE", "1d5", "0x10"),
    ],
)
def test_other_text_is_no_number(text):
    assert parse_number(text) is None


def test_a_date_without_a_year_needs_the_current_one():
    assert parse_number("5-Jul") is None
    with reading_dates(2011, date_1904=False):
        assert parse_number("5-Jul") == 40729.0


@given(st.integers(0, LAST_DAY))
def test_a_day_number_is_the_number_of_its_own_date(day):
    assert day_number(*day_parts(day)) == day
    assert (weekday(day + 1) - weekday(day)) % 7 == 1


@given(st.integers(0, LAST_DAY - 1462))
def test_the_1904_system_counts_1462_days_less(day):
    assert day_parts(day, date_1904=True) == day_parts(day + 1462)
