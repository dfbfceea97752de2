"""The records in which worksheet functions are declared, and the one way to call them.

A declaration is data: hosts, help texts, the reference and the tests are all read from it. Calling turns cell
values into what the definition computes with, turns exceptions into cell errors (here and nowhere else), and
lays out a list in the direction of the range it belongs to.
"""

from __future__ import annotations

import inspect
from collections import OrderedDict
from collections.abc import Callable, Hashable, Iterable, Sequence
from contextvars import ContextVar
from dataclasses import dataclass
from functools import cached_property
from typing import Any, Final, Literal, TypeAlias, cast

from xleq.cells import MISSING, Blank, CellError, Grid, Missing, Value
from xleq.errors import InputError, ParseError, XleqError
from xleq.functions.arguments import LIST_KINDS, READERS, Kind

#: What a host hands over for one argument.
Given: TypeAlias = Value | Grid | Missing
#: What a definition may return: one cell, a list to be laid out, or a block.
Result: TypeAlias = Value | list[Value] | Grid
Topic = Literal["reactions", "constants", "composition", "thermochemistry", "solutions", "program"]


class _Required:
    """Marks an argument without a default."""

    def __repr__(self) -> str:
        return "REQUIRED"


REQUIRED: Final = _Required()


#: Each means the default of its argument.
_EMPTY: Final = (Missing, Blank)


@dataclass(frozen=True, slots=True)
class Argument:
    """One argument of a worksheet function.

    Parameters
    ----------
    name : str
        As users see it; the definition's parameter is the same in lower case.
    kind : Kind
        How cell values are read, see `xleq.functions.arguments`.
    meaning : str
        One clause for help texts, without the unit.
    default : Value or None
        Taken when the argument is omitted or an empty cell; None where leaving it out means "not given".
    unit : str
        Default unit for help texts; empty where there is none.
    known : tuple of str
        Names of the options that an argument of kind "options" takes, or the words of a "word".
    """

    name: str
    kind: Kind
    meaning: str
    default: Value | _Required | None = REQUIRED
    unit: str = ""
    known: tuple[str, ...] = ()

    @property
    def optional(self) -> bool:
        """Whether it may be left out."""
        return self.default is not REQUIRED


@dataclass(frozen=True, slots=True)
class Example:
    """A formula that anyone can type, and what it must show.

    Parameters
    ----------
    formula : str
        With the equals sign.
    shows : Value or Grid
        The value of its cell, or of its block.
    """

    formula: str
    shows: Value | Grid


@dataclass(frozen=True)
class Function:
    """A worksheet function.

    Parameters
    ----------
    name : str
    topic : Topic
    arguments : tuple of Argument
    gives : str
        What the cell shows, with its unit.
    call : callable
        The definition; one parameter for each argument, in order.
    errors : tuple of str
        When it gives an error, a clause each, beginning with the error.
    source : str
        Where the method comes from.
    examples : tuple of Example
    volatile : bool
    """

    name: str
    topic: Topic
    arguments: tuple[Argument, ...]
    gives: str
    call: Callable[..., Result]
    errors: tuple[str, ...]
    source: str
    examples: tuple[Example, ...]
    volatile: bool = False

    @cached_property
    def least(self) -> int:
        """Fewest arguments."""
        return sum(not a.optional for a in self.arguments)

    @cached_property
    def syntax(self) -> str:
        """The call as it is written in help texts, optional arguments in brackets."""
        names = (f"[{a.name}]" if a.optional else a.name for a in self.arguments)
        return f"{self.name}({', '.join(names)})"

    @cached_property
    def layout_argument(self) -> int | None:
        """Number of the argument whose direction a list follows."""
        names = [a.name for a in self.arguments]
        if "species" in names and self.arguments[names.index("species")].kind in LIST_KINDS:
            return names.index("species")
        return next((i for i, a in enumerate(self.arguments) if a.kind in LIST_KINDS), None)

    def parameters_match(self) -> bool:
        """Whether the definition takes exactly the declared arguments."""
        return [a.name.lower() for a in self.arguments] == list(inspect.signature(self.call).parameters)


_NOTES: Final[ContextVar[dict[str, None] | None]] = ContextVar("notes", default=None)


