"""Every reference case meets its bar through the worksheet functions, as cells would ask."""

from __future__ import annotations

import re

import pytest

from tests.cases.reader import FAMILIES, Case, read
from xleq.cells import CellError
from xleq.functions import call

# The letters of the made-up formulas stand for elements; any will do, as long as they are different.
_ELEMENTS = {"A": "Fe", "B": "Cl", "C": "Na", "D": "Br"}


def names_in_cells(case: Case) -> list[str]:
    """Species as a sheet would write them: made-up formulas with real elements, other names in braces."""
    names = []
    for text, phase in zip(case.problem.species, case.problem.phases, strict=True):
        bare = text.removesuffix("(s)")
        fluid = "aq" if case.problem.state.kind == "C" else "g"
        mark = fluid if phase == "fluid" else "s"
        if "random" in case.tags and re.fullmatch(r"(?:[A-D]\d*)+", bare):
            bare = re.sub("[A-D]", lambda m: _ELEMENTS[m[0]], bare)
        else:
            bare = f"{{{bare}}}"
        names.append(f"{bare}({mark})")
    return names


def reactions_in_cells(case: Case, names: list[str]) -> list[str]:
    texts = []
    for row in case.problem.nu:
        pairs = list(zip(row, names, strict=True))
        left = " + ".join(f"{-nu} {name}" for nu, name in pairs if nu < 0)
        right = " + ".join(f"{nu} {name}" for nu, name in pairs if nu > 0)
        texts.append(f"{left} = {right}")
    return texts


def amounts_through_cells(case: Case) -> tuple[float, ...]:
    problem, state = case.problem, case.problem.state
    # A species that neither reacts nor is fed is refused in a sheet, as it is most likely misspelt.
    taking_part = [any(row[i] for row in problem.nu) for i in range(len(problem.species))]
    kept = [i for i, n in enumerate(problem.n0) if n or taking_part[i]]
    names = names_in_cells(case)
    volume = state.v if state.kind == "C" else 1.0
    given = [
        [[text] for text in reactions_in_cells(case, names)],
        [[f"ln {ln_k!r}"] for ln_k in problem.ln_k],
        [[names[i]] for i in kept],
        [[problem.n0[i] / volume] for i in kept],
    ]
    if state.kind == "P":
        found = call("XLEQ_COMPOSITION_P", [*given, state.t, state.p])
    elif state.kind == "V":
        found = call("XLEQ_COMPOSITION_V", [*given, state.t, state.v])
    else:
        found = call("XLEQ_COMPOSITION_C", [*given, "moles"])
    assert not isinstance(found, CellError), found.reason
    rows = found if isinstance(found, list) else [[found]]
    n = [0.0] * len(problem.species)
    for i, (value,) in zip(kept, rows, strict=True):
        assert isinstance(value, float)
        n[i] = value * volume
    return tuple(n)


@pytest.mark.parametrize("family", FAMILIES)
def test_every_case_of_the_family_meets_its_bar_through_cells(family: str) -> None:
    missed = {}
    for case in read(family):
        if not case.is_met_by(amounts_through_cells(case)):
            missed[case.id] = max(case.errors(amounts_through_cells(case)))
    assert not missed
