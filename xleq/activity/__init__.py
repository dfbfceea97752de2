"""Departure from ideal: gas fugacity, aqueous activity; one file a model."""

from xleq.activity.aqueous import (
    LIMITS,
    Aqueous,
    activity_coefficient,
    charge_excess,
    check_neutral,
    ionic_strength,
    log10_gamma,
    ph,
    strength_notes,
)
from xleq.activity.fluids import Fluid, FluidState, State, critical_constants
from xleq.activity.peng_robinson import PengRobinson, Roots, peng_robinson
from xleq.activity.virial import Virial, second_virial_coefficient, virial, virial_ln_phi
from xleq.activity.water import debye_huckel_a, debye_huckel_slope, dielectric_constant, liquid_density, p_kw

__all__ = [
    "LIMITS",
    "Aqueous",
    "Fluid",
    "FluidState",
    "PengRobinson",
    "Roots",
    "State",
    "Virial",
    "activity_coefficient",
    "charge_excess",
    "check_neutral",
    "critical_constants",
    "debye_huckel_a",
    "debye_huckel_slope",
    "dielectric_constant",
    "ionic_strength",
    "liquid_density",
    "log10_gamma",
    "p_kw",
    "peng_robinson",
    "ph",
    "second_virial_coefficient",
    "strength_notes",
    "virial",
    "virial_ln_phi",
]
