"""Worksheet functions about reactions as such: balance, expression, coefficients, sums, molar mass."""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction
from functools import lru_cache
from typing import Final

from xleq import reactions as rx
from xleq.cells import Value
from xleq.errors import MissingDataError
from xleq.functions.table import Argument, Example, Function

_CONSERVATION: Final = "conservation of elements and charge, in exact rational arithmetic"
_UNREADABLE: Final = "#VALUE! if a reaction cannot be read (with the position)"
_UNBALANCED: Final = "#VALUE! if a reaction does not balance (with the element and by how much)"

REACTION: Final = Argument("reaction", "text", "reaction text such as N2 + 3 H2 = 2 NH3")
REACTIONS: Final = Argument(
    "reactions", "texts", "the reactions to combine, as a range or text with ; between them"
)
TARGET: Final = Argument("target", "text", "the reaction that is wanted")


@lru_cache(maxsize=16384)
def balanced_reaction(text: str) -> rx.Reaction:
    """A reaction that is known to balance, with the phase of every species.

    Raises
    ------
    InputError
        If it cannot be read, does not balance, or leaves a phase open.
    """
    reaction = rx.natural_phases(text)
    rx.check_balance(reaction)
    return reaction


@lru_cache(maxsize=16384)
def _checked(text: str) -> rx.Reaction:
    """A reaction that is known to balance, with only the phases that its text names."""
    reaction = rx.parse_reaction(text)
    rx.check_balance(reaction)
    return reaction


def multipliers_of(target: str, reactions: Sequence[str]) -> tuple[Fraction, ...]:
    """The multipliers with which reactions, all known to balance, add up to the target.

    Raises
    ------
    InputError
        If a reaction cannot be read or does not balance.
    NoAnswerError
        If no multipliers make the target, or several do.
    """
    return _multipliers_of(target, tuple(reactions))


@lru_cache(maxsize=4096)
def _multipliers_of(target: str, reactions: tuple[str, ...]) -> tuple[Fraction, ...]:
    return tuple(rx.multipliers(_checked(target), [_checked(r) for r in reactions]))


def _balance(reaction: str) -> str:
    return rx.balance(reaction)


def _expression(reaction: str, basis: str) -> str:
    read = balanced_reaction(reaction)
    if basis.strip().lower() == "kx" and rx.liquids_mix(read):
        return rx.expression(read, basis, mixed_liquid=True)
    return rx.expression(read, basis)


def _gas_change(reaction: str) -> float:
    return float(rx.gas_change(balanced_reaction(reaction)))


def _coefficient(reaction: str, species: str) -> float:
    read = balanced_reaction(reaction)
    found = rx.find_species(read, rx.parse_species(species))
    return float(read.coefficient(found) or 0)


def _combine(reactions: Sequence[str], multipliers: Sequence[Fraction]) -> str:
    return rx.combine([_checked(r) for r in reactions], multipliers)


def _multipliers(target: str, reactions: Sequence[str]) -> list[Value]:
    return [float(m) for m in multipliers_of(target, reactions)]


def _molar_mass(formula: str) -> float:
    species = rx.parse_species(formula)
    if species.formula is None:
        raise MissingDataError(f"{species.name} has no formula, and so no molar mass")
    return rx.molar_mass(species.name)


