"""The certificate of one reaction in an ideal fluid."""

from __future__ import annotations

import math
from collections.abc import Sequence
from fractions import Fraction
from math import log

from xleq.equilibrium.certificate.verdict import (
    BALANCE_TOLERANCE,
    ERROR_TOLERANCE,
    LN_SMALLEST,
    ROUNDING,
    ROUNDING_TOLERANCE,
    Verdict,
)
from xleq.equilibrium.problem import Problem

#: Why a composition is refused where the affinity is zero and stays so.
INDIFFERENT = "any extent would do: the affinity is the same at each"


def certify_one(problem: Problem, n: Sequence[float]) -> Verdict:
    """Verdict on amounts that are numbers, at least 0.

    Parameters
    ----------
    problem : Problem
        With one reaction, and without a model.
    n : sequence [n_species] of float
        Amounts claimed. [mol]
    """
    nu = [c.numerator / c.denominator for c in problem.nu[0]]
    reason, balance = _balance(problem, nu, n)
    if reason:
        return Verdict(reason, (math.nan,), balance, math.nan)
    absent = [i for i, c in enumerate(nu) if c and n[i] == 0.0]
    if not absent:
        reason, residual, error = _at_equilibrium(problem, nu, n)
        return Verdict(reason, (residual,), balance, error)
    reason, residual = _at_end(problem, nu, n, absent)
    return Verdict(reason, (residual,), balance, 0.0)


def _balance(problem: Problem, nu: Sequence[float], n: Sequence[float]) -> tuple[str, float]:
    """Whether one extent takes the feed to the amounts, each good to BALANCE_TOLERANCE of itself.

    The species with the least left fixes the extent most sharply; every other species is held against it.
    """
    n0 = problem.n0
    least = math.inf
    pivot = -1
    for i, c in enumerate(nu):
        if c:
            ratio = n[i] / abs(c)
            if ratio < least:
                least, pivot = ratio, i
        elif n[i] != n0[i]:
            return f"{problem.species[i]} takes no part, yet its amount changes", math.inf
    turn = nu[pivot]
    size, fed, left = abs(turn), n0[pivot], n[pivot]
    moved = left - fed
    worst = 0.0
    for i, c in enumerate(nu):
        if not c or i == pivot:
            continue
        allowed = n[i] * size + left * abs(c)
        off = abs((n[i] - n0[i]) * turn - moved * c)
        blur = 4.0 * ROUNDING * ((n[i] + n0[i]) * size + (left + fed) * abs(c))
        if off + blur > BALANCE_TOLERANCE * allowed:
            off = _exact_departure(problem, n, i, pivot)
        else:
            off = max(0.0, off - blur)
        if off > BALANCE_TOLERANCE * allowed:
            worst = off / allowed if allowed else math.inf
            pair = f"{problem.species[i]} and {problem.species[pivot]}"
            return f"the changes of {pair} do not fit the reaction: off by {worst:.2g}", worst
        if off:
            worst = max(worst, off / allowed)
    return "", worst


def _exact_departure(problem: Problem, n: Sequence[float], i: int, pivot: int) -> float:
    """The same difference of changes, without rounding."""
    row, n0 = problem.nu[0], problem.n0
    moved_i = Fraction(n[i]) - Fraction(n0[i])
    moved_pivot = Fraction(n[pivot]) - Fraction(n0[pivot])
    return float(abs(moved_i * row[pivot] - moved_pivot * row[i]))


def _at_equilibrium(problem: Problem, nu: Sequence[float], n: Sequence[float]) -> tuple[str, float, float]:
    """Reason, residual and error where every species of the reaction is present."""
    state = problem.state
    fraction = state.per_total
    ln_k = problem.ln_k[0]
    residual = -ln_k
    size = abs(ln_k)
    total = growth = 0.0
    for amount, c, phase in zip(n, nu, problem.phases, strict=True):
        if phase == "fluid":
            total += amount
            if c:
                growth += c
                term = c * log(amount)
                residual += term
                size += abs(term) + abs(c)
    if growth:
        shift = state.shift - (log(total) if fraction else 0.0)
        residual += growth * shift
        size += abs(growth * shift)
    floor = ROUNDING * size
    reach = _reach(problem, nu, n, growth / total if fraction and total else 0.0)
    if reach == math.inf:
        return INDIFFERENT, residual, math.inf
    beyond = abs(residual) - floor
    if beyond > 0.0 and beyond * reach > ERROR_TOLERANCE:
        return _off(problem, residual), residual, beyond * reach
    error = min(abs(residual), floor) * reach
    if floor * reach > ROUNDING_TOLERANCE:
        return f"rounding alone moves an amount by {floor * reach:.2g} of itself", residual, error
    return "", residual, error


