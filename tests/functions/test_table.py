"""The table of worksheet functions agrees with its definitions and with itself."""

from __future__ import annotations

import math
import re

import pytest

from xleq.cells import CellError
from xleq.functions import TABLE
from xleq.functions.arguments import READERS
from xleq.functions.table import Function
from xleq.hosts.headless import evaluate_formula

FUNCTIONS = list(TABLE.values())
EXAMPLES = [(f, e) for f in FUNCTIONS for e in f.examples]

# The contract: every function of the design, with its arguments, optional ones in brackets.
SYNTAX = """
XLEQ_BALANCE(reaction)
XLEQ_EXPRESSION(reaction, [basis])
XLEQ_GAS_CHANGE(reaction)
XLEQ_COEFFICIENT(reaction, species)
XLEQ_COMBINE(reactions, multipliers)
XLEQ_MULTIPLIERS(target, reactions)
XLEQ_MOLAR_MASS(formula)
XLEQ_KP(Kc, reaction, T, [pressure_unit], [concentration_unit])
XLEQ_KC(Kp, reaction, T, [pressure_unit], [concentration_unit])
XLEQ_K_CONVERT(K, reaction, from_basis, to_basis, [T], [P])
XLEQ_K_SCALE(K, factor)
XLEQ_K_COMBINE(target, reactions, Ks)
XLEQ_K_AT(K, T_of_K, T, dH, [dCp])
XLEQ_K_DATA(reaction, T, [data])
XLEQ_K_FIT(T, K, [terms])
XLEQ_K_FROM_FIT(coefficients, T)
XLEQ_K_FROM_DG(dG, T)
XLEQ_DG_FROM_K(K, T)
XLEQ_REACTION(reaction, property, [T], [data])
XLEQ_SPECIES(species, property, [T], [data])
XLEQ_Q(reaction, species, amounts, [P], [T], [basis])
XLEQ_AFFINITY(K, Q, T)
XLEQ_APPROACH(reaction, species, amounts, T, P, [data])
XLEQ_COMPOSITION_P(reactions, K, species, feed, T, P, [want], [options], [data])
XLEQ_COMPOSITION_V(reactions, K, species, feed, T, V, [want], [options], [data])
XLEQ_COMPOSITION_C(reactions, K, species, initial, [want], [options], [T])
XLEQ_COMPOSITION_X(reactions, K, species, feed, [want], [options], [T], [data])
XLEQ_COMPOSITION_DATA(species, feed, T, P, [want], [options], [data])
XLEQ_ADIABATIC(species, feed, T_feed, P, [want], [options], [data])
XLEQ_T_FOR(reactions, K, species, feed, P, target, value, [T_low], [T_high], [data])
XLEQ_P_FOR(reactions, K, species, feed, T, target, value, [P_low], [P_high])
XLEQ_SENSITIVITY(reactions, K, species, feed, T, P, [to])
XLEQ_UNCERTAINTY(reactions, K, u_lnK, species, feed, T, P, [u_T], [u_P])
XLEQ_FUGACITY_COEFFICIENT(species, fractions, T, P, [data])
XLEQ_IONIC_STRENGTH(species, concentrations)
XLEQ_ACTIVITY_COEFFICIENT(species, ionic_strength, [T], [model])
XLEQ_PH(species, concentrations, [options])
XLEQ_VERSION()
""".strip().splitlines()


def test_the_table_has_every_function_with_its_arguments() -> None:
    assert sorted(f.syntax for f in FUNCTIONS) == sorted(SYNTAX)


@pytest.mark.parametrize("function", FUNCTIONS, ids=lambda f: f.name)
class TestEntry:
    def test_matches_its_definition(self, function: Function) -> None:
        assert function.parameters_match()

    def test_has_a_name_and_arguments_that_every_host_takes(self, function: Function) -> None:
        assert re.fullmatch(r"XLEQ_[A-Z_]+", function.name)
        assert len(function.arguments) <= 10
        assert all(re.fullmatch(r"[A-Za-z_]+", a.name) for a in function.arguments)
        assert len({a.name.lower() for a in function.arguments}) == len(function.arguments)

    def test_has_optional_arguments_last(self, function: Function) -> None:
        optional = [a.optional for a in function.arguments]
        assert optional == sorted(optional)

    def test_has_readable_arguments_with_readable_defaults(self, function: Function) -> None:
        for a in function.arguments:
            assert a.kind in READERS
            if a.optional and a.default is not None:
                READERS[a.kind](a.default, a.known)  # type: ignore[arg-type]

    def test_has_help_that_fits_the_function_wizard(self, function: Function) -> None:
        assert 0 < len(function.gives) <= 255
        for a in function.arguments:
            known = f"; known: {', '.join(a.known)}" if a.known else ""
            assert 0 < len(a.meaning + known + a.unit) <= 250, a.name

    def test_says_its_source_and_has_an_example(self, function: Function) -> None:
        assert function.source
        assert function.examples


@pytest.mark.parametrize(("function", "example"), EXAMPLES, ids=[e.formula for _, e in EXAMPLES])
def test_every_example_shows_its_value_in_the_headless_host(function: Function, example: object) -> None:
    assert function.name in example.formula  # type: ignore[attr-defined]
    found = evaluate_formula(example.formula)  # type: ignore[attr-defined]
    shows = example.shows  # type: ignore[attr-defined]
    assert not isinstance(found, CellError), found.reason
    if not isinstance(found, list):
        found, shows = [[found]], [[shows]]
    assert [len(row) for row in found] == [len(row) for row in shows]
    for row, wanted in zip(found, shows, strict=True):
        for value, expected in zip(row, wanted, strict=True):
            assert type(value) is type(expected)
            if isinstance(expected, float):
                assert math.isclose(value, expected, rel_tol=1e-9, abs_tol=1e-300), (value, expected)
            else:
                assert value == expected
