"""Puts the add-in into an office on this machine, takes it out, and says what is there."""

from __future__ import annotations

import os
import re
import shutil
import subprocess
import sys
import tempfile
from dataclasses import dataclass
from pathlib import Path
from typing import Final

from xleq.errors import HostError
from xleq.hosts.libreoffice.extension import IDENTIFIER, build_extension

#: Oldest office in which plain function names are read from and written to .xlsx files.
OLDEST: Final = (25, 2)
_SECONDS: Final = 120.0
_PLACES: Final = (
    "C:/Program Files/LibreOffice/program/soffice.com",
    "/Applications/LibreOffice.app/Contents/MacOS/soffice",
    "/opt/libreoffice/program/soffice",
)
_PYTHON: Final = re.compile(rb"libpython(3\.\d+)|python(3)(\d+)\.dll")


@dataclass(frozen=True, slots=True)
class OfficeState:
    """An office and the add-in in it.

    Parameters
    ----------
    program : Path
        Its command.
    version : str
        For example ``25.2.3.2``.
    python : str
        Major and minor version of its own Python; empty where it has none.
    add_in : str
        Version of the add-in it has; empty where it has none.
    shared : bool
        Whether the add-in is there for all users.
    """

    program: Path
    version: str
    python: str
    add_in: str
    shared: bool

    def why_unfit(self) -> str:
        """Why the add-in would not work in it; empty where it would."""
        if tuple(int(n) for n in self.version.split(".")[:2]) < OLDEST:
            wanted = ".".join(map(str, OLDEST))
            return f"LibreOffice {self.version} cannot keep these functions in .xlsx files; {wanted} can"
        if not self.python:
            return "this LibreOffice has no Python of its own (Debian's package for it is python3-uno)"
        mine = f"{sys.version_info[0]}.{sys.version_info[1]}"
        if self.python != mine:
            return (
                f"LibreOffice's Python is {self.python}, this environment's is {mine}; "
                f"install xleq with Python {self.python} and run the command from there"
            )
        return ""


def state(office: Path | None = None, profile: Path | None = None) -> OfficeState:
    """The office on this machine and the add-in in it.

    Parameters
    ----------
    office : Path, optional
        The office's command ``soffice``, if it is not where it is looked for.
    profile : Path, optional
        A user profile other than the usual one.

    Raises
    ------
    HostError
        If there is no office, or it does not say what it is.
    """
    program = _find(office)
    said = _run([str(program), *_profile(profile), "--version"])
    match = re.search(r"(\d+\.\d+(?:\.\d+)*)", said)
    if not match:
        raise HostError(f"{program} does not tell its version: {said.strip()[:200]!r}")
    # Run by root, unopkg looks at nothing but what all users have.
    for shared in (True,) if _is_root() else (False, True):
        add_in = _listed(program, profile, shared=shared)
        if add_in:
            return OfficeState(program, match[1], _python_of(program), add_in, shared)
    return OfficeState(program, match[1], _python_of(program), "", False)


def install(office: Path | None = None, profile: Path | None = None) -> OfficeState:
    """Build the add-in from the table of functions and put it in place of any older one.

    It serves the user who runs this; run by root, all users of the machine.

    Raises
    ------
    HostError
        If the office is absent or unfit, or would not take the add-in.
    """
    found = state(office, profile)
    problem = found.why_unfit()
    if problem:
        raise HostError(problem)
    with tempfile.TemporaryDirectory(prefix="xleq-") as folder:
        path = Path(folder) / "xleq.oxt"
        path.write_bytes(build_extension())
        command = [str(_unopkg(found.program)), "add", "--force", *_scope(_is_root())]
        _run([*command, *_profile(profile), str(path)])
    after = state(office, profile)
    if not after.add_in:
        raise HostError("LibreOffice reported no error, yet the add-in is not among its extensions")
    return after


def remove(office: Path | None = None, profile: Path | None = None) -> bool:
    """Take the add-in out; whether there was one.

    Raises
    ------
    HostError
        If the office is absent, or would not let it go.
    """
    found = state(office, profile)
    if not found.add_in:
        return False
    command = [str(_unopkg(found.program)), "remove", *_scope(found.shared), *_profile(profile), IDENTIFIER]
    _run(command)
    return True


def _find(office: Path | None) -> Path:
    if office is not None:
        if not office.is_file():
            raise HostError(f"there is no {office}; give the path of LibreOffice's soffice")
        return office
    on_path = shutil.which("soffice") or shutil.which("libreoffice")
    found = on_path or next((p for p in _PLACES if Path(p).is_file()), None)
    if found is None:
        raise HostError("no LibreOffice was found; give the path of its soffice with --office")
    return Path(found)


def _folder(program: Path) -> Path:
    """The office's folder of programs and libraries."""
    here = program.resolve().parent
    return here if (here / "unopkg").exists() or (here / "unopkg.com").exists() else here.parent / "program"


def _unopkg(program: Path) -> Path:
    folder = _folder(program)
    for name in ("unopkg.com", "unopkg"):
        if (folder / name).is_file():
            return folder / name
    raise HostError(f"there is no unopkg beside {program}, which installs extensions")


def _python_of(program: Path) -> str:
    folder = _folder(program)
    for inside in sorted(folder.glob("python-core-3.*")):
        match = re.match(r"python-core-(3\.\d+)", inside.name)
        if match:
            return match[1]
    # Without a Python of its own, the office is linked with the system's.
    for name in ("libpyuno.so", "libpyuno.dylib", "pyuno.pyd"):
        library = folder / name
        if library.is_file():
            found = _PYTHON.search(library.read_bytes())
            if found:
                return (found[1] or found[2] + b"." + found[3]).decode()
    return ""


def _listed(program: Path, profile: Path | None, *, shared: bool) -> str:
    command = [str(_unopkg(program)), "list", *_scope(shared), *_profile(profile)]
    said = _run(command)
    lines = iter(said.splitlines())
    for line in lines:
        if line.strip() == f"Identifier: {IDENTIFIER}":
            version = next(lines, "").partition(":")[2].strip()
            return version or "unknown"
    return ""


def _scope(shared: bool) -> list[str]:
    return ["--shared"] if shared else []


def _is_root() -> bool:
    return hasattr(os, "geteuid") and os.geteuid() == 0


def _profile(profile: Path | None) -> list[str]:
    return [] if profile is None else [f"-env:UserInstallation={profile.resolve().as_uri()}"]


def _run(command: list[str]) -> str:
    """What the office's command says.

    Raises
    ------
    HostError
        If it fails or does not end in time.
    """
    try:
        done = subprocess.run(
            command, capture_output=True, text=True, timeout=_SECONDS, check=False, stdin=subprocess.DEVNULL
        )
    except subprocess.TimeoutExpired as e:
        raise HostError(
            f"{command[0]} did not end after {_SECONDS:g} s; close LibreOffice and try again"
        ) from e
    except OSError as e:
        raise HostError(f"{command[0]} cannot be run: {e.strerror}") from e
    if done.returncode:
        said = " ".join((done.stderr or done.stdout).split())
        raise HostError(f"{Path(command[0]).name} failed: {said[:400] or f'exit code {done.returncode}'}")
    return done.stdout
