"""Chemical formulas without phase: elements, nested brackets, added parts such as hydrate water, charge.

A charge is written `Ca+2`, `Ca2+`, `Ca^2+`, `Ca²⁺`, `Cl-`, `SO4-2`, `SO4^2-`, `SO4²⁻` or the sign repeated.
A digit before a bare sign belongs to the charge after a single element or after `]`, else to the formula
(`Ca2+` and `[Cu(NH3)4]2+`, but `NH4+`); where a chemist could read it both ways it is refused.
"""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction
from functools import lru_cache
from typing import Final, TypeAlias

from xleq.errors import MissingDataError, ParseError
from xleq.reactions.elements import atomic_weights, symbols

_SUBSCRIPTS: Final = "₀₁₂₃₄₅₆₇₈₉"
_SUPERSCRIPTS: Final = "⁰¹²³⁴⁵⁶⁷⁸⁹"
#: Same length before and after, so that positions stay true.
_PLAIN: Final = str.maketrans(
    {
        "−": "-",
        "–": "-",
        "‐": "-",
        "‑": "-",
        "•": "·",
        "∙": "·",
        "⋅": "·",
        "*": "·",
        "⁄": "/",
        "₊": "+",
        "₋": "-",
    }
)
_DIGITS: Final = str.maketrans(_SUBSCRIPTS + _SUPERSCRIPTS + "⁺⁻", "0123456789" * 2 + "+-")
_SIGNS: Final = str.maketrans("⁺⁻", "+-")

_CHARGES: Final = (
    re.compile(rf"(?P<n>[{_SUPERSCRIPTS}]+)(?P<sign>[⁺⁻]+)"),
    re.compile(rf"(?P<sign>[⁺⁻])(?P<n>[{_SUPERSCRIPTS}]+)"),
    re.compile(r"\^(?P<n>\d{0,2})(?P<sign>[+-]+)"),
    re.compile(r"\^?(?P<sign>[+-])(?P<n>\d{1,2})"),
)
_TAIL: Final = re.compile(r"[-+^⁺⁻⁰¹²³⁴⁵⁶⁷⁸⁹\d]+$")
_BARE_SIGN: Final = re.compile(r"(?P<n>\d*)(?P<sign>[+-]+)$")
_SIMPLE: Final = re.compile(r"(?:[A-Z][a-z]?\d{0,9})+")
_PAIR: Final = re.compile(r"([A-Z][a-z]?)(\d*)")
_ELEMENT: Final = re.compile(r"[A-Z][a-z]?")
_INTEGER: Final = re.compile(r"\d{1,9}")
_DECIMALS: Final = re.compile(r"\.\d{1,9}")
_WATER: Final = re.compile(r"\.(?:\d{1,9}(?:\.\d{1,9}|/\d{1,9})?|[½¼¾⅓⅔])?[HD]2O(?![a-z\d])")
_MULTIPLE: Final = re.compile(r"(\d{1,9}(?:\.\d{1,9})?)(?:/(\d{1,9}))?|([¼-¾⅐-⅞])")
#: The bracket that closes a group, and the atoms read in it so far.
_Open: TypeAlias = tuple[str, dict[str, Fraction]]
_CLOSING: Final = {"(": ")", "[": "]"}
#: Bare elements where `X2-` or `X2+` can mean a molecule's charge or an atom's; only context decides.
_EITHER: Final = frozenset({"C", "N", "O", "P", "S", "Se", "Te"})
#: Elements whose atoms carry at most one charge, so that a digit before the sign is a count: I3-, H2+.
_COUNTS: Final = frozenset({"H", "D", "T", "F", "Cl", "Br", "I"})


@dataclass(frozen=True, slots=True)
class Formula:
    """What a formula says.

    Parameters
    ----------
    body : str
        The formula without charge, in plain characters (subscripts as digits, `·` before added parts).
    elements : mapping of str to Fraction
        Atoms of each element in one formula unit.
    charge : int
        In elementary charges.
    """

    body: str
    elements: Mapping[str, Fraction]
    charge: int

    @property
    def text(self) -> str:
        """The formula with its charge, spelt so that it reads back the same."""
        if not self.charge:
            return self.body
        sign = "+" if self.charge > 0 else "-"
        if abs(self.charge) > 1:
            return f"{self.body}{sign}{abs(self.charge)}"
        bare = re.fullmatch(r"[A-Z][a-z]?\d+|.*\d\d|.*\.\d+", self.body)
        return f"{self.body}^{sign}" if bare else f"{self.body}{sign}"


