"""The table of species: found by formula and phase, extended or overridden by a user's own data."""

from __future__ import annotations

import csv
import math
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from difflib import get_close_matches
from functools import lru_cache
from importlib import resources
from typing import Final, cast

from xleq.errors import AmbiguousError, MissingDataError, ParseError
from xleq.reactions import Phase, Species, parse_species
from xleq.thermo.records import CpPart, Sources, SpeciesData, integrated

PHASE_WORDS: Final[Mapping[str, str]] = {"g": "gas", "l": "liquid", "s": "solid", "aq": "solute"}


@dataclass(frozen=True, eq=False)
class Table:
    """Species data by key, with other spellings.

    Two tables are the same only if they are one object, so that a table can stand in the key of a cache.

    Parameters
    ----------
    data : mapping of key to SpeciesData
    also : mapping of key to key
        Other spellings, for example names in braces.
    kij : mapping of (key, key) to float
        Binary interaction coefficients of the Peng–Robinson equation, in both orders.
    """

    data: Mapping[str, SpeciesData]
    also: Mapping[str, str] = field(default_factory=dict)
    kij: Mapping[tuple[str, str], float] = field(default_factory=dict)

    def __len__(self) -> int:
        return len(self.data)

    def find(self, species: str | Species, default_phase: Phase = "g") -> SpeciesData:
        """Data of a species.

        Parameters
        ----------
        species : str or Species
            Formula with phase, or a name in braces with phase: ``"CO2(g)"``, ``"{methanol}(l)"``.
        default_phase : {"g", "l", "s", "aq"}
            Taken where the text has none.

        Raises
        ------
        MissingDataError
            If it is not in the table; names the phases that are, or the nearest names.
        AmbiguousError
            For an atom without a phase whose element is a solid or liquid (`C`, `S`, `Fe`): gas atoms are
            hardly meant.
        ParseError
            If the text is no species.

        Examples
        --------
        >>> standard_table().find("CO2").dhf
        -393.474
        >>> standard_table().find("CO2(l)")
        Traceback (most recent call last):
        xleq.errors.MissingDataError: no data for CO2(l); there is CO2(g) and CO2(aq)
        """
        if isinstance(species, str):
            species = parse_species(species, default_phase)
        key = species.key if species.phase else f"{species.name}({default_phase})"
        found = self.data.get(key) or self.data.get(self.also.get(key, ""))
        if found is None:
            raise MissingDataError(f"no data for {key}{self._hint(species, key)}")
        if not species.marked and found.formula is not None and sum(found.formula.values()) == 1:
            condensed = [k for k in (f"{species.name}(s)", f"{species.name}(l)") if k in self.data]
            if key.endswith("(g)") and condensed:
                raise AmbiguousError(
                    f"{species.name} without a phase would mean its gas atoms; write {condensed[0]}, "
                    f"or {key} if atoms are meant"
                )
        return found

    def __contains__(self, key: str) -> bool:
        return key in self.data or key in self.also

    def _hint(self, species: Species, key: str) -> str:
        phases = [f"{species.name}({p})" for p in PHASE_WORDS if f"{species.name}({p})" in self]
        if phases:
            return f"; there is {_listed(phases)}"
        same = [
            k
            for k, d in self.data.items()
            if species.formula is not None and d.formula == species.formula and d.charge == species.charge
        ]
        same = [k for k in same if k.endswith(key[key.rindex("(") :])] or same
        if same:
            return f"; of the same composition there is {_listed(same[:4])}"
        near = get_close_matches(key, [*self.data, *self.also], n=3, cutoff=0.6)
        if near:
            return f"; the nearest names are {_listed(near)}"
        return "; give its formation data in a data range"

    def extended(self, extra: Iterable[SpeciesData], kij: Mapping[tuple[str, str], float]) -> Table:
        """A new table in which `extra` stands before the data of this one."""
        data = dict(self.data)
        data.update((d.key, d) for d in extra)
        return Table(data, self.also, {**self.kij, **kij})


def _listed(names: list[str]) -> str:
    return names[0] if len(names) == 1 else ", ".join(names[:-1]) + " and " + names[-1]


def _number(text: str) -> float:
    return float(text) if text else math.nan


def _spelling(text: str, phase: str) -> str:
    try:
        return parse_species(f"{text}({phase})").key
    except ParseError:
        return f"{{{text}}}({phase})"


@lru_cache(maxsize=1)
def standard_table() -> Table:
    """The built-in table, ``species.csv``, read once.

    Examples
    --------
    >>> len(standard_table()) >= 400
    True
    """
    path = resources.files("xleq.thermo") / "species.csv"
    groups: dict[str, list[dict[str, str]]] = {}
    lines = (line for line in path.read_text("utf-8").splitlines() if not line.startswith("#"))
    for row in csv.DictReader(lines):
        groups.setdefault(row["species"], []).append(row)
    data: dict[str, SpeciesData] = {}
    also: dict[str, str] = {}
    for rows in groups.values():
        record = _record(rows)
        data[record.key] = record
        phase = record.key[record.key.rindex("(") + 1 : -1]
        for text in (rows[0]["name"], *filter(None, rows[0]["also"].split(";"))):
            also.setdefault(f"{{{text}}}({phase})", record.key)
            also.setdefault(_spelling(text, phase), record.key)
    return Table(data, also)


def _record(rows: list[dict[str, str]]) -> SpeciesData:
    head = rows[0]
    species = parse_species(head["species"])
    known = bool(head["A"])
    parts = []
    for row in rows:
        a, b, c, d, e = (float(row[k] or 0.0) for k in "ABCDE")
        parts.append(
            CpPart(float(row["T_min"]), float(row["T_max"]), (a, b, c, d, e), float(row["dH_tr"] or 0.0))
        )
    dhf, s298 = float(head["dHf"]), float(head["S"])
    return SpeciesData(
        key=species.key,
        name=head["name"],
        dhf=dhf,
        s298=s298,
        intervals=integrated(dhf, s298, tuple(parts)),
        cp_known=known,
        tc=_number(head["Tc"]),
        pc=_number(head["Pc"]),
        omega=_number(head["omega"]),
        sources=Sources(head["src_dHf"], head["src_S"], head["src_Cp"], head["src_crit"]),
        note=head["note"],
        formula=species.formula,
        charge=species.charge,
        parts=tuple(parts),
    )


@lru_cache(maxsize=1)
def citations() -> dict[str, str]:
    """What each source code of the table stands for.

    Examples
    --------
    >>> citations()["CODATA"][:35]
    'J. D. Cox, D. D. Wagman and V. A. M'
    """
    text = (resources.files("xleq.thermo") / "sources.csv").read_text("utf-8")
    return {row["code"]: cast(str, row["citation"]) for row in csv.DictReader(text.splitlines())}
