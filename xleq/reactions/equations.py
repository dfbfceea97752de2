"""Reaction text, read and written: ``N2 + 3 H2 = 2 NH3``."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable
from dataclasses import dataclass, field
from fractions import Fraction
from functools import lru_cache
from typing import Final, NamedTuple

from xleq.errors import InputError, ParseError
from xleq.reactions.formulas import vulgar_fraction
from xleq.reactions.species import PHASE_TEXT, Phase, Species, parse_species

_ARROW: Final = re.compile(r"<?=+>?|<-+>|-+>|[→⇌⇄⇋↔⟶⟷⇒⇔]")
_BRACED: Final = re.compile(r"\{[^{}]*\}")
_DIGITS: Final = r"\d{1,9}"
_COEFFICIENT: Final = re.compile(
    rf"(?P<whole>{_DIGITS})?(?P<vulgar>[¼-¾⅐-⅞])"
    rf"|\(\s*(?P<n2>{_DIGITS})\s*[/⁄]\s*(?P<d2>{_DIGITS})\s*\)"
    rf"|(?P<n>{_DIGITS})\s*[/⁄]\s*(?P<d>{_DIGITS})"
    rf"|(?P<decimal>{_DIGITS}\.\d{{1,9}}|{_DIGITS}|\.\d{{1,9}})"
)
_SPECIES: Final = re.compile(r"\{[^{}]*\}|[^\s+{}]+")
_CHARGE_NUMBER: Final = re.compile(r"\+(\d{1,2})(?![\d/⁄.])")
_MOST_TERMS: Final = 200
_ONE: Final = Fraction(1)


class Term(NamedTuple):
    """One species on one side, with its coefficient as written."""

    coefficient: Fraction
    species: Species


@dataclass(frozen=True, slots=True)
class Reaction:
    """A reaction: species and their net coefficients. Two are equal when these are.

    Parameters
    ----------
    species : tuple [n_species] of Species
        Each once, in the order of their first appearance.
    nu : tuple [n_species] of Fraction
        Products positive; 0 for a species that stands equally on both sides.
    left, right : tuple of Term
        As written.
    text : str
        The text it was read from.
    """

    species: tuple[Species, ...]
    nu: tuple[Fraction, ...]
    left: tuple[Term, ...] = field(compare=False)
    right: tuple[Term, ...] = field(compare=False)
    text: str = field(compare=False)

    def coefficient(self, species: Species) -> Fraction | None:
        """Net coefficient of a species, or None if it does not occur.

        Examples
        --------
        >>> reaction = parse_reaction("N2 + 3 H2 = 2 NH3", "g")
        >>> reaction.coefficient(parse_species("H2(g)"))
        Fraction(-3, 1)
        """
        for own, nu in zip(self.species, self.nu, strict=True):
            if own == species:
                return nu
        return None


@lru_cache(maxsize=16384)
def parse_reaction(text: str, default_phase: Phase | None = None) -> Reaction:
    """A reaction from its text; whether it balances is not asked here.

    Parameters
    ----------
    text : str
        Two sides with an arrow (``=``, ``<=>``, ``->``, ``→``, ``⇌``) between them.
    default_phase : {"g", "l", "s", "aq"}, optional
        Phase of the species that are written without one.

    Raises
    ------
    ParseError
        With the position and what was expected there.
    InputError
        If every species cancels.

    Examples
    --------
    >>> reaction = parse_reaction("½N2 + 3/2 H2 ⇌ NH3")
    >>> [s.name for s in reaction.species], [str(nu) for nu in reaction.nu]
    (['N2', 'H2', 'NH3'], ['-1/2', '-3/2', '1'])
    >>> [s.name for s in parse_reaction("Ag++Cl-=AgCl(s)").species]
    ['Ag+', 'Cl-', 'AgCl']
    """
    start, end = _arrow(text)
    left = _side(text, 0, start, default_phase)
    right = _side(text, end, len(text), default_phase)
    net: dict[Species, Fraction] = {}
    for coefficient, species in left:
        net[species] = net[species] - coefficient if species in net else -coefficient
    for coefficient, species in right:
        net[species] = net[species] + coefficient if species in net else coefficient
    if not any(net.values()):
        raise InputError(f"{text!r}: both sides are the same, nothing reacts")
    return Reaction(tuple(net), tuple(net.values()), left, right, text)


def with_species(reaction: Reaction, of: Callable[[Species], Species]) -> Reaction:
    """The reaction with each species replaced; those that become the same are added up.

    Parameters
    ----------
    reaction : Reaction
    of : callable
        The new species for an old one.

    Examples
    --------
    >>> reaction = with_species(parse_reaction("CO + H2O = CO2 + H2"), lambda s: parse_species(s.name, "g"))
    >>> [s.key for s in reaction.species]
    ['CO(g)', 'H2O(g)', 'CO2(g)', 'H2(g)']
    """

    def side(terms: tuple[Term, ...]) -> tuple[Term, ...]:
        return tuple(Term(t.coefficient, of(t.species)) for t in terms)

    net: dict[Species, Fraction] = {}
    for old, nu in zip(reaction.species, reaction.nu, strict=True):
        new = of(old)
        net[new] = net[new] + nu if new in net else nu
    return Reaction(tuple(net), tuple(net.values()), side(reaction.left), side(reaction.right), reaction.text)


def _arrow(text: str) -> tuple[int, int]:
    """Where the arrow begins and ends; text in braces is passed over."""
    hidden = _BRACED.sub(lambda m: " " * len(m[0]), text)
    found = list(_ARROW.finditer(hidden))
    if not found:
        raise ParseError(text, len(text), "an arrow such as = or -> between the two sides")
    if len(found) > 1:
        raise ParseError(text, found[1].start(), "only one arrow")
    start, end = found[0].span()
    if found[0][0].startswith("--") and start and not hidden[start - 1].isspace():
        raise ParseError(text, start, "a space before the arrow, as the first - may be a charge")
    return start, end


def _side(text: str, i: int, end: int, default_phase: Phase | None) -> tuple[Term, ...]:
    terms: list[Term] = []
    while True:
        term, i = _term(text, _blank(text, i, end), end, default_phase)
        terms.append(term)
        i = _blank(text, i, end)
        if i == end:
            return tuple(terms)
        if text[i] != "+":
            wanted = "+ or the end" if end == len(text) else "+ or the arrow"
            raise ParseError(text, i, wanted)
        if len(terms) == _MOST_TERMS:
            raise ParseError(text, i, f"at most {_MOST_TERMS} species on a side")
        i += 1


def _blank(text: str, i: int, end: int) -> int:
    while i < end and text[i].isspace():
        i += 1
    return i


def _term(text: str, i: int, end: int, default_phase: Phase | None) -> tuple[Term, int]:
    coefficient, i = _coefficient(text, i, end)
    if text.startswith(("-", "−"), i):
        raise ParseError(text, i, "a species; one that is used up stands on the left, without a minus")
    match = _SPECIES.match(text, i, end)
    if match is None:
        if text.startswith("{", i):
            raise ParseError(text, end, "the closing brace }")
        raise ParseError(text, i, "a species")
    stop = match.end()
    if not match[0].startswith("{"):
        stop = _with_charge(text, match[0], stop, end)
    phase = PHASE_TEXT.match(text, stop, end)
    if phase:
        stop = phase.end()
    try:
        species = parse_species(text[i:stop], default_phase)
    except ParseError as e:
        raise ParseError(text, i + e.at, e.wanted) from None
    return Term(coefficient, species), stop


def _coefficient(text: str, i: int, end: int) -> tuple[Fraction, int]:
    match = _COEFFICIENT.match(text, i, end)
    if match is None:
        return _ONE, i
    if match["vulgar"]:
        value = int(match["whole"] or 0) + vulgar_fraction(match["vulgar"])
    elif match["decimal"]:
        value = Fraction(match["decimal"])
    else:
        bottom = int(match["d"] or match["d2"])
        value = Fraction(int(match["n"] or match["n2"]), bottom) if bottom else Fraction(0)
    if value == 0:
        raise ParseError(text, i, "a coefficient above 0")
    after = _blank(text, match.end(), end)
    if after < end and text[after] in "*·":
        after = _blank(text, after + 1, end)
    return value, after


def _with_charge(text: str, body: str, i: int, end: int) -> int:
    """Where a species ends whose text runs to i, when plus signs that are its charge are counted in.

    A plus that touches the species is its charge if another plus, a phase or the end of the side follows
    (`Ag+ + Cl-`, `Ag++Cl-`, `Ca+2 = `); otherwise it joins two species (`2H2+O2`, `H2+2Cl2`).
    """
    run = i
    while run < end and text[run] == "+":
        run += 1
    if run == i:
        return i
    if re.search(r"\^\d*$", body):
        number = _CHARGE_NUMBER.match(text, i, end) if body.endswith("^") else None
        return number.end() if number else i + 1
    if run == i + 1:
        number = _CHARGE_NUMBER.match(text, i, end)
        if number:
            return number.end() if _term_ends(text, number.end(), end) else i
    return run if _term_ends(text, run, end) else run - 1


def _term_ends(text: str, i: int, end: int) -> bool:
    i = _blank(text, i, end)
    return i == end or text[i] == "+" or PHASE_TEXT.match(text, i, end) is not None


def reaction_text(species: Iterable[Species], nu: Iterable[Fraction]) -> str:
    """Text of a reaction from species and net coefficients; species that cancel are left out.

    Parameters
    ----------
    species : iterable [n_species] of Species
    nu : iterable [n_species] of Fraction
        Products positive.

    Raises
    ------
    InputError
        If one side would be empty.

    Examples
    --------
    >>> reaction = parse_reaction("0.5N2+1.5H2=NH3")
    >>> reaction_text(reaction.species, reaction.nu)
    '1/2 N2 + 3/2 H2 = NH3'
    """
    left: list[str] = []
    right: list[str] = []
    for one, coefficient in zip(species, nu, strict=True):
        if coefficient:
            size = abs(coefficient)
            side = left if coefficient < 0 else right
            side.append(one.text if size == 1 else f"{size} {one.text}")
    if not left or not right:
        raise InputError("a reaction needs species on both sides")
    return f"{' + '.join(left)} = {' + '.join(right)}"
