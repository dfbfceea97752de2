"""How cell values become what the definitions of worksheet functions compute with, a reader for each kind."""

from __future__ import annotations

import math
import re
from collections.abc import Callable
from fractions import Fraction
from functools import lru_cache
from typing import Any, Final, Literal, NamedTuple

from xleq.cells import BLANK, Blank, Grid, Value
from xleq.constants import read_k
from xleq.errors import InputError, OutOfRangeError
from xleq.reactions import exact_multiplier
from xleq.units import Quantity, checked, read_quantity

Kind = Literal[
    "text",
    "word",
    "texts",
    "number",
    "numbers",
    "multipliers",
    "temperature",
    "temperatures",
    "temperature difference",
    "pressure",
    "pressure difference",
    "volume",
    "concentration",
    "molar energy",
    "molar entropy",
    "amounts",
    "concentrations",
    "fractions",
    "K",
    "Ks",
    "constants",
    "block",
    "want",
    "options",
]

_RATIO: Final = re.compile(r"\s*([+-]?\d{1,6})\s*/\s*(\d{1,6})\s*")

#: Kinds that take a list: a range, an array, or text with semicolons.
LIST_KINDS: Final = frozenset(
    {"texts", "numbers", "multipliers", "temperatures", "amounts", "concentrations", "fractions", "Ks"}
)

WANT_WORDS: Final = (
    "moles", "fractions", "pressures", "concentrations", "change", "conversion", "extents", "total",
    "state", "residual", "table",
)  # fmt: skip


class Want(NamedTuple):
    """What is wanted of an equilibrium: a word, and a species where one cell is wanted."""

    word: str
    species: str | None


def _items(value: Value | Grid) -> list[Value]:
    """The items of a list argument, in order."""
    if isinstance(value, list):
        if len(value) > 1 and len(value[0]) > 1:
            raise InputError(f"a list is one row or one column, not {len(value)} × {len(value[0])} cells")
        return [v for row in value for v in row]
    if isinstance(value, str):
        return list(_split(value))
    return [value]


@lru_cache(maxsize=4096)
def _split(text: str) -> tuple[str, ...]:
    return tuple(part.strip() for part in text.split(";"))


def _one(value: Value | Grid) -> Value:
    if isinstance(value, list):
        raise InputError(f"one value is wanted, not {len(value)} × {len(value[0])} cells")
    return value


def _shown(value: Value) -> str:
    if isinstance(value, Blank):
        return "an empty cell"
    if isinstance(value, bool):
        return "TRUE" if value else "FALSE"
    return repr(value) if isinstance(value, str) else f"{value:g}" if isinstance(value, float) else str(value)


def _text(value: Value | Grid, known: tuple[str, ...]) -> str:
    item = _one(value)
    if isinstance(item, str) and item.strip():
        return item.strip()
    raise InputError(f"text is wanted, not {_shown(item) if item != '' else 'empty text'}")


def _word(value: Value | Grid, known: tuple[str, ...]) -> str:
    text = _text(value, known)
    for word in known:
        if word.lower() == text.lower():
            return word
    raise InputError(f"{text!r} is not known here; known are {', '.join(known)}")


def _texts(value: Value | Grid, known: tuple[str, ...]) -> tuple[str, ...]:
    if isinstance(value, str):
        texts = _split(value)
    else:
        items = _items(value)
        while items and items[-1] is BLANK:  # a range is often drawn longer than its list
            items.pop()
        for position, item in enumerate(items, 1):
            if not isinstance(item, str):
                raise InputError(f"item {position} is {_shown(item)}; text is wanted")
        texts = tuple(str(item).strip() for item in items)
    if not texts:
        raise InputError("the list is empty")
    for position, text in enumerate(texts, 1):
        if not text:
            raise InputError(f"item {position} is empty")
    return texts


def _measured(item: Value, quantity: Quantity) -> float:
    if type(item) is float:
        return checked(item, quantity)
    if isinstance(item, str):
        return read_quantity(item, quantity)
    wanted = "a number" if quantity == "number" else f"a {quantity}"
    raise InputError(f"{wanted} is wanted, not {_shown(item)}")


def _quantity(quantity: Quantity) -> Callable[[Value | Grid, tuple[str, ...]], float]:
    def read(value: Value | Grid, known: tuple[str, ...]) -> float:
        return _measured(_one(value), quantity)

    return read


def _quantities(
    quantity: Quantity, *, blank_is_zero: bool = False, negative: bool = True
) -> Callable[[Value | Grid, tuple[str, ...]], tuple[float, ...]]:
    def read(value: Value | Grid, known: tuple[str, ...]) -> tuple[float, ...]:
        numbers = []
        for position, item in enumerate(_items(value), 1):
            if item is BLANK and blank_is_zero:
                numbers.append(0.0)
                continue
            try:
                number = _measured(item, quantity)
            except InputError as e:
                raise InputError(f"item {position}: {e}") from e
            if number < 0.0 and not negative:
                raise OutOfRangeError(f"item {position} is {number:g}; it must not be negative")
            numbers.append(number)
        if not numbers:
            raise InputError("the list is empty")
        return tuple(numbers)

    return read


