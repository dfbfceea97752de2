from __future__ import annotations

import math
from dataclasses import replace
from fractions import Fraction

import numpy as np
import pytest

from tests.cases.reader import FAMILIES, VANISHING, read
from tests.equilibrium.single_systems import one_reaction
from xleq.equilibrium import Batch, Problem, State, solve
from xleq.equilibrium.certificate import certify
from xleq.equilibrium.certificate.batch import accept

#: Of the larger families every third case is taken in the quick run.
STRIDE = {"single": 3, "multi": 6, "solids": 3}


def right(case):
    return [0.0 if x < VANISHING else float(x) for x in case.n]


def wrong_answers(n):
    """The right answer with an amount off by a millionth, amounts exchanged, an absence changed."""
    for i, amount in enumerate(n):
        for factor in (1.0 + 1e-6, 1.0 - 1e-6):
            if amount:
                yield f"amount {i} times {factor}", [*n[:i], amount * factor, *n[i + 1 :]]
        yield f"amount {i} gone or come", [*n[:i], 0.0 if amount else 1e-3, *n[i + 1 :]]
        for j in range(i):
            if abs(n[i] - n[j]) > 1e-6 * max(n[i], n[j]):
                swapped = list(n)
                swapped[i], swapped[j] = n[j], n[i]
                yield f"amounts {i} and {j} exchanged", swapped


@pytest.mark.parametrize("family", FAMILIES)
def test_every_right_answer_is_certified(family):
    for case in read(family):
        certificate = certify(case.problem, right(case))
        assert certificate.ok, (case.id, certificate.reason)
        assert certificate.worst_error < 1e-9
        assert certificate.worst_balance < 1e-11


@pytest.mark.parametrize("family", FAMILIES)
def test_no_wrong_answer_is_certified(family):
    refuse_wrong_answers(read(family)[:: STRIDE[family]])


@pytest.mark.slow
@pytest.mark.parametrize("family", FAMILIES)
def test_no_wrong_answer_of_any_case_is_certified(family):
    refuse_wrong_answers(read(family))


def refuse_wrong_answers(cases):
    for case in cases:
        for what, n in wrong_answers(right(case)):
            certificate = certify(case.problem, n)
            assert not certificate.ok, (case.id, what)
            assert certificate.reason


@pytest.mark.parametrize("family", FAMILIES)
def test_the_certificate_in_arrays_accepts_no_wrong_answer_and_few_right_ones_escape_it(family):
    accepted, cases = 0, read(family)[:: STRIDE[family]]
    for case in cases:
        answers = [right(case)] + [n for _, n in wrong_answers(right(case))]
        p, k = case.problem, len(answers)
        batch = Batch(
            p.species,
            p.phases,
            p.nu,
            np.tile(p.n0, (k, 1)),
            np.tile(p.ln_k, (k, 1)),
            p.state.kind,
            np.full(k, p.state.t),
            np.full(k, p.state.p),
            np.full(k, p.state.v),
        )
        ok = accept(batch, np.array(answers))
        accepted += bool(ok[0])
        assert not ok[1:].any(), case.id
    assert accepted > 0.9 * len(cases)


@pytest.mark.parametrize("seed", range(200))
def test_no_random_answer_off_by_a_millionth_is_certified(seed):
    problem = one_reaction(seed)
    n = list(solve(problem).require().n)
    for what, wrong in wrong_answers(n):
        assert not certify(problem, wrong).ok, (seed, what)


LIME = Problem(
    ("CaCO3", "CaO", "CO2", "N2"),
    ("pure", "pure", "fluid", "fluid"),
    ((Fraction(-1), Fraction(1), Fraction(1), Fraction(0)),),
    (1.0, 0.0, 0.0, 1.0),
    (0.0,),
    State("P", 1170.0, p=2.0),
    (
        {"Ca": Fraction(1), "C": Fraction(1), "O": Fraction(3)},
        {"Ca": Fraction(1), "O": Fraction(1)},
        {"C": Fraction(1), "O": Fraction(2)},
        {"N": Fraction(2)},
    ),
)


def test_the_reasons_are_in_words():
    assert certify(LIME, (0.0, 1.0, 1.0, 1.0)).ok
    assert "CaCO3 = CaO + CO2 would still run forward" in certify(LIME, (0.5, 0.5, 0.5, 1.0)).reason
    assert "do not fit the reaction" in certify(LIME, (0.0, 1.0, 0.9, 1.0)).reason
    assert "N2 takes no part" in certify(LIME, (0.0, 1.0, 1.0, 1.1)).reason
    assert "the amount of CaO is -1.0" in certify(LIME, (1.0, -1.0, 1.0, 1.0)).reason
    assert "the amount of CO2 is nan" in certify(LIME, (1.0, 1.0, math.nan, 1.0)).reason
    hot, cold = replace(LIME, ln_k=(3.0,)), replace(LIME, ln_k=(-0.75,))
    assert "CaCO3 would form" in certify(cold, (0.0, 1.0, 1.0, 1.0)).reason
    assert "CO2 would form" in certify(hot, (1.0, 0.0, 0.0, 1.0)).reason


def test_an_unbalanced_reaction_fails_on_its_elements():
    # Two of oxygen too few on the right: 2 of the 3 + 1 that carbonate and lime hold at most.
    formulas = (*LIME.formulas[:2], {"C": Fraction(1)}, LIME.formulas[3])
    certificate = certify(replace(LIME, formulas=formulas), (0.0, 1.0, 1.0, 1.0))
    assert certificate.reason == "element O does not balance: off by 0.5 of its total"


def test_a_lump_without_a_formula_leaves_the_elements_unchecked():
    formulas = (None, *LIME.formulas[1:])
    assert certify(replace(LIME, formulas=formulas), (0.0, 1.0, 1.0, 1.0)).ok


