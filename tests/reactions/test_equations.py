"""Reaction text: arrows, coefficients, plus signs and charges."""

from __future__ import annotations

from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st

from xleq.errors import InputError, ParseError
from xleq.reactions import parse_reaction, parse_species, reaction_text


def read(text: str) -> dict[str, str]:
    reaction = parse_reaction(text)
    return {s.text: str(nu) for s, nu in zip(reaction.species, reaction.nu, strict=True)}


@pytest.mark.parametrize(
    "arrow",
    ["=", "==", "=>", "<=>", "<==>", "->", "-->", "<->", "<-->", "→", "⇌", "⇄", "⇋", "↔", "⟶", "⟷", "⇒", "⇔"],
)
@pytest.mark.parametrize("gap", ["", " ", "\u00a0"])
def test_every_arrow_is_read(arrow: str, gap: str) -> None:
    if arrow.startswith("--") and not gap:
        return  # one of the signs might be a charge; refused, see below
    assert read(f"N2 + 3 H2{gap}{arrow}{gap}2 NH3") == {"N2": "-1", "H2": "-3", "NH3": "2"}


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("N2+3H2=2NH3", {"N2": "-1", "H2": "-3", "NH3": "2"}),
        ("0.5N2+1.5 H2=NH3", {"N2": "-1/2", "H2": "-3/2", "NH3": "1"}),
        ("1/2 N2 + 3/2H2 = NH3", {"N2": "-1/2", "H2": "-3/2", "NH3": "1"}),
        ("½N2 + 1½ H2 = NH3", {"N2": "-1/2", "H2": "-3/2", "NH3": "1"}),
        ("(1/2)N2 + (3/2) H2 = NH3", {"N2": "-1/2", "H2": "-3/2", "NH3": "1"}),
        (".5 N2 + 1.5*H2 = 1·NH3", {"N2": "-1/2", "H2": "-3/2", "NH3": "1"}),
        ("2H2+O2=2H2O", {"H2": "-2", "O2": "-1", "H2O": "2"}),
        ("H2+1/2O2=H2O", {"H2": "-1", "O2": "-1/2", "H2O": "1"}),
        ("Ag+ + Cl- = AgCl(s)", {"Ag+": "-1", "Cl-": "-1", "AgCl(s)": "1"}),
        ("Ag++Cl-=AgCl(s)", {"Ag+": "-1", "Cl-": "-1", "AgCl(s)": "1"}),
        ("Ag+ +Cl- =AgCl(s)", {"Ag+": "-1", "Cl-": "-1", "AgCl(s)": "1"}),
        ("Ag+(aq)+Cl-(aq)=AgCl (s)", {"Ag+(aq)": "-1", "Cl-(aq)": "-1", "AgCl(s)": "1"}),
        ("H2+ Cl2 = 2HCl", {"H2": "-1", "Cl2": "-1", "HCl": "2"}),
        ("H2 +Cl2 = 2HCl", {"H2": "-1", "Cl2": "-1", "HCl": "2"}),
        ("2H++2e-=H2", {"H+": "-2", "e-": "-2", "H2": "1"}),
        ("Fe2++Ce4+=Fe3++Ce3+", {"Fe+2": "-1", "Ce+4": "-1", "Fe+3": "1", "Ce+3": "1"}),
        ("Fe^2++Ce^4+=Fe^3++Ce^3+", {"Fe+2": "-1", "Ce+4": "-1", "Fe+3": "1", "Ce+3": "1"}),
        ("Ca+2+2Cl-=CaCl2(s)", {"Ca+2": "-1", "Cl-": "-2", "CaCl2(s)": "1"}),
        ("Ca++ + 2 Cl- = CaCl2(s)", {"Ca+2": "-1", "Cl-": "-2", "CaCl2(s)": "1"}),
        ("Ca+2 + SO4-2 -> CaSO4(s)", {"Ca+2": "-1", "SO4-2": "-1", "CaSO4(s)": "1"}),
        ("Ca²⁺ + SO₄²⁻ → CaSO₄(s)", {"Ca+2": "-1", "SO4-2": "-1", "CaSO4(s)": "1"}),
        ("Ca+2Cl=CaCl2", {"Ca": "-1", "Cl": "-2", "CaCl2": "1"}),
        ("{a + b = c}(g) + H2 = CH4", {"{a + b = c}(g)": "-1", "H2": "-1", "CH4": "1"}),
        ("2{lump}=CH4", {"{lump}": "-2", "CH4": "1"}),
        ("I3- = I2 + I-", {"I3^-": "-1", "I2": "1", "I-": "1"}),
    ],
)  # fmt: skip
def test_plus_signs_coefficients_and_charges_are_told_apart(text: str, expected: dict[str, str]) -> None:
    assert read(text) == expected


