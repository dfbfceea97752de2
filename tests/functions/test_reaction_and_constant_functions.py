"""Worksheet functions about reactions and constants, called as a host calls them."""

from __future__ import annotations

import re

import pytest

from xleq.cells import BLANK, MISSING, NA, CellError, Grid, Value
from xleq.functions import constants, reactions
from xleq.functions.table import Example, Function, Given, evaluate

FUNCTIONS = {f.name: f for f in (*reactions.FUNCTIONS, *constants.FUNCTIONS)}
EXAMPLES = [(f, e) for f in FUNCTIONS.values() for e in f.examples]


def call(name: str, *given: Given) -> Value | Grid:
    return evaluate(FUNCTIONS[name], given)


def reason(result: Value | Grid) -> str:
    assert isinstance(result, CellError), result
    return f"{result.code} {result.reason}"


def arguments_of(formula: str) -> list[Given]:
    """Arguments of a formula whose arguments are plain numbers and texts."""
    inside = re.fullmatch(r"=\w+\((.*)\)", formula)
    assert inside
    parts = re.findall(r'"([^"]*)"|([^,"\s]+)', inside[1])
    return [float(number) if number else text for text, number in parts]


def test_every_function_of_the_two_topics_is_declared() -> None:
    assert list(FUNCTIONS) == [
        "XLEQ_BALANCE", "XLEQ_EXPRESSION", "XLEQ_GAS_CHANGE", "XLEQ_COEFFICIENT", "XLEQ_COMBINE",
        "XLEQ_MULTIPLIERS", "XLEQ_MOLAR_MASS", "XLEQ_KP", "XLEQ_KC", "XLEQ_K_CONVERT", "XLEQ_K_SCALE",
        "XLEQ_K_COMBINE", "XLEQ_K_AT", "XLEQ_K_FROM_DG", "XLEQ_DG_FROM_K", "XLEQ_Q", "XLEQ_AFFINITY",
        "XLEQ_K_FIT", "XLEQ_K_FROM_FIT",
    ]  # fmt: skip


@pytest.mark.parametrize("function", FUNCTIONS.values(), ids=lambda f: f.name)
def test_a_declaration_matches_its_definition(function: Function) -> None:
    assert function.parameters_match()
    optional = [a.optional for a in function.arguments]
    assert optional == sorted(optional)
    assert function.errors
    assert function.source
    assert function.gives


@pytest.mark.parametrize(("function", "example"), EXAMPLES, ids=[e.formula for _, e in EXAMPLES])
def test_an_example_shows_its_value(function: Function, example: Example) -> None:
    result = evaluate(function, arguments_of(example.formula))
    if isinstance(example.shows, list):
        assert isinstance(result, list)
        for row, shown in zip(result, example.shows, strict=True):
            assert row == [pytest.approx(v, rel=1e-10) if isinstance(v, float) else v for v in shown]
    elif isinstance(example.shows, float):
        assert result == pytest.approx(example.shows, rel=1e-12)
    else:
        assert result == example.shows


