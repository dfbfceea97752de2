"""Aqueous solutions through the worksheet functions: published waters, open and closed, and refusals."""

from __future__ import annotations

import csv
import math
from pathlib import Path

import pytest

from tests.benchmarks import thermochemistry
from xleq.cells import BLANK, MISSING, CellError
from xleq.functions import call, call_with_notes

REFERENCE = Path(__file__).parents[1] / "reference" / "waters.tsv"
AIR = "open=CO2 4E-4 atm; basis=Kp[atm]"
CARBONATE = (
    "CO2(g) = CO2(aq); CO2(aq) + H2O = HCO3- + H+; HCO3- = CO3-2 + H+; H2O = H+ + OH-",
    "log10 -1.468; log10 -6.352; log10 -10.329; log10 -13.995",
    "CO2(g); CO2(aq); HCO3-; CO3-2; H+; OH-",
)


def rows():
    with REFERENCE.open(encoding="utf-8") as file:
        return list(csv.DictReader((line for line in file if not line.startswith("#")), delimiter="\t"))


def water(reactions, k, species, initial, want="concentrations", options="", t=MISSING):
    return call("XLEQ_COMPOSITION_C", [reactions, k, species, initial, want, options, t])


def reason(found) -> str:
    assert isinstance(found, CellError), found
    return f"{found.code} {found.reason}"


def model(options: str) -> str:
    return "; ".join(p for p in options.split("; ") if p.startswith(("activity", "davies")))


@pytest.mark.parametrize("row", rows(), ids=lambda r: r["id"])
def test_a_published_water_is_found(row) -> None:
    given = [row["reactions"], row["k"], row["species"], row["initial"]]
    if row["result"] != "pH":
        found = water(*given, row["result"], row["options"])
    else:
        n = water(*given, "concentrations", row["options"])
        assert isinstance(n, list), n
        names = row["species"].split("; ")
        solutes = [(name, v[0]) for name, v in zip(names, n, strict=True) if v[0] != ""]
        listed = "; ".join(name for name, _ in solutes)
        found = call("XLEQ_PH", [listed, [[v] for _, v in solutes], model(row["options"])])
    assert found == pytest.approx(float(row["published"]), abs=float(row["allow"])), row["source"]


@pytest.mark.parametrize("options", ["", "activity=davies"])
@pytest.mark.parametrize("carbon", [3.2e-3, 4e-3, 8e-3])
def test_a_carbonate_water_of_ten_species_agrees_with_one_written_by_hand(carbon, options) -> None:
    by_hand = thermochemistry.water_by_fsolve(carbon, options)
    assert thermochemistry.water(carbon, options) == pytest.approx(by_hand, rel=1e-7)


def test_constants_from_formation_data_give_the_same_rain() -> None:
    given = (CARBONATE[0], "data", CARBONATE[2], "0; 0; 0; 0; 0; 0", "concentrations H+")
    assert -math.log10(water(*given, "open=CO2 4E-4 atm")) == pytest.approx(5.6, abs=0.05)
    # 0.0004 atm are the same pressure in other units.
    assert water(*given, "open=CO2 0.4053 mbar") == pytest.approx(water(*given, "open=CO2 4E-4 atm"))


def test_an_open_gas_obeys_henrys_law_and_shows_how_much_of_it_dissolved() -> None:
    n = water(*CARBONATE, "0; 0; 0; 0; 0; 0", "concentrations", AIR)
    assert n[1][0] == pytest.approx(10**-1.468 * 4e-4, rel=1e-12)
    taken = water(*CARBONATE, "0; 0; 0; 0; 0; 0", "change CO2(g)", AIR)
    assert -taken == pytest.approx(n[1][0] + n[2][0] + n[3][0], rel=1e-12)
    assert n[0][0] == ""
    table = water(*CARBONATE, "0; 0; 0; 0; 0; 0", "table", AIR)
    assert table[1] == ["CO2(g)", "", pytest.approx(taken), ""]
    said = "held at its partial pressure and has no amount"
    assert said in reason(water(*CARBONATE, "0; 0; 0; 0; 0; 0", "moles CO2(g)", AIR))


def test_a_strong_base_takes_up_gas_until_carbonate_and_bicarbonate_hold_the_charge() -> None:
    reactions, k, species = CARBONATE
    n = water(reactions, k, f"{species}; Na+", "0; 0; 0; 0; 0; 0.01; 0.01", "concentrations", AIR)
    co2, hco3, co3, h, oh, na = (v[0] for v in n[1:])
    assert co2 == pytest.approx(10**-1.468 * 4e-4, rel=1e-12)
    assert na + h == pytest.approx(hco3 + 2 * co3 + oh, rel=1e-12)
    assert hco3 > 0.008


