"""Activity coefficients of ions in dilute aqueous solution: Debye–Hückel limiting law and Davies' equation.

Concentrations are mol/L and the slope A is that for mol/L. Neutral solutes have γ = 1, and so has the water.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final, Literal

import numpy as np

from xleq.activity.fluids import Array, State
from xleq.activity.water import debye_huckel_a
from xleq.errors import InputError, OutOfRangeError

Model = Literal["davies", "debye-huckel"]

_LN10: Final = math.log(10.0)


@dataclass(frozen=True, slots=True)
class Limits:
    """Ionic strengths up to which a model is meant, and beyond which it is refused [mol/L]."""

    meant: float
    refused: float


#: `meant`: W. Stumm and J. J. Morgan, Aquatic Chemistry, 3rd ed., 1996, table 3.3 (from memory);
#: `refused`: common practice, no source. Davies' γ of a single charge has its minimum near 0.53 mol/L.
LIMITS: Final[dict[Model, Limits]] = {"davies": Limits(0.5, 1.0), "debye-huckel": Limits(0.005, 0.1)}


def ionic_strength(charges: Sequence[float], concentrations: Sequence[float]) -> float:
    """Ionic strength I = ½ Σ z² c [mol/L].

    Parameters
    ----------
    charges : sequence [n_species]
        In elementary charges.
    concentrations : sequence [n_species]
        At least 0. [mol/L]

    Raises
    ------
    InputError
        If the lengths differ or a concentration is negative or not finite.

    Examples
    --------
    >>> ionic_strength([2, -1], [0.1, 0.2])
    0.30000000000000004
    """
    if len(charges) != len(concentrations):
        raise InputError(f"{len(charges)} charges for {len(concentrations)} concentrations")
    for c in concentrations:
        if not (c >= 0.0 and math.isfinite(c)):
            raise InputError(f"a concentration must be at least 0 mol/L, not {c:g}")
    return 0.5 * math.fsum(z * z * c for z, c in zip(charges, concentrations, strict=True))


def charge_excess(charges: Sequence[float], concentrations: Sequence[float]) -> float:
    """Excess Σ z c, the charge that a solution has too much [mol/L]."""
    return math.fsum(z * c for z, c in zip(charges, concentrations, strict=True))


def check_neutral(charges: Sequence[float], concentrations: Sequence[float], tolerance: float = 1e-6) -> None:
    """Refuse a solution that is not electroneutral.

    Parameters
    ----------
    charges, concentrations : sequence [n_species]
        [elementary charges], [mol/L]
    tolerance : float
        Largest excess of charge, relative to Σ |z| c. [-]

    Raises
    ------
    InputError
        Names the excess and its sign.

    Examples
    --------
    >>> check_neutral([1, -1], [0.1, 0.2])
    Traceback (most recent call last):
    xleq.errors.InputError: the solution is not electroneutral: 0.1 mol/L of negative charge too much
    """
    excess = charge_excess(charges, concentrations)
    total = math.fsum(abs(z) * c for z, c in zip(charges, concentrations, strict=True))
    if abs(excess) > tolerance * total:
        sign = "positive" if excess > 0 else "negative"
        raise InputError(
            f"the solution is not electroneutral: {abs(excess):.4g} mol/L of {sign} charge too much"
        )


def log10_gamma(
    charge: float, strength: float, a: float, model: Model = "davies", coefficient: float = 0.3
) -> float:
    """Log10 γ of an ion.

    Debye–Hückel: −A z² √I. Davies: −A z² (√I/(1 + √I) − 0.3 I) (C. W. Davies, Ion Association, 1962, p. 41;
    J. Chem. Soc. 1938, 2093 has 0.2).

    Parameters
    ----------
    charge : float
    strength : float
        Ionic strength. [mol/L, or mol/kg with A for it]
    a : float
        Debye–Hückel slope A.
    model : {"davies", "debye-huckel"}
    coefficient : float
        Davies' coefficient, 0.3 or 0.2.

    Examples
    --------
    >>> round(10 ** log10_gamma(1, 0.1, 0.509), 4), round(10 ** log10_gamma(2, 0.1, 0.509), 4)
    (0.7816, 0.3732)
    """
    root = math.sqrt(strength)
    shape = root if model == "debye-huckel" else root / (1.0 + root) - coefficient * strength
    return -a * charge * charge * shape


def activity_coefficient(
    charge: float, strength: float, t: float = 298.15, model: Model = "davies", coefficient: float = 0.3
) -> float:
    """Activity coefficient γ of an ion on the scale of mol/L.

    Parameters
    ----------
    charge : float
    strength : float
        Ionic strength. [mol/L]
    t : float
        Temperature. [K]
    model : {"davies", "debye-huckel"}
    coefficient : float
        Davies' coefficient.

    Raises
    ------
    OutOfRangeError
        Beyond the hard limit of the model, or where water is no liquid.
    """
    strength_notes(strength, model)
    return math.pow(10.0, log10_gamma(charge, strength, debye_huckel_a(t), model, coefficient))


def strength_notes(strength: float, model: Model) -> tuple[str, ...]:
    """A warning where the ionic strength is beyond what the model is meant for.

    Raises
    ------
    OutOfRangeError
        If it is beyond the hard limit.
    """
    if not strength >= 0.0:
        raise OutOfRangeError(f"the ionic strength must be at least 0 mol/L, not {strength:g}")
    limits = LIMITS[model]
    if strength > limits.refused:
        raise OutOfRangeError(
            f"ionic strength {strength:.4g} mol/L: {model} is refused beyond {limits.refused:g} mol/L"
        )
    if strength > limits.meant:
        return (f"ionic strength {strength:.4g} mol/L: {model} is meant for up to {limits.meant:g} mol/L",)
    return ()


def ph(hydrogen: float, gamma: float = 1.0) -> float:
    """The pH, −log10(γ c) of hydrogen ions of concentration c.

    Parameters
    ----------
    hydrogen : float
        Concentration of H+. [mol/L]  Must be > 0.
    gamma : float
        Activity coefficient of H+.

    Raises
    ------
    OutOfRangeError
        If there are no hydrogen ions.

    Examples
    --------
    >>> round(ph(1e-3), 6)
    3.0
    """
    if not hydrogen > 0.0:
        raise OutOfRangeError(f"pH needs a concentration of H+ above 0, not {hydrogen:g} mol/L")
    return -math.log10(gamma * hydrogen)


class Aqueous:
    """Ions of one problem by a Debye–Hückel model.

    Parameters
    ----------
    charges : sequence [n_species] of float
        0 for neutral solutes and for species that are not dissolved.
    model : {"davies", "debye-huckel"}
    coefficient : float
        Davies' coefficient, 0.3 (1962) or 0.2 (1938).

    Examples
    --------
    >>> from xleq.activity.fluids import FluidState
    >>> model = Aqueous([1, -1, 0])
    >>> gamma = np.exp(model.ln_gamma(np.array([0.1, 0.1, 1.0]), FluidState("C", 298.15)))
    >>> [round(float(g), 4) for g in gamma]
    [0.781, 0.781, 1.0]
    """

    def __init__(self, charges: Sequence[float], model: Model = "davies", coefficient: float = 0.3) -> None:
        if model not in LIMITS:
            raise InputError(f"activity model {model!r} is unknown; there are {', '.join(LIMITS)}")
        self.name = model if model == "debye-huckel" or coefficient == 0.3 else f"{model} ({coefficient:g})"
        self.model: Model = model
        self.coefficient = coefficient
        self.z2 = np.asarray(charges, dtype=np.float64) ** 2

    def strength(self, n: Array, state: State) -> float:
        """Ionic strength of amounts n [n_species] mol in the volume of the state [mol/L]."""
        return 0.5 * float(self.z2 @ n) / state.v

    def ln_gamma(self, n: Array, state: State) -> Array:
        """Ln γ [n_species] at amounts n [n_species, mol] in a solution of volume state.v.

        Beyond the hard limit of the model the value at the limit is given, so that an iteration may pass
        through it; `notes` refuses a result there.

        Raises
        ------
        InputError
            If the state is not a solution.
        OutOfRangeError
            If water is no liquid at the temperature.
        """
        return self.ln_gamma_slopes(n, state)[0]

    def ln_gamma_slopes(self, n: Array, state: State) -> tuple[Array, Array]:
        """Ln γ [n_species] and its slopes ∂ ln γ_i/∂n_j [n_species, n_species, 1/mol], analytic."""
        if state.kind != "C":
            raise InputError(f"the {self.model} model applies to a solution, not to a gas")
        a = debye_huckel_a(state.t) * _LN10
        strength, limit = self.strength(n, state), LIMITS[self.model].refused
        inside = 0.0 < strength < limit
        root = math.sqrt(min(strength, limit))
        if self.model == "debye-huckel":
            shape, slope = root, 0.5 / root if inside else 0.0
        else:
            shape = root / (1.0 + root) - self.coefficient * root * root
            slope = 0.5 / (root * (1.0 + root) ** 2) - self.coefficient if inside else 0.0
        values: Array = -a * shape * self.z2
        matrix: Array = np.outer(-a * slope * self.z2, 0.5 * self.z2 / state.v)
        return values, matrix

    def notes(self, n: Array, state: State) -> tuple[str, ...]:
        """Warnings at this composition; to be asked of every result.

        Raises
        ------
        OutOfRangeError
            Beyond the hard limit of the model.
        """
        strength = self.strength(n, state)
        a = debye_huckel_a(state.t)
        said = f"{self.name}: ionic strength {strength:.4g} mol/L, A = {a:.4f} (mol/L)^-1/2"
        return (said, *strength_notes(strength, self.model))
