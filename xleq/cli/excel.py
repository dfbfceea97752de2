"""``xleq excel``: the add-in for Excel for Windows."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

from xleq import __version__


def run_install() -> int:
    """Install and say what was done; gives the exit code."""
    from xleq.functions import TABLE
    from xleq.hosts.excel.addin import install, running_excel

    with running_excel() as excel:
        done = install(excel)
    print(f"built      {done.add_in}: {len(TABLE)} functions")
    print(f"serves     {done.interpreter}, with xlwings {done.xlwings}")
    print(f"installed  in Excel {done.version} ({done.bits} bits); start Excel anew to use it")
    return 0


def run_remove() -> int:
    """Remove and say what was done; gives the exit code."""
    from xleq.hosts.excel.addin import remove, running_excel

    with running_excel() as excel:
        print("removed" if remove(excel) else "there was nothing to remove")
    return 0


def run_status() -> int:
    """Say what is there; gives the exit code, 2 where the add-in could not work."""
    from xleq.hosts.excel.addin import python_bits, running_excel, state

    with running_excel() as excel:
        found = state(excel)
    problem = found.why_unfit()
    print(f"Excel    {found.version}, {found.bits} bits")
    print(f"Python   {found.interpreter}, {python_bits()} bits, xlwings {found.xlwings}")
    print(f"add-in   {found.add_in}, {'installed' if found.installed else 'not installed'}")
    print(f"fit      {'no: ' + problem if problem else 'yes'}")
    return 2 if problem else 0


def run_vba() -> int:
    """Print the VBA module; gives the exit code."""
    from xleq.hosts.excel.vba import pasted_text

    print(pasted_text(), end="")
    return 0


def run_smoke(books: Sequence[Path], out: Path) -> int:
    """Compare workbooks in Excel with their headless values; gives the exit code, 1 where they differ."""
    from xleq.hosts.excel.addin import running_excel
    from xleq.hosts.excel.smoke import compare, report

    with running_excel() as excel:
        found = [compare(excel, book) for book in books]
        heading = f"xleq {__version__} headless beside Excel {excel.Version}"
    out.write_text(report(found, heading), encoding="utf-8")
    n = sum(len(c.differences) for c in found)
    print(f"{len(found)} workbooks, {sum(c.n_cells for c in found)} cells, {n} differ; written {out}")
    return 1 if n else 0