def test_two_open_gases_are_held_at_their_own_pressures() -> None:
    reactions = "CO2(g) = CO2(aq); O2(g) = O2(aq)"
    n = water(reactions, "0.034; 0.0013", "CO2(g); CO2(aq); O2(g); O2(aq)", "0;0;0;0", "concentrations",
              "open=CO2 0.5 bar, O2 0.2 bar")  # fmt: skip
    assert [n[1][0], n[3][0]] == pytest.approx([0.017, 0.00026], rel=1e-12)


def test_davies_raises_a_solubility_by_the_activity_coefficients() -> None:
    given = ("AgCl(s) = Ag+ + Cl-", 1.77e-10, "AgCl(s); Ag+; Cl-; K+; NO3-", "0.1; 0; 0; 0.1; 0.1")
    ideal = water(*given, "concentrations Ag+")
    real = water(*given, "concentrations Ag+", "activity=davies")
    gamma = call("XLEQ_ACTIVITY_COEFFICIENT", ["Ag+", 0.1])
    assert ideal == pytest.approx(math.sqrt(1.77e-10), rel=1e-9)
    assert real == pytest.approx(ideal / gamma, rel=1e-4)
    older = water(*given, "concentrations Ag+", "activity=davies; davies=0.2")
    assert older > real


def test_the_temperature_moves_water_and_its_activity_coefficients() -> None:
    given = ("H2O = H+ + OH-", "data", "H+; OH-; Na+; Cl-", "0; 0; 0.1; 0.1", "concentrations H+")
    cold, warm = (water(*given, "activity=davies", t) for t in (298.15, "60 degC"))
    gamma = call("XLEQ_ACTIVITY_COEFFICIENT", ["H+", 0.1])
    assert -math.log10(cold * gamma) == pytest.approx(7.0, abs=0.01)
    assert 3.0 * cold < warm < 3.6 * cold  # pKw 13.02 at 60 °C, IAPWS R11-24
    assert "#N/A XLEQ_COMPOSITION_C: H2O(l): the data hold from" in reason(water(*given, "", 700.0))


def test_solvent_water_may_be_left_out_or_left_empty() -> None:
    reaction, k = "NH3 + H2O = NH4+ + OH-", 1.8e-5
    without = water(reaction, k, "NH3; NH4+; OH-", "0.1; 0; 0", "concentrations OH-")
    for amount in (BLANK, 0.0, 55.35):
        initial = [[0.1], [amount], [0.0], [0.0]]
        assert water(reaction, k, "NH3; H2O; NH4+; OH-", initial, "concentrations OH-") == without


def test_a_solid_may_dissolve_away_or_form() -> None:
    reaction, k, species = "AgCl(s) = Ag+ + Cl-", 1.77e-10, "AgCl(s); Ag+; Cl-"
    assert water(reaction, k, species, "1E-6; 0; 0", "state") == "exhausted: absent AgCl(s)"
    assert water(reaction, k, species, "0; 0.01; 0.01", "moles AgCl(s)") == pytest.approx(0.01, rel=2e-3)


def test_ph_is_that_of_strong_acids_bases_and_of_water_itself() -> None:
    assert call("XLEQ_PH", ["H+; Cl-", "0.001; 0.001"]) == pytest.approx(3.0, abs=1e-12)
    assert call("XLEQ_PH", ["Na+; Cl-", "0; 0.001"]) == pytest.approx(3.0, abs=1e-7)
    # pKw 13.995 at 25 °C (IAPWS R11-24) on mol/kg, 13.997 on mol/L.
    assert call("XLEQ_PH", ["Na+; OH-", "0.001; 0.001"]) == pytest.approx(10.997, abs=0.001)
    assert call("XLEQ_PH", ["Na+; Cl-", "0.001; 0"]) == pytest.approx(10.997, abs=0.001)
    assert call("XLEQ_PH", ["Na+; Cl-", "0.1; 0.1"]) == pytest.approx(6.999, abs=0.001)
    assert call("XLEQ_PH", ["Cl-", "1E-8"]) == pytest.approx(6.977, abs=0.003)


def test_ph_of_standard_hydrochloric_acid_is_near_the_measured_one() -> None:
    # 0.1 m HCl at 25 °C: pH 1.088 to 1.10, R. G. Bates, Determination of pH, 2nd ed., 1973 (from memory).
    found = call("XLEQ_PH", ["H+; Cl-", "0.1; 0.1", "activity=davies"])
    assert found == pytest.approx(1.10, abs=0.02)


