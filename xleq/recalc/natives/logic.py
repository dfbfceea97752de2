"""Choosing between expressions: IF and its kin evaluate only what they need; AND, OR, XOR, NOT.

Where a condition is an array each element chooses for itself; the expressions are then evaluated once, as
arrays, those that no element needs not at all.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence

from xleq.cells import BLANK, NA, VALUE, CellError, Missing, Value
from xleq.recalc.coerce import to_logical, to_number
from xleq.recalc.context import Context
from xleq.recalc.natives.table import native
from xleq.recalc.operands import Argument, Array, Fail, Operand
from xleq.recalc.program.operators import apply, stretched
from xleq.recalc.program.references import contents, intersected

#: An expression that is evaluated when it is called, or nothing where none is written.
Lazy = Callable[[], Operand] | Missing
#: A value or an array.
Term = Value | Array


def term(context: Context, argument: Argument) -> Term:
    """An operand read, in a plain formula after implicit intersection; nothing as a blank."""
    if isinstance(argument, Missing):
        return BLANK
    assert not callable(argument)
    return (contents if context.array_mode else intersected)(context, argument)  # type: ignore[return-value]


def _evaluated(expression: Lazy) -> Operand:
    return BLANK if isinstance(expression, Missing) else expression()


def _select(
    context: Context, condition: Term, then: Callable[[], Operand], otherwise: Callable[[], Operand]
) -> Operand:
    """One of two expressions, or an array of elements of both."""
    if not isinstance(condition, Array):
        test = to_logical(condition)
        if isinstance(test, CellError):
            return test
        return then() if test else otherwise()
    tests = [to_logical(v) for v in condition.flat]
    yes: Operand = contents(context, then()) if any(t is True for t in tests) else BLANK
    no: Operand = contents(context, otherwise()) if any(t is False for t in tests) else BLANK
    blocks = [b for b in (condition, yes, no) if isinstance(b, Array)]
    height, width = max(b.height for b in blocks), max(b.width for b in blocks)
    chosen = [
        t if isinstance(t, CellError) else y if t else n
        for t, y, n in zip(
            stretched(Array(condition.height, condition.width, tests), height, width),
            stretched(yes, height, width),  # type: ignore[arg-type]
            stretched(no, height, width),  # type: ignore[arg-type]
            strict=True,
        )
    ]
    return Array(height, width, chosen)


@native("IF", "operand lazy lazy?", context=True)
def if_(context: Context, condition: Argument, then: Lazy, otherwise: Lazy | None = None) -> Operand:
    """One of two expressions, by a condition."""
    return _select(
        context,
        term(context, condition),
        lambda: _evaluated(then),
        lambda: False if otherwise is None else _evaluated(otherwise),
    )


@native("IFS", "(lazy lazy)*", context=True)
def ifs(context: Context, *pairs: Lazy) -> Operand:
    """Expression after the first condition that holds."""
    if len(pairs) < 2:
        raise Fail(NA)
    if len(pairs) % 2:
        raise Fail(VALUE)

    def branch(i: int) -> Operand:
        if i >= len(pairs):
            return CellError("#N/A", "no condition holds")
        return _select(
            context,
            term(context, _evaluated(pairs[i])),
            lambda: _evaluated(pairs[i + 1]),
            lambda: branch(i + 2),
        )

    return branch(0)


@native("SWITCH", "operand lazy lazy lazy*", context=True)
def switch(context: Context, expression: Argument, *cases: Lazy) -> Operand:
    """Expression after the first value that equals the given one; a last one alone is the default."""
    wanted = term(context, expression)
    if isinstance(wanted, CellError):
        return wanted

    def branch(i: int) -> Operand:
        if i + 1 >= len(cases):
            return _evaluated(cases[i]) if i < len(cases) else CellError("#N/A", "no value is equal")
        equal = apply("=", wanted, term(context, _evaluated(cases[i])))
        return _select(context, equal, lambda: _evaluated(cases[i + 1]), lambda: branch(i + 2))

    return branch(0)


def _unless(
    context: Context, argument: Argument, otherwise: Lazy, bad: Callable[[CellError], bool]
) -> Operand:
    value = term(context, argument)
    if not isinstance(value, Array):
        return _evaluated(otherwise) if isinstance(value, CellError) and bad(value) else value
    hit = [isinstance(v, CellError) and bad(v) for v in value.flat]
    if not any(hit):
        return value
    condition = Array(value.height, value.width, hit)
    return _select(context, condition, lambda: _evaluated(otherwise), lambda: value)


@native("IFERROR", "operand lazy", context=True)
def iferror(context: Context, argument: Argument, otherwise: Lazy) -> Operand:
    """The value, or another expression where it is an error."""
    return _unless(context, argument, otherwise, lambda error: True)


@native("IFNA", "operand lazy", context=True)
def ifna(context: Context, argument: Argument, otherwise: Lazy) -> Operand:
    """The value, or another expression where it is #N/A."""
    return _unless(context, argument, otherwise, lambda error: error == NA)


