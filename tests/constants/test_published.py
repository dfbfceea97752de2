"""Published correlations and energies, through the functions that take them."""

from __future__ import annotations

import csv
import math
from pathlib import Path

import pytest

from xleq.constants import STANDARD, Fit, ln_k_converted, ln_k_from_dg, ln_k_from_fit, parse_basis
from xleq.reactions import natural_phases

TABLE = Path(__file__).parents[1] / "reference" / "correlations.tsv"
with TABLE.open(encoding="utf-8", newline="") as file:
    ROWS = list(csv.DictReader(file, delimiter="\t", quoting=csv.QUOTE_NONE))

#: log10 K° of the same reactions from NIST-JANAF, 4th ed. (1998), on 1 bar.
JANAF = {
    "d200": 2.139, "d203": 0.158, "d205": -1.509, "d206": 1.419, "d207": 3.391, "d208": 0.975, "d209": 0.626,
    "d210": 0.158, "d220": -2.139, "d221": 2.456, "d222": 1.537,
}  # fmt: skip


def correlation(row: dict[str, str]) -> float:
    return ln_k_from_fit(Fit((float(row["a"]), float(row["b_K"]))), float(row["t_K"]))


@pytest.mark.parametrize("row", ROWS, ids=lambda row: row["id"])
def test_a_published_correlation_gives_its_value(row: dict[str, str]) -> None:
    got = correlation(row) / math.log(10)
    assert got == pytest.approx(float(row["log10_k"]), rel=0, abs=float(row["half_digit"])), row["source"]


@pytest.mark.parametrize("row", [r for r in ROWS if r["id"] in JANAF], ids=lambda row: row["id"])
def test_a_published_correlation_agrees_with_the_tables_on_one_basis(row: dict[str, str]) -> None:
    """Within 0.06 in log10 K, what good sources differ by."""
    reaction = natural_phases(row["reaction"])
    ln_k = ln_k_converted(correlation(row), reaction, parse_basis(row["basis"]), STANDARD)
    assert ln_k / math.log(10) == pytest.approx(JANAF[row["id"]], abs=0.06)


@pytest.mark.parametrize(
    ("dh", "ds", "pk", "allowed"),
    [
        (55.815, -80.85, 14.0015, 0.01),  # H2O(l) = H+ + OH-: -230.015 + 285.830; -10.90 - 69.95
        (65.72, 33.80, 9.748, 0.03),  # AgCl(s) = Ag+ + Cl-: 105.79 - 167.08 + 127.01; 73.45 + 56.60 - 96.25
    ],
)
def test_ionic_constants_follow_from_key_values(dh: float, ds: float, pk: float, allowed: float) -> None:
    """Cox, Wagman and Medvedev, CODATA Key Values for Thermodynamics, 1989; pK at 25 °C."""
    dg = dh - 298.15 * ds / 1000.0
    assert -ln_k_from_dg(dg, 298.15) / math.log(10) == pytest.approx(pk, abs=allowed)


@pytest.mark.parametrize(
    ("reaction", "ln_shift"),
    [("SO2 + 1/2 O2 = SO3", -0.5), ("N2O4 = 2 NO2", 1.0), ("CH4 + H2O = CO + 3 H2", 2.0)],
)
def test_a_constant_in_atm_is_not_that_in_bar(reaction: str, ln_shift: float) -> None:
    """1 atm is 1.01325 bar exactly (10th CGPM, 1954): K in bar is K in atm times 1.01325^Δn."""
    got = ln_k_converted(0.0, natural_phases(reaction), parse_basis("Kp[atm]"), parse_basis("Kp[bar]"))
    assert got == pytest.approx(ln_shift * math.log(1.01325), rel=1e-12)
