"""Counts, sums and averages of the cells that meet criteria."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from xleq.cells import BLANK, VALUE, CellError, Value
from xleq.recalc.context import Context
from xleq.recalc.natives.criteria import Criterion, read_criterion
from xleq.recalc.natives.gather import SMALL, finite, ratio
from xleq.recalc.natives.table import native
from xleq.recalc.operands import BLANK_KIND, ERROR_KIND, NUMBER_KIND, Area, Array, Fail, Ref

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray


@dataclass(frozen=True, slots=True)
class Choice:
    """The cells that meet all criteria.

    Parameters
    ----------
    height, width : int
        The block of cells looked at.
    places : sequence of int
        Places in that block, row by row, of the cells that meet the criteria.
    beyond : int
        How many cells outside the used range meet them; all are blank.
    """

    height: int
    width: int
    places: Sequence[int] | NDArray[np.intp]
    beyond: int


def _area(ref: Ref) -> Area:
    if len(ref.areas) != 1:
        raise Fail(VALUE)
    return ref.areas[0]


def _size(area: Area) -> tuple[int, int]:
    return area.bottom - area.top + 1, area.right - area.left + 1


def _pairs(arguments: Sequence[Any]) -> list[tuple[Ref, Criterion]]:
    if len(arguments) % 2:
        raise Fail(VALUE)
    return [(arguments[i], read_criterion(arguments[i + 1])) for i in range(0, len(arguments), 2)]


def _stretched(array: Array, criterion: Criterion, height: int, width: int) -> NDArray[np.bool_]:
    mask = criterion.mask(array)
    if mask.shape == (height, width):
        return mask
    import numpy as np

    whole = np.full((height, width), criterion.blank)
    whole[: array.height, : array.width] = mask
    return whole


def choose(context: Context, pairs: Sequence[tuple[Ref, Criterion]], values: Array | None = None) -> Choice:
    """The cells of ranges of one size that meet the criterion given with each range.

    Raises
    ------
    Fail
        #VALUE! if the ranges differ in size.
    """
    size = _size(_area(pairs[0][0]))
    if any(_size(_area(ref)) != size for ref, _ in pairs):
        raise Fail(VALUE)
    arrays = [(context.read(ref), criterion) for ref, criterion in pairs]
    looked_at = [a for a, _ in arrays] + ([] if values is None else [values])
    height, width = max(a.height for a in looked_at), max(a.width for a in looked_at)
    beyond = size[0] * size[1] - height * width if all(c.blank for _, c in arrays) else 0
    if height * width <= SMALL and all((a.height, a.width) == (height, width) for a, _ in arrays):
        if len(arrays) == 1:
            met_by = arrays[0][1].met_by
            return Choice(
                height, width, [i for i, v in enumerate(arrays[0][0].flat) if met_by(v)], max(beyond, 0)
            )
        places = [i for i in range(height * width) if all(c.met_by(array.flat[i]) for array, c in arrays)]
        return Choice(height, width, places, max(beyond, 0))
    import numpy as np

    mask = _stretched(*arrays[0], height, width)
    for array, criterion in arrays[1:]:
        mask = mask & _stretched(array, criterion, height, width)
    return Choice(height, width, np.flatnonzero(mask), max(beyond, 0))


def chosen_numbers(choice: Choice, values: Array) -> Sequence[float] | NDArray[np.float64]:
    """Numbers of `values` at the chosen places, which may lie beyond them; errors there end the call."""
    if isinstance(choice.places, list):
        if (choice.height, choice.width) == (values.height, values.width):
            found: list[Value] = [values.flat[i] for i in choice.places]
        else:
            found = [_at(values, *divmod(i, choice.width)) for i in choice.places]
        for v in found:
            if type(v) is CellError:
                raise Fail(v)
        return [v for v in found if type(v) is float]
    import numpy as np

    places = np.asarray(choice.places)
    if (choice.height, choice.width) != (values.height, values.width):
        rows, columns = np.divmod(places, choice.width)
        inside = (rows < values.height) & (columns < values.width)
        places = rows[inside] * values.width + columns[inside]
    kinds = values.kinds.ravel()[places]
    if (kinds == ERROR_KIND).any():
        error = values.flat[int(places[(kinds == ERROR_KIND).argmax()])]
        assert isinstance(error, CellError)
        raise Fail(error)
    numbers: NDArray[np.float64] = values.numbers.ravel()[places]
    return numbers if (kinds == NUMBER_KIND).all() else numbers[kinds == NUMBER_KIND]


def _at(values: Array, row: int, column: int) -> Value:
    return values.at(row, column) if row < values.height and column < values.width else BLANK


def total_of(numbers: Sequence[float] | NDArray[np.float64]) -> float:
    """Sum from left to right; #NUM! where it overflows."""
    if isinstance(numbers, list):
        return finite(sum(numbers, 0.0))
    import numpy as np

    return finite(float(np.add.accumulate(numbers)[-1])) if len(numbers) else 0.0


