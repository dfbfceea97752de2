"""Sums of reactions, their multipliers, and the text of their constants."""

from __future__ import annotations

import re
from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st

from xleq.errors import AmbiguousError, InputError, NoAnswerError
from xleq.reactions import (
    check_balance,
    combine,
    exact_multiplier,
    expression,
    find_species,
    gas_change,
    liquids_mix,
    multipliers,
    natural_phases,
    parse_reaction,
    parse_species,
    phase_change,
)

REFORMING = parse_reaction("CH4 + H2O = CO + 3 H2")
SHIFT = parse_reaction("CO + H2O = CO2 + H2")
AMMONIA = parse_reaction("N2 + 3 H2 = 2 NH3")
OXIDATION = parse_reaction("2 SO2 + O2 = 2 SO3")
INDEPENDENT = [REFORMING, SHIFT, AMMONIA, OXIDATION]

ratios = st.fractions(min_value=-20, max_value=20, max_denominator=12)


@given(st.lists(ratios, min_size=4, max_size=4).filter(any))
def test_the_multipliers_of_a_sum_are_those_it_was_made_with(chosen: list[Fraction]) -> None:
    text = combine(INDEPENDENT, chosen)
    total = parse_reaction(text)
    assert check_balance(total) == ""
    assert multipliers(total, INDEPENDENT) == chosen


@given(st.sampled_from(INDEPENDENT), ratios.filter(bool))
def test_scaling_there_and_back_gives_the_same_reaction(reaction: object, factor: Fraction) -> None:
    assert isinstance(reaction, type(AMMONIA))
    there = parse_reaction(combine([reaction], [factor]))
    back = parse_reaction(combine([there], [1 / factor]))
    assert dict(zip(back.species, back.nu, strict=True)) == dict(
        zip(reaction.species, reaction.nu, strict=True)
    )


def test_reversing_twice_changes_nothing() -> None:
    once = combine([AMMONIA], [Fraction(-1)])
    assert once == "2 NH3 = N2 + 3 H2"
    assert combine([parse_reaction(once)], [Fraction(-1)]) == "N2 + 3 H2 = 2 NH3"


@pytest.mark.parametrize(
    ("value", "ratio"),
    [
        (-1.0, "-1"),
        (0.5, "1/2"),
        (1 / 3, "1/3"),
        (2 / 3, "2/3"),
        (1.25, "5/4"),
        (-7 / 12, "-7/12"),
        (0.0, "0"),
    ],
)
def test_a_multiplier_is_an_exact_ratio(value: float, ratio: str) -> None:
    assert exact_multiplier(value) == Fraction(ratio)


@pytest.mark.parametrize("value", [0.33333, 0.123456, 2**0.5, float("nan"), float("inf"), 1e9])
def test_a_multiplier_that_is_no_ratio_is_refused(value: float) -> None:
    with pytest.raises(InputError, match="a multiplier of"):
        exact_multiplier(value)


def test_a_phase_left_out_is_that_of_the_other_reactions() -> None:
    parts = [parse_reaction("C(s) + O2 = CO2(g)"), parse_reaction("CO + 1/2 O2 = CO2")]
    assert combine(parts, [Fraction(1), Fraction(-1)]) == "C(s) + 1/2 O2 = CO"


def test_a_phase_left_out_where_there_are_two_is_refused() -> None:
    parts = [parse_reaction("H2 + 1/2 O2 = H2O"), parse_reaction("H2O(l) = H2O(g)")]
    with pytest.raises(AmbiguousError, match=re.escape("H2O(g), H2O(l)")):
        combine(parts, [Fraction(1), Fraction(1)])


def test_a_sum_that_cancels_is_refused() -> None:
    with pytest.raises(NoAnswerError, match="the reactions cancel"):
        combine([AMMONIA, AMMONIA], [Fraction(1), Fraction(-1)])


@pytest.mark.parametrize(
    ("target", "parts", "error", "message"),
    [
        ("C + O2 = CO2", ["CO + 1/2 O2 = CO2"], NoAnswerError, "C is in none of them"),
        ("CO + H2O = CO2 + H2", ["CO + 3 H2 = CH4 + H2O", "H2 + 1/2 O2 = H2O"], NoAnswerError, "CO2 is"),
        ("CO + H2O = CO2 + H2", ["CO + H2O = CO2 + H2", "2 CO2 + 2 H2 = 2 CO + 2 H2O"], AmbiguousError,
         "reaction 2 ('2 CO2 + 2 H2 = 2 CO + 2 H2O') follows from the others"),
        ("N2 + 3 H2 = 2 NH3", [], InputError, "no reactions"),
    ],
)  # fmt: skip
def test_multipliers_that_do_not_exist_or_are_not_unique_are_refused(
    target: str, parts: list[str], error: type[Exception], message: str
) -> None:
    with pytest.raises(error, match=re.escape(message)):
        multipliers(parse_reaction(target), [parse_reaction(p) for p in parts])


