"""Units that CONVERT knows, and what one of each is in the first unit of its group.

Where a definition has changed over time the older figure stands here, because the spreadsheet computes with
it: u and eV of CODATA 2006, mmHg as 133.322 Pa. (source: Microsoft, documentation of CONVERT, for the names;
NIST SP 811 appendix B and the national definitions of feet, gallons and acres for the figures)
"""

from __future__ import annotations

from typing import Final, NamedTuple

_FOOT = 0.3048
_INCH = 0.0254
_YARD = 0.9144
_MILE = 1609.344
_SEA_MILE = 1852.0
_SURVEY_MILE = 5280 * 1200 / 3937
_LIGHT_YEAR = 9460730472580800.0
_PARSEC = 3.0856775812815532e16
_POINT = _INCH / 72
_POUND = 453.59237
_GALLON = 231 * _INCH**3
_UK_GALLON = 0.00454609
_LBF = 4.4482216152605
_HORSE = 550 * _FOOT * _LBF
_CALORIE_IT = 4.1868
_BTU = 1055.05585262


class Unit(NamedTuple):
    """A unit: its group, its size in the group's first unit, and the power a prefix takes (0: no prefix)."""

    group: str
    size: float
    prefix: int = 0


def _units(group: str, prefix: int, **sizes: float) -> dict[str, Unit]:
    return {name: Unit(group, size, prefix) for name, size in sizes.items()}


def _powers(group: str, power: int, prefix: int, **lengths: float) -> dict[str, Unit]:
    """Squares or cubes of lengths, written both ``m2`` and ``m^2``."""
    return {
        f"{name}{mark}{power}": Unit(group, length**power, prefix)
        for name, length in lengths.items()
        for mark in ("", "^")
    }


UNITS: Final[dict[str, Unit]] = {
    **_units("mass", 1, g=1.0, u=1.660538782e-24),
    **_units(
        "mass", 0, sg=_LBF / _FOOT * 1000, lbm=_POUND, ozm=_POUND / 16, grain=_POUND / 7000,
        cwt=100 * _POUND, shweight=100 * _POUND, uk_cwt=112 * _POUND, lcwt=112 * _POUND,
        hweight=112 * _POUND, stone=14 * _POUND, ton=2000 * _POUND, uk_ton=2240 * _POUND,
        LTON=2240 * _POUND, brton=2240 * _POUND,
    ),
    **_units("length", 1, m=1.0, ang=1e-10, ly=_LIGHT_YEAR, parsec=_PARSEC, pc=_PARSEC),
    **_units(
        "length", 0, mi=_MILE, Nmi=_SEA_MILE, ft=_FOOT, yd=_YARD, ell=1.143, Picapt=_POINT, Pica=_POINT,
        pica=12 * _POINT, survey_mi=_SURVEY_MILE, **{"in": _INCH},
    ),
    **_units("time", 1, s=1.0, sec=1.0),
    **_units("time", 0, yr=31557600.0, day=86400.0, d=86400.0, hr=3600.0, mn=60.0, min=60.0),
    **_units("pressure", 1, Pa=1.0, p=1.0, atm=101325.0, at=101325.0, mmHg=133.322),
    **_units("pressure", 0, psi=_LBF / _INCH**2, Torr=101325 / 760),
    **_units("force", 1, N=1.0, dyn=1e-5, dy=1e-5, pond=0.00980665),
    **_units("force", 0, lbf=_LBF),
    **_units(
        "energy", 1, J=1.0, e=1e-7, c=4.184, cal=_CALORIE_IT, eV=1.602176487e-19, ev=1.602176487e-19,
        Wh=3600.0, wh=3600.0,
    ),
    **_units(
        "energy", 0, HPh=3600 * _HORSE, hh=3600 * _HORSE, flb=_FOOT * _LBF, BTU=_BTU, btu=_BTU,
    ),
    **_units("power", 1, W=1.0, w=1.0),
    **_units("power", 0, HP=_HORSE, h=_HORSE, PS=735.49875),
    **_units("magnetism", 1, T=1.0, ga=1e-4),
    **_units("volume", 1, l=1e-3, L=1e-3, lt=1e-3, uk_pt=_UK_GALLON / 8),
    **_units(
        "volume", 0, tsp=_GALLON / 768, tspm=5e-6, tbs=_GALLON / 256, oz=_GALLON / 128, cup=_GALLON / 16,
        pt=_GALLON / 8, us_pt=_GALLON / 8, qt=_GALLON / 4, uk_qt=_UK_GALLON / 4, gal=_GALLON,
        uk_gal=_UK_GALLON, barrel=42 * _GALLON, bushel=2150.42 * _INCH**3, GRT=100 * _FOOT**3,
        regton=100 * _FOOT**3, MTON=40 * _FOOT**3,
    ),
    **_powers("volume", 3, 3, m=1.0, ang=1e-10),
    **_powers(
        "volume", 3, 0, ft=_FOOT, ly=_LIGHT_YEAR, mi=_MILE, yd=_YARD, Nmi=_SEA_MILE, Picapt=_POINT,
        Pica=_POINT, **{"in": _INCH},
    ),
    **_units("area", 1, ar=100.0),
    **_units("area", 0, ha=1e4, uk_acre=4046.8564224, us_acre=_SURVEY_MILE**2 / 640, Morgen=2500.0),
    **_powers("area", 2, 2, m=1.0, ang=1e-10),
    **_powers(
        "area", 2, 0, ft=_FOOT, ly=_LIGHT_YEAR, mi=_MILE, yd=_YARD, Nmi=_SEA_MILE, Picapt=_POINT,
        Pica=_POINT, **{"in": _INCH},
    ),
    **_units("information", 1, bit=1.0, byte=8.0),
    **_units(
        "speed", 1, mph=0.44704,
        **{"m/s": 1.0, "m/sec": 1.0, "m/h": 1 / 3600, "m/hr": 1 / 3600},
    ),
    **_units("speed", 0, kn=1852 / 3600, admkn=6080 * _FOOT / 3600),
    **_units("temperature", 1, K=1.0, kel=1.0),
    **_units("temperature", 0, C=1.0, cel=1.0, F=5 / 9, fah=5 / 9, Rank=5 / 9, Reau=1.25),
}  # fmt: skip

#: Zero of the temperature scales that have another than absolute zero, in K.
ZEROS: Final[dict[str, float]] = {
    "C": 273.15,
    "cel": 273.15,
    "F": 273.15 - 32 / 1.8,
    "fah": 273.15 - 32 / 1.8,
    "Reau": 273.15,
}

PREFIXES: Final[dict[str, float]] = {
    "Y": 1e24, "Z": 1e21, "E": 1e18, "P": 1e15, "T": 1e12, "G": 1e9, "M": 1e6, "k": 1e3, "h": 1e2,
    "da": 1e1, "e": 1e1, "d": 1e-1, "c": 1e-2, "m": 1e-3, "u": 1e-6, "n": 1e-9, "p": 1e-12, "f": 1e-15,
    "a": 1e-18, "z": 1e-21, "y": 1e-24,
}  # fmt: skip

BINARY_PREFIXES: Final[dict[str, float]] = {
    prefix: 2.0 ** (10 * power)
    for power, prefix in enumerate(("ki", "Mi", "Gi", "Ti", "Pi", "Ei", "Zi", "Yi"), 1)
}
