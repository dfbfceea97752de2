"""Fugacity coefficients of gas mixtures by the Peng–Robinson equation of state.

D.-Y. Peng and D. B. Robinson, Ind. Eng. Chem. Fundam. 15 (1976) 59:
p = R T/(v − b) − a/(v² + 2 b v − b²), a = Σ Σ y_i y_j √(a_i a_j) (1 − k_ij), b = Σ y_i b_i. What follows
from it is derived from the residual Helmholtz energy F(n, V), which gives ln φ and all its slopes at once
(M. L. Michelsen and J. M. Mollerup, Thermodynamic Models, 2nd ed., 2007, ch. 2).

Hydrogen and helium: their critical constants are used as they stand, without an effective temperature for
quantum gases; above 100 K this changes φ by far less than the equation's own error.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Final, Literal, NamedTuple

import numpy as np
from numpy.typing import NDArray

from xleq.activity.cubic import cubic_extremes, cubic_roots
from xleq.activity.fluids import Array, Fluid, State, critical_constants
from xleq.errors import InputError, NoAnswerError, OutOfRangeError
from xleq.thermo import Table
from xleq.units import R_L_BAR

_ROOT2: Final = math.sqrt(2.0)
_D1: Final = 1.0 + _ROOT2
_D2: Final = 1.0 - _ROOT2
_OMEGA_A: Final = 0.45724
_OMEGA_B: Final = 0.07780
#: Critical volume in units of b: Zc = 0.3074 over 0.0778. A fluid denser than this is no thin gas.
_CRITICAL_COVOLUMES: Final = 3.951

Root = Literal["stable", "vapour"]


class Roots(NamedTuple):
    """Compressibility factors Z that the equation allows at T and p, in rising order, and ln φ sums at them.

    `gibbs` is Σ y ln φ of each root; the stable root is the one where it is smallest.
    """

    z: tuple[float, ...]
    gibbs: tuple[float, ...]

    @property
    def stable(self) -> float:
        """Z of the root of lowest Gibbs energy."""
        return self.z[min(range(len(self.z)), key=self.gibbs.__getitem__)]

    @property
    def vapour(self) -> float:
        """The largest Z."""
        return self.z[-1]


class PengRobinson:
    """The gas as a Peng–Robinson mixture, for the species of one problem.

    Parameters
    ----------
    constants : sequence [n_species] of Fluid or None
        Critical constants; None for a species that is not in the gas (a pure solid or liquid): its ln φ is 0.
    kij : array [n_species, n_species], optional
        Binary interaction coefficients, 0 by default. Symmetric. [-]
    root : {"vapour", "stable"}
        Where the equation has three roots at T and p: the largest volume (default: the mixture is to be a
        gas; `notes` tells when it would rather condense), or the one of lowest Gibbs energy.

    Examples
    --------
    Ammonia at 673.15 K and 200 bar:

    >>> from xleq.activity.fluids import FluidState
    >>> model = PengRobinson([Fluid(405.7, 112.8, 0.253)])
    >>> state = FluidState("P", 673.15, 200.0)
    >>> round(float(np.exp(model.ln_gamma(np.ones(1), state)[0])), 5)
    0.91986
    """

    name = "Peng-Robinson"

    def __init__(
        self, constants: Sequence[Fluid | None], kij: Array | None = None, root: Root = "vapour"
    ) -> None:
        self.size = len(constants)
        self.root: Root = root
        self.inside: NDArray[np.intp] = np.array(
            [i for i, c in enumerate(constants) if c is not None], dtype=np.intp
        )
        if not self.inside.size:
            raise InputError("the Peng-Robinson equation needs at least one gas")
        known = [c for c in constants if c is not None]
        self.tc = np.array([c.tc for c in known])
        self.pc = np.array([c.pc for c in known])
        omega = np.array([c.omega for c in known])
        self.m = 0.37464 + 1.54226 * omega - 0.26992 * omega**2
        self.b = _OMEGA_B * R_L_BAR * self.tc / self.pc
        self.ac = _OMEGA_A * (R_L_BAR * self.tc) ** 2 / self.pc
        full = np.zeros((self.size, self.size)) if kij is None else np.asarray(kij, dtype=np.float64)
        if full.shape != (self.size, self.size) or not np.array_equal(full, full.T):
            raise InputError("kij must be a symmetric matrix, one row for each species")
        self.one_minus_kij = 1.0 - full[np.ix_(self.inside, self.inside)]
        self._t, self._a = math.nan, self.one_minus_kij

    def attraction(self, t: float) -> Array:
        """The matrix √(a_i a_j)(1 − k_ij) at t [K] [n_gas, n_gas, L² bar/mol²].

        The factor α = (1 + m(1 − √T_r))² is that of 1976; where its base would become negative (beyond
        T_r = (1 + 1/m)²) it is 0, since the equation would have the attraction rise again.
        """
        if t != self._t:
            base = np.maximum(1.0 + self.m * (1.0 - np.sqrt(t / self.tc)), 0.0)
            root = np.sqrt(self.ac) * base
            self._a = np.outer(root, root) * self.one_minus_kij
            self._t = t
        return self._a

    def roots(self, y: Array, t: float, p: float) -> Roots:
        """All physical roots at mole fractions y [n_gas], t [K], p [bar].

        Raises
        ------
        OutOfRangeError
            If t or p is not positive.
        """
        if not (t > 0.0 and p > 0.0 and math.isfinite(t) and math.isfinite(p)):
            raise OutOfRangeError(
                f"a gas needs a positive temperature and pressure, not {t:g} K and {p:g} bar"
            )
        rt = R_L_BAR * t
        a, b = float(y @ self.attraction(t) @ y), float(y @ self.b)
        big_a, big_b = a * p / rt**2, b * p / rt
        z = cubic_roots(
            big_b - 1.0, big_a - 3.0 * big_b**2 - 2.0 * big_b, big_b * (big_b * (1.0 + big_b) - big_a)
        )
        found = tuple(x for x in z if x > big_b)
        if not found:
            raise NoAnswerError(
                f"the Peng-Robinson equation has no root above its covolume at {t:g} K, {p:g} bar"
            )
        gibbs = []
        for x in found:
            attraction = big_a / (2.0 * _ROOT2 * big_b) * math.log((x + _D1 * big_b) / (x + _D2 * big_b))
            gibbs.append(x - 1.0 - math.log(x - big_b) - attraction)
        return Roots(found, tuple(gibbs))

    def volume(self, n: Array, state: State) -> float:
        """Volume of the gas of amounts n [n_gas] mol in a state [L]."""
        if state.kind == "V":
            return state.v
        total = float(n.sum())
        roots = self.roots(n / total, state.t, state.p)
        z = roots.vapour if self.root == "vapour" else roots.stable
        return z * total * R_L_BAR * state.t / state.p

    def ln_gamma(self, n: Array, state: State) -> Array:
        """Ln φ at T and p, or ln(φ Z) at T and V: what is to be added to the ln activity of the ideal gas.

        Parameters
        ----------
        n : array [n_species]
            Amounts. [mol]
        state : State
            Of kind P or V.

        Returns
        -------
        array [n_species]
            0 for species that are not in the gas.

        Raises
        ------
        InputError
            If the state is of another kind.
        OutOfRangeError
            If the volume is smaller than the covolume.
        """
        return self._evaluate(n, state, slopes=False)[0]

    def ln_gamma_slopes(self, n: Array, state: State) -> tuple[Array, Array]:
        """Ln γ [n_species] and its slopes ∂ ln γ_i/∂n_j [n_species, n_species, 1/mol], analytic.

        At constant T and p for kind P, at constant T and V for kind V.
        """
        return self._evaluate(n, state, slopes=True)

    def _evaluate(self, n: Array, state: State, *, slopes: bool) -> tuple[Array, Array]:
        if state.kind not in "PV":
            raise InputError("a gas equation of state applies to a gas at T and P, or at T and V")
        gas = n[self.inside]
        total = float(gas.sum())
        values, matrix = np.zeros(self.size), np.zeros((self.size, self.size) if slopes else (0, 0))
        if total <= 0.0:
            return values, matrix
        # For one mole of it: traces of a gas are as good a gas, and their squares would be nothing.
        volume = self.volume(gas, state) / total
        part = _Helmholtz(gas / total, 1.0, volume, self.attraction(state.t), self.b, R_L_BAR * state.t)
        g = part.first()
        if state.kind == "P":
            g = g - math.log(state.p * volume / (R_L_BAR * state.t))
        values[self.inside] = g
        if slopes:
            second = part.second()
            if state.kind == "P":
                dp_dn, dp_dv = part.pressure_slopes()
                second = second + 1.0 + np.outer(dp_dn, dp_dn) / (part.rt * dp_dv)
            matrix[np.ix_(self.inside, self.inside)] = second / total
        return values, matrix

    def ln_phi_many(self, y: Array, t: Array, p: Array) -> Array:
        """Ln φ of many mixtures at once, each at its own T and p.

        Parameters
        ----------
        y : array [n_states, n_species]
            Amounts or mole fractions; those of species outside the gas are not used.
        t, p : array [n_states]
            Temperature [K], pressure [bar].

        Returns
        -------
        array [n_states, n_species]

        Raises
        ------
        OutOfRangeError
            If a temperature or pressure is not positive.
        """
        if not (np.all(t > 0.0) and np.all(p > 0.0)):
            raise OutOfRangeError("a gas needs a positive temperature and pressure")
        gas = y[:, self.inside]
        gas = gas / gas.sum(axis=1, keepdims=True)
        base = np.maximum(1.0 + self.m * (1.0 - np.sqrt(t[:, None] / self.tc)), 0.0) * np.sqrt(self.ac)
        s = base * ((gas * base) @ self.one_minus_kij)
        a, b, rt = np.sum(gas * s, axis=1), gas @ self.b, R_L_BAR * t
        big_a, big_b = a * p / rt**2, b * p / rt
        z, low = cubic_extremes(
            big_b - 1.0, big_a - 3.0 * big_b**2 - 2.0 * big_b, big_b * (big_b * (1.0 + big_b) - big_a)
        )
        if self.root == "stable":
            low = np.where(low > big_b, low, z)
            z = np.where(_gibbs(low, big_a, big_b) < _gibbs(z, big_a, big_b), low, z)
        ratio = np.log1p(2.0 * _ROOT2 * big_b / (z + _D2 * big_b)) / (2.0 * _ROOT2 * big_b) * big_a
        share = self.b / b[:, None]
        result = np.zeros(y.shape)
        ln_phi = share * (z - 1.0)[:, None] - np.log(z - big_b)[:, None]
        result[:, self.inside] = ln_phi - ratio[:, None] * (2.0 * s / a[:, None] - share)
        return result

    def pressure(self, n: Array, state: State) -> float:
        """Pressure of the gas at T and V, or that of the state [bar]."""
        gas = n[self.inside]
        if state.kind == "P":
            return state.p
        part = _Helmholtz(gas, float(gas.sum()), state.v, self.attraction(state.t), self.b, R_L_BAR * state.t)
        return part.pressure()

    def notes(self, n: Array, state: State) -> tuple[str, ...]:
        """What a checker should know of the equation at this composition.

        Raises
        ------
        OutOfRangeError
            If the pressure at T and V is not positive: there is no such gas.
        """
        gas = n[self.inside]
        if float(gas.sum()) <= 0.0:
            return ()
        p = self.pressure(n, state)
        if p <= 0.0:
            raise OutOfRangeError(
                "the Peng-Robinson equation gives no positive pressure: the fluid would split"
            )
        roots = self.roots(gas / gas.sum(), state.t, p)
        said = f"Peng-Robinson (1976), p = {p:.6g} bar: "
        if len(roots.z) == 1:
            words = f"{said}one root, Z = {roots.z[0]:.5g}"
            covolumes = roots.z[0] * R_L_BAR * state.t / (p * float(self.b @ gas) / float(gas.sum()))
            if covolumes < _CRITICAL_COVOLUMES:
                words += "; denser than the equation's critical point: liquid-like rather than a gas"
            return (words,)
        taken = roots.vapour if self.root == "vapour" or state.kind == "V" else roots.stable
        words = f"{len(roots.z)} roots, Z = {taken:.5g} taken ({self.root})"
        if roots.stable < roots.vapour:
            words += "; the liquid-like root has the lower Gibbs energy: such a gas would condense"
        return (said + words,)


def _gibbs(z: Array, big_a: Array, big_b: Array) -> Array:
    """Σ y ln φ of mixtures at roots z."""
    attraction = big_a / (2.0 * _ROOT2 * big_b) * np.log1p(2.0 * _ROOT2 * big_b / (z + _D2 * big_b))
    result: Array = z - 1.0 - np.log(z - big_b) - attraction
    return result


class _Helmholtz:
    """Derivatives of the residual Helmholtz energy F = A^r/(R T) at amounts n and volume V."""

    def __init__(self, n: Array, total: float, volume: float, a: Array, b: Array, rt: float) -> None:
        self.n, self.total, self.v, self.a, self.b, self.rt = n, total, volume, a, b, rt
        self.big_b = float(n @ b)
        self.free = volume - self.big_b
        if not self.free > 0.0:
            raise OutOfRangeError(
                f"{volume:.6g} L is less than the covolume {self.big_b:.6g} L (Peng-Robinson) of the gas"
            )
        self.s = a @ n
        self.d = float(n @ self.s)
        self.q = volume * volume + 2.0 * self.big_b * volume - self.big_b * self.big_b
        self.q_b = 2.0 * (volume - self.big_b)
        ratio = 2.0 * _ROOT2 * self.big_b / (volume + _D2 * self.big_b)
        self.f = math.log1p(ratio) / (2.0 * _ROOT2 * self.big_b)
        self.f_b = -(self.f - volume / self.q) / self.big_b

    def first(self) -> Array:
        """Slopes ∂F/∂n_i at constant V: ln(φ Z)."""
        repulsion = -math.log(self.free / self.v) + self.total * self.b / self.free
        result: Array = repulsion - (2.0 * self.s * self.f + self.d * self.f_b * self.b) / self.rt
        return result

    def second(self) -> Array:
        """Slopes ∂²F/∂n_i∂n_j at constant V [1/mol]."""
        b, free = self.b, self.free
        f_bb = -(2.0 * self.f_b + self.v * self.q_b / self.q**2) / self.big_b
        repulsion = (b[:, None] + b[None, :]) / free + self.total * np.outer(b, b) / free**2
        mixed = np.outer(self.s, b)
        attraction = (
            2.0 * self.a * self.f + 2.0 * self.f_b * (mixed + mixed.T) + self.d * f_bb * np.outer(b, b)
        )
        result: Array = repulsion - attraction / self.rt
        return result

    def pressure(self) -> float:
        """Pressure [bar]."""
        return self.total * self.rt / self.free - self.d / self.q

    def pressure_slopes(self) -> tuple[Array, float]:
        """Slopes ∂p/∂n_i at constant V [bar/mol] and ∂p/∂V [bar/L]."""
        repulsion = self.rt / self.free + self.total * self.rt * self.b / self.free**2
        dp_dn = repulsion - 2.0 * self.s / self.q + self.d * self.q_b * self.b / self.q**2
        dp_dv = -self.total * self.rt / self.free**2 + self.d * 2.0 * (self.v + self.big_b) / self.q**2
        return dp_dn, dp_dv


def peng_robinson(
    species: Sequence[str], gases: Sequence[bool], table: Table | None = None, root: Root = "vapour"
) -> PengRobinson:
    """The Peng–Robinson model of the gases among species, from the table's critical constants and kij.

    Parameters
    ----------
    species : sequence [n_species] of str
        Keys such as ``"CO2(g)"``.
    gases : sequence [n_species] of bool
        Whether each is in the gas.
    table : Table, optional
        The built-in one by default.

    Raises
    ------
    MissingDataError
        If critical constants of a gas are not in the table.

    Examples
    --------
    >>> from xleq.activity.fluids import FluidState
    >>> model = peng_robinson(["N2(g)", "H2(g)", "NH3(g)"], [True] * 3)
    >>> state = FluidState("P", 723.15, 200.0)
    >>> [round(float(x), 3) for x in np.exp(model.ln_gamma(np.array([1.0, 3.0, 1.0]), state))]
    [1.074, 1.047, 0.99]
    """
    constants, kij = critical_constants(species, gases, table)
    return PengRobinson(constants, kij, root)
