"""Physical constants, and quantity text such as ``"450 degC"`` or ``"30 barg"`` turned into numbers.

Each quantity has one unit in which the program calculates (its default unit): a plain number is taken to be
in it, text may name any other. Conversion is pint's; only the gauge pressures and a few spellings of
chemical engineers are added here.
"""

from __future__ import annotations

import math
import re
from functools import lru_cache
from typing import TYPE_CHECKING, Final, Literal

from xleq.errors import OutOfRangeError, ParseError, UnitError

if TYPE_CHECKING:
    import pint

#: Molar gas constant, exact: k N_A of the 2019 SI (BIPM, SI Brochure, 9th ed., 2019). [J/(mol K)]
R: Final = 8.31446261815324
#: The same in L bar/(mol K): 1 L bar = 100 J.
R_L_BAR: Final = R / 100.0
#: Standard pressure of gases and pure phases (IUPAC, 1982). [bar]
P_STANDARD_BAR: Final = 1.0
#: Standard concentration of solutes. [mol/L]
C_STANDARD: Final = 1.0
#: Standard atmosphere, exact (10th CGPM, 1954, resolution 4). [bar]
ATM_BAR: Final = 1.01325
#: 0 degrees Celsius, exact (BIPM, SI Brochure, 9th ed., 2019). [K]
ZERO_CELSIUS: Final = 273.15

Quantity = Literal[
    "temperature",
    "temperature difference",
    "pressure",
    "pressure difference",
    "amount",
    "concentration",
    "volume",
    "molar energy",
    "molar entropy",
    "number",
]

#: The unit in which each quantity is calculated, and in which a plain number is read.
DEFAULT_UNIT: Final[dict[Quantity, str]] = {
    "temperature": "K",
    "temperature difference": "K",
    "pressure": "bar",
    "pressure difference": "bar",
    "amount": "mol",
    "concentration": "mol/L",
    "volume": "L",
    "molar energy": "kJ/mol",
    "molar entropy": "J/(mol K)",
    "number": "-",
}

# Spellings of the trade that pint does not read as meant; keys are compared after blanks are removed.
_SPELLINGS: Final = {
    "K": "kelvin",
    "°C": "degC",
    "C": "degC",
    "℃": "degC",
    "°F": "degF",
    "F": "degF",
    "℉": "degF",
    "R": "degR",
    "°R": "degR",
    "bara": "bar",
    "barabs": "bar",
    "bar(a)": "bar",
    "atma": "atm",
    "psia": "psi",
    "kPaa": "kPa",
    "kPa(a)": "kPa",
    "kPaabs": "kPa",
    "MPaa": "MPa",
    "mmHg": "mmHg",
    "kg/cm2": "kgf/cm**2",
    "kg/cm²": "kgf/cm**2",
    "kgf/cm2": "kgf/cm**2",
    "kg/cm2a": "kgf/cm**2",
    "at": "kgf/cm**2",
    "lbmol": "lbmol",
    "M": "mol/L",
    "mM": "mmol/L",
    "µM": "umol/L",
    "uM": "umol/L",
    "kmol/m3": "kmol/m**3",
    "mol/m3": "mol/m**3",
    "mol/m³": "mol/m**3",
    "mmol/m3": "mmol/m**3",
    "mol/dm3": "mol/L",
    "mol/cm3": "mol/cm**3",
    "m3": "m**3",
    "m³": "m**3",
    "dm3": "L",
    "cm3": "cm**3",
    "ft3": "ft**3",
    "Btu/lbmol": "Btu/lbmol",
}

# Gauge units: the unit that they count in; the reference is one standard atmosphere.
_GAUGE: Final = {
    "barg": "bar",
    "bar(g)": "bar",
    "barG": "bar",
    "mbarg": "mbar",
    "psig": "psi",
    "psi(g)": "psi",
    "kPag": "kPa",
    "kPa(g)": "kPa",
    "MPag": "MPa",
    "atmg": "atm",
    "kg/cm2g": "kgf/cm**2",
    "kg/cm²g": "kgf/cm**2",
    "kgf/cm2g": "kgf/cm**2",
    "kg/cm2(g)": "kgf/cm**2",
}

_NUMBER = re.compile(r"\s*([+-]?(?:\d+(?:\.\d*)?|\.\d+)(?:[eE][+-]?\d+)?)\s*(.*?)\s*", re.DOTALL)
# One-digit exponents only: unit text comes from cells, and pint would compute any power it is shown.
_TERM = r"[A-Za-zµμ°℃℉%]+(?:(?:\*\*|\^)?[+-]?[1-9]|[²³])?"
_UNIT_TEXT = re.compile(rf"(?:1/)?\(?{_TERM}\)?(?:[*/·]\(?{_TERM}\)?){{0,5}}")


@lru_cache(maxsize=1)
def _registry() -> pint.UnitRegistry[float]:
    import pint

    registry: pint.UnitRegistry[float] = pint.UnitRegistry(autoconvert_offset_to_baseunit=True)
    registry.define("lbmol = 453.59237 * mol")
    return registry


