"""Texts and patterns made to take long are answered soon, or refused.

The limits tell a blow-up, which would take hours, from an answer; they say nothing of speed.
"""

import time

import pytest

from xleq.recalc.expressions import is_quick, unbounded_repeats
from xleq.recalc.patterns import wildcard_pattern, wildcard_position
from xleq.recalc.texts import parse_date, parse_number, parse_time


def seconds(call, *args) -> float:
    start = time.process_time()
    call(*args)
    return time.process_time() - start


@pytest.mark.parametrize(
    "text",
    [
        *("1" * 32000, "1" + " " * 250 + "b", "1" + " " * 32000 + "b", "1," * 120 + "111", "(" * 250),
        *("1/" * 120, "Jan" + " " * 240 + "1x", "1/1/2020 " * 28, "1:" * 125),
    ],
    ids=lambda text: f"{text[:6]}…{len(text)}",
)
def test_a_long_text_is_soon_known_to_be_no_number(text):
    assert seconds(parse_number, text) + seconds(parse_date, text) + seconds(parse_time, text) < 10.0


def test_wildcards_take_a_few_passes():
    pattern, text = "*a" * 20 + "*b", "a" * 30000
    assert seconds(wildcard_pattern(pattern).fullmatch, text) < 10.0
    assert seconds(wildcard_position, pattern, text, 0) < 10.0
    assert seconds(wildcard_position, "a*b", text, 0) < 10.0


@pytest.mark.parametrize(
    ("pattern", "repeats"),
    [
        *(("a", 0), (r"\(a+\)", 1), ("[(+]+", 1), ("(cat|dog)+", 1), ("(.*)x(.*)", 2), ("a{2,3}", 0)),
        *(("a{2,}", 1), ("(a+)+", None), ("(a|ab)*", None), (r"([a-z]+\s)+", None), (r"(\d|1)+", None)),
    ],
)
def test_repeats_inside_repeats_are_seen(pattern, repeats):
    assert unbounded_repeats(pattern) == repeats


def test_a_search_that_may_not_end_is_not_begun():
    assert is_quick("[a-z]+@[a-z]+", 1000)
    assert not is_quick("(a+)+$", 10)
    assert not is_quick(".*a.*b.*c.*d", 10_000)
