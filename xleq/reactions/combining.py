"""Sums of reactions with multipliers, and the multipliers that make a given sum. Exact."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from fractions import Fraction
from typing import Final

from xleq.errors import AmbiguousError, InputError, NoAnswerError
from xleq.reactions.equations import Reaction, reaction_text, with_species
from xleq.reactions.linear import reduced
from xleq.reactions.species import Phase, Species

_LARGEST_DENOMINATOR: Final = 1000
_LARGEST_MULTIPLIER: Final = 1e6
_MOST_REACTIONS: Final = 100


def exact_multiplier(value: float) -> Fraction:
    """A multiplier as an exact ratio, so that 1/3 held as a double is a third.

    Parameters
    ----------
    value : float
        A ratio of whole numbers with a denominator up to 1000, good to 1e-12.

    Raises
    ------
    InputError
        If it is no such ratio.

    Examples
    --------
    >>> exact_multiplier(-0.5), exact_multiplier(1 / 3)
    (Fraction(-1, 2), Fraction(1, 3))
    """
    if not math.isfinite(value) or abs(value) > _LARGEST_MULTIPLIER:
        raise InputError(f"a multiplier of {value:g} is not usable; the limit is ±{_LARGEST_MULTIPLIER:g}")
    ratio = Fraction(value).limit_denominator(_LARGEST_DENOMINATOR)
    if abs(float(ratio) - value) > 1e-12 * max(1.0, abs(value)):
        raise InputError(f"a multiplier of {value!r} is not a ratio of whole numbers such as 2, 0.5 or 1/3")
    return ratio


def with_same_phases(reactions: Sequence[Reaction]) -> list[Reaction]:
    """The reactions, with each species that has no phase taken as the one of that name that has.

    Raises
    ------
    AmbiguousError
        If it occurs without a phase and in more than one phase.

    Examples
    --------
    >>> from xleq.reactions import parse_reaction
    >>> pair = [parse_reaction("CO + H2O(g) = CO2 + H2"), parse_reaction("CH4 + H2O = CO + 3 H2")]
    >>> [s.text for s in with_same_phases(pair)[1].species]
    ['CH4', 'H2O(g)', 'CO', 'H2']
    """
    known: dict[str, set[Phase | None]] = {}
    for reaction in reactions:
        for species in reaction.species:
            known.setdefault(species.name, set()).add(species.phase)
    renamed: dict[str, Phase] = {}
    for name, phases in known.items():
        named = [p for p in phases if p is not None]
        if None in phases and len(named) > 1:
            shown = ", ".join(f"{name}({p})" for p in sorted(named))
            raise AmbiguousError(f"{name} is written without a phase and also as {shown}; write its phase")
        if None in phases and named:
            renamed[name] = named[0]

    def settled(species: Species) -> Species:
        if species.phase is None and species.name in renamed:
            return replace(species, phase=renamed[species.name], marked=True)
        return species

    return [with_species(r, settled) for r in reactions] if renamed else list(reactions)


def combine(reactions: Sequence[Reaction], multipliers: Sequence[Fraction]) -> str:
    """Text of the sum of reactions, each times its multiplier (-1 reverses, 1/2 halves).

    Parameters
    ----------
    reactions : sequence [n_reactions] of Reaction
    multipliers : sequence [n_reactions] of Fraction

    Raises
    ------
    InputError
        If the numbers of reactions and multipliers differ.
    NoAnswerError
        If everything cancels.

    Examples
    --------
    >>> from xleq.reactions import parse_reaction
    >>> parts = [parse_reaction("CH4 + H2O = CO + 3 H2"), parse_reaction("CO + H2O = CO2 + H2")]
    >>> combine(parts, [Fraction(1), Fraction(1)])
    'CH4 + 2 H2O = 4 H2 + CO2'
    """
    if len(reactions) != len(multipliers):
        raise InputError(
            f"reactions: {len(reactions)}, multipliers: {len(multipliers)}; one is needed for each"
        )
    net: dict[Species, Fraction] = {}
    for reaction, multiplier in zip(with_same_phases(reactions), multipliers, strict=True):
        for species, nu in zip(reaction.species, reaction.nu, strict=True):
            net[species] = net.get(species, Fraction(0)) + multiplier * nu
    if not any(net.values()):
        raise NoAnswerError("the reactions cancel: nothing is left of their sum")
    return reaction_text(net, net.values())


def multipliers(target: Reaction, reactions: Sequence[Reaction]) -> list[Fraction]:
    """The multipliers with which reactions add up to a target.

    Parameters
    ----------
    target : Reaction
    reactions : sequence [n_reactions] of Reaction

    Returns
    -------
    list [n_reactions] of Fraction

    Raises
    ------
    NoAnswerError
        If no sum of the reactions is the target.
    AmbiguousError
        If the reactions are dependent on each other, so that more than one is.

    Examples
    --------
    >>> from xleq.reactions import parse_reaction
    >>> parts = [parse_reaction("C + O2 = CO2"), parse_reaction("CO + 1/2 O2 = CO2")]
    >>> [str(m) for m in multipliers(parse_reaction("C + CO2 = 2 CO"), parts)]
    ['1', '-2']
    """
    if not reactions:
        raise InputError("no reactions are given to combine")
    if len(reactions) > _MOST_REACTIONS:
        raise InputError(f"{len(reactions)} reactions; multipliers are found for at most {_MOST_REACTIONS}")
    target, *parts = with_same_phases([target, *reactions])
    every = list(dict.fromkeys(s for r in (target, *parts) for s in r.species))
    rows = [[r.coefficient(s) or Fraction(0) for r in (*parts, target)] for s in every]
    form, pivots = reduced(rows)
    n = len(parts)
    if n in pivots:
        raise NoAnswerError(f"{target.text!r} cannot be made from these reactions{_missing(target, parts)}")
    if len(pivots) < n:
        free = next(i for i in range(n) if i not in pivots)
        raise AmbiguousError(
            f"the multipliers are not unique: reaction {free + 1} ({parts[free].text!r}) follows from the "
            "others; leave one out"
        )
    return [row[n] for row in form]


def _missing(target: Reaction, parts: Sequence[Reaction]) -> str:
    for species, nu in zip(target.species, target.nu, strict=True):
        if nu and not any(part.coefficient(species) for part in parts):
            return f": {species.text} is in none of them"
    return ""
