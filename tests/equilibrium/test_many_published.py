from __future__ import annotations

import csv
import math
from fractions import Fraction
from pathlib import Path

import numpy as np
import pytest

from xleq.equilibrium import Problem, State, solve
from xleq.units import R

with (Path(__file__).parents[1] / "reference" / "several_reactions.tsv").open(encoding="utf-8") as file:
    ROWS = {row["id"]: row for row in csv.DictReader((x for x in file if x[0] != "#"), delimiter="\t")}


def assert_as_printed(name: str, found: float) -> None:
    row = ROWS[name]
    assert found == pytest.approx(float(row["printed"]), rel=0, abs=float(row["allow"])), row["source"]


# 2 CH4 and 3 H2O at 1000 K and 1 bar; free energies of formation of the example. [J/mol]
G = {"CH4": 19720.0, "H2O": -192420.0, "CO": -200240.0, "CO2": -395790.0, "H2": 0.0}
# CH4 + H2O = CO + 3 H2, CO + H2O = CO2 + H2, and other pairs that span the same.
PAIRS = [
    ((-1, -1, 1, 0, 3), (0, -1, -1, 1, 1)),
    ((-1, -2, 0, 1, 4), (0, 1, 1, -1, -1)),
    ((-1, 0, 2, -1, 2), (-1, -1, 1, 0, 3)),
]


@pytest.mark.parametrize("pair", PAIRS)
def test_methane_and_steam_come_to_the_printed_fractions_by_whichever_reactions(pair):
    ln_k = tuple(
        -math.fsum(c * g for c, g in zip(row, G.values(), strict=True)) / (R * 1000.0) for row in pair
    )
    nu = tuple(tuple(map(Fraction, row)) for row in pair)
    problem = Problem(
        tuple(G), ("fluid",) * 5, nu, (2.0, 3.0, 0.0, 0.0, 0.0), ln_k, State("P", 1000.0, p=1.0)
    )
    n = solve(problem).require().n
    y = dict(zip(G, (x / math.fsum(n) for x in n), strict=True))
    assert_as_printed("d126", y["CH4"])
    assert_as_printed("d127", y["H2O"])
    assert_as_printed("d129", y["CO2"])
    assert_as_printed("d130", y["H2"])


class Given:
    """Fugacity coefficients that are simply given."""

    name = "given"

    def __init__(self, *phi: float) -> None:
        self.ln_phi = np.log(phi)

    def ln_gamma(self, n: np.ndarray, state: State) -> np.ndarray:
        return self.ln_phi


def test_ethylene_is_hydrated_as_far_as_printed_with_the_fugacity_coefficients_of_the_example():
    names = ("C2H4", "H2O", "C2H5OH")
    nu = (tuple(map(Fraction, (-1, -1, 1))),)
    state = State("P", 523.15, p=35.0)
    problem = Problem(
        names,
        ("fluid",) * 3,
        nu,
        (1.0, 5.0, 0.0),
        (math.log(10.02e-3),),
        state,
        model=Given(0.977, 0.887, 0.827),
    )
    assert_as_printed("d121", 1.0 - solve(problem).require().n[0])
