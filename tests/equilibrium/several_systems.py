"""Random systems of several reactions, seeded, and a judge of answers that shares nothing with the solvers.

A system has made-up species of letters that stand for elements, constants over many decades, feeds with zeros
and traces, and pure phases. The judge takes amounts as claimed and makes Newton steps of the full set of
equations (one affinity each reaction, one exact balance each conserved quantity) in 400 digits: how far they
move is the error of the claim.
"""

from __future__ import annotations

import math
import random
from fractions import Fraction

from mpmath import mp, mpf

from xleq.equilibrium.problem import Phase, Problem, State
from xleq.units import R_L_BAR

DIGITS = 400


def random_problem(seed: int, pure: bool = False) -> Problem:
    """A system with up to 12 species and, if wanted, up to 5 pure phases."""
    rng = random.Random(seed)
    while True:
        letters = "ABCD"[: rng.randint(1, 4)]
        species, formulas = _species(rng, letters, rng.randint(len(letters) + 1, 11))
        nu = null_space([[Fraction(f.get(x, 0)) for f in formulas] for x in letters])
        if nu and len(species) >= 3:
            break
    nu = _mixed(rng, nu)
    phases: list[Phase] = ["fluid"] * len(species)
    if pure:
        for i in rng.sample(range(len(species)), rng.randint(1, min(5, len(species) - 1))):
            phases[i] = "pure"
            species[i] += "(s)"
    spread = rng.choice([1.0, 10.0, 30.0, 80.0])
    potential = [rng.gauss(0.0, spread) for _ in species]
    ln_k = tuple(-math.fsum(float(c) * g for c, g in zip(row, potential, strict=True)) for row in nu)
    if rng.random() < 0.5:
        species.append("I0")
        phases.append("fluid")
        nu = [[*row, Fraction(0)] for row in nu]
    n0 = [_amount(rng) for _ in species]
    if not any(n0):
        n0[0] = 1.0
    kind = rng.choice("PPVCX")
    state = State(kind, rng.uniform(250.0, 2000.0), 10.0 ** rng.uniform(-5, 3), 10.0 ** rng.uniform(-2, 4))
    return Problem(tuple(species), tuple(phases), tuple(map(tuple, nu)), tuple(n0), ln_k, state)


def _species(rng: random.Random, letters: str, count: int) -> tuple[list[str], list[dict[str, int]]]:
    names: dict[str, dict[str, int]] = {}
    while len(names) < count:
        formula = {x: rng.randint(1, 4) for x in letters if rng.random() < 0.6}
        if not formula:
            formula = {rng.choice(letters): rng.randint(1, 2)}
        names["".join(x + (str(k) if k > 1 else "") for x, k in formula.items())] = formula
        if len(letters) == 1 and len(names) == 4:
            break
    return list(names), list(names.values())


def _amount(rng: random.Random) -> float:
    draw = rng.random()
    if draw < 0.3:
        return 0.0
    if draw < 0.4:
        return 10.0 ** rng.uniform(-14, -4)
    if draw < 0.65:
        return float(rng.choice([1, 2, 3, 10, 100]))
    return float(f"{10.0 ** rng.uniform(-3, 2.5):.8g}")


def _mixed(rng: random.Random, nu: list[list[Fraction]]) -> list[list[Fraction]]:
    """Other reactions that span the same."""
    rows = [row[:] for row in nu]
    for _ in range(rng.randint(0, len(rows))):
        i, j = rng.randrange(len(rows)), rng.randrange(len(rows))
        if i != j:
            c = Fraction(rng.choice([-2, -1, 1, 2]), rng.choice([1, 1, 2]))
            rows[i] = [x + c * y for x, y in zip(rows[i], rows[j], strict=True)]
    rng.shuffle(rows)
    return rows


