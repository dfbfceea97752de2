"""Special cases of the date functions.

Expected values agree with LibreOffice 25.2 where it has the function and follows the same rule.
"""

import pytest
import xlsxwriter

from tests.recalc.books import NOW, book, fresh
from tests.recalc.formulas import shown
from xleq.recalc import recalculate
from xleq.workbook import open_book


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ("=DATE(2020,2,30)", 43891.0),
        ("=DATE(2020,0,0)", 43799.0),
        ("=DATE(99,1,1)", 36161.0),
        ("=DATE(1900,2,29)", 60.0),
        ("=DATE(1900,1,0)", 0.0),
        ("=DATE(1899,1,1)", 693598.0),
    ],
)
def test_months_and_days_outside_their_range_count_on(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ("=DATE(10000,1,1)", "#NUM!"),
        ("=DATE(-1,1,1)", "#NUM!"),
        ("=MONTH(2958466)", "#NUM!"),
        ("=DAY(-1)", "#NUM!"),
        ("=WEEKDAY(45000,4)", "#NUM!"),
        ("=WEEKNUM(45000,3)", "#NUM!"),
        ("=TIME(-1,0,0)", "#NUM!"),
        ("=EDATE(0,-1)", "#NUM!"),
        ("=YEARFRAC(1,2,5)", "#NUM!"),
        ('=DATEDIF(2,1,"D")', "#NUM!"),
        ('=DATEDIF(1,2,"X")', "#NUM!"),
    ],
)
def test_what_is_no_date_is_a_number_error(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ("=DAY(60)", 29.0),
        ("=MONTH(60)", 2.0),
        ("=WEEKDAY(1)", 1.0),
        ("=MONTH(61)", 3.0),
        ("=YEAR(0)", 1900.0),
        ("=DAY(0)", 0.0),
    ],
)
def test_the_false_leap_day_of_1900_counts(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ("=HOUR(0.99999999)", 0.0),
        ("=MINUTE(0.5)", 0.0),
        ("=SECOND(0.00001)", 1.0),
        ("=TIME(25,61,61)", 0.0847337962962963),
    ],
)
def test_times_round_to_the_second(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ("=WEEKDAY(45000,2)", 3.0),
        ("=WEEKDAY(45000,3)", 2.0),
        ("=WEEKDAY(45000,11)", 3.0),
        ("=WEEKDAY(45000,17)", 4.0),
        ("=WEEKNUM(DATE(2020,12,31))", 53.0),
        ("=WEEKNUM(DATE(2021,1,3),21)", 53.0),
        ("=ISOWEEKNUM(DATE(2024,12,30))", 1.0),
    ],
)
def test_weeks_begin_where_the_number_says(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ("=EDATE(DATE(2023,1,31),1)", 44985.0),
        ("=EDATE(DATE(2024,2,29),12)", 45716.0),
        ("=EOMONTH(DATE(2024,1,15),1)", 45351.0),
        ("=EDATE(TRUE,1)", "#VALUE!"),
    ],
)
def test_the_end_of_a_month_stays_the_end(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ('=DATEDIF(DATE(2020,1,31),DATE(2020,3,1),"MD")', -1.0),
        ('=DATEDIF(DATE(2020,1,31),DATE(2021,1,30),"M")', 11.0),
        ('=DATEDIF(DATE(2020,1,31),DATE(2021,1,30),"YM")', 11.0),
        ("=DAYS360(DATE(2023,2,28),DATE(2023,3,31))", 30.0),
        ("=DAYS360(DATE(2023,1,31),DATE(2023,3,31),TRUE)", 60.0),
        ("=YEARFRAC(DATE(2020,2,29),DATE(2021,2,28),0)", 1.0),
        ("=YEARFRAC(DATE(2020,2,29),DATE(2020,12,31),0)", 0.8361111111111111),
        ("=YEARFRAC(DATE(2020,1,1),DATE(2021,1,1),1)", 1.0),
        ("=YEARFRAC(DATE(2020,1,31),DATE(2020,7,31),4)", 0.5),
    ],
)
def test_spans_follow_their_day_count(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ("=WORKDAY(DATE(2024,1,5),1)", 45299.0),
        ("=WORKDAY(DATE(2024,1,8),-1)", 45296.0),
        ("=WORKDAY(DATE(2024,1,5),0)", 45296.0),
        ('=WORKDAY.INTL(1,1,"1111111")', "#VALUE!"),
        ('=NETWORKDAYS.INTL(1,100,"1111111")', 0.0),
        ("=NETWORKDAYS(DATE(2024,1,6),DATE(2024,1,7))", 0.0),
        ("=WORKDAY(DATE(2024,1,5),1,{45299,45300})", 45301.0),
    ],
)
def test_working_days_skip_weekends_and_holidays(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ("=TODAY()", 46086.0),
        ("=NOW()", 46086.75),
        ('=DATEVALUE("5-Jul")', 46208.0),
    ],
)
def test_now_is_the_time_that_was_given(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ('=DATEVALUE("1/1/2020")', 43831.0),
        ('=DATEVALUE("x")', "#VALUE!"),
        ('=TIMEVALUE("25:00")', 0.041666666666666664),
        ('=TIMEVALUE("1/1/2020 1:30 PM")', 0.5625),
        ('=YEAR("2020-05-06")', 2020.0),
    ],
)
def test_text_is_read_as_a_date_or_a_time(formula, value):
    assert shown(formula) == value


