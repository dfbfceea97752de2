import math

import pytest

from xleq.cells import BLANK, NA
from xleq.errors import InputError, MissingDataError, UnitError
from xleq.reactions import parse_reaction
from xleq.thermo import reaction_data, read_data, standard_table


def test_a_new_species_joins_the_table():
    table = read_data(
        [["species", "dHf", "S", "Cp", "T_min", "T_max"], ["XeF4(g)", -215.0, 316.0, 90.0, 280.0, 600.0]]
    )
    data = table.find("XeF4")
    assert (data.dhf, data.s298, data.cp(400.0)) == (-215.0, 316.0, 90.0)
    assert data.h(400.0) == pytest.approx(-215.0 + 0.090 * 101.85)
    assert data.s(400.0) == pytest.approx(316.0 + 90.0 * math.log(400 / 298.15))
    assert "XeF4(g)" not in standard_table()
    with pytest.raises(MissingDataError, match="280 to 600 K"):
        data.g(700.0)


def test_units_of_the_header_are_heeded():
    table = read_data(
        [
            ["Species", "ΔfH° [kcal/mol]", "S (cal/(mol K))", "Pc [atm]", "Tc [degC]"],
            ["XeF4(g)", -50.0, 75.0, 60.0, 10.0],
        ]
    )
    data = table.find("XeF4(g)")
    assert data.dhf == pytest.approx(-50 * 4.184)
    assert data.s298 == pytest.approx(75 * 4.184)
    assert data.pc == pytest.approx(60 * 1.01325)
    assert data.tc == pytest.approx(283.15)


def test_a_known_species_keeps_what_is_not_given():
    own = standard_table().find("NH3(g)")
    data = read_data([["species", "dHf", "source"], ["NH3(g)", -45.9, "our laboratory"]]).find("NH3")
    assert (data.dhf, data.s298, data.cp(700.0)) == (-45.9, own.s298, own.cp(700.0))
    assert data.h(700.0) == pytest.approx(own.h(700.0) - 0.342)
    assert (data.sources.dhf, data.sources.s) == ("our laboratory", "WB")
    reaction = parse_reaction("N2 + 3H2 = 2NH3", "g")
    table = read_data([["species", "dHf"], ["NH3", -45.9]])
    shift = reaction_data(reaction, table).dh(700.0) - reaction_data(reaction).dh(700.0)
    assert shift == pytest.approx(-0.684)


def test_several_intervals_with_a_transition_are_joined():
    header = ["species", "dHf", "S", "A", "B", "T_min", "T_max", "dH_tr"]
    table = read_data(
        [header, ["{slag}(s)", -900.0, 80.0, 60.0, 20.0, 280.0, 600.0, BLANK],
         ["{slag}(s)", BLANK, BLANK, 75.0, BLANK, 600.0, 900.0, 5.0]]
    )  # fmt: skip
    data = table.find("{slag}(s)")
    assert data.h(600.0) - data.h(599.999999) == pytest.approx(5.0, abs=1e-4)
    assert data.cp(700.0) == 75.0


def test_kij_is_read_for_both_orders():
    table = read_data([["species", "kij CO2", "kij CH4"], ["CO2", BLANK, 0.1], ["H2O", 0.19, BLANK]])
    assert table.kij["CO2(g)", "CH4(g)"] == table.kij["CH4(g)", "CO2(g)"] == 0.1
    assert table.kij["CO2(g)", "H2O(g)"] == 0.19
    assert table.find("CO2") is standard_table().find("CO2")


def test_blank_rows_and_columns_do_not_matter():
    table = read_data([["species", BLANK, "dHf"], [BLANK, BLANK, BLANK], ["NH3", BLANK, -45.9]])
    assert table.find("NH3").dhf == -45.9


NARROW = ["species", "Cp", "T_min", "T_max"]


@pytest.mark.parametrize(
    ("block", "message"),
    [
        ([], "empty"),
        ([["dHf", "S"], [1.0, 2.0]], "'species' is missing"),
        ([["species", "dHf", "ΔHf"], ["NH3", 1.0, 1.0]], "'dHf' stands for a column that is there twice"),
        ([["species", "enthalpy"], ["NH3", 1.0]], "'enthalpy' is not understood"),
        ([["species", 5.0], ["NH3", 1.0]], "is not text"),
        ([["species", "dHf"], ["XeF4(g)", 1.0]], "XeF4\\(g\\) is not in the table, so dHf and S must"),
        ([["species", "dHf"], ["NH3", "much"]], "row 2, dHf"),
        ([["species", "dHf"], ["NH3", True]], "row 2, dHf: True is not a number"),
        ([["species", "dHf"], ["NH3", NA]], "row 2: a cell holds the error #N/A"),
        ([["species", "dHf"], ["NH3", -45900.0]], "write the unit in the header"),
        ([["species", "dHf"], ["N?3", -45.0]], "row 2"),
        ([["species", "dHf"], [BLANK, -45.0]], "row 2: there are data, but no species"),
        ([["species", "Cp", "A"], ["NH3", 1.0, 1.0]], "either Cp"),
        ([["species", "A", "B"], ["NH3", 30.0, 1.0]], "needs T_min and T_max"),
        ([["species", "T_min", "T_max"], ["NH3", 30.0, 100.0]], "neither Cp nor A"),
        ([NARROW, ["NH3", 30.0, 500.0, 300.0]], "below T_max"),
        ([["species", "A", "T_min", "T_max"], ["NH3", -30.0, 300.0, 500.0]], "Cp is not positive"),
        ([NARROW, ["NH3", 30.0, 300.0, 500.0], ["NH3", 31.0, 600.0, 700.0]], "at 600"),
        ([["species", "dHf"], ["NH3", -45.0], ["NH3", -46.0]], "NH3\\(g\\) has dhf in row 2"),
        ([["species", "kij CO2", "kij H2O"], ["H2O", 0.1, BLANK], ["CO2", BLANK, 0.2]], "twice, differently"),
        ([["species", "kij X?"], ["H2O", 0.1]], "header 'kij X\\?'"),
        ([["species", BLANK], ["H2O", 0.1]], "column without a header"),
    ],
)  # fmt: skip
def test_a_malformed_block_is_refused_with_its_place(block, message):
    with pytest.raises(InputError, match=message):
        read_data(block)


@pytest.mark.parametrize("header", ["dHf [furlong]", "S [kJ/mol]", "T_min (bar)", "B [J/(mol K)]"])
def test_a_unit_that_is_not_understood_is_named_with_its_header(header):
    with pytest.raises(
        UnitError, match="header '" + header.replace("[", r"\[").replace("(", r"\(").replace(")", r"\)")
    ):
        read_data([["species", header], ["NH3", 1.0]])


def test_a_truth_value_is_not_taken_for_the_number_it_equals():
    assert read_data([["species", "dHf"], ["NH3", 1.0]]).find("NH3").dhf == 1.0
    with pytest.raises(InputError, match="True is not a number"):
        read_data([["species", "dHf"], ["NH3", True]])
    assert read_data([["species", "dHf"], ["NH3", 1.0]]) is read_data([["species", "dHf"], ["NH3", 1.0]])
