"""CONVERT: a number from one unit to another."""

from __future__ import annotations

from xleq.cells import NA, Value
from xleq.recalc.natives.engineering.units import BINARY_PREFIXES, PREFIXES, UNITS, ZEROS, Unit
from xleq.recalc.natives.gather import direct_number
from xleq.recalc.natives.table import native
from xleq.recalc.operands import Fail


def unit_named(name: str) -> Unit:
    """The unit of a name with or without a prefix; #N/A if there is none.

    Examples
    --------
    >>> unit_named("kPa").size, unit_named("mm2").size, unit_named("kibyte").size
    (1000.0, 1e-06, 8192.0)
    """
    unit = UNITS.get(name)
    if unit is not None:
        return unit
    for length in (1, 2):
        unit = UNITS.get(name[length:])
        if unit is None:
            continue
        scale = PREFIXES.get(name[:length])
        if scale is not None and unit.prefix:
            return unit._replace(size=unit.size * scale**unit.prefix)
        scale = BINARY_PREFIXES.get(name[:length])
        if scale is not None and unit.group == "information":
            return unit._replace(size=unit.size * scale)
    raise Fail(NA)


@native("CONVERT", "value text text")
def convert(value: Value, source: str, target: str) -> float:
    """A number in another unit of the same kind; names are case-sensitive, #N/A for unknown or unfit ones.

    Examples
    --------
    >>> convert(68.0, "F", "C"), convert(1.0, "lbm", "kg"), convert(2.5, "ft", "m")
    (20.0, 0.45359237, 0.762)
    """
    number = direct_number(value, logicals=False)
    here, there = unit_named(source), unit_named(target)
    if here.group != there.group:
        raise Fail(NA)
    if source == target:
        return number
    if here.group == "temperature":
        return _temperature(number, source, here.size, target, there.size)
    return number * here.size / there.size


def _temperature(number: float, source: str, size: float, target: str, wanted: float) -> float:
    kelvin = number * size + ZEROS.get(source, 0.0)
    if source in ("F", "fah"):
        kelvin = (number - 32.0) / 1.8 + 273.15
    if target in ("F", "fah"):
        return (kelvin - 273.15) * 1.8 + 32.0
    return (kelvin - ZEROS.get(target, 0.0)) / wanted
