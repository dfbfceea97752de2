"""Formation data of species, and what follows from them."""

from xleq.thermo.reactions import ReactionData, reaction_data
from xleq.thermo.records import T_STANDARD, CpPart, Interval, Sources, SpeciesData, integrated
from xleq.thermo.sheets import read_data
from xleq.thermo.table import Table, citations, standard_table

__all__ = [
    "T_STANDARD",
    "CpPart",
    "Interval",
    "ReactionData",
    "Sources",
    "SpeciesData",
    "Table",
    "citations",
    "integrated",
    "reaction_data",
    "read_data",
    "standard_table",
]
