"""An equilibrium problem and its solution: the records that every solver reads and writes."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field
from fractions import Fraction
from typing import TYPE_CHECKING, Literal, Protocol

from xleq.errors import InputError, NotCertifiedError, OutOfRangeError
from xleq.units import P_STANDARD_BAR, R_L_BAR

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

#: fluid: mixed in the one gas or solution; pure: a pure solid or liquid, activity 1 while present.
Phase = Literal["fluid", "pure"]
#: P: gas at T and P; V: gas at T and volume; C: solution of given volume; X: liquid on mole fractions.
Kind = Literal["P", "V", "C", "X"]
#: exhausted: a pure phase is used up or does not form; frozen: nothing can react; fluid vanished: condensed
#: into pure phases; indeterminate: any extent would do, as for a pure decomposition at exactly P = K.
Status = Literal["equilibrium", "exhausted", "frozen", "fluid vanished", "indeterminate"]

#: Amounts below this are given as 0: a double holds them no longer with its full precision. [mol]
SMALLEST_AMOUNT = 1e-300
#: Amounts above this are refused: sums and products of them must stay within a double. [mol]
LARGEST_AMOUNT = 1e100
#: Largest ln K, either way; that of a mole of anything at 1 K is less. [-]
LARGEST_LN_K = 1e6
#: Ranges of temperature [K], and of pressure [bar] or volume [L].
TEMPERATURES = (1e-3, 1e6)
PRESSURES = VOLUMES = (1e-100, 1e100)


@dataclass(frozen=True, slots=True)
class State:
    """What is held fixed, and so how an activity follows from the amounts.

    The activity of a fluid species i is ln a_i = ln n_i - s ln N + c + ln gamma_i, where N is the amount
    of fluid, s is 1 where activities follow fractions (P, X) and 0 where they follow concentrations (V, C).

    Parameters
    ----------
    kind : {"P", "V", "C", "X"}
    t : float
        Temperature. [K]
    p : float
        Absolute pressure, for P. [bar]
    v : float
        Volume, for V and C. [L]
    """

    kind: Kind
    t: float = math.nan
    p: float = math.nan
    v: float = 1.0

    @property
    def per_total(self) -> int:
        """1 where activities follow fractions, 0 where they follow concentrations."""
        return 1 if self.kind in "PX" else 0

    @property
    def shift(self) -> float:
        """The constant c of the ln activity."""
        if self.kind == "P":
            return math.log(self.p / P_STANDARD_BAR)
        if self.kind == "V":
            return math.log(R_L_BAR * self.t / (self.v * P_STANDARD_BAR))
        if self.kind == "C":
            return -math.log(self.v)
        return 0.0


class Nonideality(Protocol):
    """Departure of the fluid from ideal: ln gamma (or ln phi) of its species."""

    name: str

    def ln_gamma(self, n: NDArray[np.float64], state: State) -> NDArray[np.float64]:
        """Ln gamma [n_species] at the amounts n [n_species, mol]; entries of pure species are 0."""
        ...


@dataclass(frozen=True, slots=True)
class Problem:
    """Amounts, reactions and constants of one equilibrium.

    Parameters
    ----------
    species : tuple [n_species] of str
    phases : tuple [n_species] of {"fluid", "pure"}
    nu : tuple [n_reactions] of tuple [n_species] of Fraction
        Stoichiometric coefficients, products positive. Exact.
    n0 : tuple [n_species] of float
        Amounts fed. [mol]  At least 0.
    ln_k : tuple [n_reactions] of float
        ln K° (p° = 1 bar, c° = 1 mol/L, or mole fractions for X). [-]
    state : State
    formulas : tuple [n_species] of mapping element -> count (charge under "e"), or None
        Composition of each species where it is known, for the certificate's own balance.
    model : Nonideality, optional
        Departure of the fluid from ideal.
    """

    species: tuple[str, ...]
    phases: tuple[Phase, ...]
    nu: tuple[tuple[Fraction, ...], ...]
    n0: tuple[float, ...]
    ln_k: tuple[float, ...]
    state: State
    formulas: tuple[Mapping[str, Fraction] | None, ...] | None = None
    model: Nonideality | None = None


@dataclass(frozen=True, slots=True)
class Certificate:
    """Proof, made without the solver's own variables, that amounts solve a problem.

    Parameters
    ----------
    ok : bool
    reason : str
        What failed; empty when nothing did.
    residuals : tuple [n_reactions] of float
        ln Q - ln K of each reaction; nan where a fluid species of it is absent. [-]
    worst_balance : float
        Largest relative departure of an element, charge or reaction balance. [-]
    worst_error : float
        Largest relative error of an amount that the residuals allow, to first order. [-]
    """

    ok: bool
    reason: str
    residuals: tuple[float, ...]
    worst_balance: float
    worst_error: float = 0.0


@dataclass(frozen=True, slots=True)
class Solution:
    """The equilibrium of a problem, always of this shape.

    Parameters
    ----------
    n : tuple [n_species] of float
        Amounts at equilibrium. [mol]  Exactly 0 for a species that cannot form, and for one below 1e-300 mol.
    xi : tuple [n_reactions] of float
        Extents; a least-norm choice where the reactions are dependent. [mol]
    status : Status
    exhausted : tuple of str
        Pure phases that are used up, or that do not form.
    certificate : Certificate
    iterations : int
    method : str
        What found it, in words for the audit.
    notes : tuple of str
        What a checker should know: dependent reactions, species that cannot form.
    """

    problem: Problem
    n: tuple[float, ...]
    xi: tuple[float, ...]
    status: Status
    exhausted: tuple[str, ...]
    certificate: Certificate
    iterations: int
    method: str
    notes: tuple[str, ...] = field(default=())

    def require(self) -> Solution:
        """Give the solution itself, if its certificate holds.

        Raises
        ------
        NotCertifiedError
            If it does not: a doubtful composition is never given.
        """
        if not self.certificate.ok:
            raise NotCertifiedError(f"no certified equilibrium: {self.certificate.reason}")
        return self


def check(problem: Problem) -> None:
    """Refuse a problem whose records do not fit together or whose numbers mean nothing.

    Parameters
    ----------
    problem : Problem

    Raises
    ------
    InputError
        If lengths differ, or an amount or a constant is not a finite number, or an amount is negative, or
        nothing is fed.
    OutOfRangeError
        If the temperature, pressure or volume is not positive, an amount, a constant or one of these is
        beyond what doubles can carry through the calculation, or there is no fluid at all.
    """
    species, n0 = problem.species, problem.n0
    width = len(species)
    if len(n0) != width or len(problem.phases) != width or any(len(row) != width for row in problem.nu):
        raise InputError("species, phases, feed and coefficients are not of the same length")
    if not problem.nu or len(problem.ln_k) != len(problem.nu):
        raise InputError(f"{len(problem.nu)} reactions with {len(problem.ln_k)} constants")
    for name, amount in zip(species, n0, strict=True):
        if not 0.0 <= amount < math.inf:
            raise InputError(f"the feed of {name} is {amount}: it must be a number, at least 0")
        if amount and not SMALLEST_AMOUNT <= amount <= LARGEST_AMOUNT:
            raise OutOfRangeError(
                f"the feed of {name} is {amount:g} mol: it must be 0 or from {SMALLEST_AMOUNT:g} to "
                f"{LARGEST_AMOUNT:g}"
            )
    for place, ln_k in enumerate(problem.ln_k, 1):
        if not -math.inf < ln_k < math.inf:
            raise InputError(f"ln K of reaction {place} is {ln_k}: it must be a finite number")
        if abs(ln_k) > LARGEST_LN_K:
            raise OutOfRangeError(f"ln K of reaction {place} is {ln_k:g}: more than 1e6 is not solved")
    if not any(n0):
        raise InputError("nothing is fed: every amount is 0")
    if "fluid" not in problem.phases:
        raise OutOfRangeError("there is no gas or solution: every species is a pure solid or liquid")
    _check_state(problem.state)


def _check_state(state: State) -> None:
    kind = state.kind
    if kind in "PV":
        _check_range("temperature", state.t, "K", TEMPERATURES)
    if kind == "P":
        _check_range("pressure", state.p, "bar", PRESSURES)
    elif kind in "VC":
        _check_range("volume", state.v, "L", VOLUMES)


def _check_range(what: str, value: float, unit: str, ends: tuple[float, float]) -> None:
    if not ends[0] <= value <= ends[1]:
        wanted = f"from {ends[0]:g} to {ends[1]:g}" if value > 0.0 else "above 0"
        raise OutOfRangeError(f"the {what} is {value:g} {unit}: it must be {wanted}")


@dataclass(frozen=True, slots=True)
class Batch:
    """Many instances of one system: the same species and reactions, each with its own numbers.

    Parameters
    ----------
    species, phases, nu, formulas
        As in `Problem`.
    n0 : array [n_instances, n_species]
        Amounts fed. [mol]
    ln_k : array [n_instances, n_reactions]
        ln K°. [-]
    kind : {"P", "V", "C", "X"}
    t, p, v : array [n_instances]
        Temperature [K], pressure [bar], volume [L]; nan, or 1 for the volume, where the kind has none.
    """

    species: tuple[str, ...]
    phases: tuple[Phase, ...]
    nu: tuple[tuple[Fraction, ...], ...]
    n0: NDArray[np.float64]
    ln_k: NDArray[np.float64]
    kind: Kind
    t: NDArray[np.float64]
    p: NDArray[np.float64]
    v: NDArray[np.float64]
    formulas: tuple[Mapping[str, Fraction] | None, ...] | None = None

    def __len__(self) -> int:
        return len(self.n0)

    def problem(self, i: int) -> Problem:
        """The instance of that place as a problem of its own."""
        state = State(self.kind, float(self.t[i]), float(self.p[i]), float(self.v[i]))
        n0, ln_k = tuple(self.n0[i].tolist()), tuple(self.ln_k[i].tolist())
        return Problem(self.species, self.phases, self.nu, n0, ln_k, state, self.formulas)


def shifts(batch: Batch) -> NDArray[np.float64]:
    """The constant of the ln activity of each instance [n_instances], as `State.shift` has it.

    Parameters
    ----------
    batch : Batch
    """
    import numpy as np

    if batch.kind == "P":
        return np.log(batch.p / P_STANDARD_BAR)
    if batch.kind == "V":
        return np.log(R_L_BAR * batch.t / (batch.v * P_STANDARD_BAR))
    if batch.kind == "C":
        return -np.log(batch.v)
    return np.zeros(len(batch.n0))


def sound(batch: Batch) -> NDArray[np.bool_]:
    """Instances [n_instances] whose numbers pass `check`; it gives the reason for the others one by one.

    Parameters
    ----------
    batch : Batch
    """
    import numpy as np

    n0 = batch.n0
    fed = n0 > 0.0
    held = {
        "P": ((batch.t, TEMPERATURES), (batch.p, PRESSURES)),
        "V": ((batch.t, TEMPERATURES), (batch.v, VOLUMES)),
        "C": ((batch.v, VOLUMES),),
        "X": (),
    }[batch.kind]
    with np.errstate(invalid="ignore"):
        ok = np.all((n0 == 0.0) | ((n0 >= SMALLEST_AMOUNT) & (n0 <= LARGEST_AMOUNT)), axis=1)
        ok &= fed.any(axis=1) & np.all(np.abs(batch.ln_k) <= LARGEST_LN_K, axis=1)
        for values, (low, high) in held:
            ok &= (values >= low) & (values <= high)
    return np.asarray(ok)


@dataclass(frozen=True, slots=True)
class BatchSolution:
    """The equilibria of a batch.

    Parameters
    ----------
    n : array [n_instances, n_species]
        Amounts at equilibrium; nan in the rows that are not certified. [mol]
    xi : array [n_instances, n_reactions]
        Extents; nan in the rows that are not certified. [mol]
    ok : array [n_instances] of bool
        Whether the certificate of each holds.
    reasons : tuple [n_instances] of str
        Why an instance has no answer; empty where it has one.
    status : tuple [n_instances] of Status or ""
        Empty where the instance was refused as input.
    iterations : array [n_instances] of int
    """

    n: NDArray[np.float64]
    xi: NDArray[np.float64]
    ok: NDArray[np.bool_]
    reasons: tuple[str, ...]
    status: tuple[Status | Literal[""], ...]
    iterations: NDArray[np.int_]