@pytest.mark.parametrize(
    ("text", "position", "wanted"),
    [
        ("", 1, "an arrow"),
        ("N2 + 3 H2", 10, "an arrow"),
        ("N2 = H2 = NH3", 9, "only one arrow"),
        ("= NH3", 1, "a species"),
        ("N2 =", 5, "a species"),
        ("N2 + = NH3", 6, "a species"),
        ("+ N2 = NH3", 1, "a species"),
        ("N2 3 H2 = NH3", 4, "+ or the arrow"),
        ("N2 = 2 NH3 H2", 12, "+ or the end"),
        ("N2 + 3 Hx = NH3", 8, "the symbol of an element"),
        ("N2 + 0 H2 = NH3", 6, "a coefficient above 0"),
        ("N2 + 1/0 H2 = NH3", 6, "a coefficient above 0"),
        ("N2 + -3 H2 = NH3", 6, "without a minus"),
        ("Ag+ + Cl--> AgCl", 9, "a space before the arrow"),
        ("{lump = CO2", 7, "the closing brace"),
        ("C(graphite) + O2 = CO2", 2, "a phase"),
        ("Ca+2 + SO42- = CaSO4", 10, "the charge after"),
    ],
)
def test_a_bad_reaction_names_the_position(text: str, position: int, wanted: str) -> None:
    with pytest.raises(ParseError) as error:
        parse_reaction(text)
    assert (error.value.at + 1, wanted in error.value.wanted) == (position, True), str(error.value)
    assert error.value.text == text


def test_a_species_on_both_sides_is_netted_and_kept_as_written() -> None:
    reaction = parse_reaction("CO + H2O + H2 = CO2 + 2 H2")
    assert reaction.coefficient(parse_species("H2")) == 1
    assert [t.coefficient for t in reaction.right] == [1, 2]
    catalyst = parse_reaction("2 H2O2 + MnO2(s) = 2 H2O + O2 + MnO2(s)")
    assert catalyst.coefficient(parse_species("MnO2(s)")) == 0
    assert reaction_text(catalyst.species, catalyst.nu) == "2 H2O2 = 2 H2O + O2"
    assert "MnO2" in catalyst.text


def test_a_reaction_in_which_everything_cancels_is_refused() -> None:
    with pytest.raises(InputError, match="nothing reacts"):
        parse_reaction("N2 + H2 = H2 + N2")


def test_the_default_phase_makes_bare_and_marked_species_the_same() -> None:
    assert parse_reaction("N2 + 3 H2 = 2 NH3", "g") == parse_reaction("N2(g) + 3 H2(g) = 2 NH3(g)")
    assert parse_reaction("N2 + 3 H2 = 2 NH3") != parse_reaction("N2(g) + 3 H2(g) = 2 NH3(g)")
    assert parse_reaction("H2 = 2 H+ + 2 e-", "aq").species[2].phase is None


NAMES = [
    "N2", "H2O", "Ca+2", "SO4-2", "NH4+", "e-", "I3^-", "O2^-", "[Fe(CN)6]-4", "CuSO4·5H2O", "CaSO4·1/2H2O",
    "Fe0.947O", "{any name}", "Hg2+2", "C60", "C60^-", "PW12O40-3", "(NH4)2SO4", "UO2.25",
]  # fmt: skip
species_texts = st.tuples(st.sampled_from(NAMES), st.sampled_from(["", "(g)", "(l)", "(s)", "(aq)"])).map(
    "".join
)
coefficients = st.fractions(min_value=Fraction(1, 50), max_value=50, max_denominator=50)
terms = st.lists(st.tuples(coefficients, species_texts), min_size=2, max_size=8, unique_by=lambda t: t[1])


@given(terms, st.data())
def test_text_written_from_a_reaction_reads_back_the_same(
    chosen: list[tuple[Fraction, str]], data: st.DataObject
) -> None:
    cut = data.draw(st.integers(1, len(chosen) - 1))
    species = [parse_species(text) for _, text in chosen]
    nu = [c if i >= cut else -c for i, (c, _) in enumerate(chosen)]
    text = reaction_text(species, nu)
    reaction = parse_reaction(text)
    assert (list(reaction.species), list(reaction.nu)) == (species, nu)
    assert reaction_text(reaction.species, reaction.nu) == text
    tight = parse_reaction(text.replace(" ", "")) if "{" not in text else reaction
    assert tight == reaction


@given(st.text(alphabet="NHOCae0123456789+-=>^().·*/ {}½²⁺[]", max_size=40))
def test_any_text_is_read_or_refused_with_a_position(text: str) -> None:
    try:
        reaction = parse_reaction(text)
    except InputError as e:
        at = e.at if isinstance(e, ParseError) else 0
        found = (0 <= at <= len(text), isinstance(e, ParseError) or "nothing reacts" in str(e))
    else:
        found = (len(reaction.species) == len(reaction.nu), any(reaction.nu))
    assert found == (True, True)


@pytest.mark.parametrize("text", ["N2+" * 10_000 + "N2=NH3", "=" * 30_000, "{" * 30_000, "N2 " * 10_000])
def test_hostile_text_is_refused_at_once(text: str) -> None:
    with pytest.raises(ParseError):
        parse_reaction(text)