@pytest.mark.parametrize(
    ("species", "amounts", "options", "said"),
    [
        ("CH3COOH; Na+", "0.1; 0.1", "", "CH3COOH may take up or give off protons"),
        ("H+; Cl-", "0; 0.1", "", "#NUM! XLEQ_PH: neither H+ nor OH- has a concentration above 0"),
        ("H+; H+", "0.1; 0.1", "", "H+ is in the list twice"),
        ("H+; H3O+", "0.1; 0.1", "", "the same ion"),
        ("H+; Cl-", "0.1", "", "2 species but 1 concentrations"),
        ("H+; Cl-", "0.1; 0.2", "activity=davies", "not electroneutral: 0.1 mol/L of negative charge"),
        ("H+; Cl-", "2; 2", "activity=davies", "#NUM! XLEQ_PH: ionic strength 2 mol/L: davies is refused"),
        ("H+; Cl-", "0.1; 0.1", "davies=0.2", "that too"),
        ("H+; Cl-", "0.1; 0.1", "model=davies", "there is no option 'model'"),
        ("Na+; OH-", "0.1; 0.1", "t=700", "#NUM! XLEQ_PH: "),
        ("H+; Cl-", "-0.1; 0.1", "", "#NUM! XLEQ_PH: concentrations: item 1 is -0.1"),
    ],
)
def test_a_ph_that_cannot_be_told_is_refused(species, amounts, options, said) -> None:
    assert said in reason(call("XLEQ_PH", [species, amounts, options]))


SALT = ("AgCl(s) = Ag+ + Cl-", 1.77e-10, "AgCl(s); Ag+; Cl-; Na+; NO3-")


def test_a_solution_with_a_model_must_be_electroneutral() -> None:
    off = water(*SALT, "0.1; 0; 0; 0.1; 0.2", "concentrations", "activity=davies")
    assert "#VALUE! XLEQ_COMPOSITION_C: the solution is not electroneutral: 0.1 mol/L of negative" in reason(
        off
    )
    assert isinstance(water(*SALT, "0.1; 0; 0; 0.1; 0.2"), list)  # ideal: spectators may be left out
    short = water(*SALT, "0.1; 0; 0; 0.1", "concentrations", "activity=davies")
    assert "5 species but 4 amounts" in reason(short)


@pytest.mark.parametrize(
    ("name", "fine", "warned", "refused"), [("davies", 0.4, 0.7, 1.2), ("debye-huckel", 0.004, 0.05, 0.2)]
)
def test_an_ionic_strength_beyond_the_model_is_warned_of_and_then_refused(
    name, fine, warned, refused
) -> None:
    def given(c):
        return [*SALT, f"0.1; 0; 0; {c}; {c}", "concentrations Ag+", f"activity={name}"]

    value, notes = call_with_notes("XLEQ_COMPOSITION_C", given(fine))
    assert isinstance(value, float)
    assert not any("is meant for" in note for note in notes)
    value, notes = call_with_notes("XLEQ_COMPOSITION_C", given(warned))
    assert isinstance(value, float)
    assert any(f"{name} is meant for up to" in note for note in notes)
    value, _ = call_with_notes("XLEQ_COMPOSITION_C", given(refused))
    assert f"#NUM! XLEQ_COMPOSITION_C: ionic strength {refused} mol/L: {name} is refused" in reason(value)


@pytest.mark.parametrize(
    ("initial", "options", "said"),
    [
        (
            "0; 0; 0; 0; 0; 0",
            "basis=Kp[atm]",
            "CO2(g) is a gas above the solution; give its partial pressure",
        ),
        ("0; 0; 0; 0; 0; 0", "open=CO2", "write a gas and its pressure: open=CO2 0.0004 atm"),
        ("0; 0; 0; 0; 0; 0", "open=N2 1 bar", "N2(g) takes part in no reaction, or is not in the list"),
        ("0; 0; 0; 0; 0; 0", "open=CO2 1 bar, CO2 2 bar", "CO2(g) is given twice"),
        ("0; 0; 0; 0; 0; 0", "open=CO2 1 parsec", "'parsec' is not a unit of pressure"),
        ("0; 0; 0; 0; 0; 0", "open=CO2 -1 bar", "#NUM! XLEQ_COMPOSITION_C: pressure '-1 bar'"),
        ("0.1; 0; 0; 0; 0; 0", "open=CO2 1 bar", "held at its partial pressure, so it has no amount"),
    ],
)
def test_an_open_gas_must_be_told_rightly(initial, options, said) -> None:
    assert said in reason(water(*CARBONATE, initial, "concentrations", options))


def test_ionic_strength_counts_ions_only() -> None:
    assert call("XLEQ_IONIC_STRENGTH", ["Ca+2; Cl-; CO2(aq); NaCl(s)", "0.1; 0.2; 5; 9"]) == pytest.approx(
        0.3
    )
    ranged = [[["Na+"], ["Cl-"], [BLANK]], [[0.1], [0.1], [BLANK]]]
    assert call("XLEQ_IONIC_STRENGTH", ranged) == pytest.approx(0.1)
    assert "#NUM!" in reason(call("XLEQ_ACTIVITY_COEFFICIENT", ["Na+", -0.1]))
    assert "#NUM!" in reason(call("XLEQ_ACTIVITY_COEFFICIENT", ["Na+", 3.0]))
    assert "#VALUE!" in reason(call("XLEQ_ACTIVITY_COEFFICIENT", ["Na+", 0.1, MISSING, "pitzer"]))
