"""Departure from ideal: activity coefficients and composition brought to agree by Newton's method.

With ln gamma held fixed the problem is convex and solved as if ideal. Outside it, Newton's method makes ln
gamma that of the composition it leads to: the composition's answer to ln gamma comes from the converged
Jacobian, the model's answer to the composition from finite differences.
"""

from __future__ import annotations

from dataclasses import replace
from typing import Protocol, runtime_checkable

import numpy as np
from numpy.typing import NDArray

from xleq.equilibrium.many.newton import System
from xleq.equilibrium.many.phases import Outcome, choose
from xleq.equilibrium.many.response import Response
from xleq.equilibrium.problem import Nonideality, State

Floats = NDArray[np.float64]

MAX_ROUNDS = 60
#: Largest change of a ln gamma in one round. [-]
LONGEST_CHANGE = 2.0
_AGREES = 2e-14
_CLOSE = 1e-11
_STEP = 1e-5


@runtime_checkable
class WithSlopes(Protocol):
    """A model that knows how its ln gamma answers to the amounts."""

    def ln_gamma_slopes(self, n: Floats, state: State) -> tuple[Floats, Floats]:
        """Ln gamma [n_species] and its derivatives by the amounts [n_species, n_species, 1/mol]."""
        ...


@runtime_checkable
class WithNotes(Protocol):
    """A model that has something to say about a composition, or refuses it."""

    def notes(self, n: Floats, state: State) -> tuple[str, ...]:
        """What a checker should know; raises OutOfRangeError beyond the range of the model."""
        ...


def choose_with_model(model: Nonideality, state: State, system: System, pure: NDArray[np.intp]) -> Outcome:
    """The equilibrium with the ln gamma of its own composition.

    Parameters
    ----------
    model : Nonideality
    state : State
    system : System
        With no pure phase present; its ln gamma is where the search begins.
    pure : array of int
        Pure phases that can be there.

    Returns
    -------
    Outcome
        "failed" if composition and coefficients do not come to agree.
    """
    last = _agree(model, state, system, pure, 1.0)
    if last.verdict == "failed":
        # Led in from ideal by parts.
        for part in (0.125, 0.25, 0.5, 0.75, 1.0):
            step = _agree(model, state, system, pure, part)
            if step.system is None or step.verdict == "failed":
                return replace(step, verdict="failed", amounts=None, steps=last.steps + step.steps)
            system = replace(system, ln_gamma=step.system.ln_gamma)
            last = replace(step, steps=last.steps + step.steps)
    return last


def _agree(model: Nonideality, state: State, system: System, pure: NDArray[np.intp], part: float) -> Outcome:
    """Newton's method on ln gamma, of which only a part counts."""
    z = system.ln_gamma.copy()
    o: Outcome | None = None
    steps, best, stalled = 0, np.inf, 0
    for _ in range(MAX_ROUNDS):
        o = choose(replace(system, ln_gamma=z.copy()), pure, o)
        steps += o.steps
        if o.amounts is None or o.system is None or o.path is None:
            return replace(o, steps=steps)
        fluid = system.fluid
        n = _composition(o, fluid)
        gap = part * model.ln_gamma(n, state)[fluid] - z[fluid]
        size = float(np.abs(gap).max(initial=0.0))
        if not np.isfinite(size):
            break
        if size < _AGREES:
            return replace(o, steps=steps)
        stalled = stalled + 1 if size >= best else 0
        if stalled >= 3 and best < _CLOSE:
            return replace(o, steps=steps)
        best = min(best, size)
        moved = Response(o.system, o.path).by_ln_gamma()[np.ix_(fluid, fluid)]
        slope = part * ln_gamma_slope(model, state, n, fluid) @ moved - np.eye(len(fluid))
        try:
            change = np.linalg.solve(slope, -gap)
        except np.linalg.LinAlgError:
            change = gap
        longest = float(np.abs(change).max())
        if not np.isfinite(longest):
            break
        z[fluid] += change * min(1.0, LONGEST_CHANGE / longest)
    return Outcome("failed", frozenset(), steps)


def _composition(o: Outcome, fluid: NDArray[np.intp]) -> Floats:
    """Amounts of the fluid, or its composition where it has vanished [mol]."""
    assert o.amounts is not None
    n = np.zeros(len(o.amounts.n))
    n[fluid] = np.exp(np.maximum(o.amounts.ln_n[fluid], -690.0))
    return n


def ln_gamma_slope(model: Nonideality, state: State, n: Floats, fluid: NDArray[np.intp]) -> Floats:
    """D ln gamma / d ln n of the fluid species [n_fluid, n_fluid].

    From the model itself if it has its slopes, else by central differences.
    """
    if isinstance(model, WithSlopes):
        return np.asarray(model.ln_gamma_slopes(n, state)[1][np.ix_(fluid, fluid)] * n[fluid])
    out = np.zeros((len(fluid), len(fluid)))
    for column, i in enumerate(fluid):
        up, down = n.copy(), n.copy()
        up[i] *= 1.0 + _STEP
        down[i] *= 1.0 - _STEP
        out[:, column] = (model.ln_gamma(up, state) - model.ln_gamma(down, state))[fluid] / (2.0 * _STEP)
    return out
