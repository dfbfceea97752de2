"""How an equilibrium answers to small changes: the converged Jacobian solved for other right-hand sides."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from xleq.equilibrium.many.newton import Path, System, log_sums, residual

Floats = NDArray[np.float64]


class Response:
    """Derivatives of the amounts at fixed phases, to first order.

    Parameters
    ----------
    system : System
    path : Path
        Converged for it.
    """

    def __init__(self, system: System, path: Path) -> None:
        self.system, self.frame = system, path.frame
        f = path.frame
        self.n_basis = len(f.basis)
        _, self.slope, ln_n = residual(system, f, path.x)
        terms = np.append(ln_n, 0.0)
        adds, add_share = log_sums(f.log_adds + terms)
        _, take_share = log_sums(f.log_takes + terms)
        self.share = (add_share - take_share)[:, :-1]
        self.by_total = -np.diag(np.exp(-adds))
        if system.per_total:
            _, share = log_sums(ln_n[None, :])
            self.share = np.concatenate([self.share, share])
            self.by_total = np.concatenate([self.by_total, np.zeros((1, self.n_basis))])
        self.n = np.exp(ln_n)
        self.species = np.concatenate([f.basis, f.made])

    def ln_amounts(self, offset: Floats, totals: Floats, diluting: Floats) -> Floats:
        """Change of ln n [n_basis + n_made, n_changes].

        Parameters
        ----------
        offset : array [n_basis + n_made, n_changes] of float
            Change of ln n at fixed unknowns.
        totals : array [n_basis, n_changes] of float
            Change of what is conserved. [mol]
        diluting : array [n_changes] of float
            Amount of something new in the fluid. [mol]
        """
        right = self.share @ offset + self.by_total @ totals
        if self.system.per_total:
            right[-1] += diluting / self.n.sum()
        if not len(self.slope):
            return offset
        return np.asarray(offset + self.frame.linear @ np.linalg.solve(self.slope, -right))

    def offset_by_ln_gamma(self) -> Floats:
        """D offset / d ln gamma [n_basis + n_made, n_basis + n_made]."""
        out = np.zeros((len(self.species), len(self.species)))
        out[self.n_basis :, : self.n_basis] = self.frame.recipe
        out[self.n_basis :, self.n_basis :] = -np.eye(len(self.frame.made))
        return out

    def by_ln_gamma(self) -> Floats:
        """D ln n / d ln gamma [n_species, n_species]; 0 for what is not in the fluid."""
        offset = self.offset_by_ln_gamma()
        nothing = np.zeros((self.n_basis, len(self.species)))
        part = self.ln_amounts(offset, nothing, np.zeros(len(self.species)))
        size = len(self.system.n0)
        out = np.zeros((size, size))
        out[np.ix_(self.species, self.species)] = part
        return out

    def offset_by_ln_k(self) -> Floats:
        """D offset / d ln K [n_basis + n_made, n_reactions], of the reactions as the system has them."""
        f = self.frame
        out = np.zeros((len(self.species), self.system.whole.shape[0]))
        combos = f.elimination.combos[list(f.rows_of_made)].astype(np.float64)
        out[self.n_basis :] = combos / f.elimination.denominator
        return out

    def offset_by_shift(self) -> Floats:
        """D offset / d shift [n_basis + n_made]."""
        out = np.zeros(len(self.species))
        out[self.n_basis :] = self.frame.recipe.sum(axis=1) - 1.0
        return out

    def totals_by_feed(self, species: NDArray[np.intp]) -> Floats:
        """D total / d n0 [len(species), n_species] of species that are no pivots."""
        e = self.frame.elimination
        out = np.zeros((len(species), len(self.system.n0)))
        out[np.arange(len(species)), species] = 1.0
        out[:, list(e.pivots)] = -(e.rows[:, species].T / e.denominator).astype(np.float64)
        return out

    def amounts(self, ln_n: Floats, totals: Floats, present: Floats) -> Floats:
        """Change of n [n_species, n_changes, mol] from that of ln n.

        The basis and the pure phases follow from their balances: an abundant species that hardly changes then
        has its small change to full precision.

        Parameters
        ----------
        ln_n : array [n_basis + n_made, n_changes] of float
        totals, present : array [n_basis | n_present, n_changes] of float
            Changes of what is conserved of the basis and of the pure phases. [mol]
        """
        f, system = self.frame, self.system
        made = self.n[self.n_basis :, None] * ln_n[self.n_basis :]
        out = np.zeros((len(system.n0), ln_n.shape[1]))
        out[f.made] = made
        out[f.basis] = totals - f.recipe.T @ made
        rows = f.elimination.rows[list(f.rows_of_made)][:, system.present].astype(np.float64)
        out[system.present] = present + rows.T @ made / f.elimination.denominator
        return out
