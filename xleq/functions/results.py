"""What a cell can ask of an equilibrium: the words of the argument `want`."""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import TYPE_CHECKING, Final, Protocol, runtime_checkable

from xleq.cells import Grid, Value
from xleq.equilibrium import Solution, State
from xleq.errors import InputError, NoAnswerError
from xleq.functions.arguments import Want
from xleq.functions.systems import System
from xleq.units import R_L_BAR

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

_NO_AMOUNT: Final = "it is held at its partial pressure and has no amount; ask for its change"
_PER_SPECIES: Final = ("moles", "fractions", "pressures", "concentrations", "change", "conversion")


def wanted(system: System, solution: Solution, want: Want) -> Value | list[Value] | Grid:
    """One value, a list over the species or reactions, or the table.

    Parameters
    ----------
    system : System
    solution : Solution
        Certified.
    want : Want

    Raises
    ------
    InputError
        If the result does not exist in this kind of system, or for this species.
    """
    word = want.word
    if word in _PER_SPECIES:
        one, total = _ONE[word], fluid_total(solution)
        open_gases = () if word == "change" else system.open_gases
        if want.species is not None:
            place = system.index(want.species)
            value = one(solution, place, total) if place not in open_gases else _NO_AMOUNT
            if isinstance(value, str):
                raise NoAnswerError(f"{want.species} has no {word}: {value}")
            return value
        listed: list[Value] = []
        for i in range(system.n_listed):
            value = one(solution, i, total) if i not in open_gases else _NO_AMOUNT
            listed.append("" if isinstance(value, str) else value)
        return listed
    if want.species is not None:
        raise InputError(f"{word} is not a result for one species; write {word} alone")
    return _WHOLE[word](system, solution)


def _moles(solution: Solution, i: int, total: float) -> float | str:
    return solution.n[i]


@runtime_checkable
class _WithPressure(Protocol):
    """A gas model that knows the pressure."""

    def pressure(self, n: NDArray[np.float64], state: State) -> float:
        """Pressure [bar]."""
        ...


def fluid_total(solution: Solution) -> float:
    """Amount of fluid at equilibrium. [mol]."""
    phases = solution.problem.phases
    return math.fsum(n for n, phase in zip(solution.n, phases, strict=True) if phase == "fluid")


def _fractions(solution: Solution, i: int, total: float) -> float | str:
    if solution.problem.phases[i] == "pure":
        return "it is a pure phase, not part of the fluid"
    if total == 0.0:
        return "no fluid is left"
    return solution.n[i] / total


def _pressures(solution: Solution, i: int, total: float) -> float | str:
    state = solution.problem.state
    if state.kind not in "PV":
        raise InputError("partial pressures are results of gases only")
    if solution.problem.phases[i] == "pure":
        return "it is a pure phase, not part of the gas"
    if state.kind == "V" and solution.problem.model is None:
        return solution.n[i] * R_L_BAR * state.t / state.v
    fraction = _fractions(solution, i, total)
    return fraction if isinstance(fraction, str) else fraction * _pressure(solution)


def _pressure(solution: Solution) -> float:
    """Total pressure [bar]: that of the state, or of the gas model in its volume."""
    state, model = solution.problem.state, solution.problem.model
    if state.kind == "P":
        return state.p
    assert isinstance(model, _WithPressure)
    import numpy as np

    return model.pressure(np.array(solution.n), state)


def _concentrations(solution: Solution, i: int, total: float) -> float | str:
    state = solution.problem.state
    if state.kind == "X":
        raise InputError("concentrations need a volume, and this liquid has none; ask for fractions")
    if solution.problem.phases[i] == "pure":
        return "it is a pure phase, not part of the fluid"
    if state.kind in "VC":
        return solution.n[i] / state.v
    if solution.problem.model is not None:
        raise InputError(
            "concentrations at given pressure are those of an ideal gas; leave the option gas away"
        )
    fraction = _fractions(solution, i, total)
    return fraction if isinstance(fraction, str) else fraction * state.p / (R_L_BAR * state.t)


def _change(solution: Solution, i: int, total: float) -> float | str:
    # From the extents, as a difference of amounts would lose the digits of a small change.
    nu = solution.problem.nu
    return math.fsum(float(row[i]) * xi for row, xi in zip(nu, solution.xi, strict=True)) + 0.0


def _conversion(solution: Solution, i: int, total: float) -> float | str:
    fed = solution.problem.n0[i]
    if fed == 0.0:
        return "none of it is fed"
    change = _change(solution, i, total)
    assert isinstance(change, float)
    conversion = -change / fed + 0.0
    return conversion if math.isfinite(conversion) else "its feed is next to nothing beside its change"


_ONE: Final[dict[str, Callable[[Solution, int, float], float | str]]] = {
    "moles": _moles,
    "fractions": _fractions,
    "pressures": _pressures,
    "concentrations": _concentrations,
    "change": _change,
    "conversion": _conversion,
}


def _extents(system: System, solution: Solution) -> list[Value]:
    return list(solution.xi)


def _total(system: System, solution: Solution) -> float:
    return fluid_total(solution)


def _state(system: System, solution: Solution) -> str:
    if solution.status == "frozen":
        return "frozen: nothing can react"
    if solution.exhausted:
        return f"{solution.status}: absent {', '.join(solution.exhausted)}"
    return solution.status


def _residual(system: System, solution: Solution) -> list[Value]:
    return ["absent" if math.isnan(r) else r for r in solution.certificate.residuals]


def _table(system: System, solution: Solution) -> Grid:
    grid: Grid = [["species", "initial", "change", "equilibrium"]]
    for i in range(system.n_listed):
        change = _change(solution, i, 0.0)
        ends: tuple[Value, Value] = (solution.problem.n0[i], solution.n[i])
        if i in system.open_gases:
            ends = ("", "")
        grid.append([system.names[i], ends[0], change, ends[1]])
    return grid


_WHOLE: Final[dict[str, Callable[[System, Solution], Value | list[Value] | Grid]]] = {
    "extents": _extents,
    "total": _total,
    "state": _state,
    "residual": _residual,
    "table": _table,
}
