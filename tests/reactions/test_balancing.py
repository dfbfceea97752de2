"""Balances checked and found."""

from __future__ import annotations

import re
from fractions import Fraction
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from xleq.errors import AmbiguousError, BalanceError, InputError, NoAnswerError
from xleq.reactions import balance, check_balance, null_space, parse_reaction, reduced, smallest_integers

TABLE = Path(__file__).parents[1] / "reference" / "balanced_reactions.tsv"
ROWS = [line.split("\t") for line in TABLE.read_text("utf-8").splitlines() if not line.startswith("#")]


def test_the_table_of_reactions_is_complete() -> None:
    assert len(ROWS) == 72


@pytest.mark.parametrize(("text", "balanced"), ROWS, ids=[text for text, _ in ROWS])
def test_a_textbook_reaction_is_balanced(text: str, balanced: str) -> None:
    assert balance(text) == balanced
    assert check_balance(parse_reaction(balanced)) == ""


@pytest.mark.parametrize(("text", "balanced"), ROWS, ids=[text for text, _ in ROWS])
def test_balancing_a_balanced_reaction_changes_nothing(text: str, balanced: str) -> None:
    assert balance(balanced) == balanced


@given(st.sampled_from(ROWS), st.randoms(use_true_random=False), st.booleans())
def test_order_and_direction_do_not_matter(row: list[str], random: object, swap: bool) -> None:
    sides = [side.split(" + ") for side in row[0].split(" = ")]
    for side in sides:
        random.shuffle(side)  # type: ignore[attr-defined]
    if swap:
        sides.reverse()
    reaction = parse_reaction(balance(" = ".join(" + ".join(side) for side in sides)))
    expected = parse_reaction(row[1])
    sign = -1 if swap else 1
    for species, nu in zip(expected.species, expected.nu, strict=True):
        assert reaction.coefficient(species) == sign * nu


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("N2 + 3 H2 = 3 NH3", "N 2 on the left, 3 on the right (1 more on the right); H 6 on the left, 9"),
        ("CO + O2 = CO2", "O 3 on the left, 2 on the right (1 more on the left)"),
        ("Fe+3 + e- = Fe+3 + H2", "H 0 on the left, 2 on the right (2 more on the right); charge +2 on the"),
        ("Fe+3 = Fe+2", "charge +3 on the left, +2 on the right"),
        ("Fe+3 + SCN- = FeSCN2+", "if the 2 of FeSCN2+ belongs to its charge, write FeSCN^2+"),
        ("1/2 N2 + H2 = NH3", "H 2 on the left, 3 on the right (1 more on the right)"),
    ],
)
def test_an_imbalance_names_the_element_and_by_how_much(text: str, message: str) -> None:
    with pytest.raises(BalanceError, match=re.escape(message)):
        check_balance(parse_reaction(text))


def test_a_name_without_formula_skips_the_check_and_says_so() -> None:
    assert check_balance(parse_reaction("{naphtha} = 3 {light ends}(g) + H2")) == (
        "elements not checked: {naphtha}, {light ends} have no formula"
    )
    assert check_balance(parse_reaction("N2 + 3 H2 + {filler} = 2 NH3 + {filler}")) == ""


@pytest.mark.parametrize(
    ("text", "error", "message"),
    [
        ("N2 + O2 = H2O", NoAnswerError, "N is only on the left"),
        ("CO2 = CO", NoAnswerError, "no coefficients conserve every element"),
        ("Fe+2 = Fe+3", NoAnswerError, "no coefficients conserve every element and the charge"),
        ("CH4 + O2 = CO2 + H2O + Ar", NoAnswerError, "balances only without Ar, which cannot take part"),
        ("CO + CO2 = C + O2 + N2", AmbiguousError, "2 independent ways"),
        ("C6H5CH3 + H2 = C6H6 + CH4", AmbiguousError, "2 independent ways"),
        ("NH3 + NO + O2 = N2 + H2O", AmbiguousError, "2 independent ways"),
        ("H2 + H2O = O2", NoAnswerError, "H2 would have to leave the left"),
        ("C + O2 + CO = CO2", AmbiguousError, "2 independent ways"),
        ("CO2 + C + O2 = CO2", InputError, "CO2 stands there twice"),
        ("{tar} + H2 = CH4", InputError, "{tar} has no formula"),
    ],
)
def test_what_cannot_be_balanced_is_refused_with_its_reason(
    text: str, error: type[Exception], message: str
) -> None:
    with pytest.raises(error, match=re.escape(message)):
        balance(text)


def test_too_many_species_are_refused_at_once() -> None:
    side = " + ".join(f"C{n}H{2 * n + 2}" for n in range(1, 60))
    with pytest.raises(InputError, match="61 species; one reaction of at most 40"):
        balance(f"{side} = C + H2")


matrices = st.integers(1, 5).flatmap(
    lambda n: st.lists(
        st.lists(st.integers(-4, 4).map(Fraction), min_size=n, max_size=n), min_size=1, max_size=5
    )
)


@given(matrices)
def test_the_null_space_is_null_and_whole(rows: list[list[Fraction]]) -> None:
    n = len(rows[0])
    basis = null_space(rows, n)
    _, pivots = reduced(rows)
    assert len(basis) + len(pivots) == n
    for vector in basis:
        assert all(sum(a * x for a, x in zip(row, vector, strict=True)) == 0 for row in rows)
    assert len(reduced(basis)[1]) == len(basis) if basis else True


@given(st.lists(st.fractions(max_denominator=60), min_size=1, max_size=6))
def test_smallest_integers_are_whole_and_without_common_divisor(vector: list[Fraction]) -> None:
    whole = smallest_integers(vector)
    assert all(x.denominator == 1 for x in whole)
    assert smallest_integers(whole) == whole
    assert [x > 0 for x in whole] == [x > 0 for x in vector]
