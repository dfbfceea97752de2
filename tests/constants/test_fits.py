"""Correlations of ln K with temperature."""

from __future__ import annotations

import math
from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st

from xleq.constants import Fit, dh_from_fit, fit_ln_k, ln_k_from_fit, u_ln_k_from_fit
from xleq.errors import InputError, NoAnswerError, OutOfRangeError
from xleq.units import R


def exact_line(x: list[float], y: list[float]) -> tuple[float, float, float, float]:
    """Intercept, slope and their standard errors in exact rationals, by the textbook sums of a line."""
    xs, ys, n = [Fraction(v) for v in x], [Fraction(v) for v in y], len(x)
    mean_x, mean_y = sum(xs) / n, sum(ys) / n
    s_xx = sum((v - mean_x) ** 2 for v in xs)
    slope = sum((v - mean_x) * (w - mean_y) for v, w in zip(xs, ys, strict=True)) / s_xx
    intercept = mean_y - slope * mean_x
    left = sum((w - intercept - slope * v) ** 2 for v, w in zip(xs, ys, strict=True)) / (n - 2)
    errors = (left * (Fraction(1, n) + mean_x**2 / s_xx), left / s_xx)
    return float(intercept), float(slope), math.sqrt(errors[0]), math.sqrt(errors[1])


NOISE = [0.011, -0.004, 0.007, -0.012, 0.003, -0.006, 0.009, -0.008, 0.002, -0.002]
TEMPERATURES = [600.0 + 50.0 * i for i in range(10)]


def test_two_terms_are_the_textbook_line() -> None:
    """Sums for a straight line: Draper and Smith, Applied Regression Analysis, 3rd ed., 1998, chapter 1."""
    ln_k = [-12.0 + 6400.0 / t + e for t, e in zip(TEMPERATURES, NOISE, strict=True)]
    fit = fit_ln_k(TEMPERATURES, ln_k, 2)
    a, b, u_a, u_b = exact_line([1.0 / t for t in TEMPERATURES], ln_k)
    assert fit.coefficients == pytest.approx((a, b), rel=1e-11)
    assert fit.standard_errors == pytest.approx((u_a, u_b), rel=1e-10)
    assert (fit.t_min, fit.t_max) == (600.0, 1050.0)
    assert fit.unsupported == ()


@given(st.integers(2, 4), st.floats(-50, 50), st.floats(-2e4, 2e4), st.floats(-8, 8), st.floats(-5e-3, 5e-3))
def test_exact_data_give_back_their_coefficients(n: int, a: float, b: float, c: float, d: float) -> None:
    true = Fit((a, b, c, d)[:n])
    t = [300.0 + 60.0 * i for i in range(12)]
    fit = fit_ln_k(t, [ln_k_from_fit(true, x) for x in t], n)
    for x in (300.0, 517.0, 960.0):
        assert ln_k_from_fit(fit, x) == pytest.approx(ln_k_from_fit(true, x), rel=1e-9, abs=1e-9)


def test_uncertainties_weigh_the_points_and_give_the_covariance() -> None:
    """Two weights a factor 2 apart are the same as one point counted four times over."""
    t = [400.0, 500.0, 600.0]
    ln_k = [3.0, 1.1, -0.4]
    weighted = fit_ln_k(t, ln_k, 2, [0.1, 0.2, 0.2])
    repeated = fit_ln_k([400.0] * 4 + t[1:], [3.0] * 4 + ln_k[1:], 2, [0.2] * 6)
    assert weighted.coefficients == pytest.approx(repeated.coefficients, rel=1e-11)
    assert weighted.standard_errors == pytest.approx(repeated.standard_errors, rel=1e-10)
    half = fit_ln_k(t, ln_k, 2, [0.05, 0.1, 0.1])
    assert half.standard_errors == pytest.approx([u / 2 for u in weighted.standard_errors], rel=1e-10)


