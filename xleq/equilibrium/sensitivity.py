"""How an equilibrium answers to its inputs, and the uncertainty that it has from theirs.

The derivatives come from the Jacobian at the solution, with the phases that are present there. The
uncertainty is that of JCGM 100:2008 (GUM), to first order: equation (10) for independent inputs, (13) for
correlated ones.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from xleq.equilibrium.many import Prepared, prepare
from xleq.equilibrium.many.follow import with_phases
from xleq.equilibrium.many.newton import Path, System, frame, newton
from xleq.equilibrium.many.nonideal import ln_gamma_slope
from xleq.equilibrium.many.response import Response
from xleq.equilibrium.problem import Problem, Solution, State
from xleq.equilibrium.structure import structure
from xleq.errors import InputError, NotCertifiedError

Floats = NDArray[np.float64]

_STEP = 1e-5


@dataclass(frozen=True, slots=True)
class Sensitivity:
    """Derivatives of the amounts at equilibrium. Rows of what is absent are 0.

    Parameters
    ----------
    by_ln_k : array [n_species, n_reactions]
        By ln K of each reaction. [mol]  0 for a dependent reaction, whose constant follows from the others.
    by_t : array [n_species] or None
        By the temperature, ln K following `dln_k_dt`. [mol/K]
    by_p : array [n_species]
        By the pressure; 0 where the state does not hold it. [mol/bar]
    by_v : array [n_species]
        By the volume; 0 where the state does not hold it. [mol/L]
    by_feed : array [n_species, n_species]
        By the feed of each species (column). [-]  nan in the column of a species that cannot form and yet
        reacts: a trace of it would open reactions that are closed.
    """

    by_ln_k: Floats
    by_t: Floats | None
    by_p: Floats
    by_v: Floats
    by_feed: Floats


def sensitivities(solution: Solution, dln_k_dt: Sequence[float] | None = None) -> Sensitivity:
    """Derivatives of the amounts with respect to ln K, temperature, pressure, volume and feed.

    Parameters
    ----------
    solution : Solution
        Certified.
    dln_k_dt : sequence [n_reactions] of float, optional
        d ln K / dT of each reaction: its enthalpy over R T^2. [1/K]  Without it there is no `by_t`.

    Returns
    -------
    Sensitivity

    Raises
    ------
    NotCertifiedError
        If the solution is not certified.
    InputError
        If `dln_k_dt` has not one number for each reaction.

    Examples
    --------
    Two isomers, K = 1: of 2 mol, half a mole moves for a change of 1 in ln K.

    >>> from fractions import Fraction
    >>> from xleq.equilibrium import Problem, State, solve
    >>> row = (Fraction(-1), Fraction(1))
    >>> problem = Problem(("A", "B"), ("fluid",) * 2, (row,), (2.0, 0.0), (0.0,), State("P", 300.0, p=1.0))
    >>> s = sensitivities(solve(problem))
    >>> s.by_ln_k.ravel().tolist(), s.by_feed[:, 0].tolist()
    ([-0.5, 0.5], [0.5, 0.5])
    """
    solution.require()
    problem = solution.problem
    if dln_k_dt is not None and len(dln_k_dt) != len(problem.nu):
        raise InputError(f"{len(problem.nu)} reactions with {len(dln_k_dt)} temperature derivatives")
    prepared = prepare(problem)
    if solution.status == "frozen":
        return _fixed(problem, _opening(problem, prepared, np.eye(len(problem.n0))), dln_k_dt)
    system = _at_solution(solution, prepared)
    if solution.status == "fluid vanished":
        return _fixed(problem, _opening(problem, prepared, _vanished(system)), dln_k_dt)
    return _moving(solution, prepared, system, dln_k_dt)


def uncertainty(
    solution: Solution,
    u_ln_k: Sequence[float],
    u_t: float = 0.0,
    u_p: float = 0.0,
    dln_k_dt: Sequence[float] | None = None,
    correlation: Sequence[Sequence[float]] | None = None,
) -> Floats:
    """Standard uncertainty of each amount [n_species], to first order. [mol].

    Parameters
    ----------
    solution : Solution
        Certified.
    u_ln_k : sequence [n_reactions] of float
        Standard uncertainty of each ln K. [-]
    u_t, u_p : float
        Standard uncertainties of the temperature [K] and of the pressure [bar].
    dln_k_dt : sequence [n_reactions] of float, optional
        d ln K / dT of each reaction, needed with `u_t`. [1/K]
    correlation : sequence [n_reactions] of sequence [n_reactions] of float, optional
        Correlation coefficients of the ln K; none by default.

    Raises
    ------
    InputError
        If an uncertainty is negative or not a number, a length does not fit, `u_t` is given without
        `dln_k_dt`, or the correlation is not one.

    Examples
    --------
    >>> from fractions import Fraction
    >>> from xleq.equilibrium import Problem, State, solve
    >>> row = (Fraction(-1), Fraction(1))
    >>> problem = Problem(("A", "B"), ("fluid",) * 2, (row,), (2.0, 0.0), (0.0,), State("P", 300.0, p=1.0))
    >>> uncertainty(solve(problem), (0.1,)).tolist()
    [0.05, 0.05]
    """
    spread = np.array(u_ln_k, dtype=float)
    if spread.shape != (len(solution.problem.nu),):
        raise InputError(f"{len(solution.problem.nu)} reactions with {len(spread)} uncertainties of ln K")
    for name, values in (("ln K", spread), ("T", np.array([u_t])), ("P", np.array([u_p]))):
        if not (np.isfinite(values) & (values >= 0.0)).all():
            raise InputError(f"a standard uncertainty of {name} is not a number, at least 0")
    if u_t and dln_k_dt is None:
        raise InputError("an uncertainty of T needs d ln K / dT of each reaction")
    between = _correlation(correlation, len(spread))
    s = sensitivities(solution, dln_k_dt)
    parts = s.by_ln_k * spread
    variance = np.einsum("ir,rq,iq->i", parts, between, parts) + (s.by_p * u_p) ** 2
    if s.by_t is not None:
        variance += (s.by_t * u_t) ** 2
    return np.asarray(np.sqrt(np.maximum(variance, 0.0)))


def _correlation(given: Sequence[Sequence[float]] | None, size: int) -> Floats:
    if given is None:
        return np.eye(size)
    between = np.array(given, dtype=float)
    if between.shape != (size, size):
        raise InputError(f"the correlation must have {size} rows and columns")
    good = (
        np.isfinite(between).all() and np.allclose(between, between.T) and np.allclose(np.diag(between), 1.0)
    )
    if not good or np.linalg.eigvalsh(between).min() < -1e-9:
        raise InputError(
            "the correlation must be symmetric, 1 on the diagonal and without negative variances"
        )
    return between


def _at_solution(solution: Solution, prepared: Prepared) -> System:
    """The system with the phases and the activity coefficients of the solution."""
    n = np.array(solution.n)
    system = prepared.system
    if solution.problem.model is not None and solution.status != "fluid vanished":
        ln_gamma = solution.problem.model.ln_gamma(n, solution.problem.state)
        kept = np.zeros(len(n))
        kept[system.fluid] = ln_gamma[system.fluid]
        system = replace(system, ln_gamma=kept)
    present = frozenset(int(p) for p in prepared.pure if n[p] > 0.0)
    return with_phases(system, prepared.pure, present)


def _moving(
    solution: Solution, prepared: Prepared, system: System, dln_k_dt: Sequence[float] | None
) -> Sensitivity:
    """Derivatives where the fluid is at equilibrium: every input is a column of one linear system."""
    problem, state = solution.problem, solution.problem.state
    path = _path(solution, system)
    response = Response(system, path)
    s = structure(problem.nu)
    rows = list(s.independent)
    n_species, n_rows, n_basis = len(problem.n0), len(rows), len(path.frame.basis)
    by_scaled, by_shift = response.offset_by_ln_k(), response.offset_by_shift()
    scales = np.array([s.scales[r] for r in rows], dtype=float)
    width = n_rows + 3 + n_species
    offset = np.zeros((len(response.species), width))
    offset[:, :n_rows] = by_scaled * scales
    offset[:, n_rows] = by_shift / state.t if state.kind == "V" else 0.0
    if dln_k_dt is not None:
        offset[:, n_rows] += by_scaled @ (scales * np.array([dln_k_dt[r] for r in rows]))
    offset[:, n_rows + 1] = by_shift / state.p if state.kind == "P" else 0.0
    offset[:, n_rows + 2] = -by_shift / state.v if state.kind in "VC" else 0.0
    if problem.model is not None:
        offset[:, n_rows : n_rows + 2] += _explicit(solution, response)
    totals, present = np.zeros((n_basis, width)), np.zeros((len(system.present), width))
    totals[:, n_rows + 3 :] = response.totals_by_feed(path.frame.basis)
    present[:, n_rows + 3 :] = response.totals_by_feed(system.present)
    diluting = np.zeros(width)
    diluting[n_rows + 3 :] = _new_and_inert(problem, prepared)
    ln_n = response.ln_amounts(offset, totals, diluting)
    if problem.model is not None:
        slope = ln_gamma_slope(problem.model, state, np.array(solution.n), response.species)
        answer = response.by_ln_gamma()[np.ix_(response.species, response.species)]
        ln_n = np.linalg.solve(np.eye(len(ln_n)) - answer @ slope, ln_n)
    change = response.amounts(ln_n, totals, present)
    by_ln_k = np.zeros((n_species, len(problem.nu)))
    by_ln_k[:, rows] = change[:, :n_rows]
    by_t = change[:, n_rows] if dln_k_dt is not None else None
    feed = _opening(problem, prepared, change[:, n_rows + 3 :])
    return Sensitivity(by_ln_k, by_t, change[:, n_rows + 1], change[:, n_rows + 2], feed)


def _explicit(solution: Solution, response: Response) -> Floats:
    """What T and P do to the offsets through the model alone [n, 2]."""
    model, state = solution.problem.model, solution.problem.state
    assert model is not None
    n = np.array(solution.n)
    out = np.zeros((len(response.species), 2))
    for column, name in enumerate(("t", "p")):
        at = getattr(state, name)
        if not np.isfinite(at):
            continue
        up: State = replace(state, **{name: at * (1.0 + _STEP)})
        down: State = replace(state, **{name: at * (1.0 - _STEP)})
        slope = (model.ln_gamma(n, up) - model.ln_gamma(n, down)) / (2.0 * _STEP * at)
        out[:, column] = response.offset_by_ln_gamma() @ slope[response.species]
    return out


def _path(solution: Solution, system: System) -> Path:
    """Newton's method begun at the solution: it is there at once, and has the Jacobian."""
    n = np.array(solution.n)
    ln_n = np.full(len(n), -690.0)
    np.log(n, out=ln_n, where=n > 0.0)
    path = newton(system, ln_n)
    if path is None or not path.converged:
        raise NotCertifiedError("the Jacobian at the solution could not be formed")
    return path