@lru_cache(maxsize=16384)
def parse_formula(text: str) -> Formula:
    """Elements and charge of a formula.

    Parameters
    ----------
    text : str
        A formula without phase, for example ``"CuSO4·5H2O"``, ``"[Fe(CN)6]-3"`` or ``"e-"``.

    Raises
    ------
    ParseError
        With the position, if it is no formula or can be read in two ways.

    Examples
    --------
    >>> f = parse_formula("Fe2(SO4)3*9H2O")
    >>> {element: int(count) for element, count in f.elements.items()}
    {'Fe': 2, 'S': 3, 'O': 21, 'H': 18}
    >>> [parse_formula(t).charge for t in ("Ca2+", "Ca+2", "SO4^2-", "NH4+", "SO₄²⁻", "e-")]
    [2, 2, -2, 1, -2, -1]
    """
    plain = text.translate(_PLAIN)
    end, charge = _charge(text, plain)
    body = plain[:end].translate(_DIGITS)
    if not body:
        raise ParseError(text, 0, "a chemical formula")
    if body == "e":
        if charge != -1:
            raise ParseError(text, end, "the charge of an electron, e-")
        return Formula("e", {}, -1)
    if _SIMPLE.fullmatch(body):
        simple = _simple_elements(body)
        if simple:
            return Formula(body, simple, charge)
    elements, body = _elements(text, body)
    return Formula(body, elements, charge)


def _charge(text: str, plain: str) -> tuple[int, int]:
    """Where the charge begins, and the charge."""
    tail = _TAIL.search(plain)
    if tail is None or not re.search(r"[-+^⁺⁻]", tail[0]):
        return len(plain), 0
    for pattern in _CHARGES:
        for match in pattern.finditer(plain, tail.start()):
            if match.end() == len(plain):
                return match.start(), _signed(text, match)
    plain = plain.translate(_SIGNS)
    bare = _BARE_SIGN.search(plain)
    if bare is None:
        raise ParseError(text, tail.start(), "a charge such as +, -2 or ^2+")
    return _bare_charge(text, plain, bare)


def _bare_charge(text: str, plain: str, match: re.Match[str]) -> tuple[int, int]:
    """Where a charge without ^ begins whose sign stands last, and the charge."""
    if not match["n"]:
        return match.start(), _signed(text, match)
    head, n, sign = plain[: match.start()], match["n"], match["sign"]
    spelt = f"the charge after ^, as in {head}{n}^{sign} or {head}^{n}{sign}"
    after_subscript = head[-1:] in _SUBSCRIPTS and head != ""
    single = head in symbols()
    if single and head in _COUNTS and len(sign) == 1:
        return match.start("sign"), _signed(text, match, counted=True)
    if single and head in _EITHER and not (head in ("S", "Se", "Te") and n == "2" and sign == "-"):
        raise ParseError(text, match.start(), spelt)
    if single or after_subscript or (head.endswith("]") and head.startswith("[")):
        if len(n) > 1 or len(sign) > 1:
            raise ParseError(text, match.start(), spelt)
        return match.start(), _signed(text, match)
    if len(n) > 1:  # SO42- is sulfate to a hasty typist, but would read as forty-two O
        raise ParseError(text, match.start(), f"the charge after ^, as in {head}{n[:-1]}^{n[-1]}{sign}")
    return match.start("sign"), _signed(text, match, counted=True)


def _signed(text: str, match: re.Match[str], counted: bool = False) -> int:
    digits, signs = match["n"].translate(_DIGITS), match["sign"].translate(_DIGITS)
    size = 1 if counted or not digits else int(digits)
    if len(set(signs)) > 1 or (len(signs) > 1 and digits and not counted) or size == 0:
        raise ParseError(text, match.start(), "a charge such as +, -2 or ^2+")
    size *= len(signs)
    return size if signs[0] == "+" else -size


@lru_cache(maxsize=1024)
def _whole(number: int) -> Fraction:
    return Fraction(number)


def _simple_elements(body: str) -> dict[str, Fraction] | None:
    """Atoms of each element of a formula without brackets; None if it needs a closer look."""
    atoms: dict[str, int] = {}
    known = symbols()
    for symbol, digits in _PAIR.findall(body):
        number = int(digits or 1)
        if symbol not in known or not number:
            return None
        atoms[symbol] = atoms.get(symbol, 0) + number
    return {symbol: _whole(number) for symbol, number in atoms.items()}


