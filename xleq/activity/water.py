"""Water as a solvent: density along saturation, dielectric constant, Debye–Hückel slope, ionic product."""

from __future__ import annotations

import math
from functools import lru_cache
from typing import Final, Literal, NamedTuple

from xleq.errors import OutOfRangeError

#: Exact constants of the 2019 SI (BIPM, SI Brochure, 9th ed., 2019), and ε0 of CODATA 2018.
ELEMENTARY_CHARGE: Final = 1.602176634e-19
BOLTZMANN: Final = 1.380649e-23
AVOGADRO: Final = 6.02214076e23
VACUUM_PERMITTIVITY: Final = 8.8541878128e-12
#: Critical temperature [K] and density [kg/m³] of water (IAPWS R2-83).
T_CRITICAL: Final = 647.096
RHO_CRITICAL: Final = 322.0
#: Range of what stands here: triple point to where the dielectric formulation is asked along saturation. [K]
T_LOW: Final = 273.15
T_HIGH: Final = 640.0

# W. Wagner and A. Pruß, J. Phys. Chem. Ref. Data 22 (1993) 783, eq. 2: (coefficient, exponent of 1 − T/Tc).
_DENSITY: Final = (
    (1.99274064, 1 / 3),
    (1.09965342, 2 / 3),
    (-0.510839303, 5 / 3),
    (-1.75493479, 16 / 3),
    (-45.5170352, 43 / 3),
    (-6.74694450e5, 110 / 3),
)
# IAPWS R8-97 (D. P. Fernández and others, J. Phys. Chem. Ref. Data 26 (1997) 1125): N, powers of δ and τ.
_DIELECTRIC: Final = (
    (0.978224486826, 1, 0.25),
    (-0.957771379375, 1, 1.0),
    (0.237511794148, 1, 2.5),
    (0.714692244396, 2, 1.5),
    (-0.298217036956, 3, 1.5),
    (-0.108863472196, 3, 2.5),
    (0.949327488264e-1, 4, 2.0),
    (-0.980469816509e-2, 5, 2.0),
    (0.165167634970e-4, 6, 5.0),
    (0.937359795772e-4, 7, 0.5),
    (-0.123179218720e-9, 10, 10.0),
)
_N12: Final = 0.196096504426e-2
_POLARIZABILITY: Final = 1.636e-40
_DIPOLE: Final = 6.138e-30
_R8_AVOGADRO: Final = 6.0221367e23
_R8_BOLTZMANN: Final = 1.380658e-23
_MOLAR_MASS: Final = 0.018015268

Release = Literal["R11-24", "R11-07"]


class _Ionization(NamedTuple):
    """Coefficients of the Bandura–Lvov equation."""

    alpha: tuple[float, float, float]
    beta: tuple[float, float, float]


_IONIZATION: Final[dict[Release, _Ionization]] = {
    "R11-24": _Ionization((-0.702132, 8681.05, -24145.1), (0.813876, -51.4471, -0.469920)),
    "R11-07": _Ionization((-0.864671, 8659.19, -22786.2), (0.642044, -56.8534, -0.375754)),
}
_COORDINATION: Final = 6


def _checked(t: float) -> None:
    if not T_LOW <= t <= T_HIGH:
        raise OutOfRangeError(f"liquid water: {t:g} K is outside {T_LOW:g} to {T_HIGH:g} K")


def liquid_density(t: float) -> float:
    """Density of saturated liquid water [kg/m³].

    W. Wagner and A. Pruß, J. Phys. Chem. Ref. Data 22 (1993) 783 (IAPWS SR1-86). At 1 bar and 25 °C the
    density is 0.004 % higher.

    Parameters
    ----------
    t : float
        Temperature. [K]  273.15 to 640.

    Raises
    ------
    OutOfRangeError
        Outside this range.

    Examples
    --------
    >>> round(liquid_density(298.15), 2)
    997.0
    """
    _checked(t)
    theta = 1.0 - t / T_CRITICAL
    return RHO_CRITICAL * (1.0 + math.fsum(c * math.pow(theta, power) for c, power in _DENSITY))


