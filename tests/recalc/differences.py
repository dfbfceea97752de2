"""Where xleq and Excel differ: one table, evaluated by the tests, and the page that is made of it.

``python -m tests.recalc.differences`` writes the page anew.
"""

from __future__ import annotations

import tempfile
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any, Final

import xlsxwriter

from tests.recalc.books import at, book, result
from xleq.cells import CellError, Grid, Value
from xleq.errors import FormulaError
from xleq.hosts.headless import evaluate_formula, recalculate_file
from xleq.recalc.texts import number_text
from xleq.workbook import open_book

PAGE: Final = Path(__file__).parents[2] / "xleq" / "functions" / "DIFFERENCES.md"
HOME: Final = "B1"


@dataclass(frozen=True)
class Difference:
    """One difference.

    Parameters
    ----------
    formula : str
        It stands in B1 where there are other cells.
    excel : str
        What Excel shows: as `shown` gives it where it is one value, else in words.
    xleq : str
        What xleq shows, as `shown` gives it.
    why : str
    source : str
        Where Excel's side is known from; empty where it is `stored`.
    cells : mapping
        Other cells of the sheet S.
    before : mapping
        Values that formulas of the sheet have stored.
    settings : mapping
        Of the workbook; see `Book`.
    situation : str
        The circumstances in words, for those that the cells don't tell.
    stored : tuple of str
        File, sheet and cell of a workbook in which Excel stored its value.
    written : bool
        The formula is put into a file, recalculated there, and read again.
    """

    formula: str
    excel: str
    xleq: str
    why: str
    source: str = ""
    cells: Mapping[str, Any] = field(default_factory=dict)
    before: Mapping[str, Value] = field(default_factory=dict)
    settings: Mapping[str, Any] = field(default_factory=dict)
    situation: str = ""
    stored: tuple[str, str, str] | None = None
    written: bool = False

    def evaluated(self) -> str:
        """What xleq shows now."""
        if self.written:
            return shown(_through_a_file(self.formula))
        if self.cells or self.before or self.settings or self.situation:
            return self._in_a_book()
        try:
            return shown(evaluate_formula(self.formula))
        except FormulaError as error:
            return f"kept: {error}"

    def _in_a_book(self) -> str:
        stored = {f"S!{address}": value for address, value in self.before.items()}
        done = result(book({"S": {**self.cells, HOME: self.formula}}, stored, **self.settings))
        for kept in done.kept:
            if kept.address == at(HOME):
                return f"kept: {kept.reason}"
        for d in done.disagreements:
            if d.address == at(HOME):
                return f"{shown(d.stored)} stays, {shown(d.fresh)} is reported"
        return shown(done.values[at(HOME)])


def _through_a_file(formula: str) -> Value:
    with tempfile.TemporaryDirectory() as folder:
        made, fresh = Path(folder) / "made.xlsx", Path(folder) / "fresh.xlsx"
        with xlsxwriter.Workbook(made) as file:
            file.add_worksheet("S").write_dynamic_array_formula(HOME, formula)
        recalculate_file(made, fresh)
        return open_book(fresh).sheets[0].stored[(1, 2)]


def shown(value: Value | Grid) -> str:
    """A value as the page has it: 15 digits, blocks with semicolons between the rows."""
    if isinstance(value, list):
        return "; ".join(" ".join(shown(v) for v in row) for row in value)
    if isinstance(value, bool):
        return "TRUE" if value else "FALSE"
    if isinstance(value, CellError):
        return value.code
    return number_text(value) if isinstance(value, float) else str(value)


_HEAD: Final = """# Differences from Excel

Generated from the table of differences that the tests evaluate, by `python -m tests.recalc.differences`; do
not edit.

What `xleq eval`, `recalc` and `check` make of the spreadsheet's own functions is meant to be what Excel
makes of them. These are the differences that are known. The column "xleq" is evaluated by the tests; "kept"
means that the cell keeps the value that the file has for it and is listed with the reason, as are the cells
that depend on it. Excel's side comes from values that Excel stored in workbooks, from Microsoft's
descriptions, or from published observations, as told.

Two safeguards stand behind the list. A formula that does not reproduce its stored value from stored inputs
keeps that value and is reported with both, so that an unknown difference is seen before it is written. And
what a file holds beside its cells (charts, pivot tables, their cached points) stays as it was, until Excel
opens it and renews them.
"""


def page() -> str:
    """The page as Markdown."""
    from tests.recalc.differences_known import TOPICS

    parts = [_HEAD]
    for topic, rows in TOPICS.items():
        parts += [f"## {topic}", "", *_table(rows), ""]
    return "\n".join(parts)


def _table(rows: Iterable[Difference]) -> list[str]:
    lines = ["| formula | Excel | xleq | why | known from |", "|---|---|---|---|---|"]
    for d in rows:
        columns = (_situation(d), d.excel, d.xleq, d.why, _known_from(d))
        lines.append(f"| {' | '.join(c.replace('|', chr(92) + '|') for c in columns)} |")
    return lines


def _situation(d: Difference) -> str:
    others = [f"{a}: `{shown(content)}`" for a, content in d.cells.items()]
    if HOME in d.before:
        others.append(f"stored {shown(d.before[HOME])}")
    if d.situation:
        others.append(d.situation)
    return f"`{d.formula}`" + (f" with {', '.join(others)}" if others else "")


def _known_from(d: Difference) -> str:
    if d.stored is None:
        return d.source
    file, sheet, cell = d.stored
    return f"stored by Excel in {file}, {sheet}!{cell}"


if __name__ == "__main__":
    PAGE.write_text(page(), encoding="utf-8")
