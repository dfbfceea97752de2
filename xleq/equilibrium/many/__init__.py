"""Any number of reactions in one fluid, with pure solids and liquids that come and go."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from xleq.equilibrium.certificate import certify
from xleq.equilibrium.many.newton import System
from xleq.equilibrium.many.nonideal import WithNotes, choose_with_model
from xleq.equilibrium.many.phases import Outcome, choose
from xleq.equilibrium.problem import SMALLEST_AMOUNT, Certificate, Problem, Solution, Status, check
from xleq.equilibrium.structure import check_dependent, check_size, eliminate, formable, structure

Floats = NDArray[np.float64]

METHOD = "Newton in log moles on the most abundant basis, polished in 50 digits"


@dataclass(frozen=True, slots=True)
class Prepared:
    """A problem in the solver's terms.

    Parameters
    ----------
    system : System
        With no pure phase present yet.
    pure : array of int
        Pure phases that can be there.
    can : array [n_species] of bool
        Species that are fed or can form.
    frozen : bool
        Whether no reaction can proceed.
    notes : tuple of str
    """

    system: System
    pure: NDArray[np.intp]
    can: NDArray[np.bool_]
    frozen: bool
    notes: tuple[str, ...]


def prepare(problem: Problem) -> Prepared:
    """Exact preliminaries: independent reactions, consistent constants, species that cannot form.

    Raises
    ------
    AmbiguousError
        If a dependent reaction's constant contradicts the others.
    OutOfRangeError
        If the system is too large.
    """
    s = structure(problem.nu)
    ln_k, notes = check_dependent(s, problem.ln_k)
    rows = list(s.independent)
    whole = s.whole[rows]
    n_species = len(problem.species)
    can = formable(whole, np.array(problem.n0) > 0.0)
    fluid = np.array([phase == "fluid" for phase in problem.phases])
    never = np.flatnonzero(~can)
    if len(never):
        notes += (f"cannot form from this feed: {', '.join(problem.species[i] for i in never)}",)
    system = System(
        whole,
        np.array([ln_k[r] * s.scales[r] for r in rows]),
        problem.n0,
        np.flatnonzero(can & fluid),
        np.array([], dtype=np.intp),
        never,
        problem.state.per_total,
        problem.state.shift,
        np.zeros(n_species),
    )
    # What cannot form first: a rewritten reaction that makes none of it can proceed.
    e = eliminate(whole, [*never, *np.flatnonzero(can)])
    frozen = all(not can[k] for k in e.pivots)
    return Prepared(system, np.flatnonzero(can & ~fluid), can, frozen, notes)


def solve(problem: Problem) -> Solution:
    """The equilibrium of a problem, with its certificate.

    Parameters
    ----------
    problem : Problem

    Returns
    -------
    Solution
        Uncertified, with the reason, where the equilibrium is indeterminate or was not found.

    Raises
    ------
    AmbiguousError
        If a dependent reaction's constant contradicts the others.
    OutOfRangeError
        If the system is too large, or the composition beyond the range of the model.
    InputError
        If the records do not fit together.

    Examples
    --------
    Two isomers of a gas, with K = 2 and K = 3:

    >>> from fractions import Fraction
    >>> from math import log
    >>> from xleq.equilibrium.problem import State
    >>> rows = ((-1, 1, 0), (-1, 0, 1))
    >>> problem = Problem(("A", "B", "C"), ("fluid",) * 3, tuple(tuple(map(Fraction, r)) for r in rows),
    ...                   (6.0, 0.0, 0.0), (log(2.0), log(3.0)), State("P", 300.0, p=1.0))
    >>> [round(n, 12) for n in solve(problem).require().n]
    [1.0, 2.0, 3.0]
    """
    check_size(len(problem.species), len(problem.nu))
    check(problem)
    prepared = prepare(problem)
    if prepared.frozen:
        return _finish(problem, prepared, np.array(problem.n0), "frozen", 0)
    outcome = find(problem, prepared)
    if outcome.verdict == "indeterminate":
        reason = (
            "the pure phases alone fix the pressure, and it is the one given: any split is at equilibrium; "
            "change the pressure or temperature, or add an inert"
        )
        return _refused(problem, prepared, "indeterminate", reason, outcome.steps)
    if outcome.amounts is None:
        reason = f"no set of phases without contradiction was found in {outcome.steps} steps"
        return _refused(problem, prepared, "equilibrium", reason, outcome.steps)
    n = np.maximum(outcome.amounts.n, 0.0)
    absent = any(n[p] == 0.0 for p, phase in enumerate(problem.phases) if phase == "pure")
    status: Status = "exhausted" if absent else "equilibrium"
    if outcome.verdict == "vanished":
        status = "fluid vanished"
    return _finish(problem, prepared, n, status, outcome.steps)


def find(problem: Problem, prepared: Prepared) -> Outcome:
    """The equilibrium and the set of phases it has."""
    if problem.model is None:
        return choose(prepared.system, prepared.pure)
    return choose_with_model(problem.model, problem.state, prepared.system, prepared.pure)


def _finish(problem: Problem, prepared: Prepared, n: Floats, status: Status, steps: int) -> Solution:
    """The record, certified; amounts too small for a double become 0 and are noted."""
    notes = prepared.notes
    small = [i for i in np.flatnonzero(n < SMALLEST_AMOUNT) if prepared.can[i]]
    tiny = [problem.species[i] for i in small if problem.phases[i] == "fluid"]
    if status == "frozen":
        n = np.array(problem.n0)
        notes += ("nothing can react: what the reactions need is missing on both sides",)
    else:
        n[n < SMALLEST_AMOUNT] = 0.0
        if tiny and status != "fluid vanished":
            notes += (f"below {SMALLEST_AMOUNT:g} mol, given as 0: {', '.join(tiny)}",)
    amounts = tuple(n.tolist())
    gone = tuple(
        name
        for name, phase, x in zip(problem.species, problem.phases, amounts, strict=True)
        if phase == "pure" and x == 0.0
    )
    model = problem.model
    if isinstance(model, WithNotes) and status != "fluid vanished":
        notes += model.notes(n, problem.state)
    certificate = certify(problem, amounts)
    xi = tuple(extents(problem, amounts).tolist())
    return Solution(problem, amounts, xi, status, gone, certificate, steps, METHOD, notes)


def _refused(problem: Problem, prepared: Prepared, status: Status, reason: str, steps: int) -> Solution:
    nothing = (float("nan"),) * len(problem.nu)
    certificate = Certificate(False, reason, nothing, float("nan"))
    return Solution(problem, problem.n0, nothing, status, (), certificate, steps, METHOD, prepared.notes)


def extents(problem: Problem, n: Sequence[float]) -> Floats:
    """How far each reaction has run; of dependent reactions the choice of least norm.

    Parameters
    ----------
    problem : Problem
    n : sequence [n_species] of float
        Amounts at equilibrium. [mol]

    Returns
    -------
    array [n_reactions] of float
        [mol]
    """
    s = structure(problem.nu)
    if s.relations:
        nu = np.array([[float(x) for x in row] for row in problem.nu])
        change = np.array(n) - np.array(problem.n0)
        return np.asarray(np.linalg.lstsq(nu.T, change, rcond=None)[0])
    # Each rewritten reaction makes its pivot alone, so its extent is exact to the last digit of that amount.
    order = np.argsort(np.maximum(np.array(n), np.array(problem.n0)), kind="stable")
    e = eliminate(s.whole, order.tolist())
    made = np.array([n[k] - problem.n0[k] for k in e.pivots])
    xi = e.combos.T.astype(np.float64) @ made / e.denominator
    return np.asarray(xi * np.array(s.scales, dtype=np.float64))
