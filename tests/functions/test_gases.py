"""Gases through the worksheet functions: real-gas models, constants from data and fits, answers backwards."""

from __future__ import annotations

import math

import pytest

from xleq.cells import BLANK, MISSING, CellError
from xleq.functions import call, call_with_notes

AMMONIA = ("N2 + 3 H2 = 2 NH3", "data", "N2; H2; NH3", "1; 3; 0")
SHIFT = ("CO + H2O = CO2 + H2", "data", "CO; H2O; CO2; H2", "1; 2; 0; 0.5")
REFORMING = (
    "CH4 + H2O = CO + 3 H2; CO + H2O = CO2 + H2", "data", "CH4; H2O; CO; CO2; H2", "1; 3; 0; 0; 0.2",
)  # fmt: skip


def at_p(given, t, p, want=MISSING, options="", data=MISSING):
    return call("XLEQ_COMPOSITION_P", [*given, t, p, want, options, data])


def at_v(given, t, v, want=MISSING, options="", data=MISSING):
    return call("XLEQ_COMPOSITION_V", [*given, t, v, want, options, data])


def column(found) -> list[float]:
    assert isinstance(found, list), (found, getattr(found, "reason", ""))
    return [row[0] for row in found]


def reason(found) -> str:
    assert isinstance(found, CellError), found
    return f"{found.code} {found.reason}"


