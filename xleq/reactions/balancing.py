"""Balance of elements and charge: checked, and found."""

from __future__ import annotations

import re
from collections.abc import Sequence
from fractions import Fraction
from typing import Final

from xleq.errors import AmbiguousError, BalanceError, InputError, NoAnswerError
from xleq.reactions.equations import Reaction, Term, parse_reaction, reaction_text
from xleq.reactions.linear import null_space, smallest_integers
from xleq.reactions.species import Species

#: Exact elimination of a dense matrix of this size takes seconds; no reaction that is written is near it.
_MOST_SPECIES: Final = 40


def unchecked_species(reaction: Reaction) -> tuple[str, ...]:
    """Names in braces that take part: with one, neither elements nor charge can be checked.

    Examples
    --------
    >>> unchecked_species(parse_reaction("{naphtha}(g) = 2 C4H8(g)"))
    ('{naphtha}',)
    """
    return tuple(
        s.name for s, nu in zip(reaction.species, reaction.nu, strict=True) if s.formula is None and nu
    )


def check_balance(reaction: Reaction) -> str:
    """Make sure that elements and charge are conserved.

    Parameters
    ----------
    reaction : Reaction

    Returns
    -------
    str
        Empty when checked; else a note that it was not, and why.

    Raises
    ------
    BalanceError
        Which element is off, and by how much.

    Examples
    --------
    >>> check_balance(parse_reaction("N2 + 3 H2 = 2 NH3"))
    ''
    >>> check_balance(parse_reaction("Fe3+ + e- = Fe2+"))
    ''
    >>> check_balance(parse_reaction("{naphtha}(g) = 2 C4H8(g)"))
    'elements not checked: {naphtha} has no formula'
    """
    lumps = unchecked_species(reaction)
    if lumps:
        return f"elements not checked: {', '.join(lumps)} {'has' if len(lumps) == 1 else 'have'} no formula"
    excess: dict[str, Fraction] = {}
    for species, nu in zip(reaction.species, reaction.nu, strict=True):
        for element, count in (species.composition() or {}).items():
            excess[element] = excess.get(element, Fraction(0)) + nu * count
    if any(excess.values()):
        raise BalanceError(_imbalance(reaction, [e for e, x in excess.items() if x]))
    return ""


def _imbalance(reaction: Reaction, wrong: Sequence[str]) -> str:
    def total(side: Sequence[Term], element: str) -> Fraction:
        parts = ((t.coefficient, t.species.composition() or {}) for t in side)
        return sum((c * p[element] for c, p in parts if element in p), Fraction(0))

    clauses = []
    for element in sorted(wrong, key=lambda e: e == "e"):
        left, right = total(reaction.left, element), total(reaction.right, element)
        if element == "e":
            clauses.append(f"charge {_signed(left)} on the left, {_signed(right)} on the right")
        else:
            side, more = ("left", left - right) if left > right else ("right", right - left)
            clauses.append(f"{element} {left} on the left, {right} on the right ({more} more on the {side})")
    hint = _charge_hint(reaction) if "e" in wrong else ""
    return f"{reaction.text!r} does not balance: {'; '.join(clauses)}{hint}"


def _charge_hint(reaction: Reaction) -> str:
    """FeSCN2+ is read as two N and one charge; its writer may have meant two charges."""
    for species in reaction.species:
        body = species.name.rstrip("^+-")
        if abs(species.charge) == 1 and re.search(r"\D\d$", body):
            spelt = f"{body[:-1]}^{body[-1]}{'+' if species.charge > 0 else '-'}"
            return f"; if the {body[-1]} of {species.name} belongs to its charge, write {spelt}"
    return ""


def _signed(value: Fraction) -> str:
    return f"+{value}" if value > 0 else str(value)


def balance(text: str) -> str:
    """Reaction text balanced with the smallest whole numbers, each species on the side where it stands.

    Coefficients in the text are not used. The numbers are the null vector of the element and charge matrix,
    found in exact rationals.

    Parameters
    ----------
    text : str
        Reaction text.

    Raises
    ------
    ParseError
        If the text cannot be read.
    InputError
        If a species has no formula, or stands there twice, or there are more than 40.
    NoAnswerError
        If no coefficients balance it, or only with a species on the other side.
    AmbiguousError
        If there are several independent ways.

    Examples
    --------
    >>> balance("Fe2O3(s) + CO = Fe(s) + CO2")
    'Fe2O3(s) + 3 CO = 2 Fe(s) + 3 CO2'
    >>> balance("MnO4- + Fe+2 + H+ = Mn+2 + Fe+3 + H2O")
    'MnO4- + 5 Fe+2 + 8 H+ = Mn+2 + 5 Fe+3 + 4 H2O'
    """
    reaction = parse_reaction(text)
    sides = [(-1, t.species) for t in reaction.left] + [(1, t.species) for t in reaction.right]
    species = [s for _, s in sides]
    if len(species) > _MOST_SPECIES:
        raise InputError(f"{len(species)} species; one reaction of at most {_MOST_SPECIES} can be balanced")
    for one in species:
        if one.formula is None:
            raise InputError(f"{one.name} has no formula, so the reaction cannot be balanced")
        if species.count(one) > 1:
            raise InputError(f"{one.text} stands there twice; write each species once to balance")
    basis = _ways(sides)
    if not basis:
        raise NoAnswerError(f"{text!r} cannot be balanced: {_why_not(sides)}")
    if len(basis) > 1:
        raise AmbiguousError(
            f"{text!r} has {len(basis)} independent ways to balance; split it into single reactions"
        )
    return _written(text, sides, basis[0])


def _ways(sides: Sequence[tuple[int, Species]]) -> list[list[Fraction]]:
    """A basis of the coefficients that balance; positive where a species stays on its side."""
    compositions = [(sign, s.composition() or {}) for sign, s in sides]
    elements = dict.fromkeys(e for _, parts in compositions for e in parts)
    rows = [[sign * parts.get(e, Fraction(0)) for sign, parts in compositions] for e in elements]
    return null_space(rows, len(sides))


def _why_not(sides: Sequence[tuple[int, Species]]) -> str:
    where: dict[str, set[int]] = {}
    for sign, species in sides:
        for element in species.formula or {}:
            where.setdefault(element, set()).add(sign)
    for element, signs in where.items():
        if len(signs) == 1:
            return f"{element} is only on the {'left' if -1 in signs else 'right'}"
    return "no coefficients conserve every element and the charge; a species is missing"


def _written(text: str, sides: Sequence[tuple[int, Species]], way: Sequence[Fraction]) -> str:
    positive, negative = sum(x > 0 for x in way), sum(x < 0 for x in way)
    if negative > positive:
        way = [-x for x in way]
    for x, (sign, species) in zip(way, sides, strict=True):
        side = "left" if sign < 0 else "right"
        if x == 0:
            raise NoAnswerError(f"{text!r} balances only without {species.text}, which cannot take part")
        if x < 0:
            raise NoAnswerError(
                f"{text!r} cannot be balanced as written: {species.text} would have to leave the {side}"
            )
    whole = smallest_integers(way)
    return reaction_text([s for _, s in sides], [sign * x for x, (sign, _) in zip(whole, sides, strict=True)])