def _numbers_if(
    context: Context, ref: Ref, criterion: Value, values: Ref | None
) -> Sequence[float] | NDArray[np.float64]:
    """Numbers of `values`, laid out like `ref` from its own first cell, where `ref` meets the criterion."""
    test = read_criterion(criterion)
    if values is None:
        array = context.read(ref)
        return chosen_numbers(choose(context, [(ref, test)]), array)
    start, (height, width) = _area(values), _size(_area(ref))
    area = Area(start.sheet, start.top, start.left, start.top + height - 1, start.left + width - 1)
    array = context.read(Ref((area,)))
    return chosen_numbers(choose(context, [(ref, test)], array), array)


def _numbers_ifs(
    context: Context, values: Ref, arguments: Sequence[Any]
) -> Sequence[float] | NDArray[np.float64]:
    pairs = _pairs(arguments)
    if not pairs or any(_size(_area(ref)) != _size(_area(values)) for ref, _ in pairs):
        raise Fail(VALUE)
    array = context.read(values)
    return chosen_numbers(choose(context, pairs, array), array)


@native("COUNTIF", "range any", context=True)
def countif(context: Context, ref: Ref, criterion: Value) -> float:
    """How many cells meet a criterion."""
    choice = choose(context, [(ref, read_criterion(criterion))])
    return float(len(choice.places) + choice.beyond)


@native("COUNTIFS", "(range any)*", context=True)
def countifs(context: Context, *arguments: Any) -> float:
    """In how many places all criteria are met."""
    pairs = _pairs(arguments)
    if not pairs:
        raise Fail(VALUE)
    choice = choose(context, pairs)
    return float(len(choice.places) + choice.beyond)


@native("SUMIF", "range any range?", context=True)
def sumif(context: Context, ref: Ref, criterion: Value, values: Ref | None = None) -> float:
    """Sum of the numbers where a criterion is met."""
    return total_of(_numbers_if(context, ref, criterion, values))


@native("SUMIFS", "range (range any)*", context=True)
def sumifs(context: Context, values: Ref, *arguments: Any) -> float:
    """Sum of the numbers where all criteria are met."""
    return total_of(_numbers_ifs(context, values, arguments))


@native("AVERAGEIF", "range any range?", context=True)
def averageif(context: Context, ref: Ref, criterion: Value, values: Ref | None = None) -> float:
    """Mean of the numbers where a criterion is met; #DIV/0! for none."""
    numbers = _numbers_if(context, ref, criterion, values)
    return ratio(total_of(numbers), float(len(numbers)))


@native("AVERAGEIFS", "range (range any)*", context=True)
def averageifs(context: Context, values: Ref, *arguments: Any) -> float:
    """Mean of the numbers where all criteria are met; #DIV/0! for none."""
    numbers = _numbers_ifs(context, values, arguments)
    return ratio(total_of(numbers), float(len(numbers)))


@native("MAXIFS", "range (range any)*", context=True)
def maxifs(context: Context, values: Ref, *arguments: Any) -> float:
    """Largest number where all criteria are met; 0 for none."""
    numbers = _numbers_ifs(context, values, arguments)
    return float(max(numbers)) if len(numbers) else 0.0


@native("MINIFS", "range (range any)*", context=True)
def minifs(context: Context, values: Ref, *arguments: Any) -> float:
    """Smallest number where all criteria are met; 0 for none."""
    numbers = _numbers_ifs(context, values, arguments)
    return float(min(numbers)) if len(numbers) else 0.0


@native("COUNTBLANK", "range", context=True)
def countblank(context: Context, ref: Ref) -> float:
    """How many cells are blank or hold empty text."""
    total = 0
    for area, array in zip(ref.areas, context.read_areas(ref), strict=True):
        height, width = _size(area)
        total += height * width - array.height * array.width
        if array.height * array.width <= SMALL:
            total += sum(v is BLANK or v == "" for v in array.flat)
        else:
            total += int((array.kinds == BLANK_KIND).sum()) + array.flat.count("")
    return float(total)
