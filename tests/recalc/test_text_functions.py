"""Special cases of the text functions.

Expected values agree with LibreOffice 25.2 where it has the function and follows the same rule.
"""

import pytest

from tests.recalc.formulas import shown


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ('=LEN("🙂a")', 3.0),
        ('=LEFT("🙂a",2)', "🙂"),
        ('=MID("a🙂b",2,2)', "🙂"),
        ('=FIND("b","a🙂b")', 4.0),
        ('=RIGHT("a🙂b",1)', "b"),
        ('=REPLACE("a🙂b",2,2,"x")', "axb"),
        ('=LENB("abc")', 3.0),
    ],
)
def test_characters_are_counted_in_utf16_units(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ('=LEFT("abc",0)', ""),
        ('=LEFT("abc",)', ""),
        ('=LEFT("abc",9)', "abc"),
        ('=RIGHT("abc",5)', "abc"),
        ('=MID("abc",4,1)', ""),
        ('=REPLACE("abc",5,1,"x")', "abcx"),
        ('=REPLACE("abc",2,0,"x")', "axbc"),
        ('=REPT("ab",2.9)', "abab"),
        ('=REPT("ab",0)', ""),
    ],
)
def test_cutting_stops_at_the_ends_of_the_text(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ('=LEFT("abc",-1)', "#VALUE!"),
        ('=MID("abc",0,1)', "#VALUE!"),
        ('=MID("abc",1,-1)', "#VALUE!"),
        ('=REPT("a",-1)', "#VALUE!"),
        ('=REPT("abcd",9000)', "#VALUE!"),
        ('=FIND("x","abc")', "#VALUE!"),
        ('=FIND("","abc",5)', "#VALUE!"),
        ('=FIND("a","abc",0)', "#VALUE!"),
        ('=SEARCH("z","abc")', "#VALUE!"),
        ('=SUBSTITUTE("a","a","b",0)', "#VALUE!"),
        ("=CHAR(0)", "#VALUE!"),
        ("=CHAR(256)", "#VALUE!"),
        ('=CODE("")', "#VALUE!"),
        ('=UNICODE("")', "#VALUE!"),
        ("=UNICHAR(0)", "#VALUE!"),
        ('=VALUE("abc")', "#VALUE!"),
        ('=VALUE("")', "#VALUE!"),
        ("=VALUE(TRUE)", "#VALUE!"),
        ('=NUMBERVALUE("1.2.3")', "#VALUE!"),
        ("=FIXED(1,200)", "#VALUE!"),
        ('=TEXTBEFORE("ab","b",0)', "#VALUE!"),
        ('=REGEXTEST("a","(")', "#VALUE!"),
    ],
)
def test_a_place_or_number_that_makes_no_sense_is_a_value_error(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ('=FIND("","abc")', 1.0),
        ('=FIND("","abc",4)', 4.0),
        ('=SEARCH("","abc",2)', 2.0),
    ],
)
def test_an_empty_text_is_found_at_the_start(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ('=SEARCH("B?","abc")', 2.0),
        ('=SEARCH("*c","abc")', 1.0),
        ('=SEARCH("~?","a?c")', 2.0),
        ('=SEARCH("~d","My dear")', 4.0),
    ],
)
def test_search_knows_wildcards_and_no_case(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ('=SUBSTITUTE("aaa","a","b",2)', "aba"),
        ('=SUBSTITUTE("aaa","","b")', "aaa"),
        ('=SUBSTITUTE("aaa","A","b")', "aaa"),
        ('=SUBSTITUTE("aaa","a","b",4)', "aaa"),
    ],
)
def test_one_occurrence_or_all_are_substituted(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ('=PROPER("o\'neil mc-donald x1y")', "O'Neil Mc-Donald X1Y"),
        ('=LOWER("ÀÉ")', "àé"),
        ('=UPPER("straße")', "STRAßE"),
    ],
)
def test_case_follows_the_letters(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ('=0.1+0.2&""', "0.3"),
        ('=1/3&""', "0.333333333333333"),
        ('=1E20&""', "1E+20"),
        ('=1E-5&""', "0.00001"),
        ('=123456789012345&""', "123456789012345"),
        ('=CONCAT({1,2;3,4},"x",TRUE)', "1234xTRUE"),
        ('=CONCATENATE(1,TRUE,"x")', "1TRUEx"),
    ],
)
def test_numbers_join_text_in_fifteen_digits(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ('=TEXTJOIN(",",TRUE,"a","","b")', "a,b"),
        ('=TEXTJOIN(",",FALSE,"a","","b")', "a,,b"),
        ('=TEXTJOIN({",",";"},TRUE,1,2,3,4)', "1,2;3,4"),
    ],
)
def test_delimiters_take_turns_and_empty_texts_may_be_left_out(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ("=CHAR(128)", "€"),
        ('=CODE("€")', 128.0),
        ('=UNICODE("€")', 8364.0),
        ('=CODE("Ω")', 63.0),
        ("=UNICHAR(55296)", "#N/A"),
    ],
)
def test_windows_codes_and_code_points_differ(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ("=FIXED(0.5,0)", "1"),
        ("=FIXED(2.5,0)", "3"),
        ("=FIXED(1234567.891,-3)", "1,235,000"),
        ("=FIXED(-0.001,2)", "0.00"),
        ("=FIXED(1.005,2)", "1.01"),
        ("=DOLLAR(0)", "$0.00"),
    ],
)
def test_numbers_are_rounded_half_away_from_zero(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ('=NUMBERVALUE("1 234,5",",",".")', 1234.5),
        ('=NUMBERVALUE("")', 0.0),
        ('=NUMBERVALUE("1,234.5%%")', 0.12345),
    ],
)
def test_number_text_is_read_with_given_separators(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ('=TEXTBEFORE("a-b-c","-",2)', "a-b"),
        ('=TEXTBEFORE("a-b-c","-",-1)', "a-b"),
        ('=TEXTAFTER("a-b-c","-",-1)', "c"),
        ('=TEXTAFTER("a-b-c","-",3)', "#N/A"),
        ('=TEXTAFTER("aXbxc","x",1,1)', "bxc"),
        ('=TEXTBEFORE("a-b;c",{";","-"})', "a"),
        ('=TEXTBEFORE("abc","-",,,,"none")', "none"),
        ('=TEXTBEFORE("abc","")', ""),
        ('=TEXTAFTER("abc","")', "abc"),
    ],
)
def test_text_is_cut_at_delimiters_counted_from_either_end(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ('=TEXTSPLIT("a,b,c",",")', [["a", "b", "c"]]),
        ('=TEXTSPLIT("1,2;3",",",";")', [["1", "2"], ["3", "#N/A"]]),
        ('=TEXTSPLIT("a,,b",",",,TRUE)', [["a", "b"]]),
        ('=TEXTSPLIT("1,2;3",",",";",,,0)', [["1", "2"], ["3", 0.0]]),
        ('=TEXTSPLIT("aXbxc","x",,,1)', [["a", "b", "c"]]),
    ],
)
def test_text_splits_into_columns_and_rows(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ('=REGEXTEST("CO2","o[0-9]",1)', True),
        ('=REGEXEXTRACT("H2 + O2","[A-Z][0-9]",1)', [["H2", "O2"]]),
        ('=REGEXEXTRACT("T=450 K","(\\w)=(\\d+)",2)', [["T", "450"]]),
        ('=REGEXEXTRACT("abc","[0-9]")', "#N/A"),
        ('=REGEXREPLACE("a1b2","[0-9]","#")', "a#b#"),
        ('=REGEXREPLACE("a1b2","[0-9]","#",-1)', "a1b#"),
        ('=REGEXREPLACE("ab","(a)(b)","$2$1")', "ba"),
    ],
)
def test_regular_expressions_find_and_replace(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ('=VALUETOTEXT("a""b",1)', '"a""b"'),
        ("=VALUETOTEXT(1/0)", "#DIV/0!"),
        ('=ARRAYTOTEXT({1,"a";TRUE,2.5},1)', '{1,"a";TRUE,2.5}'),
        ('=ARRAYTOTEXT({1,"a"})', "1, a"),
    ],
)
def test_values_and_arrays_have_a_strict_text(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ('=TEXT("12","0.00")', "12.00"),
        ('=TEXT("x","0.00")', "x"),
        ('=TEXT(TRUE,"0")', "TRUE"),
        ('=TEXT(1,"yyyy0")', "#VALUE!"),
        ('=TEXT(-1,"yyyy")', "#VALUE!"),
        ('=TEXT("1-Jan","yyyy")', "2026"),
    ],
)
def test_text_formats_what_reads_as_a_number(formula, value):
    assert shown(formula) == value


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ('=ENCODEURL("a b/c?d=é")', "a%20b%2Fc%3Fd%3D%C3%A9"),
    ],
)
def test_address_parts_are_escaped(formula, value):
    assert shown(formula) == value
