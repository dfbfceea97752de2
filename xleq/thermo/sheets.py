"""A user's own formation data: a block of cells with a header row, read beside the built-in table."""

from __future__ import annotations

import math
import re
from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import lru_cache
from typing import Final

from xleq.cells import BLANK, CellError, Value
from xleq.errors import InputError, MissingDataError, OutOfRangeError, UnitError
from xleq.reactions import Phase, Species, parse_species
from xleq.thermo.records import CpPart, Sources, SpeciesData, integrated
from xleq.thermo.table import Table, standard_table
from xleq.units import Quantity, read_quantity, to_default

#: Columns that are understood, by the spellings of their headers (compared without blanks, in lower case).
HEADERS: Final[dict[str, tuple[str, Quantity | None]]] = {
    "species": ("species", None),
    "dhf": ("dhf", "molar energy"),
    "δhf": ("dhf", "molar energy"),
    "δfh": ("dhf", "molar energy"),
    "hf": ("dhf", "molar energy"),
    "s": ("s", "molar entropy"),
    "cp": ("cp", "molar entropy"),
    "a": ("a", "molar entropy"),
    "b": ("b", "number"),
    "c": ("c", "number"),
    "d": ("d", "number"),
    "e": ("e", "number"),
    "dh_tr": ("dh_tr", "molar energy"),
    "t_min": ("t_min", "temperature"),
    "tmin": ("t_min", "temperature"),
    "t_max": ("t_max", "temperature"),
    "tmax": ("t_max", "temperature"),
    "tc": ("tc", "temperature"),
    "pc": ("pc", "pressure"),
    "omega": ("omega", "number"),
    "ω": ("omega", "number"),
    "source": ("source", None),
    "note": ("note", None),
}
_SHOWN: Final = (
    "species, dHf, S, Cp, A, B, C, D, E, dH_tr, T_min, T_max, Tc, Pc, omega, kij <species>, source, note"
)
_HEADER: Final = re.compile(r"([^\[\]()]+?)\s*(?:\[(.*)\]|\((.*)\))?\s*")
_LETTERS: Final = "abcde"
#: Where a range of temperature is not given with a constant Cp. [K]
_NARROW: Final = (273.15, 373.15)
#: Where Cp is unknown. [K]
_ROOM: Final = (288.15, 308.15)
#: No formation enthalpy of a formula unit reaches this; such a number is in J/mol. [kJ/mol]
_TOO_LARGE: Final = 20000.0

Block = tuple[tuple[Value, ...], ...]


@dataclass(frozen=True, slots=True)
class _Column:
    """One column of the block: what it holds and how a cell of it becomes a number in the default unit."""

    field: str
    header: str
    quantity: Quantity | None
    unit: str
    other: str = ""  # the second species of a kij column

    def number(self, value: Value, row: int) -> float:
        where = f"data range, row {row}, {self.header}"
        if self.quantity is None:
            raise InputError(f"{where}: a number is not expected here")
        if isinstance(value, str):
            try:
                return read_quantity(value, self.quantity)
            except InputError as e:
                raise InputError(f"{where}: {e}") from None
            except OutOfRangeError as e:
                raise OutOfRangeError(f"{where}: {e}") from None
        if not isinstance(value, float) or not math.isfinite(value):
            raise InputError(f"{where}: {value!r} is not a number")
        return to_default(value, self.unit, self.quantity) if self.unit else value


def read_data(
    block: Sequence[Sequence[Value]], default_phase: Phase = "g", table: Table | None = None
) -> Table:
    """The table, extended and overridden by a block of cells.

    Parameters
    ----------
    block : sequence of rows of cell values
        The first row is the header: ``species`` and any of dHf, S, Cp (constant) or A B C D E
        (Cp = A + B x + C x² + D x³ + E/x² with x = T/1000 K, J/(mol K)), dH_tr, T_min, T_max, Tc, Pc, omega,
        ``kij <species>``, source, note. A unit may stand in brackets: ``dHf [kcal/mol]``; the default is
        kJ/mol, J/(mol K), K, bar. A species on several rows has several intervals of Cp. What is left out of
        a known species is taken from the table; a new species needs dHf and S.
    default_phase : {"g", "l", "s", "aq"}
        Of species without a phase.
    table : Table, optional
        The built-in one by default.

    Raises
    ------
    InputError
        If a header is missing, doubled or unknown, a unit is not understood, or a row does not hold what it
        must; names header and row.

    Examples
    --------
    >>> data = [["species", "dHf [kcal/mol]", "S"], ["XeF2(g)", -25.6, 259.4]]
    >>> round(read_data(data).find("XeF2(g)").dhf, 2)
    -107.11
    """
    frozen = tuple(tuple(row) for row in block)
    kinds = tuple(
        tuple(type(cell) for cell in row) for row in frozen
    )  # 1.0 and TRUE are equal, but not the same
    return _read(frozen, kinds, default_phase, table or standard_table())