class TestRealGas:
    @pytest.mark.parametrize(("options", "t", "v"), [("gas=PR", 700.0, 0.6), ("gas=virial", 700.0, 2.5)])
    def test_the_same_gas_at_given_volume_and_at_the_pressure_that_it_has(self, options, t, v) -> None:
        pressure = sum(column(at_v(AMMONIA, t, v, "pressures", options)))
        assert column(at_v(AMMONIA, t, v, "moles", options)) == pytest.approx(
            column(at_p(AMMONIA, t, pressure, "moles", options)), rel=1e-9
        )
        ideal = sum(column(at_v(AMMONIA, t, v, "pressures")))
        assert pressure != pytest.approx(ideal, rel=0.01)

    def test_partial_pressures_are_fractions_of_the_real_pressure(self) -> None:
        y = column(at_v(AMMONIA, 700.0, 0.6, "fractions", "gas=PR"))
        p = column(at_v(AMMONIA, 700.0, 0.6, "pressures", "gas=PR"))
        assert [x / p[0] for x in p] == pytest.approx([x / y[0] for x in y], rel=1e-12)

    def test_the_fugacities_are_at_equilibrium(self) -> None:
        y = at_p(AMMONIA, 723.15, 300.0, "fractions", "gas=PR")
        phi = column(call("XLEQ_FUGACITY_COEFFICIENT", [AMMONIA[2], y, 723.15, 300.0]))
        a = [x * f * 300.0 for x, f in zip(column(y), phi, strict=True)]
        k = call("XLEQ_K_DATA", [AMMONIA[0], 723.15])
        assert a[2] ** 2 / (a[0] * a[1] ** 3) == pytest.approx(k, rel=1e-9)

    def test_ethylene_is_hydrated_as_published(self) -> None:
        # Smith, Van Ness and Abbott, 7th ed., 2005, ex. 13.6: K = 10.02E-3, φ of the pure gases 0.977, 0.887,
        # 0.827, conversion 0.233 (from memory). Those φ go into K; the mixture's own virial φ lie near them.
        given = ("C2H4 + H2O = C2H5OH", 10.02e-3 * 0.977 * 0.887 / 0.827, "C2H4; H2O; C2H5OH", "1; 5; 0")
        assert at_p(given, 523.15, 35.0, "conversion C2H4") == pytest.approx(0.233, abs=0.001)
        real = (given[0], 10.02e-3, *given[2:])
        assert at_p(real, 523.15, 35.0, "conversion C2H4", "gas=virial") == pytest.approx(0.233, abs=0.01)
        assert at_p(real, 523.15, 35.0, "conversion C2H4", "gas=PR") == pytest.approx(0.233, abs=0.015)

    def test_a_published_fugacity_coefficient_is_given_with_its_own_constants(self) -> None:
        # Pure NH3 at 673.15 K and 200 bar with Tc 405.7, Pc 112.8, ω 0.253: the equation of Peng and
        # Robinson, Ind. Eng. Chem. Fundam. 15 (1976) 59, evaluated apart to 0.919860.
        data = [["species", "Tc", "Pc", "omega"], ["NH3", 405.7, 112.8, 0.253]]
        phi = call("XLEQ_FUGACITY_COEFFICIENT", ["NH3", 1.0, "400 degC", 200.0, data])
        assert phi == pytest.approx(0.919860, abs=1e-5)

    def test_kij_come_from_the_data_range(self) -> None:
        data = [["species", "kij N2", "kij H2"], ["NH3", 0.2193, BLANK], ["H2", 0.103, BLANK]]
        plain = call("XLEQ_FUGACITY_COEFFICIENT", [AMMONIA[2], "0.2; 0.6; 0.2", 700.0, 300.0])
        with_kij = call("XLEQ_FUGACITY_COEFFICIENT", [AMMONIA[2], "0.2; 0.6; 0.2", 700.0, 300.0, data])
        assert column(with_kij)[0] > column(plain)[0] * 1.005
        y = at_p(AMMONIA, 723.15, 300.0, "fractions", "gas=PR", data)
        phi = column(call("XLEQ_FUGACITY_COEFFICIENT", [AMMONIA[2], y, 723.15, 300.0, data]))
        a = [x * f * 300.0 for x, f in zip(column(y), phi, strict=True)]
        assert a[2] ** 2 / (a[0] * a[1] ** 3) == pytest.approx(
            call("XLEQ_K_DATA", [AMMONIA[0], 723.15]), rel=1e-9
        )

    def test_the_root_that_was_taken_is_told(self) -> None:
        _, notes = call_with_notes("XLEQ_COMPOSITION_P", [*AMMONIA, 723.15, 300.0, MISSING, "gas=PR"])
        assert any("Peng-Robinson (1976), p = 300 bar: one root, Z =" in note for note in notes)

    def test_a_solid_stands_beside_a_real_gas(self) -> None:
        given = ("CaCO3(s) = CaO(s) + CO2", "data", "CaCO3(s); CaO(s); CO2; N2", "1; 0; 0; 1")
        ideal, real = (at_p(given, 1150.0, 30.0, "fractions CO2", o) for o in ("", "gas=PR"))
        assert real == pytest.approx(ideal, rel=0.05)
        assert real != ideal

    @pytest.mark.parametrize(
        ("given", "options", "said"),
        [
            (("N2O3 = NO + NO2", "data", "N2O3; NO; NO2", "1; 0; 0"), "gas=PR",
             "#N/A XLEQ_COMPOSITION_P: no critical constants of N2O3(g); give Tc, Pc and omega"),
            (AMMONIA, "gas=virial", "#NUM! XLEQ_COMPOSITION_P: the virial equation holds up to about"),
            (AMMONIA, "gas=SRK", "option gas=SRK is not known; known are ideal, PR, virial"),
            (AMMONIA, "activity=davies", "there is no option 'activity' here"),
            (AMMONIA, "basis=Kp[atm]", "constants from formation data are K°; leave the option basis away"),
            ((AMMONIA[0], 1e-4, *AMMONIA[2:]), "extrapolate=yes", "K is not data here"),
        ],
    )  # fmt: skip
    def test_what_a_model_does_not_reach_is_refused(self, given, options, said) -> None:
        assert said in reason(at_p(given, 723.15, 600.0, MISSING, options))

    @pytest.mark.parametrize(
        ("species", "fractions", "said"),
        [
            ("N2; H2", "0.5; 0.6", "#VALUE! XLEQ_FUGACITY_COEFFICIENT: the fractions sum to 1.1"),
            ("N2; H2", "1.5; -0.5", "#NUM! XLEQ_FUGACITY_COEFFICIENT: fractions: item 2 is -0.5"),
            ("N2; H2", "1", "2 species but 1 fractions"),
            ("N2; NaCl(s)", "0.5; 0.5", "NaCl(s) is not a gas"),
            ("N2; OH", "0.5; 0.5", "#N/A XLEQ_FUGACITY_COEFFICIENT: no critical constants of OH(g)"),
        ],
    )
    def test_what_no_mixture_is_has_no_fugacity_coefficient(self, species, fractions, said) -> None:
        assert said in reason(call("XLEQ_FUGACITY_COEFFICIENT", [species, fractions, 700.0, 100.0]))


