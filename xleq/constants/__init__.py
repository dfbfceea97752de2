"""Equilibrium constants: bases and their conversion, scale, reverse, sum, K(T) and fits. All in ln K."""

from xleq.constants.algebra import (
    affinity,
    dg_from_ln_k,
    ln_k_at,
    ln_k_combined,
    ln_k_from_dg,
    ln_k_scaled,
    ln_quotient,
)
from xleq.constants.bases import (
    STANDARD,
    Basis,
    concentration_size,
    ln_factor,
    ln_factor_of,
    ln_k_converted,
    parse_basis,
    pressure_size,
)
from xleq.constants.cells import read_k, write_k
from xleq.constants.fits import TERMS, Fit, dh_from_fit, fit_ln_k, ln_k_from_fit, u_ln_k_from_fit

__all__ = [
    "STANDARD",
    "TERMS",
    "Basis",
    "Fit",
    "affinity",
    "concentration_size",
    "dg_from_ln_k",
    "dh_from_fit",
    "fit_ln_k",
    "ln_factor",
    "ln_factor_of",
    "ln_k_at",
    "ln_k_combined",
    "ln_k_converted",
    "ln_k_from_dg",
    "ln_k_from_fit",
    "ln_k_scaled",
    "ln_quotient",
    "parse_basis",
    "pressure_size",
    "read_k",
    "u_ln_k_from_fit",
    "write_k",
]
