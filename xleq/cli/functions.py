"""``xleq functions``: the table of worksheet functions on a terminal."""

from __future__ import annotations

import difflib
import json
import sys

from rich.console import Console
from rich.markup import escape
from rich.table import Table

from xleq.cli.show import plain_grid, shown
from xleq.functions import TABLE
from xleq.functions.table import Function


def run(name: str | None, *, as_json: bool) -> int:
    """Print the list, or one function; gives the exit code."""
    if name is None:
        if as_json:
            print(json.dumps([as_record(f) for f in TABLE.values()], ensure_ascii=False, indent=1))
        else:
            _list(Console(highlight=False))
        return 0
    key = name.upper()
    found = TABLE.get(key) or TABLE.get(f"XLEQ_{key}")
    if found is None:
        near = difflib.get_close_matches(key, TABLE, 3, 0.5) or difflib.get_close_matches(
            f"XLEQ_{key}", TABLE, 3, 0.5
        )
        hint = f"; near it: {', '.join(near)}" if near else "; `xleq functions` lists all"
        print(f"xleq: there is no function {name}{hint}", file=sys.stderr)
        return 2
    if as_json:
        print(json.dumps(as_record(found), ensure_ascii=False, indent=1))
    else:
        _one(Console(highlight=False), found)
    return 0


def as_record(function: Function) -> dict[str, object]:
    """A function as plain data, for JSON."""
    return {
        "name": function.name,
        "topic": function.topic,
        "syntax": function.syntax,
        "gives": function.gives,
        "arguments": [
            {"name": a.name, "kind": a.kind, "unit": a.unit, "meaning": a.meaning, "optional": a.optional}
            | ({"default": a.default} if a.optional and a.default is not None else {})
            | ({"known": list(a.known)} if a.known else {})
            for a in function.arguments
        ],
        "errors": list(function.errors),
        "source": function.source,
        "examples": [{"formula": e.formula, "shows": plain_grid(e.shows)} for e in function.examples],
    }


def _list(console: Console) -> None:
    topic = ""
    for function in TABLE.values():
        if function.topic != topic:
            topic = function.topic
            console.print(f"\n[bold]{topic}[/bold]")
        console.print(f"  [cyan]{escape(function.syntax)}[/cyan]", soft_wrap=True)
        console.print(f"      {escape(function.gives)}", soft_wrap=True)
    console.print("\n`xleq functions NAME` shows one in full.")


def _one(console: Console, function: Function) -> None:
    console.print(f"[bold cyan]{escape(function.syntax)}[/bold cyan]", soft_wrap=True)
    console.print(f"{escape(function.gives)}\n", soft_wrap=True)
    if function.arguments:
        table = Table(box=None, pad_edge=False, show_header=True, header_style="bold")
        for head in ("argument", "unit", "default", "meaning"):
            table.add_column(head, overflow="fold")
        for a in function.arguments:
            default = "required" if not a.optional else "none" if a.default is None else shown(a.default)  # type: ignore[arg-type]
            meaning = a.meaning + (f"; known: {', '.join(a.known)}" if a.known else "")
            table.add_row(escape(a.name), escape(a.unit), escape(default), escape(meaning))
        console.print(table)
        console.print()
    for e in function.errors:
        console.print(
            f"[red]{escape(e.partition(' ')[0])}[/red] {escape(e.partition(' ')[2])}", soft_wrap=True
        )
    console.print(f"\nsource   {escape(function.source)}", soft_wrap=True)
    for example in function.examples:
        value = example.shows
        text = (
            "; ".join(" | ".join(shown(v) for v in row) for row in value)
            if isinstance(value, list)
            else shown(value)
        )
        console.print(f"example  {escape(example.formula)}\n         → {escape(text)}", soft_wrap=True)
