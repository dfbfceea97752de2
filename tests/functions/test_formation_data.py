"""Formation data through the worksheet functions: published values, the data range, and refusals."""

from __future__ import annotations

import csv
import math
from pathlib import Path

import pytest

from xleq.cells import NA, CellError
from xleq.functions import TABLE, call, call_with_notes
from xleq.reactions import parse_reaction
from xleq.thermo import reaction_data

REFERENCE = Path(__file__).parents[1] / "reference"
PHASES = {"cr": "s", "g": "g", "l": "l", "aq": "aq"}


def rows(name: str) -> list[dict[str, str]]:
    with (REFERENCE / name).open(encoding="utf-8") as file:
        return list(csv.DictReader((line for line in file if not line.startswith("#")), delimiter="\t"))


def reason(found) -> str:
    assert isinstance(found, CellError), found
    return f"{found.code} {found.reason}"


def test_a_cell_shows_the_constants_that_are_held_to_two_routes() -> None:
    shown = 0
    for row in rows("k_two_routes.tsv"):
        text, t = row["reaction"], float(row["T_K"])
        data = reaction_data(parse_reaction(text, "g"))
        cell = call("XLEQ_REACTION", [text, "log10K", t])
        if data.t_min <= t <= data.t_max:
            assert cell == data.log10_k(t)
            k = call("XLEQ_K_DATA", [text, t])
            assert math.log10(k) == pytest.approx(cell, abs=1e-9)
            shown += 1
        else:
            assert "#N/A XLEQ_REACTION: " in reason(cell)
    assert shown > 140


#: Beyond the interval that CODATA gives, and why.
KNOWN = {
    "b056": "ATcT 1.112 gives -45.558 ± 0.03",
    "b058": "ATcT 1.112 gives -92.173 ± 0.006",
    "b069": "NIST WebBook prints 228.183 after NIST-JANAF",
}


@pytest.mark.parametrize(
    "row", [r for r in rows("formation_values.tsv") if r["kind"] in ("b-dfH", "b-S")], ids=lambda r: r["id"]
)
def test_a_cell_shows_the_codata_key_values(row) -> None:
    name = row["inputs"].split(" ")[0].replace("(cr)", "(s)").replace("++", "+2").replace("--", "-2")
    found = call("XLEQ_SPECIES", [name, "dHf" if row["kind"] == "b-dfH" else "S"])
    limit = float(row["tolerance"].split(" ")[0].removeprefix("+-"))
    published = float(row["expected"])
    if row["id"] in KNOWN:
        assert limit < abs(found - published) < 0.5, KNOWN[row["id"]]
    else:
        assert found == pytest.approx(published, abs=limit + 0.5 * 10 ** -len(row["expected"].split(".")[1]))


def test_properties_of_a_reaction_hang_together() -> None:
    def of(what: str) -> float:
        return call("XLEQ_REACTION", ["N2 + 3 H2 = 2 NH3", what, "450 degC"])

    assert of("dG") == pytest.approx(of("dH") - 723.15 * of("dS") / 1000.0, rel=1e-12)
    assert of("lnK") == pytest.approx(-of("dG") / (8.31446261815324e-3 * 723.15), rel=1e-12)
    assert of("log10K") == pytest.approx(of("lnK") / math.log(10.0), rel=1e-12)
    warmer = call("XLEQ_REACTION", ["N2 + 3 H2 = 2 NH3", "dH", 723.16])
    assert of("dCp") == pytest.approx((warmer - of("dH")) * 1e5, rel=1e-3)


def test_a_species_tells_its_range_and_its_source() -> None:
    assert call("XLEQ_SPECIES", ["CaCO3(s)", "T_max"]) == 1200.0
    assert call("XLEQ_SPECIES", ["Na+", "dHf"]) == call("XLEQ_SPECIES", ["Na+(aq)", "dHf"])
    assert "Active Thermochemical Tables" in call("XLEQ_SPECIES", ["CO2", "source"])
    assert call("XLEQ_SPECIES", ["H2O", "molar_mass"]) == pytest.approx(18.015, abs=0.001)
    _, notes = call_with_notes("XLEQ_K_DATA", ["CO + H2O = CO2 + H2", 1000.0])
    assert "CO(g): dHf ATCT, S WB, Cp TRC" in notes


def test_the_data_range_overrides_and_extends_the_table() -> None:
    data = [["species", "dHf [kcal/mol]", "S", "Cp", "source"], ["XeF2(g)", -25.6, 259.4, 54.1, "own"]]
    assert call("XLEQ_SPECIES", ["XeF2", "dHf", 298.15, data]) == pytest.approx(-107.11, abs=0.01)
    assert "own" in call("XLEQ_SPECIES", ["XeF2", "source", 298.15, data])
    assert "#N/A" in reason(call("XLEQ_SPECIES", ["XeF2", "dHf"]))
    assert isinstance(call("XLEQ_SPECIES", ["XeF2", "H", 350.0, data]), float)
    assert "the data hold from 273.15 to 373.15 K" in reason(call("XLEQ_SPECIES", ["XeF2", "H", 500.0, data]))