def test_too_many_reactions_are_refused_at_once() -> None:
    with pytest.raises(InputError, match="101 reactions; multipliers are found for at most 100"):
        multipliers(AMMONIA, [AMMONIA] * 101)


@pytest.mark.parametrize(
    ("text", "basis", "expected"),
    [
        ("N2 + 3 H2 = 2 NH3", "K", "K = a(NH3)^2 / (a(N2) a(H2)^3)"),
        ("N2 + 3 H2 = 2 NH3", "Kp", "Kp = p(NH3)^2 / (p(N2) p(H2)^3)"),
        ("N2 + 3 H2 = 2 NH3", "Kp[atm]", "Kp[atm] = p(NH3)^2 / (p(N2) p(H2)^3)"),
        ("N2 + 3 H2 = 2 NH3", "Kc[mol/L]", "Kc[mol/L] = [NH3]^2 / ([N2] [H2]^3)"),
        ("N2 + 3 H2 = 2 NH3", "Kx", "Kx = x(NH3)^2 / (x(N2) x(H2)^3)"),
        ("1/2 N2 + 3/2 H2 = NH3", "K", "K = a(NH3) / (a(N2)^(1/2) a(H2)^(3/2))"),
        ("CaCO3(s) = CaO(s) + CO2(g)", "Kp[bar]", "Kp[bar] = p(CO2)"),
        ("CaO(s) + CO2(g) = CaCO3(s)", "K", "K = 1 / a(CO2)"),
        ("CaO(s) + SiO2(s) = CaSiO3(s)", "K", "K = 1"),
        ("Fe3O4(s) + 4 H2 = 3 Fe(s) + 4 H2O", "Kp", "Kp = p(H2O)^4 / p(H2)^4"),
        ("AgCl(s) = Ag+ + Cl-", "Kc", "Kc = [Ag+] [Cl-]"),
        ("H2O = H+ + OH-", "K", "K = a(H+) a(OH-)"),
        ("CO2(g) = CO2(aq)", "Kp[bar]", "Kp[bar] = [CO2(aq)] / p(CO2(g))"),
        ("Fe+3 + e- = Fe+2", "K", "K = a(Fe+2) / a(Fe+3)"),
    ],
)
def test_the_expression_leaves_pure_phases_out(text: str, basis: str, expected: str) -> None:
    assert expression(natural_phases(text), basis) == expected


@pytest.mark.parametrize("basis", ["Kq", "Kx[bar]", "K[atm]", "", "pressure"])
def test_an_unknown_basis_of_an_expression_is_refused(basis: str) -> None:
    with pytest.raises(InputError, match="is not a basis"):
        expression(AMMONIA, basis)


@pytest.mark.parametrize(
    ("text", "gas", "solutes"),
    [
        ("N2 + 3 H2 = 2 NH3", -2, 0),
        ("CO + H2O = CO2 + H2", 0, 0),
        ("1/2 N2 + 3/2 H2 = NH3", -1, 0),
        ("CaCO3(s) = CaO(s) + CO2(g)", 1, 0),
        ("AgCl(s) = Ag+ + Cl-", 0, 2),
        ("NH3 + H2O = NH4+ + OH-", 0, 1),
        ("CO2(g) + H2O(l) = H+ + HCO3-", -1, 2),
        ("2 H+ + 2 e- = H2(g)", 1, -2),
    ],
)
def test_the_change_of_gas_and_of_solutes(text: str, gas: int, solutes: int) -> None:
    reaction = natural_phases(text)
    assert gas_change(reaction) == gas
    assert phase_change(reaction, "aq") == solutes


def test_a_phase_that_could_be_gas_or_dissolved_is_refused() -> None:
    with pytest.raises(InputError, match="CO2 has no phase while others are dissolved"):
        natural_phases("CO2 + H2O(l) = H2CO3(aq)")


def test_liquids_alone_are_a_mixture() -> None:
    assert liquids_mix(parse_reaction("CH3COOH(l) + C2H5OH(l) = CH3COOC2H5(l) + H2O(l)"))
    assert not liquids_mix(parse_reaction("H2O(l) = H2O(g)"))


def test_a_species_of_a_reaction_is_found_by_name() -> None:
    reaction = natural_phases("H2O(l) = H2O(g)")
    assert find_species(reaction, parse_species("H2O(g)")).key == "H2O(g)"
    with pytest.raises(InputError, match="in 2 phases"):
        find_species(reaction, parse_species("H2O"))
    with pytest.raises(InputError, match="its species are"):
        find_species(reaction, parse_species("H2O(s)"))