@pytest.mark.parametrize(
    ("name", "given", "expected"),
    [
        ("XLEQ_GAS_CHANGE", ["N2 + H2 = NH3"], "'N2 + H2 = NH3' does not balance: N 2 on the left, 1 "),
        ("XLEQ_GAS_CHANGE", ["N2 + 3 Hx = 2 NH3"], "expected the symbol of an element at position 8"),
        ("XLEQ_KP", [1.0, "N2 + 3 H2 = 2 NH3", 573.0, "barr"], "'barr' is not a unit of pressure"),
        ("XLEQ_KP", [1.0, "N2 + 3 H2 = 2 NH3", 573.0, "barg"], "'barg' counts from atmospheric"),
        ("XLEQ_KP", [1.0, "N2 + 3 H2 = 2 NH3", "-300 degC"], "#NUM! XLEQ_KP: T: temperature '-300 degC' is"),
        ("XLEQ_KP", [0.0, "N2 + 3 H2 = 2 NH3", 573.0], "#NUM! XLEQ_KP: Kc: K is 0"),
        ("XLEQ_K_SCALE", [-1.0, 2.0], "#NUM! XLEQ_K_SCALE: K: K is -1"),
        ("XLEQ_K_SCALE", ["high", 2.0], "#VALUE! XLEQ_K_SCALE: K: expected K as a number"),
        ("XLEQ_K_SCALE", [2.0, 0.0], "#VALUE! XLEQ_K_SCALE: the factor is 0"),
        ("XLEQ_K_SCALE", [True, 2.0], "#VALUE! XLEQ_K_SCALE: K: an equilibrium constant is wanted, not TRUE"),
        ("XLEQ_COEFFICIENT", ["N2 + 3 H2 = 2 NH3", "O2"], "#VALUE! XLEQ_COEFFICIENT: O2 is not in"),
        ("XLEQ_MOLAR_MASS", ["TcO2"], "#N/A XLEQ_MOLAR_MASS: Tc in TcO2 has no standard atomic weight"),
        ("XLEQ_MOLAR_MASS", ["{naphtha}(g)"], "#N/A XLEQ_MOLAR_MASS: {naphtha} has no formula"),
        ("XLEQ_COMBINE", ["2 SO2 + O2 = 2 SO3", "1; 2"], "reactions: 1, multipliers: 2; one"),
        ("XLEQ_COMBINE", ["2 SO2 + O2 = 2 SO3", 0.123456], "not a ratio of whole numbers"),
        ("XLEQ_COMBINE", ["CO2 = CO2(g)", 1.0], "#NUM! XLEQ_COMBINE: the reactions cancel"),
        ("XLEQ_K_COMBINE", ["C(s) + O2 = CO2", "CO + 1/2 O2 = CO2", 1.0], "cannot be made from these"),
        ("XLEQ_K_CONVERT", [1.0, "N2O4 = 2 NO2", "K", "Kc[mol/L]"], "#VALUE! XLEQ_K_CONVERT: T is needed"),
        ("XLEQ_K_CONVERT", [1.0, "N2O4 = 2 NO2", "K", "Kx"], "#VALUE! XLEQ_K_CONVERT: P is needed"),
        ("XLEQ_K_CONVERT", [1.0, "AgCl(s) = Ag+ + Cl-", "K", "Kx"], "solvent"),
        ("XLEQ_K_CONVERT", [1.0, "N2O4 = 2 NO2", "Kp", "Kx"], "'Kp' lacks its unit"),
        ("XLEQ_Q", ["N2O4 = 2 NO2", "N2O4; NO2", "1", 1.0], "#VALUE! XLEQ_Q: species: 2, amounts: 1;"),
        ("XLEQ_Q", ["N2O4 = 2 NO2", "N2O4; NO2", "1; -1", 1.0], "#NUM! XLEQ_Q: item 2 is -1"),
        ("XLEQ_Q", ["N2O4 = 2 NO2", "N2O4; NO2", "0; 1", 1.0], "#NUM! XLEQ_Q: N2O4 is absent"),
        ("XLEQ_Q", ["N2O4 = 2 NO2", "N2O4", "1", 1.0], "#VALUE! XLEQ_Q: NO2 takes part"),
        ("XLEQ_Q", ["N2O4(g) = 2 NO2(g)", "N2O4(g); NO2(g)", "1; 1"], "#VALUE! XLEQ_Q: T is needed"),
        ("XLEQ_AFFINITY", [1.0, 0.0, 300.0], "#NUM! XLEQ_AFFINITY: Q: K is 0"),
        ("XLEQ_K_FIT", ["300; 400", "1; 2"], "#NUM! XLEQ_K_FIT: 2 terms need at least 3 points"),
        ("XLEQ_K_FIT", ["300; 400; 500", "1; 2"], "#VALUE! XLEQ_K_FIT: temperatures: 3, constants: 2;"),
        ("XLEQ_K_FIT", ["300; 400; 500", "1; 2; 3", 5.0], "#VALUE! XLEQ_K_FIT: terms is 5"),
        ("XLEQ_K_FROM_FIT", ["1", 300.0], "#VALUE! XLEQ_K_FROM_FIT: coefficients: 1;"),
        ("XLEQ_BALANCE", [BLANK], "#VALUE! XLEQ_BALANCE: argument reaction is missing or empty"),
        ("XLEQ_BALANCE", [1.0], "#VALUE! XLEQ_BALANCE: reaction: text is wanted, not 1"),
        ("XLEQ_BALANCE", [], "#VALUE! XLEQ_BALANCE: argument reaction is missing or empty"),
        ("XLEQ_BALANCE", ["H2 + O2 + N2 = H2O + NO"], "#NUM! XLEQ_BALANCE"),
    ],
)  # fmt: skip
def test_bad_input_gives_an_error_with_a_reason(name: str, given: list[Given], expected: str) -> None:
    assert expected in reason(call(name, *given))