def null_space(matrix: list[list[Fraction]]) -> list[list[Fraction]]:
    """A basis of the vectors that each row takes to zero, by Gauss-Jordan in fractions."""
    rows = [row[:] for row in matrix]
    width = len(rows[0])
    pivots: list[int] = []
    for c in range(width):
        r = next((i for i in range(len(pivots), len(rows)) if rows[i][c]), None)
        if r is None:
            continue
        t = len(pivots)
        rows[t], rows[r] = rows[r], rows[t]
        rows[t] = [x / rows[t][c] for x in rows[t]]
        for i in range(len(rows)):
            if i != t and rows[i][c]:
                factor = rows[i][c]
                rows[i] = [x - factor * y for x, y in zip(rows[i], rows[t], strict=True)]
        pivots.append(c)
    basis = []
    for free in (c for c in range(width) if c not in pivots):
        v = [Fraction(0)] * width
        v[free] = Fraction(1)
        for t, c in enumerate(pivots):
            v[c] = -rows[t][free]
        basis.append(v)
    return basis


def error_of(problem: Problem, n: tuple[float, ...]) -> float:
    """How far the amounts are from the equilibrium, relative, the worst species counting.

    Amounts below 1e-300 count as 0; the result is inf where the amounts are no equilibrium at all.
    """
    with mp.workdps(DIGITS):
        solved = refine(problem, n, steps=3)
        if solved is None:
            return math.inf
        worst = 0.0
        for claimed, exact in zip(n, solved, strict=True):
            if exact < mpf("1e-300"):
                worst = max(worst, 0.0 if 0.0 <= claimed < 2e-300 else math.inf)
            else:
                worst = max(worst, float(abs(claimed / exact - 1)))
        return worst


def refine(problem: Problem, n: tuple[float, ...], steps: int) -> list[mpf] | None:
    """The equilibrium near the amounts claimed, with the same phases present, in high precision.

    None where the amounts cannot be an equilibrium. Call it under mp.workdps. A fluid species claimed to be 0
    begins at what a reaction among the others makes of it; where there is no such reaction it has to stay 0.
    """
    claimed = {i: mpf(v) for i, v in enumerate(n) if v > 0.0}
    zero = [i for i, v in enumerate(n) if v == 0.0]
    fluid = [i for i in claimed if problem.phases[i] == "fluid"]
    start = {i: mp.log(v) if i in fluid else v for i, v in claimed.items()}
    potential = _potentials(problem, {i: start[i] for i in fluid})
    for i in zero:
        if problem.phases[i] == "fluid" and (row := _made_alone(problem, i, zero)) is not None:
            start[i] = _ln_activity(row, i, potential) - _constant(problem, potential)
            fluid.append(i)
    there = sorted(start)
    gone = [i for i in range(len(n)) if i not in start]
    x = _newton(problem, [start[i] for i in there], there, fluid, gone, steps)
    if x is None or any(v < 0 for i, v in x.items() if i not in fluid):
        return None
    potential = _potentials(problem, {i: x[i] for i in fluid})
    for i in gone:
        row = _made_alone(problem, i, gone)
        if problem.phases[i] == "pure" and row is not None and _ln_activity(row, i, potential) > mpf("1e-9"):
            return None
    return [mpf(0) if i in gone else mp.exp(x[i]) if i in fluid else x[i] for i in range(len(n))]


def _shift(state: State) -> mpf:
    if state.kind == "P":
        return mp.log(mpf(state.p))
    if state.kind == "V":
        return mp.log(mpf(R_L_BAR) * mpf(state.t) / mpf(state.v))
    return -mp.log(mpf(state.v)) if state.kind == "C" else mpf(0)


def _constant(problem: Problem, potential: dict[int, mpf]) -> mpf:
    """What a ln activity has beside ln n; -1 stands for ln of the total."""
    return _shift(problem.state) - (potential[-1] if problem.state.per_total else 0)


def _potentials(problem: Problem, ln_n: dict[int, mpf]) -> dict[int, mpf]:
    out = {-1: mp.log(sum((mp.exp(v) for v in ln_n.values()), mpf(0))) if ln_n else mpf(0)}
    constant = _constant(problem, out)
    return out | {i: v + constant for i, v in ln_n.items()}


def _made_alone(problem: Problem, i: int, zero: list[int]) -> tuple[list[Fraction], mpf] | None:
    """A reaction that makes one of species i and touches no other of the species at zero, with its ln K."""
    for mix in _leaving_out(problem, [q for q in zero if q != i]):
        row = _combined(problem, mix)
        if row[i]:
            return [c / row[i] for c in row], _mixed_ln_k(problem, mix) / _m(row[i])
    return None


