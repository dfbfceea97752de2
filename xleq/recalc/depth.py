"""How deep formulas may go."""

from __future__ import annotations

import sys
from collections.abc import Iterator
from contextlib import contextmanager
from typing import Final

#: Python frames that the longest sum of 8192 characters needs, compiled and evaluated.
_FRAMES: Final = 16_000
#: Levels that a LAMBDA may call itself, over the number of its parameters and one.
#: (source: Microsoft's documentation of the LAMBDA function)
LAMBDA_LEVELS: Final = 1024


@contextmanager
def deep() -> Iterator[None]:
    """Let Python functions call each other deeply: a long sum is a deep tree, and it is evaluated as one."""
    before = sys.getrecursionlimit()
    sys.setrecursionlimit(max(before, _FRAMES))
    try:
        yield
    finally:
        sys.setrecursionlimit(before)
