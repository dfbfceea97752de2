"""The function reference, generated from the table: ``python -m xleq.hosts.reference`` writes it anew."""

from __future__ import annotations

from pathlib import Path
from typing import Final

from xleq.cells import Grid, Value
from xleq.functions import TABLE
from xleq.functions.table import Argument, Function
from xleq.recalc.texts import number_text

PAGE: Final = Path(__file__).parents[1] / "functions" / "FUNCTIONS.md"

_HEAD: Final = """# The worksheet functions

Generated from the function table by `python -m xleq.hosts.reference`; do not edit.

## What holds for all of them

- A quantity is a number in the unit given below, or text with a unit such as `"450 degC"`, `"30 barg"`,
  or `B7&B8` where B8 holds the unit. Gauge pressures count from one standard atmosphere, 1.01325 bar.
- An omitted argument and an empty cell both mean the default. An empty cell in a list of amounts is 0.
- A list is a range, an array, or text with semicolons between the items. A list that comes back follows
  the direction of the range of `species`; text gives a column.
- An error in an argument comes back as it is. Every other error has a reason, which `xleq eval`, `recalc`
  and the add-ins show: `#VALUE!` malformed or unbalanced input, `#NUM!` no physical or no certified
  answer, `#N/A` missing data.
- An equilibrium figure is a limit, not a rate or a design. Have results checked by a qualified person;
  local codes and licensed practice decide.
- Where the spreadsheet's own functions come out otherwise than in Excel is listed in
  [DIFFERENCES.md](DIFFERENCES.md); where the hosts differ, in
  [differences_between_hosts.md](differences_between_hosts.md).

## Bases of K

K° is on activities: gases on p/p° with p° = 1 bar, solutes on c/c° with c° = 1 mol/L, pure solids and
liquids 1, liquid mixtures on mole fractions. With Δν the change in moles of gas:

| basis | written | from K° |
|---|---|---|
| activities | `K` | K° |
| pressures | `Kp[bar]`, `Kp[atm]`, `Kp[kPa]` … | Kp = K° (p°/unit)^Δν |
| concentrations | `Kc[mol/L]`, `Kc[mol/m3]` … | Kc = K° (p°/(R T unit))^Δν for gases |
| mole fractions | `Kx` | Kx = K° (p°/P)^Δν |

Worked: N2 + 3 H2 = 2 NH3 has Δν = -2. With Kc = 9.6 (mol/L)^-2 at 573 K, R T = 0.0820574 × 573 = 47.019 L
atm/mol, so Kp = 9.6 × 47.019^-2 = 0.004342 atm^-2, and K° = 0.004342 × 1.01325^-2 = 0.004230 on p° = 1
bar:
`=XLEQ_KP(9.6, "N2 + 3 H2 = 2 NH3", 573, "atm")` and
`=XLEQ_K_CONVERT(9.6, "N2 + 3 H2 = 2 NH3", "Kc[mol/L]", "K", 573)`.
"""


def whole_reference() -> str:
    """The page as Markdown."""
    parts = [_HEAD]
    topic = ""
    for function in TABLE.values():
        if function.topic != topic:
            topic = function.topic
            parts.append(f"## {topic.capitalize()}\n")
        parts.append(_entry(function))
    return "\n".join(parts)


def _entry(function: Function) -> str:
    lines = [f"### {function.name}\n", f"`{function.syntax}`\n", f"Gives {function.gives}.\n"]
    if function.arguments:
        lines += ["| argument | unit | default | meaning |", "|---|---|---|---|"]
        lines += [_row(a) for a in function.arguments]
        lines.append("")
    if function.errors:
        lines += [f"- `{e.partition(' ')[0]}` {e.partition(' ')[2]}" for e in function.errors]
        lines.append("")
    lines.append(f"Source: {function.source}.\n")
    for example in function.examples:
        lines += ["```", example.formula, f"→ {_block(example.shows)}", "```", ""]
    return "\n".join(lines)


def _row(a: Argument) -> str:
    default = "required" if not a.optional else "–" if a.default is None else _text(a.default) or "–"  # type: ignore[arg-type]
    meaning = a.meaning + (f"; known: {', '.join(a.known)}" if a.known else "")
    return f"| {a.name} | {a.unit} | {default} | {_escaped(meaning)} |"


def _escaped(text: str) -> str:
    return text.replace("|", "\\|")


def _block(value: Value | Grid) -> str:
    if isinstance(value, list):
        return "; ".join(" | ".join(_text(v) for v in row) for row in value)
    return _text(value)


def _text(value: Value) -> str:
    if isinstance(value, bool):
        return "TRUE" if value else "FALSE"
    return number_text(value) if isinstance(value, float) else str(value)


if __name__ == "__main__":
    PAGE.write_text(whole_reference(), encoding="utf-8")
