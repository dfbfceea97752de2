"""Formulas, reaction text, balances, sums of reactions, the text of constants. In exact rationals."""

from xleq.reactions.balancing import balance, check_balance, unchecked_species
from xleq.reactions.combining import combine, exact_multiplier, multipliers, with_same_phases
from xleq.reactions.elements import atomic_weights
from xleq.reactions.equations import Reaction, Term, parse_reaction, reaction_text, with_species
from xleq.reactions.formulas import Formula, molar_mass, parse_formula
from xleq.reactions.linear import null_space, reduced, smallest_integers
from xleq.reactions.quotients import (
    dissolved_phases,
    expression,
    find_species,
    gas_change,
    liquids_mix,
    natural_phases,
    phase_change,
    solvent_settled,
)
from xleq.reactions.species import Phase, Species, parse_species

__all__ = [
    "Formula",
    "Phase",
    "Reaction",
    "Species",
    "Term",
    "atomic_weights",
    "balance",
    "check_balance",
    "combine",
    "dissolved_phases",
    "exact_multiplier",
    "expression",
    "find_species",
    "gas_change",
    "liquids_mix",
    "molar_mass",
    "multipliers",
    "natural_phases",
    "null_space",
    "parse_formula",
    "parse_reaction",
    "parse_species",
    "phase_change",
    "reaction_text",
    "reduced",
    "smallest_integers",
    "solvent_settled",
    "unchecked_species",
    "with_same_phases",
    "with_species",
]
