"""About the program: `XLEQ_VERSION`."""

from __future__ import annotations

from typing import Final

from xleq import __version__
from xleq.functions.table import Example, Function


def version() -> str:
    """Version of the program, and of its data where they are its own."""
    return f"xleq {__version__}"


FUNCTIONS: Final = (
    Function(
        "XLEQ_VERSION", "program", (), "program and data version, as text", version, (), "the program itself",
        (Example("=XLEQ_VERSION()", version()),),
    ),
)  # fmt: skip
