"""The README's examples show what the program prints."""

from __future__ import annotations

import re
import shlex
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[1]
BLOCKS = re.findall(r"```console\n(.*?)```", (ROOT / "README.md").read_text("utf-8"), re.DOTALL)


def commands() -> list[tuple[str, str]]:
    """Each command of the console blocks, with the output that stands below it."""
    found = []
    for block in BLOCKS:
        for part in re.split(r"^\$ ", block, flags=re.MULTILINE)[1:]:
            command, _, output = part.partition("\n")
            found.append((command, output.strip()))
    return found


@pytest.mark.parametrize(("command", "output"), commands(), ids=[c[:60] for c, _ in commands()])
def test_a_command_of_the_readme_prints_what_stands_below_it(command: str, output: str) -> None:
    words = shlex.split(command)
    assert words[0] == "xleq"
    done = subprocess.run(
        [sys.executable, "-m", "xleq.cli", *words[1:]],
        capture_output=True, text=True, encoding="utf-8", timeout=120, cwd=ROOT,
    )  # fmt: skip
    printed = (done.stdout + done.stderr).strip()
    if output:
        assert printed == output
    else:
        assert done.returncode == 0, printed
