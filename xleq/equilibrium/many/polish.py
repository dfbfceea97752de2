"""The last digits: a converged fluid solved again in fifty decimal digits.

A double holds sixteen digits, and where a species is a small difference of large ones they are not enough.
The feed and the constants are taken as the exact numbers that they are, the residual is computed in fifty
digits, and the Jacobian of the double solution brings it to nothing in a few corrections.
"""

from __future__ import annotations

from dataclasses import dataclass
from decimal import Context, Decimal, localcontext

import numpy as np
from numpy.typing import NDArray

from xleq.equilibrium.many.newton import Frame, Path, System, residual
from xleq.equilibrium.structure import exact_totals

Floats = NDArray[np.float64]

_DIGITS = Context(prec=50, Emin=-999999999, Emax=999999999)
_MAX_CORRECTIONS = 12
#: Error of ln n that is left in the end; less where amounts of pure phases come from differences. [-]
_SMALL_ENOUGH = 1e-18
_SMALL_FOR_PHASES = 1e-28
#: What is left of a difference below this part of its terms is nothing.
_NOTHING = Decimal("1e-25")
#: A fluid species above this many times the feed is no amount but a flight to infinity.
_TOO_MUCH = 1e20


@dataclass(frozen=True, slots=True)
class Polished:
    """Amounts right to the last digit of a double, and what follows from them.

    Parameters
    ----------
    ln_n : array [n_species] of float
        Of the fluid; 0 for the rest. [-]
    n : array [n_species] of float
        Also of the phases taken to be present, where it may come out negative. [mol]
    drive : array [n_species] of float
        Driving force to form each phase taken away, ln of the activity it would have; 0 for the rest. [-]
    """

    ln_n: Floats
    n: Floats
    drive: Floats


def polish(system: System, path: Path) -> Polished | None:
    """The amounts of a converged path in fifty digits; None if the corrections do not die out."""
    with localcontext(_DIGITS):
        f = path.frame
        model = _Exact(system, f)
        x = [Decimal(float(v)) for v in path.x]
        # The slope barely moves in the last corrections; only the residual needs the digits.
        slope = residual(system, f, path.x)[1]
        try:
            inverse = np.linalg.inv(slope) if len(x) else slope
        except np.linalg.LinAlgError:
            return None
        # What one correction leaves of an error: the inverse is good to some digits only.
        leaves = 1e-13 * float(np.abs(inverse).sum()) * float(np.abs(slope).sum())
        enough = _SMALL_FOR_PHASES if len(system.present) else _SMALL_ENOUGH
        last = np.inf
        for _ in range(_MAX_CORRECTIONS):
            value = model.residual(x)
            if not np.isfinite(value).all():
                return None
            change = inverse @ value
            size = float(np.abs(change).max(initial=0.0))
            if size > last and size > 1e-3:
                return None
            x = [v - Decimal(float(c)) for v, c in zip(x, change, strict=True)]
            last = size
            if size * (leaves + size) < enough:
                break
        else:
            return None
        ln_n = x[: len(f.basis)] + model.ln_made(x)
        if ln_n and max(ln_n).exp() > Decimal(_TOO_MUCH * sum(system.n0)):
            return None
        return model.finish(x, ln_n)


class _Exact:
    """One frame with its numbers as exact as they were given."""

    def __init__(self, system: System, f: Frame) -> None:
        self.system, self.f = system, f
        e = f.elimination
        self.d = Decimal(e.denominator)
        self.ln_k = [Decimal(float(v)) for v in system.ln_k]
        self.gamma = [Decimal(float(v)) for v in system.ln_gamma]
        self.shift = Decimal(float(system.shift))
        numerators, denominator = f.exact
        self.totals = [Decimal(v) / Decimal(denominator) for v in numerators]
        rows = (
            e.rows[list(f.rows_of_made)][:, f.basis]
            if len(f.made)
            else np.zeros((0, len(f.basis)), dtype=int)
        )
        self.recipe = [[Decimal(-int(v)) / self.d if v else None for v in row] for row in rows]
        self.offset = [
            self._offset(r, k, row) for r, k, row in zip(f.rows_of_made, f.made, self.recipe, strict=True)
        ]
        self.total_power = [
            Decimal(1) - sum((v for v in row if v is not None), Decimal(0)) for row in self.recipe
        ]

    def _row_ln_k(self, r: int) -> Decimal:
        combos = self.f.elimination.combos[r]
        return sum((int(m) * k for m, k in zip(combos, self.ln_k, strict=True) if m), Decimal(0)) / self.d

    def _offset(self, r: int, k: int, row: list[Decimal | None]) -> Decimal:
        out = self._row_ln_k(r) - self.shift - self.gamma[k]
        for j, v in zip(self.f.basis, row, strict=True):
            if v is not None:
                out += v * (self.shift + self.gamma[j])
        return out

    def ln_made(self, x: list[Decimal]) -> list[Decimal]:
        out = []
        for offset, row, power in zip(self.offset, self.recipe, self.total_power, strict=True):
            value = offset
            for v, at in zip(row, x, strict=False):
                if v is not None:
                    value += v * at
            if self.system.per_total:
                value += power * x[-1]
            out.append(value)
        return out

    def residual(self, x: list[Decimal]) -> Floats:
        """The residual, small enough for doubles."""
        made = self.ln_made(x)
        n_basis = len(self.f.basis)
        ln_n = x[:n_basis] + made
        n = [v.exp() for v in ln_n]
        out = []
        for j, total in enumerate(self.totals):
            adds, takes = n[j] + max(-total, Decimal(0)), max(total, Decimal(0))
            for amount, row in zip(n[n_basis:], self.recipe, strict=True):
                v = row[j]
                if v is not None:
                    if v > 0:
                        adds += v * amount
                    else:
                        takes -= v * amount
            out.append((adds / takes).ln() if adds and takes else Decimal("nan"))
        if self.system.per_total:
            out.append(sum(n, Decimal(0)).ln() - x[-1])
        return np.array([float(v) for v in out])

    def finish(self, x: list[Decimal], ln_n: list[Decimal]) -> Polished:
        f, system = self.f, self.system
        size = len(system.n0)
        full, n, drive = np.zeros(size), np.zeros(size), np.zeros(size)
        species = [*f.basis.tolist(), *f.made.tolist()]
        amounts = [v.exp() for v in ln_n]
        for i, ln, amount in zip(species, ln_n, amounts, strict=True):
            full[i], n[i] = float(ln), float(amount)
        e = f.elimination
        totals, denominator = exact_totals(e, system.present.tolist(), system.n0)
        for p, total in zip(system.present, totals, strict=True):
            left = Decimal(total) / Decimal(denominator)
            gross = Decimal(0)
            for r, amount in zip(f.rows_of_made, amounts[len(f.basis) :], strict=True):
                if v := int(e.rows[r, p]):
                    left += v * amount / self.d
                    gross += abs(v) * amount / self.d
            n[p] = float(left) if abs(left) > _NOTHING * gross else 0.0
        ln_total = x[-1] if system.per_total else Decimal(0)
        gone = set(system.gone.tolist())
        for r, p in enumerate(e.pivots):
            if p in gone:
                drive[p] = float(self._drive(r, x, ln_total))
        return Polished(full, n, drive)

    def _drive(self, r: int, x: list[Decimal], ln_total: Decimal) -> Decimal:
        out = self._row_ln_k(r)
        for j, ln in zip(self.f.basis, x, strict=False):
            if v := int(self.f.elimination.rows[r, j]):
                out -= v * (ln - ln_total + self.shift + self.gamma[j]) / self.d
        return out