ATM = "basis=Kp[atm]"
PUBLISHED = [
    # Verhoek and Daniels, J. Am. Chem. Soc. 53 (1931) 1250: 0.1855 (from memory); K from data is 3 % lower.
    (("N2O4 = 2 NO2", "data", "N2O4; NO2", "1; 0"), 298.15, "1 atm", "conversion N2O4", "", 0.1855, 0.004),
    (("N2O4 = 2 NO2", 0.1426, "N2O4; NO2", "1; 0"), 298.15, "1 atm", "conversion N2O4", ATM, 0.1855, 0.0001),
    # General chemistry textbooks (from memory): Kp 1.78 atm at 250 °C.
    (("PCl5 = PCl3 + Cl2", 1.78, "PCl5; PCl3; Cl2", "1; 0; 0"), 523.0, "1 atm", "conversion PCl5", ATM, 0.800,
     0.001),
    # NIST-JANAF constants, 7 SO2 / 11 O2 / 82 N2 at 900 K: 0.6671.
    (("SO2 + 1/2 O2 = SO3", "data", "SO2; O2; N2; SO3", "7; 11; 82; 0"), 900.0, "1 atm", "conversion SO2", "",
     0.6671, 0.002),
]  # fmt: skip


@pytest.mark.parametrize(("given", "t", "p", "want", "options", "published", "allow"), PUBLISHED)
def test_a_published_composition_is_found(given, t, p, want, options, published, allow) -> None:
    assert at_p(given, t, p, want, options) == pytest.approx(published, abs=allow)


def test_methane_and_steam_at_1000_k_are_as_published() -> None:
    # Smith, Van Ness and Abbott, 7th ed., 2005, ex. 13.14 (from memory): ΔfG at 1000 K, fractions.
    ch4, h2o, co, co2 = 19720.0, -192420.0, -200240.0, -395790.0
    k = [[call("XLEQ_K_FROM_DG", [f"{dg!r} J/mol", 1000.0])] for dg in (co - ch4 - h2o, co2 - co - h2o)]
    y = column(at_p((REFORMING[0], k, REFORMING[2], "2; 3; 0; 0; 0"), 1000.0, 1.0, "fractions"))
    assert y == pytest.approx([0.0196, 0.0980, 0.1743, 0.0371, 0.6711], abs=0.0003)


def test_an_ester_is_made_as_published() -> None:
    # The same, ex. 13.8: K 4.8586 at 100 °C, mole fraction of ethyl acetate 0.344 (from memory).
    given = ["CH3COOH + C2H5OH = CH3COOC2H5 + H2O", 4.8586, "CH3COOH; C2H5OH; CH3COOC2H5; H2O", "1; 1; 0; 0"]
    found = call("XLEQ_COMPOSITION_X", [*given, "fractions CH3COOC2H5"])
    assert found == pytest.approx(0.344, abs=0.001)