@pytest.mark.parametrize(
    ("name", "given", "said"),
    [
        ("XLEQ_SPECIES", ["NHH3", "dHf"], "#N/A XLEQ_SPECIES: no data for NHH3(g)"),
        ("XLEQ_SPECIES", ["{methanl}", "dHf"], "the nearest names are {methanol}(g)"),
        ("XLEQ_SPECIES", ["CO2(l)", "dHf"], "no data for CO2(l); there is CO2(g) and CO2(aq)"),
        ("XLEQ_SPECIES", ["Ca+2(g)", "dHf"], "no data for Ca+2(g); there is Ca+2(aq)"),
        ("XLEQ_SPECIES", ["C", "S"], "#NUM! XLEQ_SPECIES: C without a phase would mean its gas atoms"),
        ("XLEQ_SPECIES", ["CO2", "Hf"], "#VALUE! XLEQ_SPECIES: property: 'Hf' is not known here"),
        ("XLEQ_SPECIES", ["CO2", "H", 9000.0], "#N/A XLEQ_SPECIES: CO2(g): the data hold from 200 to 4000 K"),
        ("XLEQ_SPECIES", ["CO2", "H", "-300 degC"], "#NUM! XLEQ_SPECIES: T: temperature"),
        ("XLEQ_SPECIES", ["C?2", "H"], "#VALUE! XLEQ_SPECIES: expected"),
        (
            "XLEQ_K_DATA",
            ["CO + H2O = CO2 + H3", 900.0],
            "#VALUE! XLEQ_K_DATA: 'CO + H2O = CO2 + H3' does not",
        ),
        ("XLEQ_K_DATA", ["Fe+3 + e- = Fe+2", 298.15], "a half reaction; combine it with another"),
        ("XLEQ_REACTION", ["CO + H2O = CO2 + H2", "dZ"], "'dZ' is not known here; known are dH, dS, dG"),
    ],
)
def test_what_the_data_do_not_tell_is_refused(name, given, said) -> None:
    assert said in reason(call(name, given))


SHIFT = ["CO + H2O = CO2 + H2", "data", "CO; H2O; CO2; H2", "1; 1; 0; 0"]
BLOCKS = [
    ([["dHf", "S"], [-1.0, 2.0]], "the header 'species' is missing"),
    ([["species", "dHf", "dHf"], ["CO2(g)", -1.0, -1.0]], "'dHf' stands for a column that is there twice"),
    ([["species", "dHf [furlong]"], ["CO2(g)", -1.0]], "'furlong' is not a unit of molar energy"),
    ([["species", "S [kJ/mol]"], ["CO2(g)", 0.2]], "'kJ/mol' is not a unit of molar entropy"),
    ([["species", "enthalpy"], ["CO2(g)", -1.0]], "the header 'enthalpy' is not understood"),
    ([["species", "dHf"], ["CO2(g)", "about -394"]], "data range, row 2, dHf"),
    ([["species", "dHf"], ["CO2(g)", -393474.0]], "write the unit in the header, for example dHf [J/mol]"),
    ("CO2 -393.5", "the header 'CO2 -393.5' is not understood"),
]
TAKING_DATA = {
    "XLEQ_K_DATA": ["CO + H2O = CO2 + H2", 900.0],
    "XLEQ_REACTION": ["CO + H2O = CO2 + H2", "dH", 900.0],
    "XLEQ_SPECIES": ["CO2", "H", 900.0],
    "XLEQ_APPROACH": ["CO + H2O = CO2 + H2", "CO; H2O; CO2; H2", "1; 1; 1; 1", 900.0, 1.0],
    "XLEQ_COMPOSITION_P": [*SHIFT, 900.0, 1.0, "moles", ""],
    "XLEQ_COMPOSITION_V": [*SHIFT, 900.0, 9.0, "moles", ""],
    "XLEQ_COMPOSITION_X": [
        "CH3OH + C2H5OH = CH3OC2H5 + H2O", 1.0, "CH3OH; C2H5OH; CH3OC2H5; H2O", "1; 1; 0; 0",
        "moles", "", 300.0,
    ],
    "XLEQ_COMPOSITION_DATA": ["CO; H2O; CO2; H2", "1; 1; 0; 0", 900.0, 1.0, "moles", ""],
    "XLEQ_ADIABATIC": ["CO; H2O; CO2; H2", "1; 1; 0; 0", 900.0, 1.0, "T", ""],
    "XLEQ_T_FOR": [*SHIFT, 1.0, "conversion CO", 0.6, 500.0, 1500.0],
    "XLEQ_FUGACITY_COEFFICIENT": ["CO; H2O", "0.5; 0.5", 900.0, 1.0],
}  # fmt: skip


def test_every_function_with_a_data_range_is_tried() -> None:
    assert set(TAKING_DATA) == {f.name for f in TABLE.values() if any(a.name == "data" for a in f.arguments)}


@pytest.mark.parametrize(("block", "said"), BLOCKS, ids=[said for _, said in BLOCKS])
@pytest.mark.parametrize("name", TAKING_DATA)
def test_a_bad_data_range_is_refused_with_its_place(name, block, said) -> None:
    found = reason(call(name, [*TAKING_DATA[name], block]))
    assert found.startswith(f"#VALUE! {name}: ")
    assert said in found


@pytest.mark.parametrize("name", TAKING_DATA)
def test_an_error_in_the_data_range_is_returned_as_it_came(name) -> None:
    error = CellError("#N/A", "the laboratory has not answered", "Data!C4")
    assert call(name, [*TAKING_DATA[name], [["species", "dHf"], ["CO2", NA]]]) is NA
    assert call(name, [*TAKING_DATA[name], [["species", "dHf"], ["CO2", error]]]) is error