def tell(notes: Iterable[str]) -> None:
    """Say what a checker should know of the result being computed; heard by `evaluate_with_notes` alone."""
    heard = _NOTES.get()
    if heard is not None:
        heard.update(dict.fromkeys(notes))


def evaluate_with_notes(function: Function, given: Sequence[Given]) -> tuple[Value | Grid, tuple[str, ...]]:
    """As `evaluate`, with the notes: method, model, warnings, data that were extrapolated."""
    heard: dict[str, None] = {}
    token = _NOTES.set(heard)
    try:
        return evaluate(function, given), tuple(heard)
    finally:
        _NOTES.reset(token)


def evaluate(function: Function, given: Sequence[Given]) -> Value | Grid:
    """Value or block of a worksheet function for what a host hands over.

    An error among the arguments is returned as it came. Every `XleqError` becomes a cell error with its
    reason; any other exception is a defect of the program and is left to the host.
    """
    error = _error_among(given)
    return _computed(function, given) if error is None else error


def _computed(function: Function, given: Sequence[Given]) -> Value | Grid:
    try:
        result = function.call(*_read_all(function, given))
    except XleqError as e:
        return CellError(e.cell, f"{function.name}: {e}")
    return _laid_out(function, given, result)


def _error_among(given: Sequence[Given]) -> CellError | None:
    for item in given:
        if isinstance(item, list):
            for row in item:
                for value in row:
                    if isinstance(value, CellError):
                        return value
        elif isinstance(item, CellError):
            return item
    return None


def _read_all(function: Function, given: Sequence[Given]) -> list[Any]:
    declared = function.arguments
    if len(given) > len(declared):
        raise InputError(f"{len(given)} arguments given, {len(declared)} at most: {function.syntax}")
    values: list[Any] = []
    for i, argument in enumerate(declared):
        item: Given = given[i] if i < len(given) else MISSING
        if isinstance(item, list) and len(item) == 1 and len(item[0]) == 1:
            item = item[0][0]
        if isinstance(item, _EMPTY):
            if isinstance(argument.default, _Required):
                raise InputError(f"argument {argument.name} is missing or empty: {argument.meaning}")
            if argument.default is None:
                values.append(None)
                continue
            item = argument.default
        try:
            values.append(READERS[argument.kind](item, argument.known))
        except XleqError as e:
            raise _named(e, argument.name) from e
    return values


def _named(error: XleqError, name: str) -> XleqError:
    """The same kind of error with the argument's name before its message."""
    # A ParseError is made of its text and position: here it is told as the InputError that it also is.
    kind = InputError if isinstance(error, ParseError) else type(error)
    return kind(f"{name}: {error}")


def _laid_out(function: Function, given: Sequence[Given], result: Result) -> Value | Grid:
    if not isinstance(result, list):
        return result
    if result and isinstance(result[0], list):
        return result
    values = cast(list[Value], result)
    if len(values) == 1:
        return values[0]
    index = function.layout_argument
    if index is not None and index < len(given):
        item = given[index]
        if isinstance(item, list) and len(item) == 1 and len(item[0]) > 1:
            return [values]
    return [[v] for v in values]


class Memory:
    """Remembers results by arguments, so that the same question in ten cells is answered once.

    Parameters
    ----------
    size : int
        Most results kept; the ones unused longest are dropped.
    """

    def __init__(self, size: int = 65_536) -> None:
        self.size = size
        self._results: OrderedDict[Hashable, Value | Grid] = OrderedDict()

    def evaluate(self, function: Function, given: Sequence[Given]) -> Value | Grid:
        """`evaluate`, from memory where the same arguments were asked before."""
        # First of all: errors are equal by code alone, and one must not be answered for another.
        error = _error_among(given)
        if error is not None:
            return error
        key = (function.name, *map(_key, given))
        found = self._results.get(key)
        if found is not None:
            self._results.move_to_end(key)
            return found
        found = _computed(function, given)
        if not function.volatile:
            self._results[key] = found
            if len(self._results) > self.size:
                self._results.popitem(last=False)
        return found


def _key(item: Given) -> Hashable:
    # True == 1.0 as a key, yet they are not the same argument.
    if isinstance(item, list):
        return tuple([tuple([(v, True) if v is True or v is False else v for v in row]) for row in item])
    return (item, True) if item is True or item is False else item