class TestConstants:
    def test_data_may_stand_in_every_cell_of_k(self) -> None:
        reactions = [[text] for text in REFORMING[0].split("; ")]
        both = at_p((reactions, [["data"], ["data"], [BLANK]], *REFORMING[2:]), 1100.0, 25.0)
        assert both == at_p(REFORMING, 1100.0, 25.0)

    def test_a_range_of_constants_may_be_drawn_longer_than_its_list(self) -> None:
        given = ([[SHIFT[0]], [BLANK]], [[1.0], [BLANK]], *SHIFT[2:])
        assert at_p(given, 1100.0, 1.0) == at_p((SHIFT[0], 1.0, *SHIFT[2:]), 1100.0, 1.0)

    def test_the_users_data_move_k_by_their_gibbs_energy(self) -> None:
        data = [["species", "dHf"], ["CO2", -394.474]]
        there, here = (call("XLEQ_REACTION", [SHIFT[0], "lnK", 1000.0, d]) for d in (data, MISSING))
        assert there - here == pytest.approx(1.0 / (8.31446261815324e-3 * 1000.0), rel=1e-9)
        same = (SHIFT[0], f"ln {there!r}", *SHIFT[2:])
        found = column(at_p(SHIFT, 1000.0, 1.0, MISSING, "", data))
        assert found == pytest.approx(column(at_p(same, 1000.0, 1.0)), rel=1e-9)

    def test_outside_the_data_is_no_number_unless_extrapolated_and_said(self) -> None:
        given = ("CaCO3(s) = CaO(s) + CO2", "data", "CaCO3(s); CaO(s); CO2; N2", "1; 0; 0; 1")
        said = "CaCO3(s): the data hold from 273.15 to 1200 K, not at 1250 K"
        assert f"#N/A XLEQ_COMPOSITION_P: {said}" in reason(at_p(given, 1250.0, 1.0))
        assert f"#N/A XLEQ_K_DATA: {said}" in reason(call("XLEQ_K_DATA", [given[0], 1250.0]))
        value, notes = call_with_notes(
            "XLEQ_COMPOSITION_P", [*given, 1250.0, 1.0, "moles", "extrapolate=yes"]
        )
        assert column(value)[0] == 0.0
        assert "CaCO3(s) extrapolated to 1250 K: its data hold from 273.15 to 1200 K" in notes


def test_a_conversion_that_no_cell_can_hold_is_left_empty() -> None:
    given = ("H2O = H2 + 1/2 O2", 0.01, "H2O; H2; O2", "1E10; 1E-300; 0")
    assert at_p(given, 700.0, 1.0, "conversion")[1:] == [[""], [""]]
    assert "next to nothing beside its change" in reason(at_p(given, 700.0, 1.0, "conversion H2"))