def _elements(text: str, body: str) -> tuple[dict[str, Fraction], str]:
    """Atoms of each element, and the formula with its added parts in one spelling."""
    parts: list[str] = []
    begin = 0
    total: dict[str, Fraction] = {}
    stack: list[_Open] = [("", {})]
    multiple, i, known = Fraction(1), 0, symbols()
    while i < len(body):
        char = body[i]
        if char in "([":
            stack.append((_CLOSING[char], {}))
            i += 1
        elif char in ")]":
            closing, inner = stack.pop()
            if closing != char or not inner:
                raise ParseError(text, i, "an element symbol" if closing == char else _wanted(closing))
            count, i = _count(text, body, i + 1)
            _add(stack[-1][1], inner, count)
        elif char in "·.":
            _close(text, i, stack, total, multiple)
            parts.append(_part(multiple, body[begin:i]))
            multiple, i = _multiple(text, body, i + 1)
            begin = i
        else:
            match = _ELEMENT.match(body, i)
            symbol = match[0] if match else ""
            if symbol not in known:
                symbol = symbol[:1]
            if symbol not in known or (match and symbol != match[0]):
                raise ParseError(text, i, "the symbol of an element")
            count, i = _count(text, body, i + len(symbol))
            _add(stack[-1][1], {symbol: _whole(1)}, count)
    _close(text, len(body), stack, total, multiple)
    parts.append(_part(multiple, body[begin:]))
    return total, "·".join(parts)


def _part(multiple: Fraction, formula: str) -> str:
    return formula if multiple == 1 else f"{multiple}{formula}"


def _wanted(closing: str) -> str:
    return f"{closing!r}" if closing else "no closing bracket here"


def _add(into: dict[str, Fraction], part: Mapping[str, Fraction], times: Fraction) -> None:
    for element, count in part.items():
        into[element] = into[element] + times * count if element in into else times * count


def _close(text: str, i: int, stack: list[_Open], total: dict[str, Fraction], times: Fraction) -> None:
    """End one added part: nothing may be open, and something must have been read."""
    if len(stack) > 1:
        raise ParseError(text, i, _wanted(stack[-1][0]))
    if not stack[0][1]:
        raise ParseError(text, i, "the symbol of an element")
    _add(total, stack[0][1], times)
    stack[0] = ("", {})


def _count(text: str, body: str, i: int) -> tuple[Fraction, int]:
    """The subscript at i and where it ends; 1 where there is none."""
    match = _INTEGER.match(body, i)
    if match is None:
        return _whole(1), i
    end = match.end()
    decimals = _DECIMALS.match(body, end)
    if decimals and (match[0] == "0" or not _WATER.match(body, end)):
        following = body[decimals.end() : decimals.end() + 1]
        if following and match[0] != "0":
            raise ParseError(
                text, end, "· or * before an added part (or a decimal subscript at the end of the formula)"
            )
        end = decimals.end()
    count = Fraction(body[i:end])
    if count == 0:
        raise ParseError(text, i, "a number of atoms above 0")
    return count, end


def _multiple(text: str, body: str, i: int) -> tuple[Fraction, int]:
    """The number before an added part, as in ·5H2O, and where it ends."""
    match = _MULTIPLE.match(body, i)
    if match is None:
        return _whole(1), i
    if match[3]:
        return vulgar_fraction(match[3]), match.end()
    denominator = int(match[2] or 1)
    if denominator == 0 or Fraction(match[1]) == 0:
        raise ParseError(text, i, "a number above 0")
    return Fraction(match[1]) / denominator, match.end()


def vulgar_fraction(char: str) -> Fraction:
    """The value of a one-character fraction.

    Examples
    --------
    >>> vulgar_fraction("½"), vulgar_fraction("⅔")
    (Fraction(1, 2), Fraction(2, 3))
    """
    return Fraction(unicodedata.numeric(char)).limit_denominator(100)


def molar_mass(text: str) -> float:
    """Molar mass of a formula [g/mol].

    The sum of the abridged standard atomic weights (Prohaska et al., Pure Appl. Chem. 94 (2022) 573); the
    mass of the electrons that an ion has lost or gained (0.00055 g/mol each) is not counted.

    Parameters
    ----------
    text : str
        A formula without phase.

    Raises
    ------
    ParseError
        If it is not a formula.
    MissingDataError
        If it holds an element that has no standard atomic weight, or no atom at all.

    Examples
    --------
    >>> molar_mass("H2O"), molar_mass("CuSO4·5H2O"), molar_mass("NH3")
    (18.015, 249.677, 17.031)
    """
    formula = parse_formula(text)
    if not formula.elements:
        raise MissingDataError(f"{text} has no atoms, and so no molar mass in the table of atomic weights")
    weights, total = atomic_weights(), Fraction(0)
    for element, count in formula.elements.items():
        weight = weights.get(element, "")
        if not weight:
            raise MissingDataError(f"{element} in {text} has no standard atomic weight (IUPAC 2021)")
        total += Fraction(weight) * count
    return float(total)
