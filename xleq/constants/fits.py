"""Correlations ln K = a + b/T + c ln T + d T, fitted to measured constants by weighted least squares."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

from xleq.errors import InputError, NoAnswerError, OutOfRangeError
from xleq.units import R

#: Names of the terms, in order.
TERMS: Final = ("a", "b", "c", "d")
#: Above this condition number of the scaled columns the data cannot tell the terms apart.
WORST_CONDITION: Final = 1e10
#: An estimate within this many standard errors of 0 is not supported by the data.
SUPPORT: Final = 2.0


@dataclass(frozen=True, slots=True)
class Fit:
    """A correlation ln K = a + b/T + c ln T + d T with what is known of its quality.

    Parameters
    ----------
    coefficients : tuple [n_terms] of float
        a [-], b [K], c [-], d [1/K]; the ones left out are 0.
    covariance : tuple [n_terms] of tuple [n_terms] of float
        Of the coefficients; empty where it is not known.
    t_min, t_max : float
        Range of the data. [K]
    residual : float
        Standard deviation of the weighted residuals of ln K. [-]
    condition : float
        Condition number of the scaled columns. [-]
    """

    coefficients: tuple[float, ...]
    covariance: tuple[tuple[float, ...], ...] = ()
    t_min: float = 0.0
    t_max: float = math.inf
    residual: float = math.nan
    condition: float = math.nan

    @property
    def standard_errors(self) -> tuple[float, ...]:
        """Standard errors of the coefficients, in their units."""
        return tuple(math.sqrt(row[i]) for i, row in enumerate(self.covariance))

    @property
    def unsupported(self) -> tuple[str, ...]:
        """Names of the terms, beyond the constant, that the data do not support."""
        pairs = zip(TERMS, self.coefficients, self.standard_errors, strict=False)
        return tuple(name for name, x, u in pairs if name != "a" and abs(x) < SUPPORT * u)


def _terms(t: float, n: int) -> tuple[float, ...]:
    return (1.0, 1.0 / t, math.log(t), t)[:n]


def fit_ln_k(
    t: Sequence[float], ln_k: Sequence[float], n_terms: int = 2, u_ln_k: Sequence[float] | None = None
) -> Fit:
    """The correlation that fits measured constants best, by weighted least squares on ln K.

    The columns are scaled to unit length and factored by QR (Golub & Van Loan, Matrix Computations, 4th ed.,
    2013, section 5.3). Without uncertainties of ln K all points weigh the same and the covariance is taken
    from their scatter; with them it follows from the uncertainties alone.

    Parameters
    ----------
    t : sequence [n_points] of float
        Absolute temperatures. [K]  Each > 0.
    ln_k : sequence [n_points] of float
        [-]
    n_terms : {2, 3, 4}
        How many of a, b/T, c ln T, d T.
    u_ln_k : sequence [n_points] of float, optional
        Standard uncertainties of ln K. [-]  Each > 0.

    Raises
    ------
    InputError
        If the lengths differ, or a number of terms is not 2, 3 or 4.
    OutOfRangeError
        If a temperature or an uncertainty is not above 0.
    NoAnswerError
        If there are too few points, or the data cannot tell the terms apart.

    Examples
    --------
    >>> fit = fit_ln_k([300.0, 400.0, 500.0], [10.0, 5.1, 2.0])
    >>> [round(x, 3) for x in fit.coefficients], [round(u, 3) for u in fit.standard_errors]
    ([-9.935, 5987.755], [0.226, 84.835])
    """
    import numpy as np

    _check_data(t, ln_k, n_terms, u_ln_k)
    n = len(t)
    weights = np.ones(n) if u_ln_k is None else 1.0 / np.asarray(u_ln_k, dtype=float)
    columns = np.array([_terms(x, n_terms) for x in t]) * weights[:, None]
    scale = np.linalg.norm(columns, axis=0)
    q, r = np.linalg.qr(columns / scale)
    condition = float(np.linalg.cond(r))
    if not condition < WORST_CONDITION:
        raise NoAnswerError(
            f"{n_terms} terms cannot be told apart by these temperatures; use fewer terms or a wider range"
        )
    target = np.asarray(ln_k, dtype=float) * weights
    scaled = np.linalg.solve(r, q.T @ target)
    # One step of refinement: the columns are nearly parallel over a narrow range of temperature.
    scaled += np.linalg.solve(r, q.T @ (target - (columns / scale) @ scaled))
    left = target - (columns / scale) @ scaled
    residual = math.sqrt(float(left @ left) / (n - n_terms))
    root = np.linalg.solve(r, np.eye(n_terms)) / scale[:, None]
    if u_ln_k is None:
        root *= residual
    return Fit(
        tuple(float(x) for x in scaled / scale),
        tuple(tuple(float(v) for v in row) for row in root @ root.T),
        min(t),
        max(t),
        residual,
        condition,
    )


def _check_data(
    t: Sequence[float], ln_k: Sequence[float], n_terms: int, u_ln_k: Sequence[float] | None
) -> None:
    if n_terms not in (2, 3, 4):
        raise InputError(f"{n_terms} terms; a fit has 2, 3 or 4: a, b/T, c ln T, d T")
    if len(t) != len(ln_k) or (u_ln_k is not None and len(u_ln_k) != len(t)):
        raise InputError(f"temperatures: {len(t)}, constants: {len(ln_k)}; one is needed for each")
    if any(not (x > 0.0 and math.isfinite(x)) for x in t):
        raise OutOfRangeError("a temperature is not above 0 K")
    if u_ln_k is not None and any(not (u > 0.0 and math.isfinite(u)) for u in u_ln_k):
        raise OutOfRangeError("an uncertainty of ln K is not above 0")
    if len(set(t)) < n_terms or len(t) < n_terms + 1:
        raise NoAnswerError(
            f"{n_terms} terms need at least {n_terms + 1} points at {n_terms} different temperatures; "
            f"there are {len(t)} points at {len(set(t))}"
        )


def ln_k_from_fit(fit: Fit, t: float) -> float:
    """Ln K of a correlation at a temperature.

    Parameters
    ----------
    fit : Fit
    t : float
        Absolute temperature. [K]  Within the range of the fit.

    Raises
    ------
    OutOfRangeError
        If it lies outside.

    Examples
    --------
    >>> ln_k_from_fit(Fit((-10.0, 6000.0)), 400.0)
    5.0
    """
    if not t > 0.0 or not fit.t_min * (1 - 1e-9) <= t <= fit.t_max * (1 + 1e-9):
        raise OutOfRangeError(f"{t:g} K lies outside the range of the fit, {fit.t_min:g} to {fit.t_max:g} K")
    return math.fsum(x * term for x, term in zip(fit.coefficients, _terms(t, 4), strict=False))


def u_ln_k_from_fit(fit: Fit, t: float) -> float:
    """Standard uncertainty of ln K of a correlation, from the full covariance of its coefficients.

    Parameters
    ----------
    fit : Fit
        With its covariance.
    t : float
        Absolute temperature. [K]

    Raises
    ------
    InputError
        If the covariance is not known.
    OutOfRangeError
        If T is not above 0.

    Examples
    --------
    >>> fit = fit_ln_k([300.0, 400.0, 500.0], [10.0, 5.1, 2.0])
    >>> round(u_ln_k_from_fit(fit, 400.0), 4)
    0.0476
    """
    if not fit.covariance:
        raise InputError("the covariance of this fit is not known")
    if not t > 0.0:
        raise OutOfRangeError(f"the temperature is {t:g} K; it must be above 0 K")
    x = _terms(t, len(fit.coefficients))
    variance = math.fsum(
        a * b * v for a, row in zip(x, fit.covariance, strict=True) for b, v in zip(x, row, strict=True)
    )
    return math.sqrt(max(variance, 0.0))


def dh_from_fit(fit: Fit, t: float) -> float:
    """Enthalpy of reaction that a correlation implies, R T² d ln K/dT [kJ/mol].

    Parameters
    ----------
    fit : Fit
        Of K°.
    t : float
        Absolute temperature. [K]  Must be > 0.

    Raises
    ------
    OutOfRangeError
        If T is not above 0.

    Examples
    --------
    >>> round(dh_from_fit(Fit((-10.0, 6000.0)), 400.0), 3)
    -49.887
    """
    if not t > 0.0:
        raise OutOfRangeError(f"the temperature is {t:g} K; it must be above 0 K")
    _, b, c, d = (*fit.coefficients, 0.0, 0.0, 0.0)[:4]
    return R * (-b + c * t + d * t * t) / 1000.0
