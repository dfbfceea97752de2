"""From the text in cells to an equilibrium problem: species, phases and coefficients of reactions."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction
from functools import lru_cache
from typing import Final, Literal

from xleq.equilibrium import Phase
from xleq.errors import InputError, XleqError
from xleq.reactions import (
    Reaction,
    Species,
    check_balance,
    dissolved_phases,
    parse_reaction,
    parse_species,
    solvent_settled,
)

#: The phase that is mixed: a gas, the solutes of a solution, or a liquid of several components.
Fluid = Literal["g", "aq", "l"]

_FLUID_NAMES: Final = {"g": "gas", "aq": "solution", "l": "liquid mixture"}
_PHASE_NAMES: Final = {"g": "a gas", "aq": "dissolved", "l": "a liquid", "s": "a solid"}
_ALLOWED: Final[dict[Fluid, str]] = {"g": "gls", "aq": "alsg", "l": "ls"}
#: Amount of solvent water where none is given: 997.05 g/L over 18.015 g/mol. [mol/L]
SOLVENT_WATER: Final = 55.35
#: Amount of an open gas that a solution may take up, more than any can. [mol/L]
RESERVOIR: Final = 1000.0


@dataclass(frozen=True, slots=True, eq=False)
class System:
    """Species and reactions of an equilibrium, before amounts and conditions are known.

    Two systems are the same only if they are one object, so that one can stand in the key of a cache.

    Parameters
    ----------
    fluid : {"g", "aq", "l"}
    names : tuple [n_species] of str
        As the user wrote them; solvent water that was left out comes last.
    species : tuple [n_species] of Species
    phases : tuple [n_species] of {"fluid", "pure"}
    reactions : tuple [n_reactions] of Reaction
    nu : tuple [n_reactions] of tuple [n_species] of Fraction
    formulas : tuple [n_species] of mapping, or None
        None unless every species has a formula.
    n_listed : int
        Number of species in the user's list.
    notes : tuple of str
        What a checker should know: reactions whose elements could not be checked.
    derived : bool
        Whether the reactions were found from the elements, so that none of them can be misspelt.
    """

    fluid: Fluid
    names: tuple[str, ...]
    species: tuple[Species, ...]
    phases: tuple[Phase, ...]
    reactions: tuple[Reaction, ...]
    nu: tuple[tuple[Fraction, ...], ...]
    formulas: tuple[Mapping[str, Fraction] | None, ...] | None
    n_listed: int
    notes: tuple[str, ...]
    derived: bool = False

    def index(self, text: str) -> int:
        """Place of a species in the list.

        Raises
        ------
        InputError
            If it is not there, or the text fits more than one.
        """
        listed = self.names[: self.n_listed]
        if listed.count(text) == 1:
            return listed.index(text)
        return _place(self.species[: self.n_listed], text)

    @property
    def open_gases(self) -> tuple[int, ...]:
        """Places of the gases above a solution: each is held at its partial pressure, without an end."""
        if self.fluid != "aq":
            return ()
        return tuple(i for i, s in enumerate(self.species) if s.phase == "g")

    def fed(self, amounts: tuple[float, ...]) -> tuple[float, ...]:
        """The amount of every species [n_species], from those that the user lists.

        Solvent water of which none is given counts as a litre of it, an open gas as more than can dissolve.

        Raises
        ------
        InputError
            If the lists do not fit, or a species neither reacts nor is fed.
        """
        n = self.n_listed
        if len(amounts) > n and not any(amounts[n:]):
            amounts = amounts[:n]  # a range drawn longer than its list, as that of the species may be
        if len(amounts) != n:
            raise InputError(f"{n} species but {len(amounts)} amounts; give one amount a species")
        for i, amount in enumerate(() if self.derived else amounts):
            if amount == 0.0 and not any(row[i] for row in self.nu):
                raise InputError(
                    f"{self.names[i]} takes part in no reaction and has no feed; "
                    "correct its spelling or take it off the list"
                )
        return self._with_solvent(amounts) if self.fluid == "aq" else amounts

    def _with_solvent(self, amounts: tuple[float, ...]) -> tuple[float, ...]:
        full = [*amounts, *(0.0 for _ in self.names[len(amounts) :])]
        for i, s in enumerate(self.species):
            if s.phase == "g" and full[i]:
                raise InputError(
                    f"{s.key} is held at its partial pressure, so it has no amount; leave it empty or 0"
                )
            if s.phase == "g":
                full[i] = RESERVOIR
            elif s.name == "H2O" and s.phase == "l" and full[i] == 0.0:
                full[i] = SOLVENT_WATER
        return tuple(full)


@lru_cache(maxsize=4096)
def system(reactions: tuple[str, ...], species: tuple[str, ...], fluid: Fluid) -> System:
    """Read and check reactions and a list of species.

    Parameters
    ----------
    reactions : tuple [n_reactions] of str
    species : tuple [n_species] of str
        Every species of the reactions, and those that do not react.
    fluid : {"g", "aq", "l"}
        What a species without a phase is.

    Raises
    ------
    InputError
        If a text cannot be read, a reaction does not balance, or list and reactions do not fit.
    """
    read: list[Reaction] = []
    notes: list[str] = []
    for number, text in enumerate(reactions, 1):
        try:
            reaction = dissolved_phases(text) if fluid == "aq" else parse_reaction(text, fluid)
            note = check_balance(reaction)
        except XleqError as e:
            if len(reactions) == 1:
                raise
            raise InputError(f"reaction {number}: {e}") from e
        read.append(reaction)
        if note:
            notes.append(f"reaction {number}: {note}")
    taking_part = list(dict.fromkeys(s for r in read for s in r.species))
    listed = [_settled(parse_species(text, fluid), fluid) for text in species]
    found = [_match(s, text, taking_part) for s, text in zip(listed, species, strict=True)]
    for i, s in enumerate(found):
        if s in found[:i]:
            raise InputError(f"species {species[i]} is in the list twice")
    names = list(species)
    for s in taking_part:
        if s in found:
            continue
        if fluid == "aq" and s.name == "H2O" and s.phase == "l":
            found.append(s)
            names.append("H2O(l)")
        else:
            raise InputError(
                f"{s.text} takes part in a reaction but is not in the list of species{_near(s, listed)}"
            )
    for s in found:
        _check_phase(s, fluid)
    nu = tuple(tuple(r.coefficient(s) or Fraction(0) for s in found) for r in read)
    formulas = tuple(s.composition() for s in found)
    return System(
        fluid,
        tuple(names),
        tuple(found),
        tuple("fluid" if s.phase == fluid else "pure" for s in found),
        tuple(read),
        nu,
        None if any(f is None for f in formulas) else formulas,
        len(species),
        tuple(notes),
    )


def _settled(s: Species, fluid: Fluid) -> Species:
    return solvent_settled(s) if fluid == "aq" else s


def _match(s: Species, text: str, taking_part: list[Species]) -> Species:
    """The species of the reactions that an item of the list means; the item itself if it does not react."""
    if s in taking_part:
        return s
    same = [t for t in taking_part if t.name == s.name]
    if same and not s.marked:
        if len(same) > 1:
            raise InputError(f"species {text} could be {' or '.join(t.key for t in same)}; write its phase")
        return same[0]
    if same and not any(t.marked for t in same):
        raise InputError(
            f"species {text} is {same[0].key} in the reactions, where no phase is written; "
            f"write {s.key} there too"
        )
    return s


def _near(s: Species, listed: list[Species]) -> str:
    same = [t.key for t in listed if t.name == s.name]
    return f"; the list has {same[0]}" if same else ""


def _check_phase(s: Species, fluid: Fluid) -> None:
    if s.electron:
        raise InputError("an electron has no amount at equilibrium; combine the half reactions first")
    assert s.phase is not None
    if s.phase[0] not in _ALLOWED[fluid]:
        raise InputError(
            f"{s.key} is {_PHASE_NAMES[s.phase]}; a {_FLUID_NAMES[fluid]} here holds "
            + ("gases" if fluid == "g" else "solutes" if fluid == "aq" else "liquids")
            + " beside pure solids"
            + ("" if fluid == "l" else " and liquids")
        )


def _place(species: tuple[Species, ...], text: str) -> int:
    bare = parse_species(text)
    places = [
        i
        for i, s in enumerate(species)
        if s.name == bare.name and (bare.phase is None or s.phase == bare.phase)
    ]
    if len(places) == 1:
        return places[0]
    if places:
        raise InputError(f"{text} could be {' or '.join(species[i].key for i in places)}; write its phase")
    raise InputError(f"{text} is not in the list of species: {', '.join(s.text for s in species)}")
