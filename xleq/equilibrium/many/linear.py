"""The set of pure phases guessed from the linear part of the free energy.

Without the entropy of mixing the free energy is linear in the amounts, and its minimum a linear program.
Where constants span many decades its phases are mostly those of the equilibrium; at any rate they are a set
to try.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from xleq.equilibrium.many.newton import System
from xleq.equilibrium.structure import eliminate, exact_totals

Floats = NDArray[np.float64]


def by_linear_program(base: System, pure: NDArray[np.intp]) -> tuple[frozenset[int] | None, Floats]:
    """The set of phases and ln n [n_species] of the linear program's vertex; None if it has none.

    Parameters
    ----------
    base : System
        With no pure phase present.
    pure : array of int
        Pure phases that can be there.
    """
    from scipy.optimize import linprog

    size = len(base.n0)
    can = np.concatenate([base.fluid, pure])
    e = eliminate(base.whole, [*base.gone, *can])
    absent = set(base.gone.tolist())
    rows = [r for r, k in enumerate(e.pivots) if k not in absent]
    basis = np.array([i for i in can if i not in e.pivots], dtype=np.intp)
    cost = np.zeros(size)
    # A pivot is made from the basis, which costs nothing; fluid species count at fraction 1.
    cost[base.fluid] = base.shift + base.ln_gamma[base.fluid]
    by_row = base.ln_k @ e.combos[rows].astype(np.float64).T / e.denominator
    cost[[e.pivots[r] for r in rows]] -= by_row
    balance = np.zeros((len(basis), size))
    balance[np.arange(len(basis)), basis] = 1.0
    balance[:, [e.pivots[r] for r in rows]] = -e.rows[rows][:, basis].astype(np.float64).T / e.denominator
    totals, denominator = exact_totals(e, basis.tolist(), base.n0)
    fed = float(sum(base.n0))
    found = linprog(cost[can], A_eq=balance[:, can], b_eq=[x / denominator / fed for x in totals])
    n = np.zeros(size)
    if found.x is None:
        return None, n
    n[can] = found.x * fed
    present = frozenset(int(p) for p in pure if n[p] > 1e-12 * fed)
    return present, np.asarray(np.log(np.maximum(n, 1e-6 * fed)))
