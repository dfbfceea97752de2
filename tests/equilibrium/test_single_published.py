from __future__ import annotations

import csv
import math
from fractions import Fraction
from pathlib import Path

import pytest

from xleq.equilibrium import Problem, State, solve
from xleq.units import ATM_BAR

with (Path(__file__).parents[1] / "reference" / "single_reactions.tsv").open(encoding="utf-8") as lines:
    ROWS = list(csv.DictReader(lines, delimiter="\t"))

#: log10 K° (1 bar) of N2 + 3 H2 = 2 NH3 at 700 and 800 K: ATcT 1.112 enthalpies, NIST WebBook entropies,
#: TRC heat capacities as the package chemicals 1.5.2 carries them. (JANAF's are higher by 0.05, which
#: would make 6 % more ammonia than was measured at 10 atm.)
AMMONIA = {700.0: -4.1101, 800.0: -5.0947}


def ln_k_of_ammonia(t: float) -> float:
    """Linear in 1/T between the two."""
    (t1, k1), (t2, k2) = AMMONIA.items()
    return math.log(10.0) * (k1 + (k2 - k1) * (1.0 / t - 1.0 / t1) / (1.0 / t2 - 1.0 / t1))


@pytest.mark.parametrize("row", ROWS, ids=lambda row: row["id"])
def test_a_published_composition_is_found(row):
    species = tuple(row["species"].split())
    nu = tuple(Fraction(x) for x in row["nu"].split())
    t, feed = float(row["t_K"]), tuple(map(float, row["feed"].split()))
    ln_k = ln_k_of_ammonia(t) if row["k"] == "data" else math.log(float(row["k"]))
    if row["p0"] == "atm":
        ln_k += float(sum(nu)) * math.log(ATM_BAR)
    state = State("P", t, p=float(row["p_bar"]))
    n = solve(Problem(species, ("fluid",) * len(species), (nu,), feed, (ln_k,), state)).require().n
    quantity, name = row["quantity"].split()
    i = species.index(name)
    found = 100.0 * n[i] / sum(n) if quantity == "percent" else 1.0 - n[i] / feed[i]
    assert found == pytest.approx(float(row["published"]), rel=0, abs=float(row["tolerance"])), row["source"]


def test_esterification_of_an_equimolar_liquid():
    # Smith, Van Ness & Abbott, 7th ed. 2005, Ex. 13.8 (from memory): K = 4.8586 at 100 degC, ester 0.344.
    nu = ((Fraction(-1), Fraction(-1), Fraction(1), Fraction(1)),)
    names = ("CH3COOH", "C2H5OH", "CH3COOC2H5", "H2O")
    problem = Problem(names, ("fluid",) * 4, nu, (1.0, 1.0, 0.0, 0.0), (math.log(4.8586),), State("X"))
    n = solve(problem).require().n
    assert n[2] / sum(n) == pytest.approx(0.344, abs=0.0005)


def test_methane_and_steam_at_1000_k():
    # Smith, Van Ness & Abbott, 7th ed. 2005, Ex. 13.14 (from memory): free energies of formation [J/mol],
    # mole fractions printed to four digits; the example works with R = 8.314.
    g = {"CH4": 19720.0, "H2O": -192420.0, "CO": -200240.0, "CO2": -395790.0, "H2": 0.0}
    names = tuple(g)
    rows = ((-1, -1, 1, 0, 3), (0, -1, -1, 1, 1))
    ln_k = tuple(-sum(c * x for c, x in zip(row, g.values(), strict=True)) / 8314.0 for row in rows)
    nu = tuple(tuple(map(Fraction, row)) for row in rows)
    problem = Problem(names, ("fluid",) * 5, nu, (2.0, 3.0, 0.0, 0.0, 0.0), ln_k, State("P", 1000.0, p=1.0))
    n = solve(problem).require().n
    printed = {"CH4": 0.0196, "H2O": 0.0980, "CO2": 0.0371, "H2": 0.6711}
    for name, fraction in printed.items():
        assert n[names.index(name)] / sum(n) == pytest.approx(fraction, abs=0.0003), name