def test_the_uncertainty_of_a_constant_uses_the_whole_covariance() -> None:
    """For a line u² = s² (1/n + (x - x̄)²/Sxx); the standard errors alone would give many times more."""
    ln_k = [-12.0 + 6400.0 / t + e for t, e in zip(TEMPERATURES, NOISE, strict=True)]
    fit = fit_ln_k(TEMPERATURES, ln_k, 2)
    x = [1.0 / t for t in TEMPERATURES]
    mean = math.fsum(x) / 10
    s_xx = math.fsum((v - mean) ** 2 for v in x)
    for t in (600.0, 800.0, 1000.0):
        expected = fit.residual * math.sqrt(0.1 + (1 / t - mean) ** 2 / s_xx)
        assert u_ln_k_from_fit(fit, t) == pytest.approx(expected, rel=1e-8)
    alone = math.hypot(fit.standard_errors[0], fit.standard_errors[1] / 800.0)
    assert alone > 3 * u_ln_k_from_fit(fit, 800.0)


def test_a_term_that_the_data_do_not_support_is_named() -> None:
    ln_k = [-12.0 + 6400.0 / t + e for t, e in zip(TEMPERATURES, NOISE, strict=True)]
    fit = fit_ln_k(TEMPERATURES, ln_k, 4)
    assert set(fit.unsupported) >= {"c", "d"}


def test_the_slope_is_the_enthalpy() -> None:
    fit = Fit((10.0, 5000.0, -2.0, 1e-3))
    t, step = 700.0, 1e-3
    slope = (ln_k_from_fit(fit, t + step) - ln_k_from_fit(fit, t - step)) / (2 * step)
    assert dh_from_fit(fit, t) == pytest.approx(R * t * t * slope / 1000.0, rel=1e-7)


def test_the_ammonia_table_is_met_by_a_fit_of_three_terms() -> None:
    """NIST-JANAF, 4th ed., table H-083, log10 Kf of NH3 at 400 to 900 K."""
    t = [400.0, 500.0, 600.0, 700.0, 800.0, 900.0]
    log10_k = [0.776, -0.501, -1.382, -2.029, -2.524, -2.916]
    fit = fit_ln_k(t, [v * math.log(10) for v in log10_k], 3)
    for x, v in zip(t, log10_k, strict=True):
        assert ln_k_from_fit(fit, x) / math.log(10) == pytest.approx(v, abs=0.004)
    # The enthalpy it implies is that of formation at 700 K in the same table.
    assert dh_from_fit(fit, 700.0) == pytest.approx(-52.618, abs=0.1)


@pytest.mark.parametrize(
    ("t", "ln_k", "n", "error", "message"),
    [
        ([300.0, 400.0], [1.0, 2.0], 2, NoAnswerError, "at least 3 points at 2 different"),
        ([300.0] * 5, [1.0] * 5, 2, NoAnswerError, "there are 5 points at 1"),
        ([300.0, 400.0, 300.0, 400.0, 300.0], [1.0] * 5, 3, NoAnswerError, "there are 5 points at 2"),
        ([300.0, 400.0, 500.0], [1.0, 2.0], 2, InputError, "temperatures: 3, constants: 2;"),
        ([300.0, 400.0, 500.0], [1.0, 2.0, 3.0], 5, InputError, "a fit has 2, 3 or 4"),
        ([300.0, 0.0, 500.0], [1.0, 2.0, 3.0], 2, OutOfRangeError, "not above 0 K"),
        ([300.0 + 1e-6 * i for i in range(6)], [1.0] * 6, 4, NoAnswerError, "cannot be told apart"),
    ],
)
def test_data_that_cannot_be_fitted_are_refused(
    t: list[float], ln_k: list[float], n: int, error: type[Exception], message: str
) -> None:
    with pytest.raises(error, match=message):
        fit_ln_k(t, ln_k, n)


def test_uncertainties_must_be_positive() -> None:
    with pytest.raises(OutOfRangeError, match="uncertainty"):
        fit_ln_k([300.0, 400.0, 500.0], [1.0, 2.0, 3.0], 2, [0.1, 0.0, 0.1])


def test_a_fit_is_not_used_outside_its_range() -> None:
    fit = Fit((1.0, 2.0), t_min=300.0, t_max=400.0)
    assert ln_k_from_fit(fit, 400.0) == 1.005
    for t in (299.0, 401.0, 0.0, -5.0, math.nan):
        with pytest.raises(OutOfRangeError, match="outside the range"):
            ln_k_from_fit(fit, t)
    with pytest.raises(InputError, match="covariance"):
        u_ln_k_from_fit(fit, 350.0)
