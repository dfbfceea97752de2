from __future__ import annotations

from fractions import Fraction

import numpy as np
import pytest

from tests.equilibrium.several_systems import random_problem
from xleq.equilibrium.structure import (
    check_dependent,
    check_size,
    eliminate,
    exact_totals,
    formable,
    structure,
)
from xleq.errors import AmbiguousError, OutOfRangeError


def rows(*lines: str) -> tuple[tuple[Fraction, ...], ...]:
    return tuple(tuple(map(Fraction, line.split())) for line in lines)


def test_a_sum_of_two_reactions_is_found_to_depend_on_them():
    s = structure(rows("-1 -1 1 3 0", "0 -1 -1 1 1", "-1 -2 0 4 1"))
    assert s.independent == (0, 1)
    assert s.relations == ((2, (Fraction(1), Fraction(1), Fraction(0))),)


def test_fractional_coefficients_keep_their_multipliers():
    s = structure(rows("-1 1/2", "-2/3 1/3"))
    assert s.relations == ((1, (Fraction(2, 3), Fraction(0))),)


def test_constants_that_agree_within_their_digits_are_accepted_and_the_dependent_one_replaced():
    s = structure(rows("-1 1 0", "0 -1 1", "-1 0 1"))
    ln_k, notes = check_dependent(s, (1.0, 2.0, 3.0000001))
    assert ln_k == (1.0, 2.0, 3.0)
    assert len(notes) == 1
    assert "reaction 3 depends" in notes[0]


def test_constants_that_contradict_are_refused_with_the_reaction_and_the_discrepancy():
    s = structure(rows("-1 1 0", "0 -1 1", "-1 0 1"))
    with pytest.raises(AmbiguousError, match=r"reaction 3 .* differs by 0\.5"):
        check_dependent(s, (1.0, 2.0, 3.5))


def test_a_reaction_of_nothing_must_have_k_of_one():
    s = structure(rows("0 0", "-1 1"))
    assert check_dependent(s, (0.0, 1.0))[0] == (0.0, 1.0)
    with pytest.raises(AmbiguousError, match="reaction 1"):
        check_dependent(s, (0.1, 1.0))


def test_columns_early_in_the_order_become_pivots():
    e = eliminate(np.array([[-1, -1, 1, 3, 0], [0, -1, -1, 1, 1]]), [4, 0, 1, 2, 3])
    assert e.pivots == (4, 0)
    assert (e.rows / e.denominator).tolist() == [[0, -1, -1, 1, 1], [1, 1, -1, -3, 0]]


@pytest.mark.parametrize("seed", range(40))
def test_rewritten_reactions_are_the_combinations_they_claim_to_be(seed):
    s = structure(random_problem(seed).nu)
    order = np.random.default_rng(seed).permutation(s.whole.shape[1])
    e = eliminate(s.whole, order.tolist())
    assert (e.combos.dot(s.whole) == e.rows).all()
    assert (e.rows[:, list(e.pivots)] == e.denominator * np.eye(len(e.pivots))).all()


def test_numbers_too_large_for_machine_words_stay_exact():
    e = eliminate(np.array([[10**9, 1, 7], [3, 10**9, 11], [5, 13, 10**9]]), [0, 1, 2])
    assert e.denominator == 10**27 - 3 * 10**9 - 13 * 11 * 10**9 - 35 * 10**9 + 5 * 11 + 3 * 13 * 7


def test_totals_keep_the_difference_of_nearly_equal_feeds():
    e = eliminate(np.array([[-1, -1, 1]]), [1])
    totals, denominator = exact_totals(e, [0, 2], (1.0 + 2.0**-52, 1.0, 1e-300))
    assert totals[0] / denominator == 2.0**-52


def test_a_carrier_that_is_not_fed_is_not_needed_for_the_sum():
    # A + X = B + Y and Y = X: neither starts without X, yet their sum is A = B. The carrier cannot form.
    nu = np.array([[-1, -1, 1, 1], [0, 1, 0, -1]])
    assert formable(nu, np.array([True, False, False, False])).tolist() == [True, False, True, False]


def test_what_only_a_combination_of_reactions_reaches_can_form():
    # A + C = D and D = C + B each need a species that is not there; their sum A = B needs none.
    nu = np.array([[-1, 0, -1, 1], [0, 1, 1, -1]])
    assert formable(nu, np.array([True, False, False, False])).tolist() == [True, True, False, False]


def test_an_element_that_is_not_fed_leaves_its_species_out():
    nu = np.array([[-2, -1, 2, 0, 0], [0, 0, 0, -1, 2]])
    fed = np.array([True, False, True, False, False])
    assert formable(nu, fed).tolist() == [True, True, True, False, False]


def test_too_many_species_are_refused_at_once():
    with pytest.raises(OutOfRangeError, match="10000 species are too many"):
        check_size(10_000, 1)
    with pytest.raises(OutOfRangeError, match="251 reactions"):
        check_size(10, 251)