class TestBackwards:
    def test_the_temperature_of_a_composition_is_found_again(self) -> None:
        x = at_p(REFORMING, 1083.0, 25.0, "conversion CH4")
        found = call("XLEQ_T_FOR", [*REFORMING, 25.0, "conversion CH4", x])
        assert found == pytest.approx(1083.0, abs=1e-6)

    def test_the_search_keeps_to_the_range_of_the_data(self) -> None:
        given = ("CaCO3(s) = CaO(s) + CO2", "data", "CaCO3(s); CaO(s); CO2; N2", "1; 0; 0; 1")
        value, notes = call_with_notes("XLEQ_T_FOR", [*given, 1.0, "conversion CaCO3", 0.5])
        assert at_p(given, value, 1.0, "conversion CaCO3") == pytest.approx(0.5, rel=1e-8)
        assert "searched from 300 to 1200 K only, where K is known" in notes
        nowhere = call("XLEQ_T_FOR", [*given, 1.0, "conversion CaCO3", 0.5, 1300.0, 1400.0])
        assert "#N/A XLEQ_T_FOR: K is known from 273.15 to 1200 K, nowhere from 1300" in reason(nowhere)

    def test_the_temperature_follows_a_fit_in_its_range(self) -> None:
        t = [[600.0], [700.0], [800.0], [900.0]]
        k = [[call("XLEQ_K_DATA", [AMMONIA[0], row[0]])] for row in t]
        block = call("XLEQ_K_FIT", [t, k, 3.0])
        x = at_p(AMMONIA, 735.0, 150.0, "fractions NH3")
        found = call("XLEQ_T_FOR", [AMMONIA[0], block, *AMMONIA[2:], 150.0, "fractions NH3", x])
        assert found == pytest.approx(735.0, abs=0.2)
        cold = call("XLEQ_T_FOR", [AMMONIA[0], block, *AMMONIA[2:], 150.0, "fractions NH3", 0.9])
        assert "#NUM! XLEQ_T_FOR: no temperature from 600 to 900 K gives 0.9" in reason(cold)

    def test_a_plain_number_has_no_temperature(self) -> None:
        found = call("XLEQ_T_FOR", [SHIFT[0], 1.0, *SHIFT[2:], 1.0, "conversion CO", 0.5])
        assert "#VALUE! XLEQ_T_FOR: K is a plain number, whose change with T is not known" in reason(found)

    def test_the_pressure_of_a_composition_is_found_again(self) -> None:
        x = at_p(AMMONIA, 700.0, 87.0, "fractions NH3")
        assert call("XLEQ_P_FOR", [*AMMONIA, 700.0, "fractions NH3", x]) == pytest.approx(87.0, rel=1e-8)
        assert "P_FOR: target moles is not one number" in reason(
            call("XLEQ_P_FOR", [*AMMONIA, 700.0, "moles", x])
        )

    @pytest.mark.parametrize("t", [600.0, 900.0, 1300.0])
    def test_a_gas_at_equilibrium_has_no_approach(self, t) -> None:
        n = at_p(SHIFT, t, 20.0)
        assert call("XLEQ_APPROACH", [SHIFT[0], SHIFT[2], n, t, 20.0]) == pytest.approx(0.0, abs=1e-6)
        # Measured 15 K above: the sign is as written.
        assert call("XLEQ_APPROACH", [SHIFT[0], SHIFT[2], n, t + 15.0, 20.0]) == pytest.approx(15.0, abs=1e-6)

    @pytest.mark.parametrize(
        ("amounts", "said"),
        [
            ("1; 1; 1", "4 species but 3 amounts"),
            ("1; 1; 1; 0", "#NUM! XLEQ_APPROACH: a product has no amount"),
            ("0; 1; 1; 1", "#NUM! XLEQ_APPROACH: CO is absent"),
            ("1E-9; 1E-9; 1; 1", "#NUM! XLEQ_APPROACH: no temperature from 200 to 3000 K gives"),
        ],
    )
    def test_an_approach_that_cannot_be_told_is_refused(self, amounts, said) -> None:
        assert said in reason(call("XLEQ_APPROACH", [SHIFT[0], SHIFT[2], amounts, 700.0, 20.0]))


class TestSensitivity:
    @pytest.mark.parametrize("given", [SHIFT, AMMONIA, REFORMING], ids=["shift", "ammonia", "reforming"])
    def test_changes_with_t_and_p_are_those_of_the_composition(self, given) -> None:
        t, p = 950.0, 20.0
        by_t = column(call("XLEQ_SENSITIVITY", [*given, t, p, "T"]))
        by_p = column(call("XLEQ_SENSITIVITY", [*given, t, p, "P"]))
        up, down = (column(at_p(given, t + d, p)) for d in (0.05, -0.05))
        assert by_t == pytest.approx(
            [(a - b) / 0.1 for a, b in zip(up, down, strict=True)], rel=1e-5, abs=1e-12
        )
        up, down = (column(at_p(given, t, p + d)) for d in (0.005, -0.005))
        assert by_p == pytest.approx(
            [(a - b) / 0.01 for a, b in zip(up, down, strict=True)], rel=1e-5, abs=1e-9
        )

    def test_it_follows_the_slope_of_a_fit(self) -> None:
        given = ("N2O4 = 2 NO2", "20.5; -6700", "N2O4; NO2", "1; 0")
        dk, by_t = (column(call("XLEQ_SENSITIVITY", [*given, 330.0, 1.0, to])) for to in ("lnK", "T"))
        assert by_t == pytest.approx([x * 6700 / 330.0**2 for x in dk], rel=1e-12)

    def test_what_has_no_derivative_is_left_empty(self) -> None:
        given = ("N2 + 3 H2 = 2 NH3", 1.0, "N2; H2; NH3; Ar", "1; 0; 0; 1")
        block = call("XLEQ_SENSITIVITY", [*given, 700.0, 1.0, "feed"])
        assert [row[1] for row in block] == [""] * 4
        assert [row[0] for row in block] == [1.0, 0.0, 0.0, 0.0]

    def test_a_plain_number_has_no_slope(self) -> None:
        found = call("XLEQ_SENSITIVITY", [SHIFT[0], 1.0, *SHIFT[2:], 1000.0, 1.0, "T"])
        assert "K is a plain number, whose change with T is not known" in reason(found)


