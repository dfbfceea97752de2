"""Cell and value metadata: which `cm` marks dynamic arrays, which `vm` stands for a newer error."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field
from typing import Final

from xleq.cells import CellError, error_named
from xleq.workbook.markup import Node
from xleq.workbook.package import Package, Relationship

_DYNAMIC: Final = "XLDAPR"
_RICH: Final = "XLRICHVALUE"
#: Numbers of the newer errors, which the cell itself stores as #VALUE!: one less than ERROR.TYPE gives.
#: 13 was seen in a file by Excel; the others follow the same count.
_RICH_ERRORS: Final = {
    "8": "#SPILL!",
    "9": "#CONNECT!",
    "10": "#BLOCKED!",
    "11": "#UNKNOWN!",
    "12": "#FIELD!",
    "13": "#CALC!",
}


@dataclass(frozen=True, slots=True)
class Metadata:
    """What the numbers in `cm` and `vm` attributes mean.

    Parameters
    ----------
    dynamic : frozenset of int
        `cm` numbers of dynamic-array formulas.
    errors : dict
        `vm` number → the error that such a cell really shows.
    """

    dynamic: frozenset[int] = frozenset()
    errors: dict[int, CellError] = field(default_factory=dict)


def read_metadata(package: Package, links: list[Relationship]) -> Metadata:
    """Metadata of a workbook, from its own relationships; empty when it has none."""
    parts = {link.type: link.target for link in links if not link.outside and package.has(link.target)}
    if "sheetMetadata" not in parts:
        return Metadata()
    tree = package.tree(parts["sheetMetadata"])
    kinds = [node.get("name") for node in tree.inside("metadataTypes", "metadataType")]
    dynamic = {
        str(at) for at, block in _blocks(tree, _DYNAMIC) if any(n.flag("fDynamic") for n in _below(block))
    }
    marks = {number for number, value in _records(tree, "cellMetadata", kinds, _DYNAMIC) if value in dynamic}
    errors: dict[int, CellError] = {}
    if "rdRichValue" in parts and "rdRichValueStructure" in parts:
        shown = _rich_errors(package.tree(parts["rdRichValue"]), package.tree(parts["rdRichValueStructure"]))
        rich = {
            str(at): shown[node.get("i")]
            for at, block in _blocks(tree, _RICH)
            for node in _below(block)
            if node.get("i") in shown
        }
        errors = {n: rich[v] for n, v in _records(tree, "valueMetadata", kinds, _RICH) if v in rich}
    return Metadata(frozenset(marks), errors)


def _blocks(tree: Node, kind: str) -> Iterator[tuple[int, Node]]:
    """Numbered blocks of one kind of future metadata."""
    for future in tree.all("futureMetadata"):
        if future.get("name") == kind:
            yield from enumerate(future.all("bk"))


def _records(tree: Node, where: str, kinds: list[str], kind: str) -> Iterator[tuple[int, str]]:
    """Numbers, from 1, of the records of a kind, each with the block it names."""
    for number, block in enumerate(tree.inside(where, "bk"), 1):
        for record in block.all("rc"):
            at = record.get("t")
            if at.isdecimal() and 1 <= int(at) <= len(kinds) and kinds[int(at) - 1] == kind:
                yield number, record.get("v")


def _rich_errors(values: Node, structures: Node) -> dict[str, CellError]:
    """Number of a rich value, as text → the error it is, for those that are errors."""
    keys = [
        [_last(key.get("n")) for key in structure.children] if structure.get("t") == "_error" else []
        for structure in structures.children
        if _last(structure.name) == "s"
    ]
    errors = {}
    for at, value in enumerate(node for node in values.children if _last(node.name) == "rv"):
        number = value.get("s")
        names = keys[int(number)] if number.isdecimal() and int(number) < len(keys) else []
        fields = dict(zip(names, (node.text for node in value.children), strict=False))
        code = _RICH_ERRORS.get(fields.get("errorType", ""))
        if code is not None:
            errors[str(at)] = error_named(code)
    return errors


def _last(name: str) -> str:
    return name.rpartition(" ")[2]


def _below(node: Node) -> Iterator[Node]:
    for child in node.children:
        yield child
        yield from _below(child)