def _multipliers(value: Value | Grid, known: tuple[str, ...]) -> tuple[Fraction, ...]:
    """Exact ratios: numbers such as 0.5, or text such as 1/2."""
    ratios = []
    for position, item in enumerate(_items(value), 1):
        match = _RATIO.fullmatch(item) if isinstance(item, str) else None
        try:
            if match and int(match[2]):
                ratios.append(Fraction(int(match[1]), int(match[2])))
            else:
                ratios.append(exact_multiplier(_measured(item, "number")))
        except InputError as e:
            raise InputError(f"item {position}: {e}") from e
    if not ratios:
        raise InputError("the list is empty")
    return tuple(ratios)


def _k(value: Value | Grid, known: tuple[str, ...]) -> float:
    item = _one(value)
    if isinstance(item, float | str) and not isinstance(item, bool):
        return read_k(item)
    raise InputError(f"an equilibrium constant is wanted, not {_shown(item)}")


def _ks(value: Value | Grid, known: tuple[str, ...]) -> tuple[float, ...]:
    read = []
    items = _items(value)
    while items and items[-1] is BLANK:  # as in `_texts`
        items.pop()
    for position, item in enumerate(items, 1):
        try:
            read.append(_k(item, known))
        except InputError as e:
            raise InputError(f"item {position}: {e}") from e
    if not read:
        raise InputError("the list is empty")
    return tuple(read)


def _constants(value: Value | Grid, known: tuple[str, ...]) -> Value | Grid:
    """As it came: what it means depends on the number of reactions, see `xleq.functions.conditions`."""
    return value


def _block(value: Value | Grid, known: tuple[str, ...]) -> Grid:
    return value if isinstance(value, list) else [[value]]


@lru_cache(maxsize=1024)
def _read_want(text: str, more: tuple[str, ...]) -> Want:
    word, _, species = text.strip().partition(" ")
    if word.lower() not in (*WANT_WORDS, *map(str.lower, more)):
        raise InputError(
            f"{word!r} is not a result; known are {', '.join((*more, *WANT_WORDS))}, "
            "with a species for one cell"
        )
    return Want(word.lower(), species.strip() or None)


def _want(value: Value | Grid, known: tuple[str, ...]) -> Want:
    return _read_want(_text(value, known), known)


@lru_cache(maxsize=1024)
def _read_options(text: str, known: tuple[str, ...]) -> dict[str, str]:
    options: dict[str, str] = {}
    for part in filter(None, _split(text)):
        name, equals, setting = (piece.strip() for piece in part.partition("="))
        if not equals or not setting:
            raise InputError(f"{part!r}: an option is written name=value; known are {', '.join(known)}")
        if name.lower() not in known:
            raise InputError(f"there is no option {name!r} here; known are {', '.join(known)}")
        if name.lower() in options:
            raise InputError(f"option {name!r} is given twice")
        options[name.lower()] = setting
    return options


def _options(value: Value | Grid, known: tuple[str, ...]) -> dict[str, str]:
    item = _one(value)
    if not isinstance(item, str):
        raise InputError(f"options are text such as basis=Kp[atm]; not {_shown(item)}")
    return _read_options(item, known)


READERS: Final[dict[Kind, Callable[[Value | Grid, tuple[str, ...]], Any]]] = {
    "text": _text,
    "word": _word,
    "texts": _texts,
    "number": _quantity("number"),
    "numbers": _quantities("number"),
    "multipliers": _multipliers,
    "temperature": _quantity("temperature"),
    "temperatures": _quantities("temperature"),
    "temperature difference": _quantity("temperature difference"),
    "pressure": _quantity("pressure"),
    "pressure difference": _quantity("pressure difference"),
    "volume": _quantity("volume"),
    "concentration": _quantity("concentration"),
    "molar energy": _quantity("molar energy"),
    "molar entropy": _quantity("molar entropy"),
    "amounts": _quantities("amount", blank_is_zero=True, negative=False),
    "concentrations": _quantities("concentration", blank_is_zero=True, negative=False),
    "fractions": _quantities("number", blank_is_zero=True, negative=False),
    "K": _k,
    "Ks": _ks,
    "constants": _constants,
    "block": _block,
    "want": _want,
    "options": _options,
}


def finite(value: float, what: str) -> float:
    """The value itself, if a cell can hold it.

    Raises
    ------
    OutOfRangeError
        If it is too large for a number, or not a number.
    """
    if math.isfinite(value):
        return value
    raise OutOfRangeError(f"{what} is beyond what a cell can hold")