def test_an_error_in_an_argument_is_returned_as_it_came() -> None:
    error = CellError("#N/A", "no such feed", "Loop!B7")
    result = call("XLEQ_KP", error, "N2 + 3 H2 = 2 NH3", 573.0)
    assert result is error
    assert call("XLEQ_K_FIT", [[300.0], [NA]], [[1.0], [2.0]]) is NA


def test_an_omitted_or_empty_argument_means_its_default() -> None:
    kp = call("XLEQ_KP", 9.6, "N2 + 3 H2 = 2 NH3", 573.0)
    assert call("XLEQ_KP", 9.6, "N2 + 3 H2 = 2 NH3", 573.0, BLANK, MISSING) == kp
    assert call("XLEQ_KP", 9.6, "N2 + 3 H2 = 2 NH3", 573.0, "bar", "mol/L") == kp


def test_a_constant_that_no_double_holds_survives_a_chain_of_functions() -> None:
    small = call("XLEQ_K_SCALE", 1e-200, 2.0)
    assert isinstance(small, str)
    assert call("XLEQ_K_SCALE", small, 0.5) == pytest.approx(1e-200, rel=1e-12)
    assert call("XLEQ_DG_FROM_K", small, 298.15) == pytest.approx(400 * 5.708009502535258, rel=1e-12)


def test_multipliers_follow_the_direction_of_their_reactions() -> None:
    row: Grid = [["C(s) + O2 = CO2", "CO + 1/2 O2 = CO2"]]
    column: Grid = [[text] for text in row[0]]
    assert call("XLEQ_MULTIPLIERS", "C(s) + CO2 = 2 CO", row) == [[1.0, -2.0]]
    assert call("XLEQ_MULTIPLIERS", "C(s) + CO2 = 2 CO", column) == [[1.0], [-2.0]]


def test_multipliers_are_read_as_numbers_and_as_ratios_in_text() -> None:
    text = "2 SO2 + O2 = 2 SO3"
    halved = "SO2 + 1/2 O2 = SO3"
    assert call("XLEQ_COMBINE", text, 0.5) == halved
    assert call("XLEQ_COMBINE", text, "1/2") == halved
    assert call("XLEQ_COMBINE", [[text]], [[0.5]]) == halved
    assert call("XLEQ_COMBINE", text, 1 / 3) == "2/3 SO2 + 1/3 O2 = 2/3 SO3"


def test_a_quotient_of_gas_counts_inert_species_and_passes_pure_phases_over() -> None:
    # p(CO2) = 2 bar x 1/4.
    q = call("XLEQ_Q", "CaCO3(s) = CaO(s) + CO2", "CO2; N2", "1; 3", 2.0)
    assert q == pytest.approx(0.5, rel=1e-14)
    assert call("XLEQ_Q", "CaCO3(s) = CaO(s) + CO2", "CaO(s); CO2; N2", "5; 1; 3", 2.0) == q


def test_a_range_drawn_longer_than_its_list_is_as_good() -> None:
    names: Grid = [["N2O4"], ["NO2"], [BLANK], [BLANK]]
    amounts: Grid = [[1.0], [1.0], [BLANK], [BLANK]]
    assert call("XLEQ_Q", "N2O4 = 2 NO2", names, amounts, 2.0) == pytest.approx(1.0, rel=1e-14)
    assert call("XLEQ_K_FROM_FIT", [[0.0, 0.0, BLANK, BLANK]], 300.0) == 1.0


def test_a_quotient_without_product_is_zero() -> None:
    assert call("XLEQ_Q", "N2O4 = 2 NO2", "N2O4; NO2", [[1.0], [BLANK]], 1.0) == 0.0


