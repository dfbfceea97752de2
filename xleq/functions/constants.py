"""Worksheet functions about equilibrium constants: bases, sums, temperature, quotient, fits."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Final

from xleq import constants as kx
from xleq.cells import BLANK, Grid, Value
from xleq.errors import InputError
from xleq.functions.arguments import READERS
from xleq.functions.quotients import ln_q_of
from xleq.functions.reactions import (
    REACTION,
    REACTIONS,
    TARGET,
    balanced_reaction,
    multipliers_of,
)
from xleq.functions.table import Argument, Example, Function

_UNREADABLE: Final = "#VALUE! if the reaction cannot be read or does not balance"
_NOT_POSITIVE: Final = "#NUM! if K is not above 0"
_COLD: Final = "#NUM! if T is not above 0 K"
_GREEN_BOOK: Final = (
    "IUPAC, Quantities, Units and Symbols in Physical Chemistry, 3rd ed., 2007, section 2.11.1"
)
_IDEAL: Final = f"p = c R T and p = x P of ideal gases; {_GREEN_BOOK}"

_K: Final = Argument("K", "K", "equilibrium constant, a number or text such as ln -12.3")
_T: Final = Argument("T", "temperature", "absolute temperature", unit="K")
_PRESSURE_UNIT: Final = Argument("pressure_unit", "text", "absolute pressure unit of Kp", "bar")
_CONCENTRATION_UNIT: Final = Argument("concentration_unit", "text", "concentration unit of Kc", "mol/L")

K = float | str


def _kp(kc: float, reaction: str, t: float, pressure_unit: str, concentration_unit: str) -> K:
    here, there = _units(pressure_unit, concentration_unit)
    return kx.write_k(kx.ln_k_converted(kc, balanced_reaction(reaction), there, here, t))


def _kc(kp: float, reaction: str, t: float, pressure_unit: str, concentration_unit: str) -> K:
    here, there = _units(pressure_unit, concentration_unit)
    return kx.write_k(kx.ln_k_converted(kp, balanced_reaction(reaction), here, there, t))


def _units(pressure: str, concentration: str) -> tuple[kx.Basis, kx.Basis]:
    kp = kx.Basis("Kp", pressure, kx.pressure_size(pressure))
    return kp, kx.Basis("Kc", concentration, kx.concentration_size(concentration))


def _k_convert(
    k: float, reaction: str, from_basis: str, to_basis: str, t: float | None, p: float | None
) -> K:
    read = balanced_reaction(reaction)
    bases = kx.parse_basis(from_basis), kx.parse_basis(to_basis)
    return kx.write_k(kx.ln_k_converted(k, read, *bases, t, p))


def _k_scale(k: float, factor: float) -> K:
    return kx.write_k(kx.ln_k_scaled(k, factor))


def _k_combine(target: str, reactions: Sequence[str], ks: Sequence[float]) -> K:
    return kx.write_k(kx.ln_k_combined(ks, multipliers_of(target, reactions)))


def _k_at(k: float, t_of_k: float, t: float, dh: float, dcp: float) -> K:
    return kx.write_k(kx.ln_k_at(k, t_of_k, t, dh, dcp))


def _k_from_dg(dg: float, t: float) -> K:
    return kx.write_k(kx.ln_k_from_dg(dg, t))


def _dg_from_k(k: float, t: float) -> float:
    return kx.dg_from_ln_k(k, t)


def _q(
    reaction: str,
    species: tuple[str, ...],
    amounts: Grid,
    p: float | None,
    t: float | None,
    basis: str,
) -> K:
    ln_q = ln_q_of(reaction, species, _amounts(amounts, len(species), p, basis), p, t, kx.parse_basis(basis))
    return 0.0 if ln_q == -math.inf else kx.write_k(ln_q)


def _amounts(block: Grid, n: int, p: float | None, basis: str) -> tuple[float, ...]:
    """Moles where there is a total to take fractions of, else concentrations."""
    moles = p is not None or kx.parse_basis(basis).kind == "Kx"
    numbers: tuple[float, ...] = READERS["amounts" if moles else "concentrations"](_listed(block, n), ())
    if len(numbers) != n:
        raise InputError(f"species: {n}, amounts: {len(numbers)}; one is needed for each")
    return numbers


def _listed(block: Grid, least: int = 0) -> Value | Grid:
    """A list as the readers take it, without the empty cells at its end that are more than the least."""
    if len(block) == 1 and len(block[0]) == 1:
        return block[0][0]
    if len(block) > 1 and len(block[0]) > 1:
        return block
    items = [v for row in block for v in row]
    while len(items) > least and items[-1] is BLANK:
        items.pop()
    return [items]


def _affinity(k: float, q: float, t: float) -> float:
    return kx.affinity(k, q, t)


def _k_fit(t: Sequence[float], k: Sequence[float], terms: float) -> Grid:
    if terms not in (2.0, 3.0, 4.0):
        raise InputError(f"terms is {terms:g}; a fit has 2, 3 or 4 terms: a, b/T, c ln T, d T")
    fit = kx.fit_ln_k(t, k, int(terms))
    names = kx.TERMS[: len(fit.coefficients)]
    head: list[Value] = ["term", "coefficient", "standard error", "supported"]
    block: Grid = [[*head, *(f"cov {name}" for name in names)]]
    rows = zip(names, fit.coefficients, fit.standard_errors, fit.covariance, strict=True)
    for name, coefficient, error, covariance in rows:
        supported = "no" if name in fit.unsupported else "yes"
        block.append([name, coefficient, error, supported, *covariance])
    blanks: list[Value] = [""] * (2 + len(names))
    for label, value in (("T_min", fit.t_min), ("T_max", fit.t_max), ("residual", fit.residual)):
        block.append([label, value, *blanks])
    return block


def read_fit(block: Grid) -> kx.Fit:
    """A correlation from the cells that hold it.

    Parameters
    ----------
    block : Grid
        The block that `XLEQ_K_FIT` gives, or a list of 2 to 4 coefficients.

    Raises
    ------
    InputError
        If it is neither.

    Examples
    --------
    >>> read_fit([["-10; 6000"]]).coefficients
    (-10.0, 6000.0)
    """
    if len(block) > 4 and len(block[0]) >= 6 and block[0][0] == "term":
        return _read_fit_block(block)
    numbers: tuple[float, ...] = READERS["numbers"](_listed(block), ())
    if not 2 <= len(numbers) <= 4:
        raise InputError(f"coefficients: {len(numbers)}; a fit has 2, 3 or 4: a, b/T, c ln T, d T")
    return kx.Fit(numbers)


def _read_fit_block(block: Grid) -> kx.Fit:
    values = {row[0]: row[1] for row in block[1:]}
    names = [name for name in kx.TERMS if name in values]
    wanted = (*names, "T_min", "T_max", "residual")
    numbers = [values.get(name) for name in wanted]
    covariance = [row[4 : 4 + len(names)] for row in block[1 : 1 + len(names)]]
    flat = [*numbers, *(v for row in covariance for v in row)]
    if any(not isinstance(v, float) for v in flat) or len(names) < 2 or len(block[0]) != 4 + len(names):
        raise InputError(
            "the block is not one that XLEQ_K_FIT gives; refer to all of it, or to the coefficients"
        )
    coefficients = tuple(float(v) for v in numbers[: len(names)] if isinstance(v, float))
    t_min, t_max, residual = (float(v) for v in numbers[len(names) :] if isinstance(v, float))
    rows = tuple(tuple(float(v) for v in row if isinstance(v, float)) for row in covariance)
    return kx.Fit(coefficients, rows, t_min, t_max, residual)


def _k_from_fit(coefficients: Grid, t: float) -> K:
    return kx.write_k(kx.ln_k_from_fit(read_fit(coefficients), t))


_FIT_SHOWN: Final[Grid] = [
    ["term", "coefficient", "standard error", "supported", "cov a", "cov b"],
    ["a", -9.93469387755101, 0.226374279573257, "yes", 0.0512453144523111, -18.792169929196],
    ["b", 5987.75510204081, 84.8351415952099, "yes", -18.792169929196, 7197.00124947932],
    ["T_min", 300.0, "", "", "", ""],
    ["T_max", 500.0, "", "", "", ""],
    ["residual", 0.0808122035641766, "", "", "", ""],
]

FUNCTIONS: Final = (
    Function(
        "XLEQ_KP",
        "constants",
        (
            Argument("Kc", "K", "constant on concentrations"),
            REACTION,
            _T,
            _PRESSURE_UNIT,
            _CONCENTRATION_UNIT,
        ),
        "Kp in the pressure unit",
        _kp,
        (_UNREADABLE, "#VALUE! if a unit is unknown or a gauge pressure", _NOT_POSITIVE, _COLD),
        _IDEAL,
        (Example('=XLEQ_KP(9.6, "N2 + 3 H2 = 2 NH3", 573, "atm")', 0.00434237018210258),),
    ),
    Function(
        "XLEQ_KC",
        "constants",
        (Argument("Kp", "K", "constant on pressures"), REACTION, _T, _PRESSURE_UNIT, _CONCENTRATION_UNIT),
        "Kc in the concentration unit",
        _kc,
        (_UNREADABLE, "#VALUE! if a unit is unknown or a gauge pressure", _NOT_POSITIVE, _COLD),
        _IDEAL,
        (Example('=XLEQ_KC(1.78, "PCl5 = PCl3 + Cl2", 523, "atm")', 0.041476370070695046),),
    ),
    Function(
        "XLEQ_K_CONVERT",
        "constants",
        (
            _K,
            REACTION,
            Argument("from_basis", "text", "basis of K: K, Kp[bar], Kp[atm], Kc[mol/L], Kx and the like"),
            Argument("to_basis", "text", "basis that is wanted"),
            Argument("T", "temperature", "absolute temperature, needed for Kc where gas changes", None, "K"),
            Argument("P", "pressure", "absolute pressure, needed for Kx where gas changes", None, "bar"),
        ),
        "the constant on the other basis",
        _k_convert,
        (
            _UNREADABLE,
            "#VALUE! if a basis or its unit is not known, or T or P is needed and not given",
            "#VALUE! if Kx of solutes is asked for",
            _NOT_POSITIVE,
        ),
        _IDEAL,
        (Example('=XLEQ_K_CONVERT(0.14, "N2O4 = 2 NO2", "K", "Kp[atm]")', 0.13816925734024182),),
    ),
    Function(
        "XLEQ_K_SCALE",
        "constants",
        (_K, Argument("factor", "number", "what the reaction is multiplied by; -1 reverses it")),
        "K of the reaction times the factor, K^factor",
        _k_scale,
        ("#VALUE! if the factor is 0", _NOT_POSITIVE),
        "ΔG° is proportional to the reaction as written",
        (
            Example("=XLEQ_K_SCALE(16, -0.5)", 0.25),
            Example('=XLEQ_K_SCALE("ln -500", 2)', "ln -1000.0"),
        ),
    ),
    Function(
        "XLEQ_K_COMBINE",
        "constants",
        (TARGET, REACTIONS, Argument("Ks", "Ks", "constant of each reaction, all on one basis")),
        "K of the target, on the basis of the others",
        _k_combine,
        (
            "#VALUE! if a reaction cannot be read or does not balance, or the lists differ in length",
            "#NUM! if the target cannot be made from the reactions, or not in one way only",
            _NOT_POSITIVE,
        ),
        "Hess's law: ΔG° of a sum is the sum of ΔG°",
        (Example('=XLEQ_K_COMBINE("C(s) + CO2 = 2 CO", "C(s) + O2 = CO2; CO + 1/2 O2 = CO2", "8; 4")', 0.5),),
    ),
    Function(
        "XLEQ_K_AT",
        "constants",
        (
            Argument("K", "K", "K° at T_of_K"),
            Argument("T_of_K", "temperature", "absolute temperature of K", unit="K"),
            _T,
            Argument("dH", "molar energy", "enthalpy of reaction at T_of_K", unit="kJ/mol"),
            Argument("dCp", "molar entropy", "heat capacity of reaction, constant", 0.0, "J/(mol K)"),
        ),
        "K° at T",
        _k_at,
        (_NOT_POSITIVE, _COLD),
        f"van 't Hoff's equation; {_GREEN_BOOK}",
        (Example("=XLEQ_K_AT(1, 300, 310, 50)", 1.9090878542057665),),
    ),
    Function(
        "XLEQ_K_FROM_DG",
        "constants",
        (Argument("dG", "molar energy", "standard Gibbs energy of reaction", unit="kJ/mol"), _T),
        "K°",
        _k_from_dg,
        (_COLD,),
        f"K° = exp(-ΔG°/(R T)); {_GREEN_BOOK}",
        (Example("=XLEQ_K_FROM_DG(-32.8, 298.15)", 557585.3912751713),),
    ),
    Function(
        "XLEQ_DG_FROM_K",
        "constants",
        (Argument("K", "K", "K°"), _T),
        "standard Gibbs energy of reaction [kJ/mol]",
        _dg_from_k,
        (_NOT_POSITIVE, _COLD),
        f"ΔG° = -R T ln K°; {_GREEN_BOOK}",
        (Example("=XLEQ_DG_FROM_K(10, 298.15)", -5.708009502535258),),
    ),
    Function(
        "XLEQ_Q",
        "constants",
        (
            REACTION,
            Argument("species", "texts", "the species, inert ones too"),
            Argument("amounts", "block", "moles with P or on Kx, else concentrations in mol/L"),
            Argument("P", "pressure", "absolute pressure of the gas", None, "bar"),
            Argument("T", "temperature", "absolute temperature, where gas has concentrations", None, "K"),
            Argument("basis", "text", "basis of the quotient", "K"),
        ),
        "the reaction quotient; 0 where a product is absent",
        _q,
        (
            _UNREADABLE,
            "#VALUE! if the lists differ in length or lack a species, or T is needed and not given",
            "#NUM! if an amount is negative, or a reactant is absent",
        ),
        _GREEN_BOOK,
        (
            Example(
                '=XLEQ_Q("N2 + 3 H2 = 2 NH3", "N2; H2; NH3", "1; 3; 1", "100 bar")', 9.259259259259259e-05
            ),
            Example('=XLEQ_Q("AgCl(s) = Ag+ + Cl-", "Ag+; Cl-", "1E-5; 2E-5")', 2e-10),
        ),
    ),
    Function(
        "XLEQ_AFFINITY",
        "constants",
        (_K, Argument("Q", "K", "reaction quotient on the same basis"), _T),
        "R T ln(K/Q) [kJ/mol]; positive where the reaction runs forward",
        _affinity,
        ("#NUM! if K or Q is not above 0", _COLD),
        f"A = -ΔG = R T ln(K/Q); {_GREEN_BOOK}",
        (Example("=XLEQ_AFFINITY(10, 1, 298.15)", 5.708009502535258),),
    ),
    Function(
        "XLEQ_K_FIT",
        "constants",
        (
            Argument("T", "temperatures", "absolute temperatures", unit="K"),
            Argument("K", "Ks", "constant at each"),
            Argument("terms", "number", "2, 3 or 4 of a, b/T, c ln T, d T", 2.0),
        ),
        "a block: coefficients of ln K = a + b/T + c ln T + d T, standard errors, whether the data support "
        "each, covariance, range of T [K] and residual standard deviation of ln K",
        _k_fit,
        (
            "#VALUE! if the lists differ in length",
            "#NUM! if there are fewer points than terms + 1, or the terms cannot be told apart",
            _NOT_POSITIVE,
            _COLD,
        ),
        "linear least squares by QR: Golub and Van Loan, Matrix Computations, 4th ed., 2013, section 5.3",
        (Example('=XLEQ_K_FIT("300; 400; 500", "ln 10; ln 5.1; ln 2")', _FIT_SHOWN),),
    ),
    Function(
        "XLEQ_K_FROM_FIT",
        "constants",
        (
            Argument("coefficients", "block", "a, b, c, d, or the whole block of XLEQ_K_FIT"),
            _T,
        ),
        "K at T",
        _k_from_fit,
        (
            "#VALUE! if there are not 2 to 4 coefficients",
            "#NUM! if T lies outside the range of the block",
            _COLD,
        ),
        "ln K = a + b/T + c ln T + d T",
        (Example('=XLEQ_K_FROM_FIT("-10; 6000", 400)', 148.4131591025766),),
    ),
)
