"""Species: a formula or a name in braces, with its phase."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass, field
from fractions import Fraction
from functools import lru_cache
from typing import Final, Literal, TypeAlias

from xleq.errors import ParseError
from xleq.reactions.formulas import parse_formula

#: gas, liquid, solid, dissolved
Phase: TypeAlias = Literal["g", "l", "s", "aq"]

#: How a phase may be spelt, and the phase it is.
PHASES: Final[Mapping[str, Phase]] = {"g": "g", "l": "l", "s": "s", "cr": "s", "aq": "aq"}
#: A phase and what follows it is judged by the caller.
PHASE_TEXT: Final = re.compile(r"\s*\((aq|cr|g|l|s)\)")

_PHASE_AT_END: Final = re.compile(r"\s*\((aq|cr|g|l|s)\)$")
_OTHER_WORD: Final = re.compile(r"\(([a-z][a-z, ]*)\)$")


@dataclass(frozen=True, slots=True)
class Species:
    """A substance that takes part in reactions. Two are the same when name and phase are.

    Parameters
    ----------
    name : str
        Formula with charge in one spelling (`Ca+2`, `SO4-2`, `CuSO4·5H2O`), or `{any name}`; no phase.
    phase : {"g", "l", "s", "aq"} or None
        None where the text has none and no default was given.
    formula : mapping of str to Fraction, or None
        Atoms of each element; None for a name in braces.
    charge : int
        In elementary charges; 0 for a name in braces, which may stand for anything.
    marked : bool
        Whether the text itself names the phase.
    """

    name: str
    phase: Phase | None
    formula: Mapping[str, Fraction] | None = field(compare=False)
    charge: int = field(compare=False)
    marked: bool = field(compare=False)

    @property
    def text(self) -> str:
        """The species as it was written, in one spelling; reads back as the same."""
        return f"{self.name}({self.phase})" if self.marked else self.name

    @property
    def key(self) -> str:
        """Name and phase, the default phase included: the same for the same species."""
        return f"{self.name}({self.phase})" if self.phase else self.name

    @property
    def pure(self) -> bool:
        """Whether it is a pure solid or liquid: of activity 1, left out of K."""
        return self.phase in ("s", "l")

    @property
    def electron(self) -> bool:
        """Whether it is the electron of a half reaction, which K leaves out too."""
        return self.name == "e-"

    def composition(self) -> dict[str, Fraction] | None:
        """Atoms of each element, and the charge under ``"e"``; None for a name in braces.

        Examples
        --------
        >>> {k: int(v) for k, v in parse_species("SO4-2").composition().items()}
        {'S': 1, 'O': 4, 'e': -2}
        """
        if self.formula is None:
            return None
        parts = dict(self.formula)
        if self.charge:
            parts["e"] = Fraction(self.charge)
        return parts


@lru_cache(maxsize=16384)
def parse_species(text: str, default_phase: Phase | None = None) -> Species:
    """A species from its text.

    Parameters
    ----------
    text : str
        For example ``"NH3"``, ``"CO2(g)"``, ``"Ca2+"``, ``"CuSO4·5H2O(s)"`` or ``"{light naphtha}(g)"``.
    default_phase : {"g", "l", "s", "aq"}, optional
        Taken where the text has none, except for the electron, which has no phase.

    Raises
    ------
    ParseError
        With the position, if it cannot be read.

    Examples
    --------
    >>> parse_species("NH3", "g") == parse_species("NH₃ (g)")
    True
    >>> parse_species("Ca2+").name, parse_species("Fe(cr)").key, parse_species("{heavy ends}", "g").key
    ('Ca+2', 'Fe(s)', '{heavy ends}(g)')
    """
    start = len(text) - len(text.lstrip())
    stripped = text.strip()
    match = _PHASE_AT_END.search(stripped)
    phase = PHASES[match[1]] if match else None
    body = stripped[: match.start()] if match else stripped
    if not body:
        raise ParseError(text, start, "a species")
    formula: Mapping[str, Fraction] | None = None
    if body.startswith("{"):
        name, charge = _braced(text, body, start), 0
    else:
        other = _OTHER_WORD.search(body)
        if other:
            raise ParseError(text, start + other.start(), "a phase: (g), (l), (s), (aq) or (cr)")
        try:
            read = parse_formula(body)
        except ParseError as e:
            raise ParseError(text, start + e.at, e.wanted) from None
        name, formula, charge = read.text, read.elements, read.charge
    marked = phase is not None
    if phase is None and name != "e-":
        phase = default_phase
    return Species(name, phase, formula, charge, marked)


def _braced(text: str, body: str, start: int) -> str:
    closing = body.find("}")
    if closing < 0:
        raise ParseError(text, start + len(body), "the closing brace }")
    if closing != len(body) - 1:
        raise ParseError(text, start + closing + 1, "a phase such as (g), or the end of the species")
    name = " ".join(body[1:closing].split())
    if not name or "{" in name:
        raise ParseError(text, start + 1, "a name between the braces")
    return f"{{{name}}}"
