"""Bases of constants against published conversions, and there and back."""

from __future__ import annotations

import csv
import math
from decimal import Decimal
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from xleq.constants import (
    STANDARD,
    concentration_size,
    ln_factor,
    ln_k_converted,
    parse_basis,
    pressure_size,
    read_k,
)
from xleq.errors import InputError, UnitError
from xleq.reactions import natural_phases
from xleq.units import ATM_BAR, R_L_BAR, R, from_default, to_default

REFERENCE = Path(__file__).parents[1] / "reference"


def rows(name: str) -> list[dict[str, str]]:
    with (REFERENCE / name).open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file, delimiter="\t", quoting=csv.QUOTE_NONE))


def half_digit(printed: str) -> float:
    exponent = Decimal(printed).as_tuple().exponent
    assert isinstance(exponent, int)
    return float(Decimal(1).scaleb(exponent)) / 2


@pytest.mark.parametrize("row", rows("kc_kp.tsv"), ids=lambda row: row["id"])
def test_kp_from_kc_is_as_printed(row: dict[str, str]) -> None:
    reaction = natural_phases(row["reaction"])
    kc, kp = parse_basis("Kc[mol/L]"), parse_basis("Kp[atm]")
    got = math.exp(ln_k_converted(read_k(row["kc"]), reaction, kc, kp, float(row["t_K"])))
    allowed = float(row["allow"] or half_digit(row["kp_atm"]))
    assert got == pytest.approx(float(row["kp_atm"]), rel=0, abs=allowed), row["source"]


CALCULATED = {
    "c098": R,
    "c099": R_L_BAR,
    "c100": R_L_BAR / ATM_BAR,
    "c101": R / 4.184,
    "c102": R * 298.15,
    "c103": R_L_BAR * 298.15,
    "c104": R_L_BAR * 298.15 / ATM_BAR,
    "c105": R * 298.15 * math.log(10.0) / 1000.0,
    "c106": R_L_BAR * 273.15,
    "c107": R_L_BAR * 273.15 / ATM_BAR,
    "c108": from_default(R_L_BAR, "psi", "pressure")
    * from_default(1.0, "ft3", "volume")
    / from_default(1.0, "lbmol", "amount")
    / 1.8,
    "c110": pressure_size("psi") * 1e5,
    "c111": math.exp(ln_factor(parse_basis("Kp[atm]"), 1.0)),
    "c112": math.exp(ln_factor(parse_basis("Kp[atm]"), -2.0)),
    "c113": -ln_factor(parse_basis("Kp[atm]"), 1.0),
}


@pytest.mark.parametrize("row", rows("constants.tsv"), ids=lambda row: row["id"])
def test_a_constant_is_as_printed(row: dict[str, str]) -> None:
    expected = float(row["printed"])
    allowed = float(row["allow"] or half_digit(row["printed"]) + 1e-15 * expected)
    assert CALCULATED[row["id"]] == pytest.approx(expected, rel=0, abs=allowed), row["source"]


def test_the_half_reaction_in_atm_is_that_of_the_full_one_in_bar() -> None:
    """JANAF (NIST SRD 13, table H-083): log10 Kf of NH3 is -0.501 at 500 K on 1 bar, so that of the full
    reaction is twice it; the half reaction's Kp in 1/atm is larger by 1.01325 (Δn = -1)."""
    full = natural_phases("N2 + 3 H2 = 2 NH3")
    half = natural_phases("1/2 N2 + 3/2 H2 = NH3")
    atm = parse_basis("Kp[atm]")
    ln_half = ln_k_converted(-0.501 * math.log(10), half, STANDARD, atm)
    ln_full = ln_k_converted(2 * -0.501 * math.log(10), full, STANDARD, atm)
    assert ln_full == pytest.approx(2 * ln_half, rel=1e-14)
    assert ln_half - -0.501 * math.log(10) == pytest.approx(math.log(1.01325), rel=1e-12)


@pytest.mark.parametrize(
    ("text", "kind", "size"),
    [
        ("K", "K", 1.0), ("K°", "K", 1.0), ("Kx", "Kx", 1.0), ("Kp[bar]", "Kp", 1.0),
        (" kp [ atm ] ", "Kp", 1.01325),
        ("Kp[kPa]", "Kp", 0.01), ("Kp[psia]", "Kp", 0.06894757293168), ("Kc[mol/L]", "Kc", 1.0),
        ("Kc[M]", "Kc", 1.0),
        ("Kc[mol/m3]", "Kc", 1e-3), ("Kc[mmol/L]", "Kc", 1e-3), ("KP[Pa]", "Kp", 1e-5),
    ],
)  # fmt: skip
def test_a_basis_is_read(text: str, kind: str, size: float) -> None:
    basis = parse_basis(text)
    assert basis.kind == kind
    assert basis.size == pytest.approx(size, rel=1e-14)
    assert parse_basis(str(basis)) == basis


