"""``xleq recalc`` and ``xleq check``: whole workbooks."""

from __future__ import annotations

import json
import sys
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import TypeVar

from xleq.cells import CellError, Value
from xleq.cli.show import plain, shown
from xleq.errors import InputError, XleqError
from xleq.hosts.headless import FileReport, read_limits, recalculate_file

_T = TypeVar("_T")

#: Lines of each kind that a terminal gets; JSON has all.
_MOST_LINES = 20


def run(
    books: Sequence[Path],
    *,
    out: Path | None,
    in_place: bool,
    settings: Sequence[str],
    trust_fresh: bool,
    limits: Sequence[str],
    as_json: bool,
) -> int:
    """Recalculate and write each workbook; gives the exit code."""
    if in_place == (out is not None):
        raise InputError("say where the result goes: -o FILE for a copy, or --in-place")
    if out is not None and len(books) > 1 and not out.is_dir():
        raise InputError(f"{len(books)} workbooks need a folder that exists after -o, not {out}")
    allowed, seconds = read_limits(limits)
    worst = 0
    for path in books:
        target = out / path.name if out is not None and out.is_dir() else out
        try:
            report = recalculate_file(
                path,
                target,
                in_place=in_place,
                settings=settings,
                trust_fresh=trust_fresh,
                limits=allowed,
                seconds=seconds,
            )
        except XleqError as e:
            worst = max(worst, _refused(path, e, as_json))
            continue
        _tell(report, as_json=as_json)
        worst = max(worst, 0 if report.complete else 3)
    return worst


def run_check(books: Sequence[Path], *, limits: Sequence[str], as_json: bool) -> int:
    """Recalculate each workbook without writing; gives the exit code, 1 where values differ."""
    allowed, seconds = read_limits(limits)
    codes = []
    for path in books:
        try:
            report = recalculate_file(path, limits=allowed, seconds=seconds)
        except XleqError as e:
            codes.append(_refused(path, e, as_json))
            continue
        _tell(report, as_json=as_json)
        codes.append(1 if report.found.changed or report.found.disagreements else 0 if report.complete else 3)
    # A difference says more than a refusal of another file, a refusal more than kept cells.
    return next((code for code in (1, 2, 3) if code in codes), 0)


def _refused(path: Path, error: XleqError, as_json: bool) -> int:
    message = str(error)
    if as_json:
        print(json.dumps({"workbook": str(path), "refused": message, "code": error.code}, ensure_ascii=False))
    else:
        print(f"xleq: {message}", file=sys.stderr)
    return 2


def _tell(report: FileReport, *, as_json: bool) -> None:
    if as_json:
        print(json.dumps(as_record(report), ensure_ascii=False))
        return
    found, written = report.found, report.written
    print(
        f"{report.path}: {found.n_formulas} formulas, {len(found.changed)} cells changed, "
        f"{len(found.kept)} kept, {len(found.disagreements)} disagree"
    )
    _lines("changed", found.changed, lambda c: f"{c.address}  {_stored(c.stored)} → {shown(c.fresh)}")
    _lines("errors", report.errors(), lambda e: f"{e[0]}  {e[1].code}  {e[1].reason}")
    _lines("kept their stored value", found.kept, lambda k: f"{k.address}  {_stored(k.stored)}  {k.reason}")
    _lines(
        "disagree with their stored value",
        found.disagreements,
        lambda d: f"{d.address}  stored {_stored(d.stored)}, computed {_full(d.fresh)}",
    )
    _lines("depend on those", found.marked, lambda m: f"{m.address}  through {m.because}")
    if written is not None:
        kept = f"; the old one is {written.backup}" if written.backup else ""
        print(f"written {written.path}{kept}")


def _lines(head: str, items: Sequence[_T], line: Callable[[_T], str]) -> None:
    if items:
        print(f"  {head}:")
        for item in items[:_MOST_LINES]:
            print(f"    {line(item)}")
        if len(items) > _MOST_LINES:
            print(f"    … and {len(items) - _MOST_LINES} more (--json lists all)")


def _stored(value: Value) -> str:
    return shown(value) or "nothing"


def _full(value: Value) -> str:
    return f"{value.code} ({value.reason})" if isinstance(value, CellError) and value.reason else shown(value)


def as_record(report: FileReport) -> dict[str, object]:
    """A report as plain data, for JSON."""
    found, written = report.found, report.written
    return {
        "workbook": str(report.path),
        "written": str(written.path) if written else None,
        "backup": str(written.backup) if written and written.backup else None,
        "formulas": found.n_formulas,
        "seconds": round(found.seconds, 3),
        "changed": [
            {"cell": str(c.address), "stored": plain(c.stored), "fresh": plain(c.fresh)}
            for c in found.changed
        ],
        "errors": [{"cell": str(a), "error": e.code, "reason": e.reason} for a, e in report.errors()],
        "kept": [{"cell": str(k.address), "stored": plain(k.stored), "reason": k.reason} for k in found.kept],
        "disagreements": [
            {"cell": str(d.address), "stored": plain(d.stored), "fresh": plain(d.fresh)}
            for d in found.disagreements
        ],
        "marked": [{"cell": str(m.address), "because": str(m.because)} for m in found.marked],
    }
