"""How a native function is declared.

A declaration names the function and the kind of each of its parameters; what the evaluator does with an
argument follows from the kind alone, so that a definition only computes.

=========  =====================================================================================
kind       what the definition receives
=========  =====================================================================================
number     float: text that reads as a number, logicals and blanks are converted
text       str: numbers and logicals are converted, a blank is ""
logical    bool
value      a cell value as it is (float, str, bool, BLANK); an error ends the call with that error
any        a cell value as it is, errors too
array      an `Array`, always: the expression is evaluated as an array, references are read
list       a cell value (given directly) or an `Array` (from a reference or an array): SUM and its kin,
           which treat the two differently; the expression keeps the formula's own mode
range      a `Ref`; anything else ends the call with #VALUE!
operand    whatever comes: cell value, `Array` or `Ref`, not read and not converted
matrix     the same, but the expression is evaluated as an array
lazy       a function without arguments that evaluates the expression when it is called
=========  =====================================================================================

`number`, `text`, `logical`, `value` and `any` are scalar kinds. In a plain formula a reference given for one
is reduced by implicit intersection. Where an array arrives, the call is repeated for every element and gives
an array: shapes are stretched as in the spreadsheet, and elements that have no partner are #N/A.

After the kind: ``?`` the parameter may be omitted (the definition's own default is used) and an argument
left empty counts as blank; ``~`` omitted or empty, the default is used; ``*`` the last parameter repeats,
zero times or more. A group of kinds in brackets repeats as a whole: ``(range any)*``.
For the kinds list, operand and lazy, and for value, any and array where they are optional, an argument left
empty arrives as `MISSING`; for value, any and array that are not, it arrives as a blank.

A definition returns a float (never an int), str, bool, `BLANK`, a `CellError`, an `Array` or a `Ref`, or
raises `Fail`. Where it computes with `number` alone, `OverflowError` and `ValueError` become #NUM!,
`ZeroDivisionError` becomes #DIV/0!, and a result that is not finite becomes #NUM!.
"""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, Final, Literal, TypeVar, cast

Kind = Literal[
    "number", "text", "logical", "value", "any", "array", "list", "range", "operand", "matrix", "lazy"
]  # fmt: skip
SCALAR_KINDS: Final = frozenset({"number", "text", "logical", "value", "any"})

_F = TypeVar("_F", bound=Callable[..., Any])


@dataclass(frozen=True, slots=True)
class Parameter:
    """One parameter of a native function."""

    kind: Kind
    optional: bool = False
    empty_is_default: bool = False


@dataclass(frozen=True, slots=True)
class Native:
    """A native function as declared.

    Parameters
    ----------
    name : str
        In capitals, without any prefix that files put before newer functions.
    call : callable
    parameters : tuple of Parameter
        Those that stand once.
    repeated : tuple of Parameter
        Those that repeat, as a group, after them.
    context : bool
        The definition takes the evaluation `Context` as its first argument.
    volatile : bool
        The result may change although no argument does.
    vector : callable, optional
        The same function over float64 arrays of one shape, for functions of numbers alone; nan or inf in
        its result means that the element is computed by `call` instead.
    """

    name: str
    call: Callable[..., Any]
    parameters: tuple[Parameter, ...]
    repeated: tuple[Parameter, ...] = ()
    context: bool = False
    volatile: bool = False
    vector: Callable[..., Any] | None = None

    @property
    def least(self) -> int:
        """Fewest arguments."""
        return max((i for i, p in enumerate(self.parameters, 1) if not p.optional), default=0)

    @property
    def most(self) -> int:
        """Most arguments."""
        return 255 if self.repeated else len(self.parameters)

    def parameter(self, index: int) -> Parameter:
        """The parameter that argument number `index`, from 0, belongs to."""
        if index < len(self.parameters):
            return self.parameters[index]
        return self.repeated[(index - len(self.parameters)) % len(self.repeated)]


#: Every declared function by name; filled as the modules of this folder are imported.
NATIVES: Final[dict[str, Native]] = {}

_SIGNATURE = re.compile(r"\s*(?:\(([^)]*)\)\*|(\w+)([?~*]?))")


def _read_signature(text: str) -> tuple[tuple[Parameter, ...], tuple[Parameter, ...]]:
    once: list[Parameter] = []
    repeated: tuple[Parameter, ...] = ()
    at = 0
    while at < len(text.rstrip()):
        match = _SIGNATURE.match(text, at)
        assert match is not None, text
        at = match.end()
        if match[1] is not None:
            repeated = tuple(Parameter(cast(Kind, kind)) for kind in match[1].split())
        elif match[3] == "*":
            repeated = (Parameter(cast(Kind, match[2])),)
        else:
            once.append(Parameter(cast(Kind, match[2]), match[3] in ("?", "~"), match[3] == "~"))
    return tuple(once), repeated


def native(
    names: str,
    signature: str = "",
    *,
    context: bool = False,
    volatile: bool = False,
    vector: Callable[..., Any] | None = None,
) -> Callable[[_F], _F]:
    """Declare a native function.

    Parameters
    ----------
    names : str
        Name, or several names of the same function separated by blanks.
    signature : str
        Kinds of the parameters, for example ``"value array number?"``.
    context, volatile, vector
        See `Native`.
    """
    once, repeated = _read_signature(signature)

    def declare(call: _F) -> _F:
        for name in names.split():
            assert name not in NATIVES, name
            NATIVES[name] = Native(name, call, once, repeated, context, volatile, vector)
        return call

    return declare