@lru_cache(maxsize=4096)
def _linear(unit: str, quantity: Quantity) -> tuple[float, float]:
    """Factor and offset that take a number in `unit` to the default unit."""
    compact = unit.replace(" ", "")
    if quantity == "number":
        if compact in ("", "-", "1"):
            return 1.0, 0.0
        if compact == "%":
            return 0.01, 0.0
        raise UnitError(f"{unit!r}: a plain number is wanted here, without a unit")
    if quantity == "pressure" and compact in _GAUGE:
        factor, _ = _linear(_GAUGE[compact], quantity)
        return factor, ATM_BAR
    import pint

    name = _SPELLINGS.get(compact)
    if name is None:
        name = re.sub(r"\s+", "*", unit)
        if not _UNIT_TEXT.fullmatch(name) or name.count("(") != name.count(")"):
            raise UnitError(_unit_message(unit, quantity))
        name = name.replace("^", "**").replace("·", "*")
    registry = _registry()
    if quantity == "temperature difference" and name in ("degC", "degF"):
        name = f"delta_{name}"
    target = DEFAULT_UNIT[quantity].replace("(mol K)", "mol/K") if quantity != "temperature" else "kelvin"
    if quantity == "temperature difference":
        target = "kelvin"
    try:
        one = registry.Quantity(1.0, name).to(target).magnitude
        zero = registry.Quantity(0.0, name).to(target).magnitude
    except (pint.PintError, AttributeError, TypeError, ValueError, ArithmeticError) as e:
        raise UnitError(_unit_message(unit, quantity)) from e
    if quantity == "temperature" and zero == 0.0:
        return float(one), 0.0
    return float(one) - float(zero), float(zero)


def _unit_message(unit: str, quantity: Quantity) -> str:
    examples = {
        "temperature": "K, degC, degF, degR",
        "temperature difference": "K, degC, degF",
        "pressure": "bar, atm, kPa, MPa, psia, barg, psig, kPag, torr, kg/cm2",
        "pressure difference": "bar, atm, kPa, MPa, psi, torr, kg/cm2",
        "amount": "mol, mmol, kmol, lbmol",
        "concentration": "mol/L, mmol/L, mol/m3",
        "volume": "L, mL, m3",
        "molar energy": "kJ/mol, J/mol, kcal/mol",
        "molar entropy": "J/(mol K), cal/(mol K)",
        "number": "none",
    }[quantity]
    return f"{unit!r} is not a unit of {quantity} that is understood; for example {examples}"


def to_default(value: float, unit: str, quantity: Quantity) -> float:
    """A number in `unit`, in the default unit of its quantity.

    Parameters
    ----------
    value : float
    unit : str
        Unit text; gauge pressures such as ``barg`` count from one standard atmosphere.
    quantity : Quantity

    Raises
    ------
    UnitError
        If the unit is unknown or measures another quantity.

    Examples
    --------
    >>> to_default(450.0, "degC", "temperature")
    723.15
    >>> round(to_default(30.0, "barg", "pressure"), 5)
    31.01325
    >>> round(to_default(1.0, "psi", "pressure") * 1e5, 6)
    6894.757293
    """
    factor, offset = _linear(unit.strip(), quantity)
    return value * factor + offset


def from_default(value: float, unit: str, quantity: Quantity) -> float:
    """A number in the default unit of its quantity, in `unit`.

    Examples
    --------
    >>> round(from_default(1.01325, "atm", "pressure"), 12)
    1.0
    """
    factor, offset = _linear(unit.strip(), quantity)
    return (value - offset) / factor


@lru_cache(maxsize=16384)
def read_quantity(text: str, quantity: Quantity) -> float:
    """Quantity text such as ``"450 degC"`` as a number in the default unit.

    Parameters
    ----------
    text : str
        A number, with a unit or without one (then in the default unit).
    quantity : Quantity

    Raises
    ------
    ParseError
        If it does not begin with a number.
    UnitError
        If the unit is unknown or measures another quantity.

    Examples
    --------
    >>> read_quantity("450 degC", "temperature"), read_quantity("2.5", "pressure")
    (723.15, 2.5)
    """
    match = _NUMBER.fullmatch(text)
    if match is None:
        wanted = "a number" if quantity == "number" else f"a number, with a unit of {quantity} or without"
        raise ParseError(text, 0, wanted)
    value = float(match[1])
    if match[2]:
        value = to_default(value, match[2], quantity)
    return checked(value, quantity, text)


def number_or_none(text: str) -> float | None:
    """The number that a text is, without a unit; None if it is anything else.

    Examples
    --------
    >>> number_or_none("4.5E2"), number_or_none("450 degC")
    (450.0, None)
    """
    match = _NUMBER.fullmatch(text)
    return float(match[1]) if match and not match[2] else None


def checked(value: float, quantity: Quantity, text: str = "") -> float:
    """The value itself, if physics allows it for the quantity.

    Raises
    ------
    OutOfRangeError
        If it is not finite, or a temperature or pressure that is not positive, or a negative volume.
    """
    shown = f"{text!r}" if text else f"{value:g}"
    if not math.isfinite(value):
        raise OutOfRangeError(f"{shown} is not a finite number")
    if quantity == "temperature" and value <= 0.0:
        raise OutOfRangeError(f"temperature {shown} is {value:g} K; it must be above 0 K")
    if quantity == "pressure" and value <= 0.0:
        raise OutOfRangeError(f"pressure {shown} is {value:g} bar absolute; it must be above 0")
    if quantity == "volume" and value <= 0.0:
        raise OutOfRangeError(f"volume {shown} is {value:g} L; it must be above 0")
    return value