def _vanished(system: System) -> Floats:
    """Derivatives by the feed where everything lies in the pure phases."""
    out = np.zeros((len(system.n0), len(system.n0)))
    f = frame(system, np.zeros(len(system.n0)))
    if f is None:
        raise NotCertifiedError("the phases present could not be told apart")
    e = f.elimination
    out[system.present, system.present] = 1.0
    out[np.ix_(system.present, np.array(e.pivots))] = -(e.rows[:, system.present].T / e.denominator)
    return out


def _fixed(problem: Problem, by_feed: Floats, dln_k_dt: Sequence[float] | None) -> Sensitivity:
    """Derivatives where nothing but the feed matters."""
    nothing = np.zeros(len(problem.n0))
    by_ln_k = np.zeros((len(problem.n0), len(problem.nu)))
    return Sensitivity(by_ln_k, None if dln_k_dt is None else nothing, nothing, nothing, by_feed)


def _idle(problem: Problem) -> NDArray[np.bool_]:
    """Species that take part in no reaction."""
    return np.array([not any(row[i] for row in problem.nu) for i in range(len(problem.n0))])


def _new_and_inert(problem: Problem, prepared: Prepared) -> Floats:
    """1 for fluid species that are not fed and take part in no reaction, else 0."""
    idle = _idle(problem)
    fluid = np.array([phase == "fluid" for phase in problem.phases])
    return np.asarray(idle & fluid & ~prepared.can, dtype=np.float64)


def _opening(problem: Problem, prepared: Prepared, by_feed: Floats) -> Floats:
    """The same with the columns of species that cannot form: 1 for their own amount if inert, else nan."""
    idle = _idle(problem)
    out = by_feed.copy()
    for j in np.flatnonzero(~prepared.can):
        if idle[j]:
            out[j, j] = 1.0
        else:
            out[:, j] = np.nan
    return out
