"""Fugacity coefficients by the virial equation cut after the second coefficient, Z = 1 + B p/(R T).

B of a pure gas after Pitzer and Abbott: B p_c/(R T_c) = B0 + ω B1, B0 = 0.083 − 0.422/T_r^1.6,
B1 = 0.139 − 0.172/T_r^4.2; B of a pair by the rules of Prausnitz, with Z_c = 0.291 − 0.080 ω and
V_c = Z_c R T_c/p_c (J. M. Smith, H. C. Van Ness and M. M. Abbott, Introduction to Chemical Engineering
Thermodynamics, 7th ed., 2005, ch. 3 and 11; Z_c after B. I. Lee and M. G. Kesler, AIChE J. 21 (1975) 510).
For moderate pressures; the limits of `notes` are after R. C. Reid, J. M. Prausnitz and B. E. Poling (1987),
p ≤ (T/2) Σ y p_c/Σ y T_c (from memory).
"""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from xleq.activity.fluids import Array, Fluid, State, critical_constants
from xleq.errors import InputError, OutOfRangeError
from xleq.thermo import Table
from xleq.units import R_L_BAR


def second_virial_coefficient(t: float, tc: Array, pc: Array, omega: Array) -> Array:
    """B of pure gases or pairs by the Pitzer–Abbott correlation [L/mol].

    Parameters
    ----------
    t : float
        Temperature. [K]
    tc, pc, omega : array
        Critical temperature [K] and pressure [bar], acentric factor [-].

    Examples
    --------
    >>> b = second_virial_coefficient(523.15, np.array([647.1]), np.array([220.55]), np.array([0.345]))
    >>> round(float(b[0]), 4)
    -0.1481
    """
    tr = t / tc
    b0 = 0.083 - 0.422 / tr**1.6
    b1 = 0.139 - 0.172 / tr**4.2
    result: Array = R_L_BAR * tc / pc * (b0 + omega * b1)
    return result


def virial_ln_phi(b: Array, y: Array, t: float, p: float) -> Array:
    """Ln φ of a mixture from its matrix of second virial coefficients.

    Parameters
    ----------
    b : array [n_gas, n_gas]
        B of pairs; pure gases on the diagonal. [L/mol]
    y : array [n_gas]
        Mole fractions.
    t, p : float
        Temperature [K], pressure [bar].
    """
    mixed = b @ y
    result: Array = p / (R_L_BAR * t) * (2.0 * mixed - float(y @ mixed))
    return result


