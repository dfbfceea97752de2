"""Random systems of one reaction, made from a seed."""

from __future__ import annotations

import math
import random
from fractions import Fraction

from xleq.equilibrium import Phase, Problem, State
from xleq.equilibrium.problem import Kind

COEFFICIENTS = tuple(Fraction(x) for x in ("1/3", "1/2", "1", "1", "1", "3/2", "2", "2", "5/2", "3", "4", "7"))


def amount(rng: random.Random) -> float:
    """A feed: often ordinary, sometimes zero, a trace or an exact small number."""
    kind = rng.random()
    if kind < 0.15:
        return 0.0
    if kind < 0.3:
        return 10.0 ** rng.uniform(-14.0, -4.0)
    if kind < 0.55:
        return float(rng.choice((1, 1, 2, 3, 4, 5, 10)))
    return 10.0 ** rng.uniform(-3.0, 3.0)


def one_reaction(seed: int) -> Problem:
    """A problem of one reaction, of any state, with or without pure phases and inert gas."""
    rng = random.Random(seed)
    row = [-rng.choice(COEFFICIENTS) for _ in range(rng.randint(1, 3))]
    row += [rng.choice(COEFFICIENTS) for _ in range(rng.randint(1, 3))]
    phases: list[Phase] = ["pure" if rng.random() < 0.25 else "fluid" for _ in row]
    for _ in range(rng.randint(0, 2)):
        row.append(Fraction(0))
        phases.append("fluid" if rng.random() < 0.8 else "pure")
    if "fluid" not in phases:
        row.append(Fraction(0))
        phases.append("fluid")
    n0 = [amount(rng) for _ in row]
    if rng.random() < 0.15:
        # Exactly in the ratio of the reaction.
        n0 = [float(-c) * 2.0 if c < 0 else x for c, x in zip(row, n0, strict=True)]
    if not any(n0):
        n0[0] = 1.0
    kind: Kind = rng.choice(("P", "V", "C", "X"))
    t = rng.uniform(280.0, 2200.0)
    state = State(kind, t, p=10.0 ** rng.uniform(-4.0, 3.0), v=10.0 ** rng.uniform(-2.0, 4.0))
    ln_k = rng.gauss(0.0, 60.0) if rng.random() < 0.9 else rng.uniform(-900.0, 900.0)
    names = tuple(f"S{i}" for i in range(len(row)))
    return Problem(names, tuple(phases), (tuple(row),), tuple(n0), (ln_k,), state)


def exact_root(problem: Problem, bits: int = 400) -> list[float] | None:
    """The amounts by plain bisection of the extent in long decimals; None unless it lies inside the range.

    Slow and simple on purpose: it shares nothing with the solver.
    """
    from decimal import Decimal, localcontext

    with localcontext() as context:
        context.prec = bits
        row = problem.nu[0]
        nu = [Decimal(c.numerator) / Decimal(c.denominator) for c in row]
        n0 = [Decimal(x) for x in problem.n0]
        low = max(-x / c for x, c in zip(n0, nu, strict=True) if c > 0)
        high = min(-x / c for x, c in zip(n0, nu, strict=True) if c < 0)
        if low == high:
            return None
        fluid = [i for i, phase in enumerate(problem.phases) if phase == "fluid"]
        shift = Decimal(problem.state.shift)
        growth = sum(nu[i] for i in fluid)

        def value(xi):
            n = [x + c * xi for x, c in zip(n0, nu, strict=True)]
            total = sum(n[i] for i in fluid)
            terms = sum(nu[i] * n[i].ln() for i in fluid if nu[i])
            if problem.state.per_total and growth:
                terms -= growth * total.ln()
            return terms + growth * shift - Decimal(problem.ln_k[0])

        span = high - low
        tiny = span.scaleb(-int(bits * 0.8))
        try:
            if value(low + tiny) >= 0 or value(high - tiny) <= 0:
                return None
        except ArithmeticError:
            return None
        # The nearer end first, then in the logarithm of the distance from it.
        from_low = value(low + span / 2) > 0
        a, b = tiny.ln(), (span / 2).ln()
        for _ in range(90):
            middle = (a + b) / 2
            d = middle.exp()
            inside = value(low + d) > 0 if from_low else value(high - d) < 0
            a, b = (a, middle) if inside else (middle, b)
        d = ((a + b) / 2).exp()
        xi = low + d if from_low else high - d
        return [float(x + c * xi) for x, c in zip(n0, nu, strict=True)]


def relative(found: float, exact: float) -> float:
    """Relative error; both below 1e-299 count as 0."""
    if max(found, exact) < 1e-299:
        return 0.0
    return abs(found - exact) / max(abs(exact), math.ulp(0.0))