def _leaving_out(problem: Problem, species: list[int]) -> list[list[Fraction]]:
    """Multipliers of the reactions whose sums leave these species out, as a basis."""
    if not species:
        size = range(len(problem.nu))
        return [[Fraction(int(i == j)) for j in size] for i in size]
    return null_space([[row[i] for row in problem.nu] for i in species])


def _combined(problem: Problem, mix: list[Fraction]) -> list[Fraction]:
    width = range(len(problem.n0))
    return [sum((c * row[i] for c, row in zip(mix, problem.nu, strict=True)), Fraction(0)) for i in width]


def _mixed_ln_k(problem: Problem, mix: list[Fraction]) -> mpf:
    return sum((_m(c) * mpf(k) for c, k in zip(mix, problem.ln_k, strict=True)), mpf(0))


def _ln_activity(made: tuple[list[Fraction], mpf], i: int, potential: dict[int, mpf]) -> mpf:
    """The ln activity that a species would have by the reaction that makes it."""
    row, ln_k = made
    used = (_m(c) * potential[k] for k, c in enumerate(row) if c and k != i and k in potential)
    return ln_k - sum(used, mpf(0))


def _balances(problem: Problem, there: list[int]) -> list[list[Fraction]] | None:
    """Independent balances over what is there, total last; None where something conserved has no place."""
    rows = []
    for law in null_space([list(row) for row in problem.nu]):
        total = sum((a * Fraction(b) for a, b in zip(law, problem.n0, strict=True)), Fraction(0))
        rows.append([*(law[i] for i in there), total])
    out: list[list[Fraction]] = []
    for c in range(len(there)):
        r = next((k for k, row in enumerate(rows) if row[c]), None)
        if r is None:
            continue
        lead = rows.pop(r)
        rows = [[x - row[c] / lead[c] * y for x, y in zip(row, lead, strict=True)] for row in rows]
        out.append(lead)
    return None if any(row[-1] for row in rows) else out


def _newton(
    problem: Problem, x: list[mpf], there: list[int], fluid: list[int], gone: list[int], steps: int
) -> dict[int, mpf] | None:
    """Newton's method on every affinity and balance at once; None if the last change is not small."""
    size = len(there)
    balances = _balances(problem, there)
    mixes = [mix for mix in _leaving_out(problem, gone) if any(_combined(problem, mix))]
    if balances is None or len(balances) + len(mixes) != size:
        return None
    for _ in range(steps):
        amount = [mp.exp(v) if i in fluid else v for i, v in zip(there, x, strict=True)]
        total = sum((a for i, a in zip(there, amount, strict=True) if i in fluid), mpf(0))
        potential = _potentials(problem, {i: v for i, v in zip(there, x, strict=True) if i in fluid})
        matrix, right = mp.matrix(size, size), mp.matrix(size, 1)
        for r, mix in enumerate(mixes):
            row = _combined(problem, mix)
            growth = sum((row[i] for i in fluid), Fraction(0)) * problem.state.per_total
            right[r] = _mixed_ln_k(problem, mix) - sum((_m(row[i]) * potential[i] for i in fluid), mpf(0))
            for c, i in enumerate(there):
                if i in fluid:
                    matrix[r, c] = _m(row[i]) - _m(growth) * amount[c] / total
        for r, law in enumerate(balances, len(mixes)):
            right[r] = _m(law[-1]) - sum((_m(a) * b for a, b in zip(law[:-1], amount, strict=True)), mpf(0))
            for c, i in enumerate(there):
                matrix[r, c] = _m(law[c]) * (amount[c] if i in fluid else 1)
        try:
            change = mp.lu_solve(matrix, right)
        except ZeroDivisionError:
            return None
        x = [v + change[c] for c, v in enumerate(x)]
    moves = [abs(change[c]) if i in fluid else abs(change[c] / x[c]) for c, i in enumerate(there)]
    return dict(zip(there, x, strict=True)) if max(moves, default=0) < 1e-12 else None


def _m(x: Fraction) -> mpf:
    return mpf(x.numerator) / mpf(x.denominator)