class Virial:
    """The gas by the virial equation, for the species of one problem.

    Parameters
    ----------
    constants : sequence [n_species] of Fluid or None
        None for a species that is not in the gas: its ln φ is 0.
    kij : array [n_species, n_species], optional
        Corrections of the pair's critical temperature, 0 by default. [-]
    """

    name = "virial"

    def __init__(self, constants: Sequence[Fluid | None], kij: Array | None = None) -> None:
        self.size = len(constants)
        self.inside = np.array([i for i, c in enumerate(constants) if c is not None], dtype=np.intp)
        if not self.inside.size:
            raise InputError("the virial equation needs at least one gas")
        known = [c for c in constants if c is not None]
        self.tc, self.pc = np.array([c.tc for c in known]), np.array([c.pc for c in known])
        omega = np.array([c.omega for c in known])
        full = np.zeros((self.size, self.size)) if kij is None else np.asarray(kij, dtype=np.float64)
        zc = 0.291 - 0.080 * omega
        cube = np.cbrt(zc * R_L_BAR * self.tc / self.pc)
        self.omega = (omega[:, None] + omega[None, :]) / 2.0
        self.tcij = np.sqrt(np.outer(self.tc, self.tc)) * (1.0 - full[np.ix_(self.inside, self.inside)])
        volume = ((cube[:, None] + cube[None, :]) / 2.0) ** 3
        self.pcij = (zc[:, None] + zc[None, :]) / 2.0 * R_L_BAR * self.tcij / volume
        np.fill_diagonal(self.pcij, self.pc)

    def coefficients(self, t: float) -> Array:
        """B of all pairs at t [K] [n_gas, n_gas, L/mol]."""
        return second_virial_coefficient(t, self.tcij, self.pcij, self.omega)

    def ln_gamma(self, n: Array, state: State) -> Array:
        """Ln φ at T and p, or ln(φ Z) at T and V, of amounts n [n_species] mol; 0 outside the gas.

        Raises
        ------
        InputError
            If the state is not one of a gas.
        OutOfRangeError
            If the volume is so small that the equation has no pressure for it.
        """
        return self.ln_gamma_slopes(n, state)[0]

    def ln_gamma_slopes(self, n: Array, state: State) -> tuple[Array, Array]:
        """Ln γ [n_species] and its slopes ∂ ln γ_i/∂n_j [n_species, n_species, 1/mol], analytic."""
        if state.kind not in "PV":
            raise InputError("a gas equation of state applies to a gas at T and P, or at T and V")
        gas = n[self.inside]
        total = float(gas.sum())
        values, matrix = np.zeros(self.size), np.zeros((self.size, self.size))
        if total <= 0.0:
            return values, matrix
        b, y, rt = self.coefficients(state.t), gas / total, R_L_BAR * state.t
        mixed = b @ y
        mean = float(y @ mixed)
        db = 2.0 * (mixed - mean) / total  # slope of the mean B
        spread = 2.0 * mixed - mean
        d_spread = 2.0 * (b - mixed[:, None]) / total - db[None, :]
        if state.kind == "P":
            values[self.inside] = state.p / rt * spread
            matrix[np.ix_(self.inside, self.inside)] = state.p / rt * d_spread
            return values, matrix
        free = state.v - total * mean
        if not free > 0.0:
            raise OutOfRangeError(f"{state.v:.6g} L is too small a volume for the virial equation")
        density = total / free  # p/(R T)
        d_free = -mean - total * db
        d_density = (1.0 - density * d_free) / free
        values[self.inside] = density * spread + math.log(state.v / free)
        slopes = density * d_spread + np.outer(spread, d_density) - d_free[None, :] / free
        matrix[np.ix_(self.inside, self.inside)] = slopes
        return values, matrix

    def pressure(self, n: Array, state: State) -> float:
        """Pressure of the gas at T and V, or that of the state [bar]."""
        if state.kind == "P":
            return state.p
        gas = n[self.inside]
        total = float(gas.sum())
        if total <= 0.0:
            return 0.0
        mean = float(gas @ self.coefficients(state.t) @ gas) / (total * total)
        return total * R_L_BAR * state.t / (state.v - total * mean)

    def notes(self, n: Array, state: State) -> tuple[str, ...]:
        """Warnings at this composition.

        Raises
        ------
        OutOfRangeError
            Beyond twice the pressure up to which the equation is recommended.
        """
        gas = n[self.inside]
        total = float(gas.sum())
        if total <= 0.0:
            return ()
        y, p = gas / total, self.pressure(n, state)
        limit = 0.5 * state.t * float(y @ self.pc) / float(y @ self.tc)
        if p > 2.0 * limit:
            raise OutOfRangeError(
                f"the virial equation holds up to about {limit:.4g} bar here, not at {p:.4g} bar; use gas=PR"
            )
        if p > limit:
            return (f"the virial equation is meant for up to about {limit:.4g} bar here; it is {p:.4g} bar",)
        return ()


def virial(species: Sequence[str], gases: Sequence[bool], table: Table | None = None) -> Virial:
    """The virial model of the gases among species, from the table's critical constants and kij.

    Parameters
    ----------
    species : sequence [n_species] of str
    gases : sequence [n_species] of bool
    table : Table, optional

    Raises
    ------
    MissingDataError
        If critical constants of a gas are not in the table.
    """
    constants, kij = critical_constants(species, gases, table)
    return Virial(constants, kij)