def test_a_fluid_that_should_be_there_is_missed():
    problem = replace(LIME, n0=(1.0, 0.5, 0.5, 0.0), ln_k=(1.0,))
    assert "the fluid would form" in certify(problem, (1.5, 0.0, 0.0, 0.0)).reason
    assert certify(problem, (0.0, 1.5, 1.5, 0.0)).ok


def test_several_reactions_name_the_species_that_is_off():
    case = next(case for case in read("multi") if case.title.startswith("combustion gas phi=0.5 T=500"))
    n = right(case)
    place = case.problem.species.index("OH")
    n[place] *= 1.001
    assert certify(case.problem, n).reason.startswith("OH is not at equilibrium: ln Q - ln K = 0.001")


def test_a_wrong_set_of_solids_is_refused():
    refused = 0
    for case in read("solids"):
        problem = case.problem
        for i, phase in enumerate(problem.phases):
            # The same system as if this pure phase could not exist, solved rightly.
            if phase != "pure" or problem.n0[i] or not case.n[i]:
                continue
            kept = [row for row in problem.nu if not row[i]]
            if len(kept) != len(problem.nu) - 1 or not kept:
                continue
            ln_k = tuple(k for k, row in zip(problem.ln_k, problem.nu, strict=True) if not row[i])
            poorer = solve(replace(problem, nu=tuple(kept), ln_k=ln_k))
            if poorer.certificate.ok:
                refused += 1
                certificate = certify(problem, poorer.n)
                assert not certificate.ok, case.id
                assert problem.species[i] in certificate.reason
    assert refused > 5


def carbonates(n0, ln_k) -> Problem:
    """CaCO3 = CaO + CO2 and MgCO3 = MgO + CO2 at 1 bar, without any other gas."""
    rows = ((-1, 1, 0, 0, 1), (0, 0, -1, 1, 1))
    return Problem(
        ("CaCO3", "CaO", "MgCO3", "MgO", "CO2"),
        ("pure", "pure", "pure", "pure", "fluid"),
        tuple(tuple(map(Fraction, row)) for row in rows),
        n0,
        ln_k,
        State("P", 1000.0, p=1.0),
    )


def test_two_carbonates_below_their_temperatures_stay_without_gas():
    problem = carbonates((1.0, 0.5, 1.0, 0.5, 0.0), (-2.0, -1.0))
    taken = (1.5, 0.0, 0.5, 1.0, 0.0)
    assert certify(problem, taken).ok
    assert not certify(problem, problem.n0).ok
    assert solve(problem).n == pytest.approx(taken)


def test_two_carbonates_above_one_temperature_make_gas():
    problem = carbonates((1.0, 0.0, 1.0, 0.0, 0.0), (-2.0, 1.0))
    assert certify(problem, (1.0, 0.0, 0.0, 1.0, 1.0)).ok
    assert "a fluid would form" in certify(problem, (1.0, 0.0, 1.0, 0.0, 0.0)).reason


def test_species_that_only_make_each_other_may_be_absent():
    # A = B with neither fed cannot start; C = D runs beside it.
    rows = ((-1, 1, 0, 0), (0, 0, -1, 1))
    nu = tuple(tuple(map(Fraction, row)) for row in rows)
    problem = Problem(("A", "B", "C", "D"), ("fluid",) * 4, nu, (0.0, 0.0, 1.0, 0.0), (1.0, 0.0), State("X"))
    assert certify(problem, (0.0, 0.0, 0.5, 0.5)).ok
    assert "would form" in certify(problem, (0.0, 0.0, 1.0, 0.0)).reason


def test_a_gas_that_could_form_with_the_help_of_an_absent_solid_is_missed():
    # The solid S forms from C, and S with C makes A: so A can form, though S is absent.
    rows = ((0, 1, -1, 0), (1, -1, -1, 0), (0, 0, -1, 1))
    nu = tuple(tuple(map(Fraction, row)) for row in rows)
    problem = Problem(
        ("A", "S", "C", "D"),
        ("fluid", "pure", "fluid", "fluid"),
        nu,
        (0.0, 0.0, 1.0, 0.0),
        (-20.0, 0.0, 0.0),
        State("C"),
    )
    assert "A would form" in certify(problem, (0.0, 0.0, 0.5, 0.5)).reason
    assert solve(problem).require().n[0] > 0.0


def test_reactions_that_contradict_each_other_certify_nothing():
    nu = ((Fraction(-1), Fraction(1)), (Fraction(-2), Fraction(2)))
    problem = Problem(("A", "B"), ("fluid",) * 2, nu, (1.0, 0.0), (0.0, 1.0), State("X"))
    assert "depends on the others" in certify(problem, (0.5, 0.5)).reason
    assert certify(replace(problem, ln_k=(0.0, 0.0)), (0.5, 0.5)).ok


def test_without_the_element_of_the_gas_the_solids_react_alone():
    # A4(g) could only come from A2(s), which is not fed; B4(s) and B2(s) turn into each other meanwhile.
    nu = (
        (Fraction(-2), Fraction(0), Fraction(1), Fraction(0)),
        (Fraction(0), Fraction(-1, 2), Fraction(0), Fraction(1)),
    )
    problem = Problem(
        ("A2(s)", "B4(s)", "A4", "B2(s)"),
        ("pure", "pure", "fluid", "pure"),
        nu,
        (0.0, 0.0, 0.0, 0.8),
        (68.0, -117.0),
        State("P", 930.0, p=1.0),
    )
    assert certify(problem, (0.0, 0.4, 0.0, 0.0)).ok
    assert "B4(s) would form" in certify(problem, problem.n0).reason
    assert solve(problem).require().n == (0.0, 0.4, 0.0, 0.0)