@lru_cache(maxsize=64)
def _read(block: Block, kinds: tuple[tuple[type, ...], ...], default_phase: Phase, table: Table) -> Table:
    if not block:
        raise InputError("the data range is empty; its first row must be a header with the word species")
    columns = _columns(block[0], default_phase)
    groups: dict[str, list[tuple[int, dict[str, Value]]]] = {}
    species: dict[str, Species] = {}
    kij: dict[tuple[str, str], float] = {}
    for number, row in enumerate(block[1:], 2):
        cells = _cells(row, columns, number)
        text = cells.pop("species", "")
        if not text:
            if cells:
                raise InputError(f"data range, row {number}: there are data, but no species")
            continue
        one = _species(text, default_phase, number)
        species[one.key] = one
        for column, value in zip(columns, row, strict=False):
            if column is not None and column.field == "kij" and value is not BLANK and value != "":
                _add_kij(kij, one.key, column, column.number(value, number), number)
        groups.setdefault(one.key, []).append((number, cells))
    extra = [_record(species[key], rows, columns, table) for key, rows in groups.items()]
    return table.extended([d for d in extra if d is not None], kij)


def _columns(header: Sequence[Value], default_phase: Phase) -> list[_Column | None]:
    columns: list[_Column | None] = []
    for cell in header:
        if cell is BLANK or cell == "":
            columns.append(None)
            continue
        if not isinstance(cell, str):
            raise InputError(
                f"data range: the header {cell!r} is not text; the first row must name the columns"
            )
        columns.append(_column(cell, default_phase))
    fields = [c.field + c.other for c in columns if c is not None]
    for c in columns:
        if c is not None and fields.count(c.field + c.other) > 1:
            raise InputError(f"data range: the header {c.header!r} stands for a column that is there twice")
    if "species" not in fields:
        raise InputError(f"data range: the header 'species' is missing; understood are {_SHOWN}")
    if "cp" in fields and any(letter in fields for letter in _LETTERS):
        raise InputError("data range: give either Cp (constant) or its coefficients A to E, not both")
    return columns


def _column(cell: str, default_phase: Phase) -> _Column:
    text = cell.strip()
    if text.lower().startswith("kij "):
        try:
            other = parse_species(text[4:].strip(), default_phase).key
        except InputError as e:
            raise InputError(f"data range, header {cell!r}: {e}") from None
        return _Column("kij", cell, "number", "", other)
    match = _HEADER.fullmatch(text)
    name = re.sub(r"[\s°]", "", match[1]).lower() if match else ""
    if name not in HEADERS:
        raise InputError(f"data range: the header {cell!r} is not understood; understood are {_SHOWN}")
    assert match is not None
    field, quantity = HEADERS[name]
    unit = (match[2] or match[3] or "").strip()
    if unit and quantity is not None:
        try:
            to_default(1.0, unit, quantity)
        except UnitError as e:
            raise UnitError(f"data range, header {cell!r}: {e}") from None
    return _Column(field, cell, quantity, unit)


def _cells(row: Sequence[Value], columns: list[_Column | None], number: int) -> dict[str, Value]:
    cells: dict[str, Value] = {}
    for column, value in zip(columns, row, strict=False):
        if value is BLANK or value == "":
            continue
        if isinstance(value, CellError):
            raise InputError(f"data range, row {number}: a cell holds the error {value}")
        if column is None:
            raise InputError(f"data range, row {number}: {value!r} stands in a column without a header")
        if column.field in ("species", "source", "note"):
            cells[column.field] = value if isinstance(value, str) else f"{value:g}"
        elif column.field != "kij":
            cells[column.field] = column.number(value, number)
    return cells


def _species(text: Value, default_phase: Phase, number: int) -> Species:
    if not isinstance(text, str):
        raise InputError(f"data range, row {number}: the species {text!r} is not text")
    try:
        return parse_species(text, default_phase)
    except InputError as e:
        raise InputError(f"data range, row {number}: {e}") from None


def _add_kij(kij: dict[tuple[str, str], float], key: str, column: _Column, value: float, row: int) -> None:
    for pair in ((key, column.other), (column.other, key)):
        if kij.get(pair, value) != value:
            raise InputError(
                f"data range, row {row}, {column.header}: kij of this pair is given twice, differently"
            )
        kij[pair] = value


def _number(cells: dict[str, Value], field: str, otherwise: float) -> float:
    value = cells.get(field, otherwise)
    assert isinstance(value, float)
    return value


