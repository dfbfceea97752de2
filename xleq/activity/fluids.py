"""What the gas models share: critical constants of the species, and the state they are asked in."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import NamedTuple, Protocol

import numpy as np
from numpy.typing import NDArray

from xleq.errors import MissingDataError
from xleq.thermo import Table, standard_table

Array = NDArray[np.float64]


class State(Protocol):
    """What is held fixed: the part of an equilibrium's state that the models of this room read."""

    @property
    def kind(self) -> str:
        """P: gas at T and p; V: gas at T and V; C: solution."""
        ...

    @property
    def t(self) -> float:
        """Temperature [K]."""
        ...

    @property
    def p(self) -> float:
        """Absolute pressure [bar]."""
        ...

    @property
    def v(self) -> float:
        """Volume [L]."""
        ...


@dataclass(frozen=True, slots=True)
class FluidState:
    """A state to ask a model in, outside an equilibrium.

    Parameters
    ----------
    kind : {"P", "V", "C"}
    t : float
        Temperature. [K]
    p : float
        Absolute pressure, for P. [bar]
    v : float
        Volume, for V and C. [L]
    """

    kind: str
    t: float
    p: float = math.nan
    v: float = 1.0


class Fluid(NamedTuple):
    """Critical temperature [K], critical pressure [bar], acentric factor [-]."""

    tc: float
    pc: float
    omega: float


def critical_constants(
    species: Sequence[str], gases: Sequence[bool], table: Table | None = None
) -> tuple[list[Fluid | None], Array]:
    """Critical constants of the gases among species, and their kij [n_species, n_species].

    Parameters
    ----------
    species : sequence [n_species] of str
    gases : sequence [n_species] of bool
        Whether each is in the gas; the others get None.

    Raises
    ------
    MissingDataError
        If a gas has no critical constants: names all of them.
    """
    table = table or standard_table()
    found: list[Fluid | None] = []
    keys: list[str] = []
    lacking: list[str] = []
    for name, is_gas in zip(species, gases, strict=True):
        data = table.find(name) if is_gas else None
        keys.append(data.key if data else "")
        if data is None:
            found.append(None)
        elif math.isfinite(data.tc) and math.isfinite(data.pc) and math.isfinite(data.omega):
            found.append(Fluid(data.tc, data.pc, data.omega))
        else:
            lacking.append(data.key)
    if lacking:
        raise MissingDataError(
            f"no critical constants of {', '.join(lacking)}; give Tc, Pc and omega in a data range, "
            "or take the gas as ideal"
        )
    kij = np.array([[table.kij.get((a, b), 0.0) if a and b else 0.0 for b in keys] for a in keys])
    return found, kij
