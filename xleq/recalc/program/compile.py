"""Syntax trees compiled to closures.

Every expression can be compiled in two modes. In *value mode* (a plain formula) a range that stands where
one value is wanted is reduced to the cell in the formula's row or column; in *array mode* (array formulas,
dynamic arrays, arguments of kind array, names) it is read whole and worked element by element.
`Compiler.operand` keeps references as they are; `Compiler.scalar` reads or reduces them.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import TYPE_CHECKING, Any, Final

from xleq.cells import BLANK, MISSING, NAME, CellError, Missing
from xleq.recalc.context import Context
from xleq.recalc.natives import natives
from xleq.recalc.operands import Array, Operand, Ref
from xleq.recalc.program.calls import native_call, own_call, prepared
from xleq.recalc.program.operators import SCALAR, apply, hundredth, negate
from xleq.recalc.program.quick import arithmetic, comparison, difference, total
from xleq.recalc.program.references import (
    Run,
    area_of,
    block,
    common,
    constant,
    contents,
    intersected,
    is_cell,
    reader,
    single,
    spanned,
    united,
)
from xleq.recalc.sheets.columns import Unsupported
from xleq.recalc.syntax import tree
from xleq.recalc.syntax.parse import bare_name

if TYPE_CHECKING:
    from xleq.recalc.sheets.columns import Cells
    from xleq.recalc.sheets.names import Names

#: Names of LET and LAMBDA in scope, in lower case, and their places among the context's `locals`.
Scope = Mapping[str, int]

#: In a plain formula these stay in value mode even where an array is wanted: `SUMPRODUCT(IF(A1:A5>2,1,0))`
#: looks at one row unless it is an array formula. (common knowledge of the trade, no source)
_PLAIN_ALL_THE_SAME: Final = frozenset({"IF", "IFERROR", "IFNA", "CHOOSE"})
_NOT_A_REFERENCE: Final = frozenset("+-*/^&=<>%") | {"<=", ">=", "<>"}


class Compiler:
    """Compiles the formulas of one sheet.

    Parameters
    ----------
    sheet : int
        Index of the sheet that references without a sheet mean.
    stores : sequence of Cells
        Cells of each sheet, and after them of each sheet of linked books.
    names : Names
        Finds sheets, names and tables.
    functions : mapping
        Worksheet functions that were passed in, by name in capitals.
    """

    def __init__(
        self,
        sheet: int,
        stores: list[Cells],
        names: Names,
        functions: Mapping[str, Callable[[list[Any]], Any]],
    ) -> None:
        self.sheet = sheet
        self.stores = stores
        self.names = names
        self.functions = functions
        # whether an argument of kind array is being compiled in a plain formula
        self._forced = False

    def formula(self, node: tree.Node, array: bool) -> Run:
        """A whole formula. A sum or difference at its top snaps to zero."""
        if isinstance(node, tree.Infix) and node.operator in "+-":
            quick = total if node.operator == "+" else difference
            return quick(self.scalar(node.left, array, {}), self.scalar(node.right, array, {}))
        return self.scalar(node, array, {})

    def scalar(self, node: tree.Node, array: bool, scope: Scope) -> Run:
        """An expression that gives a value, or an array where it is one."""
        if isinstance(node, tree.Name):
            node = self.names.plain(node, self.sheet, scope)
        if isinstance(node, tree.Cells) and is_cell(node):
            sheet = self.names.one_sheet(node.place, self.sheet)
            if sheet is not None:
                return reader(self.stores[sheet], node)
        run = self.operand(node, array, scope)
        if isinstance(node, tree.Literal | tree.Block) or (
            isinstance(node, tree.Infix | tree.Prefix | tree.Postfix) and node.operator in _NOT_A_REFERENCE
        ):
            return run
        if isinstance(node, tree.Call) and self.gives_values(node, scope):
            return run
        reduce = contents if array else intersected

        def reduced(at: Context) -> Operand:
            found = run(at)
            return reduce(at, found) if isinstance(found, Ref) else found

        return reduced

    def gives_values(self, node: tree.Call, scope: Scope) -> bool:
        """Whether a call never gives a reference: it gets none that it could give, and can't look for any."""
        native = natives().get(node.name)
        if native is None or native.context or node.name.lower() in scope or node.own.startswith("["):
            return False
        kinds = {p.kind for p in (*native.parameters, *native.repeated)}
        return kinds.isdisjoint(("range", "operand", "lazy")) and node.name not in self.functions

    def operand(self, node: tree.Node, array: bool, scope: Scope) -> Run:
        """An expression that gives whatever it is, a reference too."""
        match node:
            case tree.Literal():
                return constant(node.value)
            case tree.Omitted():
                return constant(BLANK)
            case tree.Block():
                return constant(Array.of_rows(node.rows))
            case tree.Cells():
                return self.cells(node)
            case tree.Name():
                return self.name(node, array, scope)
            case tree.Structured():
                return self.names.structured(node, self.sheet)
            case tree.Prefix():
                return self.prefix(node, array, scope)
            case tree.Postfix():
                return self.postfix(node, array, scope)
            case tree.Infix():
                return self.infix(node, array, scope)
            case tree.Call():
                return self.call(node, array, scope)
            case tree.Apply():
                from xleq.recalc.program.scopes import apply_value

                return apply_value(
                    self, self.operand(node.function, array, scope), node.arguments, array, scope
                )

    def cells(self, node: tree.Cells) -> Run:
        """A reference to cells."""
        sheets = self.names.sheets(node.place, self.sheet)
        if not sheets:
            return constant(CellError("#REF!", "there is no such sheet"))
        finds = [area_of(sheet, node) for sheet in sheets]
        if len(finds) == 1:
            find = finds[0]
            return lambda at: Ref((find(at),))
        return lambda at: Ref(tuple(find(at) for find in finds))

    def name(self, node: tree.Name, array: bool, scope: Scope) -> Run:
        """A name of LET, a defined name or a table."""
        bare = bare_name(node.name).lower()
        if node.place is None and bare in scope:
            place = scope[bare]
            return lambda at: at.locals[place]  # type: ignore[return-value]
        if node.name.lower().startswith("_xleta."):
            from xleq.recalc.program.scopes import function_value

            return function_value(self, bare.upper())
        return self.names.run(node, self.sheet, self)

    def prefix(self, node: tree.Prefix, array: bool, scope: Scope) -> Run:
        """Signs, brackets and ``@``."""
        if node.operator == "(":
            return self.operand(node.operand, array, scope)
        if node.operator == "@":
            inner = self.operand(node.operand, False, scope)
            return lambda at: single(at, inner(at))
        run = self.scalar(node.operand, array, scope)
        if node.operator == "+":
            return run

        def negative(at: Context) -> Operand:
            value = run(at)
            if type(value) is float:
                return 0.0 - value
            return negate(value)  # type: ignore[arg-type]

        return negative

    def postfix(self, node: tree.Postfix, array: bool, scope: Scope) -> Run:
        """Percent and ``#``."""
        if node.operator == "#":
            inner = self.operand(node.operand, True, scope)
            return lambda at: self.names.spilled(at, inner(at))
        run = self.scalar(node.operand, array, scope)
        return lambda at: hundredth(run(at))  # type: ignore[arg-type]

    def infix(self, node: tree.Infix, array: bool, scope: Scope) -> Run:
        """Operators between two expressions."""
        operator = node.operator
        if operator in SCALAR:
            left = self.scalar(node.left, array, scope)
            right = self.scalar(node.right, array, scope)
            return (
                arithmetic(operator, left, right)
                if operator in "+-*/^"
                else comparison(operator, left, right)
                if operator != "&"
                else lambda at: apply("&", left(at), right(at))  # type: ignore[arg-type]
            )
        a = self.operand(node.left, array, scope)
        b = self.operand(node.right, array, scope)
        combine = {":": spanned, " ": common, ",": united}[operator]
        return lambda at: combine(a(at), b(at))

    def call(self, node: tree.Call, array: bool, scope: Scope) -> Run:
        """A function by name."""
        from xleq.recalc.program import scopes

        if self._forced and node.name in _PLAIN_ALL_THE_SAME:
            self._forced = False
            try:
                return self.call(node, False, scope)
            finally:
                self._forced = True
        bare = node.name.lower()
        if bare in scope:
            place = scope[bare]
            return scopes.apply_value(self, lambda at: at.locals[place], node.arguments, array, scope)  # type: ignore[return-value, arg-type]
        own = self.functions.get(node.name)
        if own is not None:
            arguments = [
                MISSING if isinstance(a, tree.Omitted) else self.operand(a, array, scope)
                for a in node.arguments
            ]
            return own_call(own, arguments)
        if node.own.startswith("["):
            return _unknown(node.own)
        special = scopes.SPECIAL.get(node.name)
        if special is not None:
            return special(self, node, array, scope)
        native = natives().get(node.name)
        if native is None:
            if self.names.has(node.name, self.sheet):
                function = self.names.run(tree.Name(None, node.name), self.sheet, self)
                return scopes.apply_value(self, function, node.arguments, array, scope)
            return _unknown(node.own)
        if not native.least <= len(node.arguments) <= native.most:
            return constant(
                CellError("#VALUE!", f"{node.name} does not take {len(node.arguments)} arguments")
            )
        arguments = [
            MISSING
            if isinstance(a, tree.Omitted)
            else self.argument(native.parameter(i).kind, a, array, scope)
            for i, a in enumerate(node.arguments)
        ]
        return native_call(
            native,
            [
                a if isinstance(a, Missing) else prepared(native.parameter(i), a)
                for i, a in enumerate(arguments)
            ],
        )

    def argument(self, kind: str, node: tree.Node, array: bool, scope: Scope) -> Run:
        """An argument compiled as its kind wants it."""
        if kind in ("array", "matrix"):
            before = self._forced
            self._forced = before or not array
            try:
                return self.operand(node, True, scope)
            finally:
                self._forced = before
        if kind in ("list", "range", "operand", "lazy"):
            return self.operand(node, array, scope)
        return self.scalar(node, array, scope)

    def whole(self, node: tree.Node, scope: Scope) -> Callable[[Context], Array]:
        """An expression read as an array, whatever it is."""
        run = self.operand(node, True, scope)
        return lambda at: block(at, run(at))


def _unknown(name: str) -> Run:
    """A call of a function that is not there: the cell keeps its stored value."""

    def unknown(at: Context) -> Operand:
        raise Unsupported(f"the function {name} is not known")

    return unknown


def not_a_name(name: str) -> Run:
    """A name that nothing has."""
    return constant(CellError(NAME.code, f"nothing is named {name}"))
