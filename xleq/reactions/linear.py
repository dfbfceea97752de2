"""Linear algebra in exact rationals, for systems as small as reactions are."""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction
from math import gcd, lcm

Row = list[Fraction]


def reduced(rows: Sequence[Sequence[Fraction]]) -> tuple[list[Row], list[int]]:
    """Reduced row-echelon form, without its zero rows, and its pivot columns.

    Parameters
    ----------
    rows : sequence [n_rows] of sequence [n_columns] of Fraction

    Examples
    --------
    >>> form, pivots = reduced([[Fraction(2), Fraction(4)], [Fraction(1), Fraction(2)]])
    >>> [[str(x) for x in row] for row in form], pivots
    ([['1', '2']], [0])
    """
    work = [list(row) for row in rows]
    pivots: list[int] = []
    done = 0
    for column in range(len(work[0]) if work else 0):
        found = next((r for r in range(done, len(work)) if work[r][column]), None)
        if found is None:
            continue
        work[done], work[found] = work[found], work[done]
        pivot = work[done][column]
        head = work[done] = [x / pivot for x in work[done]]
        for r, row in enumerate(work):
            factor = row[column]
            if r != done and factor:
                work[r] = [x - factor * h if h else x for x, h in zip(row, head, strict=True)]
        pivots.append(column)
        done += 1
    return work[:done], pivots


def null_space(rows: Sequence[Sequence[Fraction]], n_columns: int) -> list[Row]:
    """A basis of the vectors x with rows · x = 0.

    Parameters
    ----------
    rows : sequence [n_rows] of sequence [n_columns] of Fraction
    n_columns : int

    Returns
    -------
    list [dimension] of list [n_columns] of Fraction

    Examples
    --------
    >>> [[str(x) for x in v] for v in null_space([[Fraction(2), Fraction(-1)]], 2)]
    [['1/2', '1']]
    """
    form, pivots = reduced(rows)
    basis = []
    for free in range(n_columns):
        if free in pivots:
            continue
        vector = [Fraction(0)] * n_columns
        vector[free] = Fraction(1)
        for row, pivot in zip(form, pivots, strict=True):
            vector[pivot] = -row[free]
        basis.append(vector)
    return basis


def smallest_integers(vector: Sequence[Fraction]) -> Row:
    """The vector times the positive number that makes it whole numbers without a common divisor.

    Examples
    --------
    >>> [int(x) for x in smallest_integers([Fraction(1, 2), Fraction(3, 2), Fraction(-1)])]
    [1, 3, -2]
    """
    scale = lcm(*(x.denominator for x in vector))
    whole = [x * scale for x in vector]
    divisor = gcd(*(int(x) for x in whole)) or 1
    return [x / divisor for x in whole]