@native("CHOOSE", "operand lazy lazy*", context=True)
def choose(context: Context, index: Argument, *expressions: Lazy) -> Operand:
    """Expression of a number; an array of numbers chooses element by element."""
    numbers = term(context, index)
    if not isinstance(numbers, Array):
        return _evaluated(expressions[_choice(numbers, len(expressions))])
    picked: list[int | CellError] = []
    for v in numbers.flat:
        try:
            picked.append(_choice(v, len(expressions)))
        except Fail as fail:
            picked.append(fail.error)
    blocks: dict[int, Term] = {}
    for i in {p for p in picked if isinstance(p, int)}:
        blocks[i] = contents(context, _evaluated(expressions[i]))  # type: ignore[assignment]
    arrays = [numbers, *(b for b in blocks.values() if isinstance(b, Array))]
    height, width = max(a.height for a in arrays), max(a.width for a in arrays)
    lists = {i: stretched(b, height, width) for i, b in blocks.items()}
    order = Array(numbers.height, numbers.width, [float(p) if isinstance(p, int) else p for p in picked])
    chosen = [
        lists[int(p)][place] if isinstance(p, float) else p
        for place, p in enumerate(stretched(order, height, width))
    ]
    return Array(height, width, chosen)


def _choice(value: Value, count: int) -> int:
    number = to_number(value)
    if isinstance(number, CellError):
        raise Fail(number)
    if not 1 <= number < count + 1:
        raise Fail(CellError("#VALUE!", f"the number of the choice must be 1 to {count}"))
    return int(number) - 1


def _logicals(arguments: Sequence[Argument]) -> Iterable[bool]:
    """Logicals of the arguments: of ranges and arrays only numbers and logicals count."""
    found = False
    for argument in arguments:
        if isinstance(argument, Array):
            for v in argument.flat:
                if isinstance(v, CellError):
                    raise Fail(v)
                if isinstance(v, float | bool):
                    found = True
                    yield bool(v)
            continue
        value = BLANK if isinstance(argument, Missing) else argument
        if isinstance(value, CellError):
            raise Fail(value)
        test = to_logical(value)  # type: ignore[arg-type]
        if isinstance(test, bool):  # text that is no logical is passed over
            found = True
            yield test
    if not found:
        raise Fail(CellError("#VALUE!", "there is no logical value"))


@native("AND", "list list*")
def and_(*arguments: Argument) -> bool:
    """Whether all are TRUE."""
    return all(list(_logicals(arguments)))


@native("OR", "list list*")
def or_(*arguments: Argument) -> bool:
    """Whether any is TRUE."""
    return any(list(_logicals(arguments)))


@native("XOR", "list list*")
def xor(*arguments: Argument) -> bool:
    """Whether an odd number of them is TRUE."""
    return sum(_logicals(arguments)) % 2 == 1


@native("NOT", "logical")
def not_(value: bool) -> bool:
    """The opposite."""
    return not value


@native("TRUE")
def true() -> bool:
    """TRUE."""
    return True


@native("FALSE")
def false() -> bool:
    """FALSE."""
    return False
