"""Functions that give names to values or choose what is evaluated: LET, LAMBDA and its helpers, IF."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import TYPE_CHECKING, Any, Final

from xleq.cells import MISSING, CellError, Missing, Value
from xleq.recalc.coerce import to_logical, to_number
from xleq.recalc.context import Context
from xleq.recalc.operands import Array, Fail, Operand
from xleq.recalc.program.calls import gathered
from xleq.recalc.program.lambdas import Lambda, call_lambda
from xleq.recalc.program.references import Run, constant, contents
from xleq.recalc.syntax import tree
from xleq.recalc.syntax.parse import bare_name

if TYPE_CHECKING:
    from xleq.recalc.program.compile import Compiler, Scope

Special = Callable[["Compiler", tree.Call, bool, "Scope"], Run]

_BAD_NAMES: Final = CellError("#VALUE!", "a name is wanted here")
_NESTED: Final = CellError("#CALC!", "an array within an array")


def _wrong_number(node: tree.Call) -> Run:
    return constant(CellError("#VALUE!", f"{node.name} does not take {len(node.arguments)} arguments"))


def _let(compiler: Compiler, node: tree.Call, array: bool, scope: Scope) -> Run:
    """LET(name, value, …, result)."""
    args = node.arguments
    if len(args) < 3 or len(args) % 2 == 0:
        return _wrong_number(node)
    inner = dict(scope)
    base = max(scope.values(), default=-1) + 1
    runs: list[Run] = []
    for name, value in zip(args[:-1:2], args[1::2], strict=True):
        if not isinstance(name, tree.Name) or name.place is not None:
            return constant(_BAD_NAMES)
        runs.append(compiler.operand(value, array, dict(inner)))
        inner[bare_name(name.name).lower()] = base + len(runs) - 1
    body = compiler.operand(args[-1], array, inner)

    def run(at: Context) -> Operand:
        before = at.locals
        try:
            at.locals = before[:base]
            for step in runs:
                at.locals = (*at.locals, step(at))
            return body(at)
        finally:
            at.locals = before

    return run


def _lambda(compiler: Compiler, node: tree.Call, array: bool, scope: Scope) -> Run:
    """LAMBDA(parameter, …, body)."""
    if not node.arguments:
        return _wrong_number(node)
    inner = dict(scope)
    base = max(scope.values(), default=-1) + 1
    n_optional = 0
    for place, parameter in enumerate(node.arguments[:-1]):
        if isinstance(parameter, tree.Structured) and not parameter.table:
            name, n_optional = parameter.first, n_optional + 1
        elif isinstance(parameter, tree.Name) and parameter.place is None:
            name = parameter.name
            n_optional += name.lower().startswith("_xlop.")
        else:
            return constant(_BAD_NAMES)
        inner[bare_name(name).lower()] = base + place
    body = compiler.operand(node.arguments[-1], array, inner)
    n = len(node.arguments) - 1
    return lambda at: Lambda(n, n_optional, body, at, at.locals[:base])  # type: ignore[return-value]


def apply_value(
    compiler: Compiler, function: Run, arguments: Sequence[tree.Node], array: bool, scope: Scope
) -> Run:
    """An expression's value called as a function."""
    runs = [None if isinstance(a, tree.Omitted) else compiler.operand(a, array, scope) for a in arguments]

    def run(at: Context) -> Operand:
        given: list[Operand | Missing] = [MISSING if r is None else r(at) for r in runs]
        try:
            return call_lambda(function(at), given)
        except Fail as fail:
            return fail.error

    return run


def function_value(compiler: Compiler, name: str) -> Run:
    """A function's name given as a value, as in ``BYROW(A1:B2,SUM)``."""
    bodies: dict[int, Run] = {}

    def body_for(n: int) -> Run:
        if n not in bodies:
            names = tuple(tree.Name(None, f" {i}") for i in range(n))
            scope = {f" {i}": i for i in range(n)}
            bodies[n] = compiler.operand(tree.Call(name, names, name), True, scope)
        return bodies[n]

    def body(at: Context) -> Operand:
        given = tuple(v for v in at.locals if not isinstance(v, Missing))
        before = at.locals
        at.locals = given
        try:
            return body_for(len(given))(at)
        finally:
            at.locals = before

    return lambda at: Lambda(255, 255, body, at, ())  # type: ignore[return-value]


def _is_omitted(compiler: Compiler, node: tree.Call, array: bool, scope: Scope) -> Run:
    """ISOMITTED(parameter)."""
    if len(node.arguments) != 1:
        return _wrong_number(node)
    run = compiler.operand(node.arguments[0], array, scope)
    return lambda at: isinstance(run(at), Missing)


def _if(compiler: Compiler, node: tree.Call, array: bool, scope: Scope) -> Run:
    """IF(condition, then, else): only the branch that is taken is evaluated."""
    args = node.arguments
    if not 1 <= len(args) <= 3:
        return _wrong_number(node)
    condition = compiler.scalar(args[0], array, scope)
    yes = compiler.operand(args[1], array, scope) if len(args) > 1 else constant(True)
    no = compiler.operand(args[2], array, scope) if len(args) > 2 else constant(False)

    def run(at: Context) -> Operand:
        found = condition(at)
        if type(found) is bool:
            return yes(at) if found else no(at)
        if isinstance(found, Array):
            return _choose(at, found, yes, no)
        logical = to_logical(found)  # type: ignore[arg-type]
        if type(logical) is bool:
            return yes(at) if logical else no(at)
        return logical

    return run