TEXT_DATES = {
    **{f"A{r}": "1/2/2020" for r in range(1, 21)},
    "B1": '="1/2/2020"+0',
    "B2": "=A1+1",
    "B3": "=-A1",
    "B4": "=SUM(1,A1+0)",
    "B5": '=YEAR("1/2/2020")',
    "B6": "=YEAR(A2)*100+MONTH(A2)",
    "B7": "=SUMPRODUCT(A1:A20*1)",
    "B8": '=VALUE("1/2/2020")=A1+0',
    "B9": '=TEXT(A1,"yyyy-mm-dd")',
    "B10": '=COUNTIF(D1:D2,"1/2/2020")',
    "B11": '=SUM("1/2/2020")',
    "B12": '=MAX(1,"1/2/2020")',
    "D1": 43832,
    "D2": 42370,
}


@pytest.mark.parametrize(("date_1904", "day"), [(False, 43832.0), (True, 42370.0)])
def test_dates_in_texts_count_from_the_workbooks_first_day(date_1904, day):
    values = fresh(book({"S": TEXT_DATES}, date_1904=date_1904))
    assert [values[f"B{r}"] for r in range(1, 13)] == [
        *(day, day + 1, -day, day + 1, 2020.0, 202001.0, 20 * day, True, "2020-01-02", 1.0, day, day)
    ]


def test_dates_in_texts_without_a_year_are_of_the_current_one_wherever_a_number_is_wanted():
    cells = {"A1": '=YEAR("1/2")', "A2": '="1-Jan"+0', "A3": '=VALUE("1-Jan")', "A4": '=COUNT("5-Jul")'}
    assert list(fresh(cells).values()) == [2026.0, 46023.0, 46023.0, 1.0]
    in_1904 = fresh(book({"S": cells}, date_1904=True))
    assert list(in_1904.values()) == [2026.0, 44561.0, 44561.0, 1.0]


def test_a_file_that_counts_from_1904_reads_dates_in_texts_so(tmp_path):
    path = tmp_path / "made.xlsx"
    with xlsxwriter.Workbook(path, {"date_1904": True}) as file:
        sheet = file.add_worksheet("S")
        sheet.write_formula("A1", '="1/2/2020"+0', None, 42370)
        sheet.write_formula("A2", '=YEAR("1/2/2020")', None, 2020)
        sheet.write_formula("A3", '=DATE(2020,1,2)="1/2/2020"+0', None, True)
    done = recalculate(open_book(path), {}, now=NOW, trust_fresh=False)
    assert (done.changed, done.disagreements, done.kept) == ([], [], [])
