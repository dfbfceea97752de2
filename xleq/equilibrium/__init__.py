"""Chemical equilibrium of one fluid with pure solids and liquids: problem in, certified solution out."""

from __future__ import annotations

from xleq.equilibrium.problem import (
    Batch,
    BatchSolution,
    Certificate,
    Nonideality,
    Phase,
    Problem,
    Solution,
    State,
)

__all__ = [
    "Batch",
    "BatchSolution",
    "Certificate",
    "Nonideality",
    "Phase",
    "Problem",
    "Solution",
    "State",
    "solve",
    "solve_batch",
]


def solve(problem: Problem) -> Solution:
    """The equilibrium of a problem, with its certificate.

    One reaction in an ideal fluid goes to the solver for single reactions, everything else to the one for
    several. The solution may be uncertified: `Solution.require` insists.

    Parameters
    ----------
    problem : Problem

    Returns
    -------
    Solution

    Raises
    ------
    InputError
        If amounts, constants or the state are not numbers that mean something, or records do not fit.
    NoAnswerError
        If the problem has no equilibrium that can be computed.

    Examples
    --------
    Nitrogen dioxide from its dimer at 1 bar, with K = 0.15:

    >>> from fractions import Fraction
    >>> one, two = Fraction(-1), Fraction(2)
    >>> problem = Problem(("N2O4", "NO2"), ("fluid", "fluid"), ((one, two),), (1.0, 0.0),
    ...                   (-1.8971199848858813,), State("P", 298.15, p=1.0))
    >>> [round(n, 6) for n in solve(problem).require().n]
    [0.809883, 0.380235]
    """
    if len(problem.nu) == 1 and problem.model is None:
        from xleq.equilibrium import single

        return single.solve(problem)
    from xleq.equilibrium import many

    return many.solve(problem)


def solve_batch(batch: Batch) -> BatchSolution:
    """The equilibria of many instances of one system, each with its certificate.

    An instance that has no certified answer has a reason and no numbers; it does not stop the others.

    Parameters
    ----------
    batch : Batch

    Returns
    -------
    BatchSolution
    """
    if len(batch.nu) == 1:
        from xleq.equilibrium import single_batch

        return single_batch.solve_batch(batch)
    from xleq.equilibrium import many_batch

    return many_batch.solve_batch(batch)