def _choose(at: Context, condition: Array, yes: Run, no: Run) -> Operand:
    branches: dict[bool, Operand] = {}
    results: list[Operand] = []
    for value in condition.flat:
        logical = to_logical(value)
        if type(logical) is not bool:
            results.append(logical)
            continue
        if logical not in branches:
            branches[logical] = contents(at, (yes if logical else no)(at))
        results.append(branches[logical])
    return gathered(results, condition.height, condition.width)


def _alone(at: Context, operand: Operand) -> Value:
    """A helper's result for one element, which must be one value."""
    found = contents(at, operand)
    if isinstance(found, Array):
        return found.flat[0] if len(found.flat) == 1 else _NESTED
    return found  # type: ignore[return-value]


def _helper(least: int, most: int, work: Callable[..., Operand]) -> Special:
    """A function whose last argument is a LAMBDA and whose first ones are arrays."""

    def special(compiler: Compiler, node: tree.Call, array: bool, scope: Scope) -> Run:
        args = node.arguments
        if not least <= len(args) <= most:
            return _wrong_number(node)
        runs: list[Callable[[Context], Any]] = [
            (lambda at: MISSING) if isinstance(a, tree.Omitted) else compiler.whole(a, scope)
            for a in args[:-1]
        ]
        function = compiler.operand(args[-1], array, scope)

        def run(at: Context) -> Operand:
            try:
                return work(at, function(at), *[r(at) for r in runs])
            except Fail as fail:
                return fail.error

        return run

    return special


def _map(at: Context, function: Operand, *arrays: Array) -> Operand:
    from xleq.recalc.program.operators import stretched

    height, width = max(a.height for a in arrays), max(a.width for a in arrays)
    lists = [stretched(a, height, width) for a in arrays]
    flat = [_alone(at, call_lambda(function, args)) for args in zip(*lists, strict=True)]
    return Array(height, width, flat)


def _reduce(at: Context, function: Operand, *given: Array | Missing) -> Operand:
    start, array = (given[0], given[1]) if len(given) == 2 else (MISSING, given[0])
    assert isinstance(array, Array)
    flat = list(array.flat)
    total: Operand = _start(start) if isinstance(start, Array) else flat.pop(0)
    for value in flat:
        total = contents(at, call_lambda(function, (total, value)))
    return total


def _start(array: Array) -> Operand:
    return array.flat[0] if len(array.flat) == 1 else array


def _scan(at: Context, function: Operand, *given: Array | Missing) -> Operand:
    start, array = (given[0], given[1]) if len(given) == 2 else (MISSING, given[0])
    assert isinstance(array, Array)
    flat: list[Value] = []
    total: Operand = _start(start) if isinstance(start, Array) else MISSING  # type: ignore[assignment]
    for value in array.flat:
        total = value if isinstance(total, Missing) else _alone(at, call_lambda(function, (total, value)))
        flat.append(total)
    return Array(array.height, array.width, flat)


def _by_row(at: Context, function: Operand, array: Array) -> Operand:
    rows = array.rows()
    return Array.column(_alone(at, call_lambda(function, (Array.row(row),))) for row in rows)


def _by_column(at: Context, function: Operand, array: Array) -> Operand:
    columns = zip(*array.rows(), strict=True)
    return Array.row(_alone(at, call_lambda(function, (Array.column(c),))) for c in columns)


def _make_array(at: Context, function: Operand, rows: Array, columns: Array) -> Operand:
    sizes = []
    for size in (rows.flat[0], columns.flat[0]):
        number = to_number(size)
        if type(number) is not float:
            return number
        sizes.append(int(number))
    height, width = sizes
    if height < 1 or width < 1 or height * width > 2**24:
        return CellError("#VALUE!", f"there is no array of {height} × {width}")
    return Array(
        height,
        width,
        [
            _alone(at, call_lambda(function, (float(r), float(c))))
            for r in range(1, height + 1)
            for c in range(1, width + 1)
        ],
    )


def _single(compiler: Compiler, node: tree.Call, array: bool, scope: Scope) -> Run:
    """SINGLE(reference): the function that files have for ``@``."""
    if len(node.arguments) != 1:
        return _wrong_number(node)
    return compiler.prefix(tree.Prefix("@", node.arguments[0]), array, scope)


def _anchor_array(compiler: Compiler, node: tree.Call, array: bool, scope: Scope) -> Run:
    """ANCHORARRAY(cell): the function that files have for ``#``."""
    if len(node.arguments) != 1:
        return _wrong_number(node)
    return compiler.postfix(tree.Postfix("#", node.arguments[0]), array, scope)


#: Functions that are compiled in a way of their own.
SPECIAL: Final[dict[str, Special]] = {
    "LET": _let,
    "LAMBDA": _lambda,
    "ISOMITTED": _is_omitted,
    "IF": _if,
    "SINGLE": _single,
    "ANCHORARRAY": _anchor_array,
    "MAP": _helper(2, 254, _map),
    "REDUCE": _helper(2, 3, _reduce),
    "SCAN": _helper(2, 3, _scan),
    "BYROW": _helper(2, 2, _by_row),
    "BYCOL": _helper(2, 2, _by_column),
    "MAKEARRAY": _helper(3, 3, _make_array),
}
