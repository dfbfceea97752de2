"""Recalculate workbooks that Excel saved and count how many of its values come out.

Run as ``python tests/recalc/corpus.py [FOLDER …]``; without a folder the corpus beside the project is taken.
Per file and in total: formula cells whose fresh value equals the stored one; cells kept and named;
cells that disagree, which the stored-value check reports; and cells that are silently different: given as
computed, not equal, and not reported.
"""

from __future__ import annotations

import re
import sys
import time
import traceback
from collections import Counter
from dataclasses import dataclass, field
from datetime import datetime
from pathlib import Path

from xleq.cells import BLANK, CellAddress
from xleq.errors import XleqError
from xleq.recalc import recalculate
from xleq.recalc.sheets.evaluate import agree, tolerance_of
from xleq.workbook import Book, FormulaKind, open_book

CORPUS = Path(__file__).resolve().parents[3] / "shared" / "corpus"
#: Counted apart: they change with the day, or are not what an engineer's sheet uses.
APART = {
    "volatile": r"NOW|TODAY|RAND|RANDBETWEEN|RANDARRAY|INFO|CELL",
    "finance": r"ACCRINT|ACCRINTM"
    r"|AMORDEGRC|AMORLINC|COUP\w+|CUMIPMT|CUMPRINC|DB|DDB|DISC|DOLLARDE|DOLLARFR|DURATION"
    r"|EFFECT|FV|FVSCHEDULE|INTRATE|IPMT|IRR|ISPMT|MDURATION|MIRR|NOMINAL|NPER|NPV|ODD\w+|PDURATION|PMT|PPMT"
    r"|PRICE|PRICEDISC|PRICEMAT|PV|RATE|RECEIVED|RRI|SLN|SYD|TBILL\w+|VDB|XIRR|XNPV|YIELD|YIELDDISC|YIELDMAT",
    "database": r"DAVERAGE|DCOUNT|DCOUNTA|DGET|DMAX|DMIN|DPRODUCT|DSTDEV|DSTDEVP|DSUM|DVAR|DVARP",
    "roman": r"ROMAN|ARABIC",
}
_APART = {kind: re.compile(rf"(?<![\w.])(?:{names})\(", re.IGNORECASE) for kind, names in APART.items()}


@dataclass
class Tally:
    """What became of a file's formula cells."""

    counts: Counter[str] = field(default_factory=Counter)
    apart: Counter[str] = field(default_factory=Counter)
    functions: Counter[str] = field(default_factory=Counter)
    reasons: Counter[str] = field(default_factory=Counter)
    examples: list[str] = field(default_factory=list)

    def add(self, other: Tally) -> None:
        """Add another file's counts."""
        for name in ("counts", "apart", "functions", "reasons"):
            getattr(self, name).update(getattr(other, name))

    @property
    def share(self) -> float:
        """Equal cells among those not counted apart. [%]"""
        total = sum(self.counts.values())
        return 100.0 * self.counts["equal"] / total if total else 100.0


def kind_apart(text: str) -> str:
    """Why a formula is counted apart; empty if it isn't."""
    return next((kind for kind, pattern in _APART.items() if pattern.search(text)), "")


def examine(book: Book) -> Tally:
    """Recalculate a book, holding its stored values to be true, and compare."""
    done = recalculate(book, {}, now=datetime(2026, 12, 1), trust_fresh=False)
    kept = {k.address: k.reason for k in done.kept}
    disagreed = {d.address: d.fresh for d in done.disagreements}
    followed = set(done.followed)
    changed = {c.address: c.fresh for c in done.changed}
    tally = Tally()
    for sheet in book.sheets:
        for (row, column), formula in sheet.formulas.items():
            address = CellAddress(sheet.name, row, column)
            stored = sheet.stored.get((row, column), BLANK)
            text = formula.text or ""
            if address in kept:
                outcome = "kept"
                tally.reasons[re.sub(r"depends on .*", "depends on …", kept[address])[:90]] += 1
            elif stored is BLANK:
                outcome = "no stored value"
            elif address in disagreed:
                outcome = "disagrees"
            elif address in followed:
                outcome = "equal"
            elif address in changed and not agree(changed[address], stored, tolerance_of(text)):
                outcome = "silently different"
            else:
                outcome = "equal"
            why = kind_apart(text)
            if why:
                tally.apart[f"{why}: {outcome}"] += 1
            elif outcome != "no stored value":
                tally.counts[outcome] += 1
            if outcome in ("disagrees", "silently different", "kept"):
                if not why:
                    for name in set(re.findall(r"([A-Z][A-Z0-9.]+)\(", text)) or {"(none)"}:
                        tally.functions[name] += 1
                shown = disagreed.get(address, changed.get(address, kept.get(address)))
                array = "" if formula.kind is FormulaKind.PLAIN else "{}"
                tally.examples.append(
                    f"{outcome}{' ' + why if why else ''} {address} {array}={text[:100]}"
                    f"  stored {stored!r}  here {shown!r}"
                )
    return tally


def main(arguments: list[str]) -> int:
    """Print the counts of every file."""
    verbose = "-v" in arguments
    folders = [Path(a) for a in arguments if a != "-v"] or [CORPUS / "ironcalc", CORPUS / "poi"]
    worst = 0
    for folder in folders:
        total, excel = Tally(), Tally()
        for path in sorted(folder.glob("**/*.xls[xm]")) if folder.is_dir() else [folder]:
            start = time.perf_counter()
            try:
                book = open_book(path)
                tally = examine(book)
            except XleqError as error:
                print(f"{path.name}: {type(error).__name__}: {error}")
                continue
            except Exception as bug:  # a traceback is what this counts
                where = traceback.extract_tb(bug.__traceback__)[-1]
                print(
                    f"{path.name}: TRACEBACK {type(bug).__name__}: {bug} in {where.filename}:{where.lineno}"
                )
                total.reasons["TRACEBACK"] += 1
                continue
            took = time.perf_counter() - start
            total.add(tally)
            if book.application == "Microsoft Excel":
                excel.add(tally)
            if tally.counts or tally.apart or took > 2:
                print(f"{path.name}: {dict(tally.counts)} {dict(tally.apart)} {took:.2f} s")
            if verbose:
                for line in tally.examples:
                    print("   ", line)
        for title, tally in (("all", total), ("saved by Excel", excel)):
            print(f"== {folder.name}, {title}: {tally.share:.2f} % equal {dict(tally.counts)}")
            print(f"   apart: {dict(tally.apart)}")
        print(f"   not equal, by function: {total.functions.most_common(40)}")
        print(f"   kept because: {total.reasons.most_common(25)}")
        worst = max(worst, total.counts["silently different"])
    return 1 if worst else 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