def _reach(problem: Problem, nu: Sequence[float], n: Sequence[float], mean: float) -> float:
    """Relative change of the most touchy amount for a change of 1 in ln K; inf where nothing resists.

    d ln Q / d xi is summed as squares about its mean, so that it does not cancel, in units of the largest
    relative change |nu| / n, so that it does not overflow.
    """
    share = max([abs(c) / amount for amount, c in zip(n, nu, strict=True) if c])
    stiffness = noise = 0.0
    against = mean / share
    for amount, c, phase in zip(n, nu, problem.phases, strict=True):
        if phase == "fluid" and amount:
            pull = c / amount / share
            net = pull - against
            gross = abs(pull) + abs(against)
            stiffness += amount * net * net
            noise += amount * gross * gross
    if stiffness <= 4.0 * ROUNDING * ROUNDING * noise:
        return math.inf
    return 1.0 / (share * stiffness)


def _off(problem: Problem, residual: float) -> str:
    """The reaction that is not at equilibrium, written out, and which way it would run."""
    sides: tuple[list[str], list[str]] = ([], [])
    for name, c in zip(problem.species, problem.nu[0], strict=True):
        if c:
            sides[c > 0].append(name if abs(c) == 1 else f"{abs(c)} {name}")
    way = "backward" if residual > 0.0 else "forward"
    reaction = f"{' + '.join(sides[0])} = {' + '.join(sides[1])}"
    return f"{reaction} would still run {way}: ln Q - ln K = {residual:.3g}"


def _at_end(
    problem: Problem, nu: Sequence[float], n: Sequence[float], absent: Sequence[int]
) -> tuple[str, float]:
    """Reason and residual where a species of the reaction is absent.

    The reaction may then run only away from the absent species; it must have no drive to do so.
    """
    names = ", ".join(problem.species[i] for i in absent)
    made = [i for i in absent if nu[i] > 0.0]
    if made and len(made) < len(absent):
        return "", math.nan
    away = 1.0 if made else -1.0
    state = problem.state
    fluid = [i for i, phase in enumerate(problem.phases) if phase == "fluid"]
    growth = sum(nu[i] for i in fluid)
    gone = [i for i in absent if problem.phases[i] == "fluid"]
    total = math.fsum(n[i] for i in fluid)
    terms = [-problem.ln_k[0], growth * state.shift]
    terms += [nu[i] * log(n[i]) for i in fluid if nu[i] and n[i]]
    if gone and not total and state.per_total:
        terms += [nu[i] * log(nu[i] / growth) for i in gone]
        residual = math.fsum(terms)
        what = "the fluid would form"
    elif gone:
        return _too_little(problem, nu, gone, terms, total, growth), math.nan
    else:
        if state.per_total and growth:
            terms.append(-growth * log(total))
        residual = math.fsum(terms)
        what = f"{names} would form"
    # Affinity to make what is absent: away * (ln K - ln Q).
    drive = -away * residual
    floor = ROUNDING * (math.fsum(map(abs, terms)) + 1.0)
    if drive > floor:
        return f"{what}: ln K - ln Q = {drive:.3g} in that direction", residual
    if drive >= -floor and not _varies(problem, nu, n, growth):
        return INDIFFERENT, residual
    return "", residual


def _varies(problem: Problem, nu: Sequence[float], n: Sequence[float], growth: float) -> bool:
    """Whether ln Q changes as the reaction leaves an end at which pure phases or the fluid are absent."""
    present = [(n[i], nu[i]) for i, phase in enumerate(problem.phases) if phase == "fluid" and n[i]]
    if not any(c for _, c in present):
        return False
    if not problem.state.per_total:
        return True
    total = math.fsum(amount for amount, _ in present)
    return any(abs(c * total - growth * amount) > ROUNDING * abs(c) * total for amount, c in present)


def _too_little(
    problem: Problem,
    nu: Sequence[float],
    gone: Sequence[int],
    terms: list[float],
    total: float,
    growth: float,
) -> str:
    """Whether absent fluid species are absent because they are too little for a double.

    Any affinity drives the first traces of a fluid species out of what is there, so 0 stands for an amount
    that follows from ln Q = ln K with ln n = ln |nu| + ln d.
    """
    power = math.fsum(nu[i] for i in gone)
    terms = [*terms, *(nu[i] * log(abs(nu[i])) for i in gone)]
    if problem.state.per_total and growth:
        terms.append(-growth * log(total))
    ln_d = -math.fsum(terms) / power
    for i in gone:
        if ln_d + log(abs(nu[i])) > LN_SMALLEST:
            return f"{problem.species[i]} would form: ln of its amount is {ln_d + log(abs(nu[i])):.4g}"
    return ""