class TestUncertainty:
    T = ((600.0,), (650.0,), (700.0,), (750.0,), (800.0,))

    def block(self, slope: float = 11000.0):
        noise = (0.01, -0.02, 0.015, 0.004, -0.012)
        k = [[f"ln {-25.0 + slope / row[0] + e!r}"] for row, e in zip(self.T, noise, strict=True)]
        return call("XLEQ_K_FIT", [[list(row) for row in self.T], k])

    def u_ln_k(self, block, t: float) -> float:
        (aa, ab), (_, bb) = block[1][4:6], block[2][4:6]
        return math.sqrt(aa + 2.0 * ab / t + bb / (t * t))

    def test_the_covariance_of_the_fit_is_used(self) -> None:
        block, t = self.block(), 710.0
        given = [AMMONIA[0], block, "fit", *AMMONIA[2:], t, 150.0]
        u = column(call("XLEQ_UNCERTAINTY", given))
        dn = column(call("XLEQ_SENSITIVITY", [AMMONIA[0], block, *AMMONIA[2:], t, 150.0]))
        assert u == pytest.approx([abs(x) * self.u_ln_k(block, t) for x in dn], rel=1e-9)
        # Without the covariance between a and b it would be far larger.
        independent = math.sqrt(block[1][4] + block[2][5] / t**2)
        assert self.u_ln_k(block, t) < independent / 5

    def test_blocks_of_several_reactions_stand_one_below_the_other(self) -> None:
        first, second = self.block(-20000.0), self.block(15000.0)
        empty = [[BLANK] * 6]
        both = [REFORMING[0], [*first, *empty, *second, *empty], "fit", *REFORMING[2:], 710.0, 10.0]
        u = column(call("XLEQ_UNCERTAINTY", both))
        each = f"{self.u_ln_k(first, 710.0)!r}; {self.u_ln_k(second, 710.0)!r}"
        lists = [[row[1] for row in block[1:3]] for block in (first, second)]
        same = [REFORMING[0], lists, each, *REFORMING[2:], 710.0, 10.0]
        assert u == pytest.approx(column(call("XLEQ_UNCERTAINTY", same)), rel=1e-9)

    def test_temperature_and_pressure_add_in_squares(self) -> None:
        point = (1000.0, 20.0)
        u = column(call("XLEQ_UNCERTAINTY", [*REFORMING[:2], "0; 0", *REFORMING[2:], *point, "2 degC", 0.1]))
        by_t = column(call("XLEQ_SENSITIVITY", [*REFORMING, *point, "T"]))
        by_p = column(call("XLEQ_SENSITIVITY", [*REFORMING, *point, "P"]))
        expected = [math.hypot(2.0 * a, 0.1 * b) for a, b in zip(by_t, by_p, strict=True)]
        assert u == pytest.approx(expected, rel=1e-9)

    @pytest.mark.parametrize(
        ("k", "u", "said"),
        [
            ("data", "fit", "u_lnK is fit, but K holds no fit"),
            (1.0, "fit", "u_lnK is fit, but K holds no fit"),
            ("-25; 11000", "fit", "the covariance of this fit is not known"),
            (1.0, "0.1; 0.2", "1 reactions but 2 values of u_lnK"),
            (1.0, -0.1, "a standard uncertainty of ln K is not a number, at least 0"),
        ],
    )
    def test_an_uncertainty_that_is_none_is_refused(self, k, u, said) -> None:
        found = call("XLEQ_UNCERTAINTY", [AMMONIA[0], k, u, *AMMONIA[2:], 700.0, 100.0])
        assert said in reason(found)