def test_a_quotient_takes_units_and_bases() -> None:
    given: list[Given] = ["N2O4 = 2 NO2", "N2O4; NO2", "1 kmol; 500 mol", "2 atm"]
    x_no2, x_n2o4 = 1 / 3, 2 / 3
    kp_atm = (2 * x_no2) ** 2 / (2 * x_n2o4)
    assert call("XLEQ_Q", *given, MISSING, "Kp[atm]") == pytest.approx(kp_atm, rel=1e-13)
    assert call("XLEQ_Q", *given) == pytest.approx(kp_atm * 1.01325, rel=1e-13)
    assert call("XLEQ_Q", *given, MISSING, "Kx") == pytest.approx(x_no2**2 / x_n2o4, rel=1e-13)


def test_a_quotient_of_concentrations_needs_no_temperature_on_their_own_basis() -> None:
    q = call("XLEQ_Q", "N2O4(g) = 2 NO2(g)", "N2O4(g); NO2(g)", "0.1; 0.2", MISSING, MISSING, "Kc[mol/L]")
    assert q == pytest.approx(0.4, rel=1e-14)
    q = call("XLEQ_Q", "N2O4(g) = 2 NO2(g)", "N2O4(g); NO2(g)", "0.1; 0.2", MISSING, 300.0)
    assert q == pytest.approx(0.4 * 0.0831446261815324 * 300, rel=1e-13)


def test_solvent_water_stays_out_of_a_quotient() -> None:
    q = call("XLEQ_Q", "NH3 + H2O = NH4+ + OH-", "NH3; NH4+; OH-", "0.1; 0.001; 0.001")
    assert q == pytest.approx(1e-5, rel=1e-13)


def test_a_quotient_of_a_liquid_mixture_is_on_mole_fractions() -> None:
    text = "CH3COOH(l) + C2H5OH(l) = CH3COOC2H5(l) + H2O(l)"
    names = "CH3COOH(l); C2H5OH(l); CH3COOC2H5(l); H2O(l)"
    q = call("XLEQ_Q", text, names, "1; 1; 2; 2", MISSING, MISSING, "Kx")
    assert q == pytest.approx(4.0, rel=1e-14)
    assert "for a liquid mixture ask for Kx" in reason(call("XLEQ_Q", text, names, "1; 1; 2; 2"))


def test_a_fit_goes_from_its_block_to_a_constant_within_its_range_only() -> None:
    t: Grid = [[300.0], [350.0], [400.0], [450.0], [500.0]]
    k: Grid = [[f"ln {-10 + 6000 / row[0]!r}"] for row in t if isinstance(row[0], float)]
    block = call("XLEQ_K_FIT", t, k)
    assert isinstance(block, list)
    assert [row[0] for row in block] == ["term", "a", "b", "T_min", "T_max", "residual"]
    coefficients: Grid = [[row[1]] for row in block[1:3]]
    assert coefficients == [[pytest.approx(-10, rel=1e-10)], [pytest.approx(6000, rel=1e-10)]]
    expected = pytest.approx(148.4131591025766, rel=1e-10)
    assert call("XLEQ_K_FROM_FIT", block, 400.0) == expected
    assert call("XLEQ_K_FROM_FIT", coefficients, 400.0) == expected
    assert "outside the range of the fit, 300 to 500 K" in reason(call("XLEQ_K_FROM_FIT", block, 600.0))
    assert isinstance(call("XLEQ_K_FROM_FIT", coefficients, 600.0), float)
    assert "refer to all of it" in reason(call("XLEQ_K_FROM_FIT", [[*row[:-1], ""] for row in block], 400.0))


def test_a_liquid_mixture_shows_in_the_expression_on_mole_fractions_only() -> None:
    text = "CH3COOH(l) + C2H5OH(l) = CH3COOC2H5(l) + H2O(l)"
    assert call("XLEQ_EXPRESSION", text, "Kx") == "Kx = x(CH3COOC2H5) x(H2O) / (x(CH3COOH) x(C2H5OH))"
    assert call("XLEQ_EXPRESSION", text) == "K = 1"
