"""Proof that amounts solve a problem, made from the amounts alone.

A certificate shares nothing with a solver but the problem: it takes the amounts as they are given and asks
whether they are numbers, whether they can come from the feed by the reactions (exactly, up to the rounding of
the amounts themselves), whether elements and charge balance, whether every reaction among what is present is
at equilibrium, and whether what is absent has no reason to form. How near to equilibrium is near enough
follows from the conditioning: the residual may move no amount by more than 1e-10 of itself, beyond what
rounding makes of the amounts and constants as given.
"""

from __future__ import annotations

import math
from collections.abc import Sequence

from xleq.equilibrium.certificate.elements import element_imbalance
from xleq.equilibrium.certificate.one import certify_one
from xleq.equilibrium.certificate.verdict import BALANCE_TOLERANCE, Verdict
from xleq.equilibrium.problem import Certificate, Problem

__all__ = ["certify"]


def certify(problem: Problem, n: Sequence[float]) -> Certificate:
    """Whether the amounts are the equilibrium of the problem, and if not, why not.

    Parameters
    ----------
    problem : Problem
    n : sequence [n_species] of float
        Amounts claimed. [mol]

    Returns
    -------
    Certificate

    Examples
    --------
    >>> from fractions import Fraction
    >>> from xleq.equilibrium.problem import State
    >>> problem = Problem(("A", "B"), ("fluid", "fluid"), ((Fraction(-1), Fraction(1)),), (1.0, 0.0),
    ...                   (0.0,), State("P", 300.0, p=1.0))
    >>> certify(problem, (0.5, 0.5)).ok
    True
    >>> certify(problem, (0.6, 0.4)).reason
    'A = B would still run forward: ln Q - ln K = -0.405'
    """
    for i, amount in enumerate(n):
        if not 0.0 <= amount < math.inf:
            reason = f"the amount of {problem.species[i]} is {amount}"
            return Certificate(False, reason, (math.nan,) * len(problem.ln_k), math.nan, math.nan)
    verdict = _verdict(problem, n)
    reason, balance = verdict.reason, verdict.balance
    if problem.formulas is not None:
        worst, what = element_imbalance(problem.formulas, problem.n0, n)
        balance = max(balance, worst)
        if worst > BALANCE_TOLERANCE and not reason:
            reason = f"{what} does not balance: off by {worst:.2g} of its total"
    return Certificate(not reason, reason, verdict.residuals, balance, verdict.error)


def _verdict(problem: Problem, n: Sequence[float]) -> Verdict:
    if len(problem.nu) == 1 and problem.model is None:
        return certify_one(problem, n)
    from xleq.equilibrium.certificate.several import certify_several

    return certify_several(problem, n)