FUNCTIONS: Final = (
    Function(
        "XLEQ_BALANCE",
        "reactions",
        (Argument("reaction", "text", "reaction text; coefficients in it are not used"),),
        "the balanced reaction as text, with the smallest whole numbers",
        _balance,
        (
            _UNREADABLE,
            "#VALUE! if a species has no formula or is written twice",
            "#NUM! if no coefficients balance it, or only with a species on the other side",
            "#NUM! if there are several independent ways to balance it",
        ),
        f"{_CONSERVATION}: null vector of the element matrix",
        (
            Example('=XLEQ_BALANCE("Fe2O3(s) + CO = Fe(s) + CO2")', "Fe2O3(s) + 3 CO = 2 Fe(s) + 3 CO2"),
            Example(
                '=XLEQ_BALANCE("MnO4- + Fe+2 + H+ = Mn+2 + Fe+3 + H2O")',
                "MnO4- + 5 Fe+2 + 8 H+ = Mn+2 + 5 Fe+3 + 4 H2O",
            ),
        ),
    ),
    Function(
        "XLEQ_EXPRESSION",
        "reactions",
        (REACTION, Argument("basis", "text", "K, Kp[bar], Kc[mol/L], Kx and the like", "K")),
        "the equilibrium-constant expression as text; pure (s) and (l) are left out",
        _expression,
        (_UNREADABLE, _UNBALANCED, "#VALUE! if the basis is not known"),
        "IUPAC, Quantities, Units and Symbols in Physical Chemistry, 3rd ed., 2007, section 2.11.1",
        (
            Example('=XLEQ_EXPRESSION("N2 + 3 H2 = 2 NH3")', "K = a(NH3)^2 / (a(N2) a(H2)^3)"),
            Example('=XLEQ_EXPRESSION("CaCO3(s) = CaO(s) + CO2(g)", "Kp[atm]")', "Kp[atm] = p(CO2)"),
        ),
    ),
    Function(
        "XLEQ_GAS_CHANGE",
        "reactions",
        (REACTION,),
        "moles of gas made minus moles of gas used [-]",
        _gas_change,
        (_UNREADABLE, _UNBALANCED, "#VALUE! if a species could be gas or dissolved"),
        "definition",
        (
            Example('=XLEQ_GAS_CHANGE("N2 + 3 H2 = 2 NH3")', -2.0),
            Example('=XLEQ_GAS_CHANGE("CaCO3(s) = CaO(s) + CO2(g)")', 1.0),
        ),
    ),
    Function(
        "XLEQ_COEFFICIENT",
        "reactions",
        (REACTION, Argument("species", "text", "a species of the reaction")),
        "its coefficient [-], positive where it is made, negative where it is used",
        _coefficient,
        (_UNREADABLE, _UNBALANCED, "#VALUE! if the species is not in the reaction"),
        "definition",
        (Example('=XLEQ_COEFFICIENT("N2 + 3 H2 = 2 NH3", "H2")', -3.0),),
    ),
    Function(
        "XLEQ_COMBINE",
        "reactions",
        (REACTIONS, Argument("multipliers", "multipliers", "a number for each; -1 reverses, 1/2 halves")),
        "the net reaction as text",
        _combine,
        (
            _UNREADABLE,
            _UNBALANCED,
            "#VALUE! if the lists differ in length, or a multiplier is not a ratio of whole numbers",
            "#NUM! if everything cancels",
        ),
        _CONSERVATION,
        (
            Example(
                '=XLEQ_COMBINE("CH4 + H2O = CO + 3 H2; CO + H2O = CO2 + H2", "1; 1")',
                "CH4 + 2 H2O = 4 H2 + CO2",
            ),
            Example('=XLEQ_COMBINE("2 SO2 + O2 = 2 SO3", "-1/2")', "SO3 = SO2 + 1/2 O2"),
        ),
    ),
    Function(
        "XLEQ_MULTIPLIERS",
        "reactions",
        (TARGET, REACTIONS),
        "the multiplier of each reaction [-], in the direction of the list",
        _multipliers,
        (
            _UNREADABLE,
            _UNBALANCED,
            "#NUM! if the target cannot be made from the reactions",
            "#NUM! if the multipliers are not unique",
        ),
        _CONSERVATION,
        (
            Example(
                '=XLEQ_MULTIPLIERS("C(s) + CO2 = 2 CO", "C(s) + O2 = CO2; CO + 1/2 O2 = CO2")',
                [[1.0], [-2.0]],
            ),
        ),
    ),
    Function(
        "XLEQ_MOLAR_MASS",
        "reactions",
        (Argument("formula", "text", "a chemical formula; a phase is passed over"),),
        "molar mass [g/mol]; electrons lost or gained by an ion are not counted",
        _molar_mass,
        (
            "#VALUE! if the formula cannot be read (with the position)",
            "#N/A if an element has no standard atomic weight, or a name in braces is given",
        ),
        "abridged standard atomic weights 2021: Prohaska et al., Pure Appl. Chem. 94 (2022) 573",
        (
            Example('=XLEQ_MOLAR_MASS("CuSO4·5H2O")', 249.677),
            Example('=XLEQ_MOLAR_MASS("Ca(OH)2")', 74.092),
        ),
    ),
)