@pytest.mark.parametrize(
    ("text", "error", "message"),
    [
        ("Kq", InputError, "known are K, Kp"),
        ("", InputError, "known are K, Kp"),
        ("Kp", InputError, r"write Kp\[bar\]"),
        ("Kc[]", InputError, r"write Kc\[mol/L\]"),
        ("K[bar]", InputError, "K has no unit"),
        ("Kp[barg]", UnitError, "counts from atmospheric pressure"),
        ("Kp[psig]", UnitError, "counts from atmospheric pressure"),
        ("Kp[mol/L]", UnitError, "is not a unit of pressure"),
        ("Kc[bar]", UnitError, "is not a unit of concentration"),
    ],
)
def test_a_basis_that_cannot_be_used_is_refused(text: str, error: type[Exception], message: str) -> None:
    with pytest.raises(error, match=message):
        parse_basis(text)


BASES = ["K", "Kp[bar]", "Kp[atm]", "Kp[kPa]", "Kp[psia]", "Kc[mol/L]", "Kc[mol/m3]", "Kx"]
GASES = [
    "N2 + 3 H2 = 2 NH3",
    "N2O4 = 2 NO2",
    "CO + H2O = CO2 + H2",
    "CaCO3(s) = CaO(s) + CO2",
    "C(s) + CO2 = 2 CO",
]


@given(
    st.floats(-2000, 2000), st.sampled_from(GASES), st.sampled_from(BASES), st.sampled_from(BASES),
    st.floats(100, 3000), st.floats(1e-3, 1e3),
)  # fmt: skip
def test_there_and_back_is_the_same(ln_k: float, text: str, one: str, other: str, t: float, p: float) -> None:
    reaction = natural_phases(text)
    a, b = parse_basis(one), parse_basis(other)
    there = ln_k_converted(ln_k, reaction, a, b, t, p)
    assert ln_k_converted(there, reaction, b, a, t, p) == pytest.approx(ln_k, rel=1e-13, abs=1e-11)


@given(
    st.sampled_from(["N2 + 3 H2 = 2 NH3", "N2O4 = 2 NO2"]), st.floats(200, 3000), st.floats(0.01, 500),
    st.floats(0.01, 0.99),
)  # fmt: skip
def test_the_same_composition_is_at_equilibrium_on_every_basis(
    text: str, t: float, p: float, x: float
) -> None:
    """Quotients written out from partial pressures, concentrations and fractions of one gas."""
    reaction = natural_phases(text)
    n = len(reaction.species)
    fractions = [x] + [(1 - x) / (n - 1)] * (n - 1)
    of = {
        "K": [f * p for f in fractions],
        "Kp[atm]": [f * p / 1.01325 for f in fractions],
        "Kc[mol/m3]": [1e5 * f * p / (R * t) for f in fractions],
        "Kx": fractions,
    }
    ln_q = {
        basis: sum(float(nu) * math.log(v) for nu, v in zip(reaction.nu, values, strict=True))
        for basis, values in of.items()
    }
    for basis, expected in ln_q.items():
        got = ln_k_converted(ln_q["K"], reaction, STANDARD, parse_basis(basis), t, p)
        assert got == pytest.approx(expected, rel=1e-10, abs=1e-10)


def test_solutes_follow_their_own_standard_concentration() -> None:
    reaction = natural_phases("AgCl(s) = Ag+ + Cl-")
    # CRC Handbook of Chemistry and Physics, solubility product of AgCl at 25 °C, 1.77e-10 (from memory).
    per_m3 = ln_k_converted(math.log(1.77e-10), reaction, STANDARD, parse_basis("Kc[mol/m3]"))
    assert math.exp(per_m3) == pytest.approx(1.77e-4, rel=1e-12)
    assert ln_k_converted(-5.0, reaction, STANDARD, parse_basis("Kc[mol/L]")) == -5.0
    assert ln_k_converted(-5.0, reaction, STANDARD, parse_basis("Kp[atm]")) == -5.0


def test_gas_and_solutes_together_are_each_converted_their_own_way() -> None:
    reaction = natural_phases("CO2(g) = CO2(aq)")
    t = 298.15
    # K° = (c/c°)/(p/p°): with both as concentrations it is c_aq/c_gas = K° R T (p°/c°).
    kc = ln_k_converted(math.log(0.034), reaction, STANDARD, parse_basis("Kc[mol/m3]"), t)
    assert math.exp(kc) == pytest.approx(0.034 * R_L_BAR * t, rel=1e-12)
    kp = ln_k_converted(math.log(0.034), reaction, STANDARD, parse_basis("Kp[atm]"))
    assert math.exp(kp) == pytest.approx(0.034 * 1.01325, rel=1e-12)


def test_what_a_conversion_needs_is_asked_for_only_where_it_matters() -> None:
    shift, ammonia = natural_phases(GASES[2]), natural_phases(GASES[0])
    for basis in BASES:
        assert ln_k_converted(1.5, shift, STANDARD, parse_basis(basis)) == 1.5
    with pytest.raises(InputError, match="T is needed"):
        ln_k_converted(1.5, ammonia, STANDARD, parse_basis("Kc[mol/L]"))
    with pytest.raises(InputError, match="P is needed"):
        ln_k_converted(1.5, ammonia, STANDARD, parse_basis("Kx"))
    with pytest.raises(InputError, match="solvent"):
        ln_k_converted(1.5, natural_phases("AgCl(s) = Ag+ + Cl-"), STANDARD, parse_basis("Kx"))


def test_units_of_concentration_have_a_size() -> None:
    assert concentration_size("mol/L") == 1.0
    assert to_default(1.0, "mol/m3", "concentration") == pytest.approx(1e-3, rel=1e-14)
