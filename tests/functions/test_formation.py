"""Equilibria found from formation data alone: compositions and adiabatic temperatures, and refusals."""

from __future__ import annotations

import csv
import math
from pathlib import Path

import pytest

from xleq.cells import BLANK, MISSING, CellError
from xleq.functions import call, call_with_notes

REFERENCE = Path(__file__).parents[1] / "reference" / "adiabatic.tsv"
PRODUCTS = ("CO2", "CO", "H2O", "H2", "OH", "O", "H", "NO", "N", "NO2")


def flames():
    with REFERENCE.open(encoding="utf-8") as file:
        return list(csv.DictReader((line for line in file if not line.startswith("#")), delimiter="\t"))


def composition(species, feed, t, p, want=MISSING, options="", data=MISSING):
    return call("XLEQ_COMPOSITION_DATA", [species, feed, t, p, want, options, data])


def adiabatic(species, feed, t, p, want=MISSING, options="", data=MISSING):
    return call("XLEQ_ADIABATIC", [species, feed, t, p, want, options, data])


def reason(found) -> str:
    assert isinstance(found, CellError), found
    return f"{found.code} {found.reason}"


@pytest.mark.parametrize("row", flames(), ids=lambda r: r["id"])
def test_a_stoichiometric_flame_in_air_is_as_hot_as_published(row) -> None:
    species = list(dict.fromkeys([row["fuel"], "O2", "N2", *PRODUCTS]))
    o2 = float(row["o2"])
    feed = {row["fuel"]: 1.0, "O2": o2, "N2": 3.76 * o2}
    found = adiabatic(
        [[s] for s in species], [[feed.get(s, 0.0)] for s in species], float(row["t_feed_K"]), "1 atm"
    )
    assert found == pytest.approx(float(row["published_K"]), abs=float(row["allow_K"])), row["source"]


class TestCompositionFromData:
    def test_reforming_at_1000_k_is_as_published(self) -> None:
        # Smith, Van Ness and Abbott, 7th ed., 2005, ex. 13.14 (from memory); ΔfG of other sources.
        y = composition("CH4; H2O; CO; CO2; H2", "2; 3; 0; 0; 0", 1000.0, 1.0, "fractions")
        published = [0.0196, 0.0980, 0.1743, 0.0371, 0.6711]
        assert [v[0] for v in y] == pytest.approx(published, abs=0.0015)

    def test_it_is_what_the_reactions_give(self) -> None:
        y = composition("CH4; H2O; CO; CO2; H2", "1; 3; 0; 0; 0", 1100.0, 25.0, "fractions")
        given = [
            "CH4 + H2O = CO + 3 H2; CO + H2O = CO2 + H2",
            "data",
            "CH4; H2O; CO; CO2; H2",
            "1; 3; 0; 0; 0",
        ]
        same = call("XLEQ_COMPOSITION_P", [*given, 1100.0, 25.0, "fractions"])
        assert [v[0] for v in y] == pytest.approx([v[0] for v in same], rel=1e-9)
        # Steam reforming at 1100 K, 25 bar, S/C 3: dry CH4 7.01 mol% from NIST-JANAF constants.
        assert 100 * y[0][0] / (1 - y[1][0]) == pytest.approx(7.01, abs=0.15)

    def test_it_follows_the_direction_of_the_species(self) -> None:
        row = composition([["CO", "H2O", "CO2", "H2"]], [[1.0, 1.0, BLANK, BLANK]], 1000.0, 1.0)
        assert len(row) == 1
        assert len(row[0]) == 4

    @pytest.mark.parametrize(("steam", "soot"), [(1.0, True), (6.0, False)])
    def test_graphite_forms_where_steam_is_short(self, steam, soot) -> None:
        given = ("CH4; H2O; CO; CO2; H2; C(s)", f"2; {steam}; 0; 0; 0; 0", 1000.0, 1.0)
        assert (composition(*given, "moles C(s)") > 0.0) is soot
        assert composition(*given, "state") == ("equilibrium" if soot else "exhausted: absent C(s)")

    def test_elements_balance_whatever_forms(self) -> None:
        species = "CH4; C2H6; C2H4; C2H2; CO; CO2; H2; H2O; O2; N2; NH3; HCN; NO; C(s)"
        n = [v[0] for v in composition(species, "1;0;0;0;0;0;0;1;0;1;0;0;0;0", 1400.0, 5.0)]
        carbon = [1, 2, 2, 2, 1, 1, 0, 0, 0, 0, 0, 1, 0, 1]
        assert math.fsum(a * b for a, b in zip(carbon, n, strict=True)) == pytest.approx(1.0, rel=1e-12)

    def test_a_species_whose_elements_are_not_fed_is_absent(self) -> None:
        n = composition("CO; O2; CO2; N2; NO; Cl2", "2; 1; 0; 0; 0; 0", 1000.0, 1.0)
        assert [v[0] for v in n[3:]] == [0.0, 0.0, 0.0]

    def test_pressure_favours_fewer_moles_and_a_real_gas_more_ammonia(self) -> None:
        given = ("N2; H2; NH3", "1; 3; 0", "450 degC")
        low, high, real = (
            composition(*given, p, "fractions NH3", o)
            for p, o in ((10.0, ""), (300.0, ""), (300.0, "gas=PR"))
        )
        assert low < high < real

    def test_limestone_is_calcined_only_where_its_data_reach_unless_extrapolated(self) -> None:
        given = ("CaCO3(s); CaO(s); CO2; N2", "1; 0; 0; 1")
        assert composition(*given, 1000.0, 1.0, "moles CaO(s)") == pytest.approx(0.07, abs=0.02)
        beyond = reason(composition(*given, 1300.0, 1.0))
        assert "#N/A XLEQ_COMPOSITION_DATA: CaCO3(s): the data hold from 273.15 to 1200 K" in beyond
        value, notes = call_with_notes(
            "XLEQ_COMPOSITION_DATA", [*given, 1300.0, 1.0, "moles", "extrapolate=yes"]
        )
        assert [v[0] for v in value] == [0.0, 1.0, 1.0, 1.0]
        assert "CaCO3(s) extrapolated to 1300 K: its data hold from 273.15 to 1200 K" in notes

    def test_the_users_data_stand_before_the_table(self) -> None:
        data = [["species", "dHf", "S"], ["CO2", -400.0, 213.8]]
        given = ("CO; H2O; CO2; H2", "1; 1; 0; 0", 1000.0, 1.0, "moles H2", "")
        assert composition(*given, data) > composition(*given) + 0.05


