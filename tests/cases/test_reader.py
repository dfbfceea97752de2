from __future__ import annotations

import math

import pytest

from tests.cases.reader import FAMILIES, read


def test_the_files_hold_every_case_once():
    assert {family: len(read(family)) for family in FAMILIES} == {"single": 472, "multi": 186, "solids": 133}
    ids = [case.id for family in FAMILIES for case in read(family)]
    assert len(set(ids)) == len(ids)


@pytest.mark.parametrize("family", FAMILIES)
def test_the_exact_answer_rounded_to_doubles_meets_its_own_bar(family):
    assert all(case.is_met_by(tuple(map(float, case.n))) for case in read(family))


@pytest.mark.parametrize("family", FAMILIES)
def test_an_answer_off_by_more_than_its_bar_does_not_meet_it(family):
    for case in read(family):
        bars = case.bars()
        for i, exact in enumerate(case.n):
            if float(exact) > 1e-290 and bars[i] < 0.1:
                wrong = [float(x) for x in case.n]
                wrong[i] *= 1.0 + 3.0 * bars[i]
                assert not case.is_met_by(tuple(wrong)), case.id
            wrong = [float(x) for x in case.n]
            wrong[i] = math.nan
            assert not case.is_met_by(tuple(wrong)), case.id
