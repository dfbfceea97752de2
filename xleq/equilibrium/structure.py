"""The exact linear algebra of a set of reactions: rank, bases, dependent reactions, species that cannot form.

Everything here is done in whole numbers, so that a zero is a zero: whether reactions are independent, whether
a species can form and what remains of a limiting component are questions that rounding must not answer.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from functools import lru_cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

from xleq.errors import AmbiguousError, OutOfRangeError

#: Largest system that is taken on; the work grows with the third power. [-]
MAX_SPECIES = 250
MAX_REACTIONS = 250
#: How far ln K of a dependent reaction may be from what the others imply, relative to their size. [-]
LN_K_AGREEMENT = 1e-6
_INT64_SAFE = 2.0**61

Stoichiometry = tuple[tuple[Fraction, ...], ...]


@dataclass(frozen=True, slots=True)
class Elimination:
    """Reactions rewritten so that each makes one species (its pivot) out of those that are no pivots.

    Parameters
    ----------
    pivots : tuple [rank] of int
        The species that each rewritten reaction makes.
    rows : array [rank, n_species] of whole numbers
        Coefficients times `denominator`; the pivot's own is `denominator`.
    combos : array [rank, n_reactions] of whole numbers
        Multipliers of the reactions given (each scaled to whole numbers) that make the row.
    denominator : int
        Positive.
    """

    pivots: tuple[int, ...]
    rows: NDArray[Any]
    combos: NDArray[Any]
    denominator: int


@dataclass(frozen=True, slots=True)
class Structure:
    """What the stoichiometry alone decides.

    Parameters
    ----------
    whole : array [n_reactions, n_species] of whole numbers
        Each reaction times its own `scales` entry.
    scales : tuple [n_reactions] of int
    independent : tuple of int
        Reactions, in the order given, that are not combinations of earlier ones.
    relations : tuple of (int, tuple [n_reactions] of Fraction)
        For each dependent reaction the multipliers of the independent ones that make it.
    """

    whole: NDArray[Any]
    scales: tuple[int, ...]
    independent: tuple[int, ...]
    relations: tuple[tuple[int, tuple[Fraction, ...]], ...]


def check_size(n_species: int, n_reactions: int) -> None:
    """Refuse a system too large to be solved in reasonable time.

    Raises
    ------
    OutOfRangeError
        If there are more than `MAX_SPECIES` species or `MAX_REACTIONS` reactions.

    Examples
    --------
    >>> check_size(10_000, 3)
    Traceback (most recent call last):
    xleq.errors.OutOfRangeError: 10000 species are too many; at most 250 are solved at once
    """
    if n_species > MAX_SPECIES:
        raise OutOfRangeError(f"{n_species} species are too many; at most {MAX_SPECIES} are solved at once")
    if n_reactions > MAX_REACTIONS:
        raise OutOfRangeError(
            f"{n_reactions} reactions are too many; at most {MAX_REACTIONS} are solved at once"
        )


@lru_cache(maxsize=256)
def structure(nu: Stoichiometry) -> Structure:
    """Rank and dependent reactions of a set, by exact elimination.

    Parameters
    ----------
    nu : tuple [n_reactions] of tuple [n_species] of Fraction
        Products positive.

    Examples
    --------
    >>> one, two = Fraction(1), Fraction(2)
    >>> s = structure(((-one, one), (-two, two)))
    >>> s.independent, s.relations
    ((0,), ((1, (Fraction(2, 1), Fraction(0, 1))),))
    """
    scales = tuple(math.lcm(1, *(Fraction(x).denominator for x in row)) for row in nu)
    n_species = len(nu[0]) if nu else 0
    check_size(n_species, len(nu))
    whole = np.array(
        [[int(x * scale) for x in row] for row, scale in zip(nu, scales, strict=True)], dtype=object
    ).reshape(len(nu), n_species)
    if not whole.size or max(abs(x) for x in whole.flat) < 2**30:
        whole = whole.astype(np.int64)
    whole.setflags(write=False)
    # The transposed matrix is eliminated: its pivots are the reactions that are independent of earlier ones.
    turned = eliminate(np.ascontiguousarray(whole.T), range(len(nu)))
    relations = []
    for r in sorted(set(range(len(nu))) - set(turned.pivots)):
        share = [Fraction(0)] * len(nu)
        for row, s in enumerate(turned.pivots):
            # Back from the reactions scaled to whole numbers to the reactions as given.
            share[s] = Fraction(int(turned.rows[row, r]), turned.denominator) * scales[s] / scales[r]
        relations.append((r, tuple(share)))
    return Structure(whole, scales, tuple(sorted(turned.pivots)), tuple(relations))


def eliminate(matrix: NDArray[Any], order: Sequence[int]) -> Elimination:
    """Gauss-Jordan elimination in whole numbers, columns taken in the order given.

    No fractions arise, and each row is kept free of common factors, so that its numbers stay small. Species
    early in the order become pivots if they can; so the order decides the basis.

    Parameters
    ----------
    matrix : array [n_reactions, n_species] of whole numbers
    order : sequence of int
        Columns to try as pivots, first to last.

    Examples
    --------
    >>> e = eliminate(np.array([[-1, 2, 0], [-1, 0, 3]]), [1, 0, 2])
    >>> e.pivots, e.rows.tolist(), e.denominator
    ((1, 0), [[0, 2, -3], [2, 0, -6]], 2)
    """
    n_rows, n_cols = matrix.shape
    m = np.concatenate([matrix, np.eye(n_rows, dtype=matrix.dtype)], axis=1)
    pivots: list[int] = []
    for c in order:
        t = len(pivots)
        if t == n_rows:
            break
        hit = np.flatnonzero(m[:, c])
        at = int(np.searchsorted(hit, t))
        if at == len(hit):
            continue
        source = int(hit[at])
        if source != t:
            m[[t, source]] = m[[source, t]]
            hit = np.flatnonzero(m[:, c])
        others = hit[hit != t]
        pivots.append(int(c))
        if not len(others):
            continue
        if m.dtype != object and 2.0 * float(np.abs(m).max()) ** 2 > _INT64_SAFE:
            m = m.astype(object)
        changed = m[t, c] * m[others] - np.multiply.outer(m[others, c], m[t])
        m[others] = changed // np.gcd.reduce(changed, axis=1)[:, None]
    rank = len(pivots)
    own = [int(m[r, c]) for r, c in enumerate(pivots)]
    denominator = math.lcm(1, *own)
    factors = [denominator // x for x in own]
    top = float(np.abs(m[:rank]).max()) if rank else 0.0
    if m.dtype != object and denominator * top > _INT64_SAFE:
        m = m.astype(object)
    m = m[:rank] * np.array(factors, dtype=m.dtype)[:, None]
    return Elimination(tuple(pivots), m[:, :n_cols], m[:, n_cols:], denominator)


def check_dependent(s: Structure, ln_k: Sequence[float]) -> tuple[tuple[float, ...], tuple[str, ...]]:
    """The constants made consistent, and a note for each dependent reaction.

    Parameters
    ----------
    s : Structure
    ln_k : sequence [n_reactions] of float
        ln K of the reactions. [-]

    Returns
    -------
    tuple [n_reactions] of float
        ln K, those of dependent reactions replaced by what the independent ones imply. [-]
    tuple of str

    Raises
    ------
    AmbiguousError
        If a dependent reaction's constant contradicts the others: the reaction and the discrepancy are named.
    """
    if not s.relations:
        return tuple(ln_k), ()
    consistent, notes = list(ln_k), []
    for r, share in s.relations:
        terms = [float(x) * ln_k[i] for i, x in enumerate(share) if x]
        implied = math.fsum(terms)
        scale = max(1.0, abs(ln_k[r]), *(abs(x) for x in terms)) if terms else 1.0
        gap = ln_k[r] - implied
        made_of = " ".join(
            f"{'+' if x > 0 else '-'} {_times(abs(x))}({i + 1})" for i, x in enumerate(share) if x
        )
        if abs(gap) > LN_K_AGREEMENT * scale:
            raise AmbiguousError(
                f"reaction {r + 1} is the combination {made_of or 'of none'} of the others, which give it "
                f"ln K = {implied:.10g}; its own ln K = {ln_k[r]:.10g} differs by {gap:.3g}: "
                "correct one constant or leave the reaction out"
            )
        consistent[r] = implied
        notes.append(
            f"reaction {r + 1} depends on the others ({made_of}); its ln K agrees within {abs(gap):.1g}"
        )
    return tuple(consistent), tuple(notes)


def _times(x: Fraction) -> str:
    return "" if x == 1 else f"{x} "


def formable(whole: NDArray[Any], fed: NDArray[np.bool_]) -> NDArray[np.bool_]:
    """Which species are fed or can form from what is fed, by any combination of the reactions.

    Parameters
    ----------
    whole : array [n_reactions, n_species] of whole numbers
    fed : array [n_species] of bool
        Species whose feed is above zero.

    Examples
    --------
    >>> formable(np.array([[-1, 1, 0], [0, 1, -1]]), np.array([True, False, False])).tolist()
    [True, True, True]
    """
    can = fed.copy()
    while not can.all():
        # A reaction that consumes only what can be there makes its other side possible.
        grown = can.copy()
        for row in whole:
            for side in (row, -row):
                if can[side < 0].all():
                    grown |= side > 0
        if (grown == can).all():
            missing = np.flatnonzero(~can)
            made = _jointly_formable(whole[:, missing])
            if not made:
                break
            grown[missing[made]] = True
        can = grown
    return can


def _jointly_formable(columns: NDArray[Any]) -> list[int]:
    """Columns that some combination of the rows makes positive while it makes none negative.

    A combination is fixed by what it makes of the pivot columns, t >= 0; the others are C t >= 0. The largest
    sum of t under sum t <= 1 is found by the simplex method in fractions, with Bland's rule.
    """
    e = eliminate(columns, range(columns.shape[1]))
    others = [j for j in range(columns.shape[1]) if j not in e.pivots]
    r = len(e.pivots)
    if r == 0:
        return []
    d = e.denominator
    table = [[Fraction(-int(e.rows[i, j]), d) for i in range(r)] for j in others] + [[Fraction(1)] * r]
    right = [Fraction(0)] * len(others) + [Fraction(1)]
    cost = [Fraction(1)] * r
    value, basic, free = Fraction(0), [r + i for i in range(len(table))], list(range(r))
    while True:
        entering = [(free[j], j) for j in range(r) if cost[j] > 0]
        if not entering:
            break
        j = min(entering)[1]
        ratios = [(right[i] / row[j], basic[i], i) for i, row in enumerate(table) if row[j] > 0]
        i = min(ratios)[2]
        pivot = table[i][j]
        value += cost[j] * right[i] / pivot
        _exchange(table, right, cost, i, j)
        basic[i], free[j] = free[j], basic[i]
    if value == 0:
        return []
    amount = {basic[i]: right[i] for i in range(len(table))}
    t = [amount.get(i, Fraction(0)) for i in range(r)]
    made = [p for i, p in enumerate(e.pivots) if t[i] > 0]
    made += [j for j in others if sum(t[i] * int(e.rows[i, j]) for i in range(r)) > 0]
    return sorted(made)


def _exchange(
    table: list[list[Fraction]], right: list[Fraction], cost: list[Fraction], i: int, j: int
) -> None:
    """One pivot of a condensed simplex tableau, in place."""
    pivot = table[i][j]
    row = [x / pivot for x in table[i]]
    row[j] = 1 / pivot
    right[i] /= pivot
    for k, other in enumerate(table):
        if k != i and other[j]:
            factor = other[j]
            table[k] = [x - factor * y for x, y in zip(other, row, strict=True)]
            table[k][j] = -factor / pivot
            right[k] -= factor * right[i]
    factor = cost[j]
    cost[:] = [x - factor * y for x, y in zip(cost, row, strict=True)]
    cost[j] = -factor / pivot
    table[i] = row


def exact_totals(e: Elimination, columns: Sequence[int], n0: Sequence[float]) -> tuple[list[int], int]:
    """What is conserved of each species that is no pivot: n_j minus its part in the pivots, exactly.

    Parameters
    ----------
    e : Elimination
    columns : sequence of int
        Species that are no pivots.
    n0 : sequence [n_species] of float
        Amounts fed. [mol]

    Returns
    -------
    list of int
        Totals as whole multiples of one over the second result. [mol]
    int
        The common denominator.
    """
    ratios = [x.as_integer_ratio() for x in n0]
    base = max((q for _, q in ratios), default=1)
    amounts = [p * (base // q) for p, q in ratios]
    totals = []
    for j in columns:
        total = e.denominator * amounts[j]
        for row, k in enumerate(e.pivots):
            if amounts[k] and (x := int(e.rows[row, j])):
                total -= x * amounts[k]
        totals.append(total)
    return totals, base * e.denominator
