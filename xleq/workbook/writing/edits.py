"""What has to change in a sheet, from what recalculation found and what the file has."""

from __future__ import annotations

from dataclasses import dataclass
from enum import Enum
from typing import Final

from xleq.cells import BLANK, Value, address_text, quote_sheet
from xleq.errors import InputError
from xleq.workbook.records import Area, FormulaKind, Place, Sheet, SheetResults
from xleq.workbook.writing.values import same_value

#: Cells of an area from which on it is not worth listing them.
_VAST: Final = 10_000


class Role(Enum):
    """What the edited cell is."""

    FORMULA = "formula"
    CHILD = "filled by an array formula"
    CONSTANT = "constant"


@dataclass(slots=True)
class Edit:
    """A cell's new value, and the new area of the array formula in it.

    Parameters
    ----------
    value : Value or None
        None leaves the value as it is.
    role : Role
        What the cell is.
    area : Area or None
        New `ref` of its array formula; None leaves it.
    """

    value: Value | None
    role: Role
    area: Area | None = None


def edits_of(sheet: Sheet, results: SheetResults) -> dict[Place, Edit]:
    """The cells of a sheet that must be rewritten; cells whose value is stored already are not among them.

    Raises
    ------
    InputError
        If a result is given for a cell that no formula fills, an array formula would overwrite a constant,
        an area is given for a cell without an array formula, or an input for a cell with a formula.
    """
    edits: dict[Place, Edit] = {}
    formulas, stored = sheet.formulas, sheet.stored
    for place, value in results.values.items():
        if place in formulas and not same_value(stored.get(place, BLANK), value):
            edits[place] = Edit(value, Role.FORMULA)
    if results.areas or any(place not in formulas for place in results.values):
        _add_children(edits, sheet, results)
    for place, value in results.inputs.items():
        if place in formulas or place in edits:
            raise InputError(f"{_where(sheet, place)} is computed: it cannot be given a value")
        if not same_value(stored.get(place, BLANK), value):
            edits[place] = Edit(value, Role.CONSTANT)
    return edits


def _add_children(edits: dict[Place, Edit], sheet: Sheet, results: SheetResults) -> None:
    old = {
        place: formula.area
        for place, formula in sheet.formulas.items()
        if formula.area is not None and formula.kind is not FormulaKind.PLAIN
    }
    for place, area in results.areas.items():
        if place not in old or sheet.formulas[place].kind is not FormulaKind.ARRAY:
            raise InputError(f"{_where(sheet, place)} holds no array formula")
        if not sheet.formulas[place].dynamic and area != old[place]:
            # its cells are fixed, and each of them stands in the calculation chain
            raise InputError(f"{_where(sheet, place)} holds an array formula that cannot spill")
        if (area.top, area.left) != place:
            raise InputError(f"{_where(sheet, place)} cannot fill an area that begins elsewhere")
        if area != old[place]:
            edits.setdefault(place, Edit(None, Role.FORMULA)).area = area
    filled_before = _Cover(old)
    filled_now = _Cover(old | results.areas)
    for place, value in results.values.items():
        if place in sheet.formulas:
            continue
        if value is BLANK and place in filled_before and place not in filled_now:
            continue  # a cell that a spill has left is emptied below
        if place not in filled_now:
            raise InputError(f"{_where(sheet, place)} has a result, but no formula fills it")
        stored = sheet.stored.get(place, BLANK)
        if stored is not BLANK and place not in filled_before:
            raise InputError(f"{_where(sheet, place)} is a constant that an array formula would overwrite")
        if not same_value(stored, value):
            edits[place] = Edit(value, Role.CHILD)
    if results.areas:
        for place in sheet.stored:
            if place in filled_before and place not in filled_now and place not in sheet.formulas:
                edits[place] = Edit(BLANK, Role.CHILD)


class _Cover:
    """The cells that some areas hold; vast areas are asked, not listed."""

    def __init__(self, areas: dict[Place, Area]) -> None:
        small = [area for area in areas.values() if area.n_cells <= _VAST]
        self.vast = [area for area in areas.values() if area.n_cells > _VAST]
        self.cells = {place for area in small for place in area.places()}

    def __contains__(self, place: Place) -> bool:
        return place in self.cells or any(area.holds(*place) for area in self.vast)


def _where(sheet: Sheet, place: Place) -> str:
    return f"{quote_sheet(sheet.name)}!{address_text(*place)}"
