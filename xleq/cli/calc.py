"""``xleq calc``: the add-in for LibreOffice Calc."""

from __future__ import annotations

from pathlib import Path

from xleq.functions import TABLE
from xleq.hosts import libreoffice
from xleq.hosts.libreoffice import OfficeState


def run_install(office: Path | None) -> int:
    """Install and say what was done; gives the exit code."""
    done = libreoffice.install(office)
    whom = "all users of this machine" if done.shared else "you"
    print(
        f"installed: {len(TABLE)} functions, add-in {done.add_in}, in LibreOffice {done.version} for {whom}; "
        "start LibreOffice anew to use them"
    )
    return 0


def run_remove(office: Path | None) -> int:
    """Remove and say what was done; gives the exit code."""
    print("removed" if libreoffice.remove(office) else "there was nothing to remove")
    return 0


def run_status(office: Path | None) -> int:
    """Say what is there; gives the exit code, 2 where the add-in could not work."""
    found = libreoffice.state(office)
    for line in _lines(found):
        print(line)
    return 2 if found.why_unfit() else 0


def _lines(found: OfficeState) -> list[str]:
    problem = found.why_unfit()
    scope = " for all users" if found.shared else ""
    return [
        f"LibreOffice  {found.version}  {found.program}",
        f"its Python   {found.python or 'none'}",
        f"add-in       {found.add_in + scope if found.add_in else 'not installed'}",
        f"fit          {'no: ' + problem if problem else 'yes'}",
    ]
