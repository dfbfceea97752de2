"""Runs LibreOffice on a copy of a workbook: throw-away profile, our add-in beside it, a hard time limit."""

from __future__ import annotations

import os
import shutil
import signal
import subprocess
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from xleq.hosts.libreoffice import extension_members

#: Recalculate every file on load, keep the first-start pages away.
_SETTINGS = """<?xml version="1.0" encoding="UTF-8"?>
<oor:items xmlns:oor="http://openoffice.org/2001/registry" xmlns:xs="http://www.w3.org/2001/XMLSchema">
<item oor:path="/org.openoffice.Office.Calc/Formula/Load"><prop oor:name="OOXMLRecalcMode" oor:op="fuse"><value>0</value></prop></item>
<item oor:path="/org.openoffice.Setup/Office"><prop oor:name="ooSetupInstCompleted" oor:op="fuse"><value>true</value></prop></item>
<item oor:path="/org.openoffice.Office.Common/Misc"><prop oor:name="FirstRun" oor:op="fuse"><value>false</value></prop></item>
<item oor:path="/org.openoffice.Office.Common/Misc"><prop oor:name="ShowTipOfTheDay" oor:op="fuse"><value>false</value></prop></item>
<item oor:path="/org.openoffice.Setup/Product"><prop oor:name="LastTimeGetInvolvedShown" oor:op="fuse"><value>4000000000</value></prop></item>
<item oor:path="/org.openoffice.Setup/Product"><prop oor:name="LastTimeDonateShown" oor:op="fuse"><value>4000000000</value></prop></item>
<item oor:path="/org.openoffice.Setup/Product"><prop oor:name="ooSetupLastVersion" oor:op="fuse"><value>25.2</value></prop></item>
</oor:items>
"""  # noqa: E501


def available() -> bool:
    """Whether an office is on the path."""
    return shutil.which("soffice") is not None


@contextmanager
def office_arguments() -> Iterator[list[str]]:
    """Start of a command line: an office with an empty profile and the add-in; all of it goes at the end."""
    home = Path(tempfile.mkdtemp(prefix="xleq-office-"))
    try:
        user = home / "profile" / "user"
        user.mkdir(parents=True)
        (user / "registrymodifications.xcu").write_text(_SETTINGS, encoding="utf-8")
        for name, text in extension_members().items():
            path = home / "extensions" / "xleq" / name
            path.parent.mkdir(parents=True, exist_ok=True)
            path.write_text(text, encoding="utf-8")
        yield [
            "soffice",
            f"-env:UserInstallation=file://{home}/profile",
            f"-env:BUNDLED_EXTENSIONS=file://{home}/extensions",
            "--norestore",
            "--nologo",
            "--nodefault",
        ]
    finally:
        shutil.rmtree(home, ignore_errors=True)


def run(command: list[str], seconds: float, **environment: str) -> str:
    """What a command says; it and all it started are killed when the time is over."""
    process = subprocess.Popen(
        command,
        stdout=subprocess.PIPE,
        stderr=subprocess.STDOUT,
        text=True,
        start_new_session=True,
        env=os.environ | environment,
    )
    try:
        said, _ = process.communicate(timeout=seconds)
    except subprocess.TimeoutExpired as e:
        os.killpg(process.pid, signal.SIGKILL)
        process.communicate()
        raise AssertionError(f"no end after {seconds:g} s: {command}") from e
    assert process.returncode == 0, said
    return said


def recalculated(book: Path, folder: Path, seconds: float = 120.0) -> Path:
    """The workbook as the office saves it after a hard recalculation."""
    source = folder / "given" / book.name
    source.parent.mkdir(parents=True, exist_ok=True)
    shutil.copy(book, source)  # a lock file of a killed run must not lie beside the original
    out = folder / "saved"
    with office_arguments() as start:
        said = run([*start, "--headless", "--convert-to", "xlsx", "--outdir", str(out), str(source)], seconds)
    saved = out / book.with_suffix(".xlsx").name
    assert saved.exists(), said
    return saved