def dielectric_constant(t: float, rho: float) -> float:
    """Static dielectric constant of water (IAPWS R8-97) [-].

    Parameters
    ----------
    t : float
        Temperature. [K]
    rho : float
        Density. [kg/m³]

    Examples
    --------
    >>> round(dielectric_constant(298.15, 997.047), 2)
    78.41
    """
    delta, tau = rho / RHO_CRITICAL, T_CRITICAL / t
    g = 1.0 + math.fsum(c * delta**i * math.pow(tau, j) for c, i, j in _DIELECTRIC)
    g += _N12 * delta * math.pow(t / 228.0 - 1.0, -1.2)
    molecules = _R8_AVOGADRO * rho / (_MOLAR_MASS * VACUUM_PERMITTIVITY)
    a = molecules * _DIPOLE**2 * g / (_R8_BOLTZMANN * t)
    b = molecules * _POLARIZABILITY / 3.0
    root = math.sqrt(9.0 + 2.0 * a + 18.0 * b + a * a + 10.0 * a * b + 9.0 * b * b)
    return (1.0 + a + 5.0 * b + root) / (4.0 - 4.0 * b)


def debye_huckel_slope(t: float, rho: float, epsilon: float, *, molal: bool = True) -> float:
    """Slope A of log10 γ = −A z² √I, from the dielectric constant and the density of the solvent.

    A = (e²/(4π ε0 ε k T))^(3/2) (2π N_A ρ)^(1/2)/ln 10 (P. Debye and E. Hückel, Phys. Z. 24 (1923) 185).

    Parameters
    ----------
    t : float
        Temperature. [K]
    rho : float
        Density of the solvent. [kg/m³]
    epsilon : float
        Dielectric constant. [-]
    molal : bool
        For I in mol/kg [(mol/kg)^−½]; otherwise for I in mol/L [(mol/L)^−½].

    Examples
    --------
    >>> round(debye_huckel_slope(298.15, 997.047, 78.38), 4)
    0.5101
    """
    length = ELEMENTARY_CHARGE**2 / (4.0 * math.pi * VACUUM_PERMITTIVITY * epsilon * BOLTZMANN * t)
    density = rho if molal else 1000.0
    return math.pow(length, 1.5) * math.sqrt(2.0 * math.pi * AVOGADRO * density) / math.log(10.0)


@lru_cache(maxsize=1024)
def debye_huckel_a(t: float, *, molal: bool = False) -> float:
    """Debye–Hückel slope A for water along saturation, for I in mol/L (or in mol/kg, if `molal`).

    Parameters
    ----------
    t : float
        Temperature. [K]  273.15 to 640.

    Raises
    ------
    OutOfRangeError
        Outside this range.

    Examples
    --------
    >>> round(debye_huckel_a(298.15), 4), round(debye_huckel_a(298.15, molal=True), 4)
    (0.5106, 0.5098)
    """
    rho = liquid_density(t)
    return debye_huckel_slope(t, rho, dielectric_constant(t, rho), molal=molal)


def p_kw(t: float, rho: float | None = None, release: Release = "R11-24") -> float:
    """Negative log10 of the ionic product of water, on molality.

    IAPWS R11-24, Revised Release on the Ionization Constant of H2O (2024), after A. V. Bandura and
    S. N. Lvov, J. Phys. Chem. Ref. Data 35 (2006) 15; R11-07 is the release that it supersedes.

    Parameters
    ----------
    t : float
        Temperature. [K]  273.15 to 1273.15.
    rho : float, optional
        Density. [g/cm³]  By default that of the saturated liquid.
    release : {"R11-24", "R11-07"}

    Raises
    ------
    OutOfRangeError
        Outside the range of temperature, or without `rho` where there is no liquid.

    Examples
    --------
    >>> round(p_kw(298.15), 4)
    13.9947
    """
    if not T_LOW <= t <= 1273.15:
        raise OutOfRangeError(
            f"the ionic product of water is known from {T_LOW:g} to 1273.15 K, not at {t:g} K"
        )
    if rho is None:
        rho = liquid_density(t) / 1000.0
    (a0, a1, a2), (b0, b1, b2) = _IONIZATION[release]
    z = rho * math.exp(a0 + a1 / t + a2 / (t * t) * rho ** (2.0 / 3.0))
    gas = 0.61415 + 48251.33 / t - 67707.93 / t**2 + 10102100.0 / t**3
    liquid = math.log10(1.0 + z) - z / (z + 1.0) * rho * (b0 + b1 / t + b2 * rho)
    return -2.0 * _COORDINATION * liquid + gas + 2.0 * math.log10(_MOLAR_MASS)