def _record(
    species: Species, rows: list[tuple[int, dict[str, Value]]], columns: list[_Column | None], table: Table
) -> SpeciesData | None:
    """The data of one species from its rows; None if they hold nothing but kij."""
    first, cells = rows[0]
    if not any(cells for _, cells in rows):
        return None
    try:
        known: SpeciesData | None = table.find(replace(species, marked=True))
    except MissingDataError:
        known = None
    where = f"data range, row {first}: {species.key}"
    dhf = _number(cells, "dhf", known.dhf if known else math.nan)
    s298 = _number(cells, "s", known.s298 if known else math.nan)
    if math.isnan(dhf) or math.isnan(s298):
        raise InputError(f"{where} is not in the table, so dHf and S must be given")
    if abs(dhf) > _TOO_LARGE:
        raise InputError(
            f"{where}: dHf is {dhf:g} kJ/mol; write the unit in the header, for example dHf [J/mol]"
        )
    for number, later in rows[1:]:
        double = sorted(set(later) & {"dhf", "s", "tc", "pc", "omega"})
        if double:
            raise InputError(
                f"data range, row {number}: {species.key} has {double[0]} in row {first} already"
            )
    parts, cp_known, own = _parts(species.key, rows, known)
    words = str(cells.get("source", "data range"))
    old = known.sources if known else Sources()
    sources = Sources(
        words if "dhf" in cells else old.dhf,
        words if "s" in cells else old.s,
        words if own else old.cp,
        words if "tc" in cells else old.critical,
    )
    return SpeciesData(
        key=species.key,
        name=known.name if known else species.name,
        dhf=dhf,
        s298=s298,
        intervals=integrated(dhf, s298, parts),
        cp_known=cp_known,
        tc=_number(cells, "tc", known.tc if known else math.nan),
        pc=_number(cells, "pc", known.pc if known else math.nan),
        omega=_number(cells, "omega", known.omega if known else math.nan),
        sources=sources,
        note=str(cells.get("note", "from the data range" if own or "dhf" in cells or "s" in cells else "")),
        formula=species.formula,
        charge=species.charge,
        parts=parts,
    )


def _parts(
    key: str, rows: list[tuple[int, dict[str, Value]]], known: SpeciesData | None
) -> tuple[tuple[CpPart, ...], bool, bool]:
    """Intervals of Cp, whether Cp is known, and whether it comes from the rows."""
    given = [(n, c) for n, c in rows if "cp" in c or "a" in c]
    for number, cells in rows:
        loose = [f for f in (*"bcde", "dh_tr", "t_min", "t_max") if f in cells]
        if loose and (number, cells) not in given:
            raise InputError(f"data range, row {number}: {key} has {loose[0]}, but neither Cp nor A")
    if not given:
        if known:
            return known.parts, known.cp_known, False
        return (CpPart(*_ROOM, (0.0, 0.0, 0.0, 0.0, 0.0)),), False, False
    if len(given) < len(rows):
        raise InputError(
            f"data range: {key} stands on {len(rows)} rows, of which only {len(given)} have a Cp"
        )
    parts: list[CpPart] = []
    for number, c in given:
        constant = all(letter not in c for letter in "bcde")
        if "t_min" not in c or "t_max" not in c:
            if not constant or len(given) > 1 or "t_min" in c or "t_max" in c:
                raise InputError(f"data range, row {number}: {key} needs T_min and T_max of its Cp")
            c = {**c, "t_min": _NARROW[0], "t_max": _NARROW[1]}
        a = _number(c, "cp", _number(c, "a", 0.0))
        coefficients = (
            a,
            _number(c, "b", 0.0),
            _number(c, "c", 0.0),
            _number(c, "d", 0.0),
            _number(c, "e", 0.0),
        )
        part = CpPart(
            _number(c, "t_min", 0.0), _number(c, "t_max", 0.0), coefficients, _number(c, "dh_tr", 0.0)
        )
        _check(part, parts[-1] if parts else None, number, key)
        parts.append(part)
    return tuple(parts), True, True


def _check(part: CpPart, below: CpPart | None, number: int, key: str) -> None:
    where = f"data range, row {number}: {key}"
    if not 0.0 < part.t_min < part.t_max:
        raise InputError(f"{where}: T_min {part.t_min:g} K must be above 0 and below T_max {part.t_max:g} K")
    if below is not None and abs(below.t_max - part.t_min) > 1e-6 * part.t_min:
        raise InputError(
            f"{where}: this interval begins at {part.t_min:g} K, the one before ends at {below.t_max:g} K"
        )
    if below is None and part.dh_tr:
        raise InputError(f"{where}: the lowest interval has no transition to enter it by; leave dH_tr empty")
    for t in (part.t_min, part.t_max):
        x = t / 1000.0
        a, b, c, d, e = part.coefficients
        if a + x * (b + x * (c + x * d)) + e / (x * x) <= 0.0 and not key.endswith("(aq)"):
            raise InputError(f"{where}: Cp is not positive at {t:g} K; coefficients are for x = T/1000 K")
