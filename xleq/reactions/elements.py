"""The chemical elements and their standard atomic weights."""

from __future__ import annotations

from functools import lru_cache
from pathlib import Path
from typing import Final

#: Isotopes that have a symbol of their own. They are conserved apart from H, and have no weight in the table.
ISOTOPES: Final = ("D", "T")


@lru_cache(maxsize=1)
def atomic_weights() -> dict[str, str]:
    """Abridged standard atomic weight of each element as printed, by symbol; empty where there is none.

    Source: Prohaska et al., Pure Appl. Chem. 94 (2022) 573, the 2021 values.

    Examples
    --------
    >>> atomic_weights()["Fe"], atomic_weights()["H"], atomic_weights()["Tc"]
    ('55.845', '1.0080', '')
    """
    table: dict[str, str] = {}
    for line in Path(__file__).with_name("atomic_weights.csv").read_text("utf-8").splitlines():
        if line and not line.startswith(("#", "number,")):
            _, symbol, weight = line.split(",")
            table[symbol] = weight
    return table


@lru_cache(maxsize=1)
def symbols() -> frozenset[str]:
    """Every symbol that a formula may hold.

    Examples
    --------
    >>> len(symbols())
    120
    """
    return frozenset(atomic_weights()) | frozenset(ISOTOPES)
