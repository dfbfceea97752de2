"""Whatever stands in the cells, a worksheet function gives values or an error with its reason."""

from __future__ import annotations

import math
import random
import re

import pytest

from xleq.cells import BLANK, MISSING, Blank, CellError
from xleq.functions import TABLE, call

REACTIONS = [
    "N2 + 3 H2 = 2 NH3", "CO + H2O = CO2 + H2", "CaCO3(s) = CaO(s) + CO2", "AgCl(s) = Ag+ + Cl-",
    "CO2(g) = CO2(aq)", "NH3 + H2O = NH4+ + OH-", "H2O = H+ + OH-", "C(s) + CO2 = 2 CO",
    "CH3COOH + C2H5OH = CH3COOC2H5 + H2O",
]  # fmt: skip
SPECIES = ["N2", "H2O", "H2O(l)", "C", "C(s)", "{tar}(g)", "", "Ag+", "e-", "S8", "Ar", "X?"]
NUMBERS = [0.0, 1.0, -1.0, 0.1, 1e-300, 1e300, 298.15, 1000.0, 2.0**60]
TEXTS = [
    "data", "fit", "ln -500", "log10 -60", "450 degC", "30 barg", ";", ";;", "x=y", "moles", "table", "T",
    "gas=PR", "activity=davies", "open=CO2 1 atm", "basis=Kc[mol/L]", "-20; 6000", "1; 0; 0",
]  # fmt: skip
OPTIONS = ["", "", "gas=PR", "gas=virial", "activity=davies", "activity=debye-huckel", "basis=Kp[atm]",
           "extrapolate=yes", "open=CO2 1 atm"]  # fmt: skip
WANTS = [
    "moles", "fractions", "table", "pressures", "concentrations", "state", "residual", "extents", "total",
    "conversion", "change", "T", "fractions H2", "moles CO2",
]  # fmt: skip
BLOCKS = [
    [["species", "dHf"], ["CO2", -390.0]], [["x"]],
    [["species", "Tc", "Pc", "omega", "kij N2"], ["NH3", 400.0, 110.0, 0.25, 0.1]],
]  # fmt: skip


class Sheet:
    """Cells at random: mostly what fits, sometimes anything."""

    def __init__(self, seed: int) -> None:
        self.random = random.Random(seed)
        chosen = self.random.sample(REACTIONS, self.random.choice([1, 1, 2]))
        species: list[str] = []
        for text in chosen:
            for part in re.split(r" \+ | = ", text):
                name = re.sub(r"^\d+ ", "", part.strip())
                if name not in species:
                    species.append(name)
        if self.random.random() < 0.3:
            species.append(self.random.choice(SPECIES))
        self.reactions, self.species = "; ".join(chosen), "; ".join(species)
        self.amounts = [[self.random.choice([0.0, 1.0, 0.1, BLANK, 1e-8])] for _ in species]

    def anything(self):
        return self.random.choice(
            [
                *NUMBERS,
                *TEXTS,
                MISSING,
                BLANK,
                True,
                "",
                CellError("#N/A"),
                [[1.0, "a"], [BLANK, 2.0]],
                [[1.0]],
            ]
        )

    def argument(self, a):
        if self.random.random() < 0.1:
            return self.anything()
        by_name = {
            "reactions": self.reactions, "reaction": self.reactions.split("; ")[0],
            "feed": self.amounts, "initial": self.amounts, "amounts": self.amounts,
            "concentrations": self.amounts, "data": self.random.choice([MISSING, MISSING, MISSING, *BLOCKS]),
            "K": self.random.choice(["data", 1.0, "ln -5", "-20; 6000", [["data"]] * 2, [[1.0], [2.0]]]),
            "species": self.species if a.kind == "texts" else self.random.choice(SPECIES),
        }  # fmt: skip
        by_kind = {
            "temperature": [298.15, 700.0, 1250.0, "450 degC"], "pressure": [1.0, 100.0, "30 barg", 1e-6],
            "volume": [1.0, 0.01, 100.0], "options": OPTIONS, "want": WANTS, "word": [*a.known, "x"],
        }  # fmt: skip
        if a.name in by_name:
            return by_name[a.name]
        return self.random.choice(by_kind.get(a.kind, [*NUMBERS, *TEXTS]))


def is_cell_value(value) -> bool:
    return isinstance(value, str | bool | Blank | CellError) or (
        isinstance(value, float) and math.isfinite(value)
    )


@pytest.mark.parametrize("function", TABLE.values(), ids=lambda f: f.name)
def test_no_cells_bring_a_function_down(function) -> None:
    searches = function.name in ("XLEQ_T_FOR", "XLEQ_P_FOR", "XLEQ_ADIABATIC")
    answered = 0
    for seed in range(25 if searches else 150):
        sheet = Sheet(seed)
        given = [sheet.argument(a) for a in function.arguments]
        found = call(function.name, given)
        values = [v for row in found for v in row] if isinstance(found, list) else [found]
        assert all(map(is_cell_value, values)), (given, found)
        if isinstance(found, CellError) and not any(isinstance(g, CellError) for g in given):
            assert found.reason.startswith(f"{function.name}: "), given
        answered += not isinstance(found, CellError)
    # What is drawn must not be so wild that nothing is ever computed.
    assert answered or not function.name.startswith("XLEQ_COMPOSITION")
