import math

import numpy as np
import pytest

from xleq.errors import AmbiguousError, InputError, MissingDataError, ParseError
from xleq.reactions import parse_reaction
from xleq.thermo import reaction_data, standard_table

TABLE = standard_table()


def data(text):
    return reaction_data(parse_reaction(text, "g"))


def test_a_species_without_phase_is_a_gas():
    assert TABLE.find("CO2") is TABLE.find("CO2(g)")
    assert TABLE.find("Na+", "aq").key == "Na+(aq)"


@pytest.mark.parametrize(
    ("text", "key"),
    [
        ("Ca2+(aq)", "Ca+2(aq)"),
        ("SO4^2-(aq)", "SO4-2(aq)"),
        ("NH₃(g)", "NH3(g)"),
        ("Fe(cr)", "Fe(s)"),
        ("CaSO4*2H2O(s)", "CaSO4·2H2O(s)"),
        ("{methanol}(l)", "CH3OH(l)"),
        ("{i-C4H10}(g)", "CH3CH(CH3)CH3(g)"),
        ("CH(CH3)3(g)", "CH3CH(CH3)CH3(g)"),
        ("{calcite}(s)", "CaCO3(s)"),
        ("CH4O(g)", "CH3OH(g)"),
    ],
)
def test_other_spellings_find_the_same_species(text, key):
    assert TABLE.find(text).key == key


def test_a_wrong_phase_is_answered_with_the_phases_there_are():
    with pytest.raises(MissingDataError, match=r"no data for CO2\(l\); there is CO2\(g\) and CO2\(aq\)"):
        TABLE.find("CO2(l)")
    with pytest.raises(MissingDataError, match=r"CaCO3\(g\); there is CaCO3\(s\)"):
        data("CaCO3 = CaO(s) + CO2")


def test_an_isomer_is_named_but_never_taken_for_another():
    with pytest.raises(MissingDataError, match=r"same composition there is C2H5OH\(g\) and CH3OCH3\(g\)"):
        TABLE.find("C2H6O(g)")


def test_an_unknown_species_is_answered_with_the_nearest_names():
    with pytest.raises(MissingDataError, match=r"nearest names are .*\{methanol\}\(g\)"):
        TABLE.find("{metanol}(g)")
    with pytest.raises(MissingDataError, match="give its formation data"):
        TABLE.find("{cracked naphtha, cut 4}(g)")
    with pytest.raises(ParseError):
        TABLE.find("Xy2(g)")


@pytest.mark.parametrize("element", ["C", "S", "Fe", "Zn"])
def test_an_atom_without_phase_is_refused_where_the_solid_is_meant(element):
    with pytest.raises(AmbiguousError, match=rf"write {element}\(s\)"):
        data(
            f"{element} + O2 = {element}O2(g)" if element in "CS" else f"{element} + H2O = {element}O(s) + H2"
        )
    assert TABLE.find(f"{element}(g)").dhf > 100


def test_atoms_of_gaseous_elements_need_no_phase():
    assert math.isfinite(data("H2 = 2H").ln_k(2000.0))


def test_outside_the_range_is_no_number_unless_asked_for():
    lime = data("CaCO3(s) = CaO(s) + CO2")
    with pytest.raises(
        MissingDataError, match=r"CaCO3\(s\): the data hold from 273.15 to 1200 K, not at 1500 K"
    ):
        lime.ln_k(1500.0)
    assert math.isfinite(lime.ln_k(1500.0, extrapolate=True))
    assert any("CaCO3(s) extrapolated to 1500 K" in note for note in lime.notes(1500.0))
    assert not any("extrapolated" in note for note in lime.notes(1000.0))
    with pytest.raises(MissingDataError):
        lime.ln_k(math.nan)
    with pytest.raises(MissingDataError, match="CaCO3"):
        lime.ln_k_many(np.array([500.0, 1500.0]))
    with pytest.raises(MissingDataError, match="CaCO3"):
        TABLE.find("CaCO3(s)").h(1300.0)


def test_an_unknown_cp_is_no_number_and_narrows_the_range():
    ksp = data("BaSO4(s) = Ba+2(aq) + SO4-2(aq)")
    assert math.isfinite(ksp.ln_k(298.15))
    with pytest.raises(MissingDataError, match=r"Ba\+2\(aq\): no source gives its heat capacity"):
        ksp.dcp(298.15)
    with pytest.raises(MissingDataError, match=r"288\.15 to 308\.15 K"):
        ksp.ln_k(330.0)


def test_a_half_reaction_has_no_constant_of_its_own():
    with pytest.raises(InputError, match="half reaction"):
        data("Zn(s) = Zn+2(aq) + 2e-")


def test_reverse_and_double_do_what_they_must():
    shift = data("CO + H2O = CO2 + H2")
    assert data("CO2 + H2 = CO + H2O").ln_k(900.0) == pytest.approx(-shift.ln_k(900.0), rel=1e-12)
    assert data("2CO + 2H2O = 2CO2 + 2H2").ln_k(900.0) == pytest.approx(2 * shift.ln_k(900.0), rel=1e-12)


def test_many_temperatures_give_what_one_gives():
    reaction = data("CH4 + H2O = CO + 3H2")
    t = np.linspace(reaction.t_min, reaction.t_max, 333)
    one = np.array([reaction.ln_k(float(x)) for x in t])
    np.testing.assert_allclose(reaction.ln_k_many(t), one, rtol=1e-12, atol=1e-12)
    water = TABLE.find("H2O(g)")
    t = np.linspace(300.0, 3500.0, 50)
    np.testing.assert_allclose(water.h_many(t), [water.h(float(x)) for x in t], rtol=1e-12)


def test_a_phase_change_is_a_jump_of_the_enthalpy():
    sulphur = TABLE.find("S(s)")
    assert sulphur.h(368.301) - sulphur.h(368.299) == pytest.approx(0.401, abs=1e-4)


def test_liquid_and_gas_water_meet_at_the_boiling_point():
    boiling = data("H2O(l) = H2O(g)")
    low, high = 350.0, 400.0
    for _ in range(60):
        middle = (low + high) / 2
        low, high = (middle, high) if boiling.ln_k(middle) < math.log(1.01325) else (low, middle)
    assert low == pytest.approx(373.12, abs=0.5)  # IAPWS: 373.124 K; ideal gas, so half a kelvin is fair
    assert boiling.dh(373.12) == pytest.approx(40.65, abs=0.6)  # CRC Handbook: 40.65 kJ/mol, real vapour


def test_sources_and_notes_name_every_species():
    reaction = data("PCl5 = PCl3 + Cl2")
    assert len(reaction.sources()) == 3
    assert any("JANAF -360.184" in note for note in reaction.notes(500.0))