class TestAdiabatic:
    def test_the_enthalpy_of_the_feed_is_kept(self) -> None:
        species = ["N2", "H2", "NH3"]
        given = ("; ".join(species), "1; 3; 0", "300 degC", "150 bar")
        t, n = adiabatic(*given), adiabatic(*given, "moles")

        def enthalpy(amounts, t):
            return sum(a * call("XLEQ_SPECIES", [s, "H", t]) for a, s in zip(amounts, species, strict=True))

        assert enthalpy([v[0] for v in n], t) == pytest.approx(enthalpy([1.0, 3.0, 0.0], 573.15), rel=1e-9)
        assert [v[0] for v in composition(*given[:2], t, given[3])] == pytest.approx([v[0] for v in n])

    def test_a_feed_that_is_at_equilibrium_stays_as_it_is(self) -> None:
        species, t = "CO; H2O; CO2; H2", 900.0
        n = composition(species, "1; 2; 0; 0", t, 20.0)
        assert adiabatic(species, n, t, 20.0) == pytest.approx(t, rel=1e-9)

    def test_an_endothermic_feed_cools(self) -> None:
        assert adiabatic("CH4; H2O; CO; CO2; H2", "1; 3; 0; 0; 0", 1100.0, 20.0) < 1000.0

    def test_water_that_boils_away_in_a_flame_needs_no_data_for_hot_liquid(self) -> None:
        species = "CH4; O2; N2; CO2; CO; H2O; H2; OH; H2O(l)"
        dry, wet = (
            adiabatic(species, f"1; 2; 7.52; 0; 0; 0; 0; 0; {w}", 298.15, "1 atm") for w in (0.0, 1.0)
        )
        assert wet < dry - 150.0
        steam = adiabatic("CH4; O2; N2; CO2; CO; H2O; H2; OH", "1; 2; 7.52; 0; 0; 1; 0; 0", 298.15, "1 atm")
        assert wet < steam - 60.0
        given = [species, "1; 2; 7.52; 0; 0; 0; 0; 0; 1", 298.15, "1 atm", "moles"]
        n, notes = call_with_notes("XLEQ_ADIABATIC", given)
        assert n[-1] == [0.0]
        assert any(note.startswith("H2O(l) left out") for note in notes)

    def test_water_that_stays_is_at_its_dew_point(self) -> None:
        species, feed = "H2O(l); H2O; N2", "10; 1; 1"
        t = adiabatic(species, feed, 400.0, "1 atm")
        y = adiabatic(species, feed, 400.0, "1 atm", "fractions H2O")
        # Vapour pressure of water 0.5 atm at 354.5 K (steam tables).
        assert y * 1.01325 == pytest.approx(call("XLEQ_K_DATA", ["H2O(l) = H2O(g)", t]), rel=1e-9)

    def test_a_phase_that_changes_in_part_has_a_temperature_but_no_composition(self) -> None:
        given = ("CaCO3(s); CaO(s); CO2", "1; 0.1; 1", 1200.0, 1.0)
        t = adiabatic(*given)
        # CO2 alone over lime and limestone at 1 bar: K = 1 there.
        assert call("XLEQ_REACTION", ["CaCO3(s) = CaO(s) + CO2", "lnK", t]) == pytest.approx(0.0, abs=1e-6)
        assert "a phase is changing in part" in reason(adiabatic(*given, "moles"))

    @pytest.mark.parametrize("inert", [0.1, 1000.0])
    def test_a_melt_beside_any_amount_of_gas_is_at_its_melting_point(self, inert) -> None:
        given = ("S(s); S(l); N2", f"0.5; 0.5; {inert}", 388.3, 1.0)
        t = adiabatic(*given)
        assert call("XLEQ_REACTION", ["S(s) = S(l)", "lnK", t]) == pytest.approx(0.0, abs=1e-9)
        assert "a phase is changing in part" in reason(adiabatic(*given, "moles"))

    def test_a_solid_that_melts_where_its_data_end_needs_none_beyond(self) -> None:
        n = adiabatic("S(s); S(l); N2; H2; O2; H2O", "0.1; 0; 2; 3E-3; 1.5E-3; 0", 385.0, 1.0, "moles")
        assert [v[0] for v in n[:2]] == [0.0, 0.1]

    def test_it_is_extrapolated_only_if_asked_to(self) -> None:
        given = ("CaCO3(s); CaO(s); CO2; N2", "1; 0.1; 0; 1")
        assert "#N/A XLEQ_ADIABATIC: CaCO3(s): the data hold" in reason(adiabatic(*given, 1300.0, 1.0))
        assert 900.0 < adiabatic(*given, 1300.0, 1.0, "T", "extrapolate=yes") < 1300.0

    def test_a_phase_that_is_still_there_where_its_data_end_is_not_left_out(self) -> None:
        given = ("CaCO3(s); CaO(s); CO2; N2; CO; O2", "1; 0; 0; 0; 1.2; 0.6", 1100.0, "30 bar")
        assert "CaCO3(s) is still there at 1200 K, where its data end" in reason(adiabatic(*given))


BAD = [
    (["CO; CO; O2; CO2", "2;1;0;0", 1000.0, 1.0], "#VALUE!", "species CO is in the list twice"),
    (["CO; O2; CO2; {tar}(g)", "2;1;0;0", 1000.0, 1.0], "#VALUE!", "{tar}(g) has no formula"),
    (["CO; O2; CO2; Ca+2", "2;1;0;0", 1000.0, 1.0], "#VALUE!", "Ca+2(g) is not a gas or a pure phase"),
    (["CO; O2; CO2; C", "2;1;0;0", 1000.0, 1.0], "#NUM!", "write C(s), or C(g) if atoms are meant"),
    (["CO; O2; CO2; CH3FO9", "2;1;0;0", 1000.0, 1.0], "#N/A", "no data for CH3FO9(g)"),
    (["CO; O2; CO2(l)", "2;1;0", 1000.0, 1.0], "#N/A", "no data for CO2(l); there is CO2(g) and CO2(aq)"),
    (["CO; O2; CO2", "2;1", 1000.0, 1.0], "#VALUE!", "3 species but 2 amounts"),
    (["CO; O2; CO2", "0;0;0", 1000.0, 1.0], "#VALUE!", "nothing is fed"),
    (["CO; O2; CO2", "2;-1;0", 1000.0, 1.0], "#NUM!", "item 2 is -1; it must not be negative"),
    (["CO; O2; CO2", "2;1;0", 50000.0, 1.0], "#N/A", "the data hold from 200 to 4000 K, not at 50000 K"),
    (["CO; O2; CO2", "2;1;0", 1000.0, -1.0], "#NUM!", "pressure -1 is -1 bar absolute"),
    (["CO; O2; CO2", "2;1;0", "1000 kelvins per", 1.0], "#VALUE!", "is not a unit of temperature"),
    (["N2; Ar", "1;1", 1000.0, 1.0], "#NUM!", "the elements allow no reaction"),
    (["CO; O2; CO2", "2;1;0", 1000.0, 1.0, "molles"], "#VALUE!", "'molles' is not a result"),
    (["CO; O2; CO2", "2;1;0", 1000.0, 1.0, "moles N2"], "#VALUE!", "N2 is not in the list of species"),
    (["CO; O2; CO2", "2;1;0", 1000.0, 1.0, "moles", "basis=Kx"], "#VALUE!", "there is no option 'basis'"),
]  # fmt: skip


@pytest.mark.parametrize(("given", "code", "said"), BAD, ids=[said for _, _, said in BAD])
@pytest.mark.parametrize("name", ["XLEQ_COMPOSITION_DATA", "XLEQ_ADIABATIC"])
def test_bad_input_gives_an_error_with_a_reason(name, given, code, said) -> None:
    found = reason(call(name, given))
    assert found.startswith(f"{code} {name}: ")
    assert said in found


def test_a_gas_model_is_no_option_of_the_adiabatic_balance() -> None:
    assert "no option 'gas'" in reason(adiabatic("CO; O2; CO2", "2;1;0", 1000.0, 1.0, "T", "gas=PR"))
    assert "option gas=SRK is not known" in reason(
        composition("CO; O2; CO2", "2;1;0", 1000.0, 1.0, "moles", "gas=SRK")
    )
