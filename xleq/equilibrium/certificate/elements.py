"""Element and charge balances from the formulas of the species."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from fractions import Fraction


def element_imbalance(
    formulas: Sequence[Mapping[str, Fraction] | None], n0: Sequence[float], n: Sequence[float]
) -> tuple[float, str]:
    """The worst balance: its departure relative to the largest total on either side, and its name.

    A species without a formula may only keep its amount; if it does not, no balance can be made and the
    result is (0, "").

    Parameters
    ----------
    formulas : sequence [n_species] of mapping element -> count, or None
        Charge stands under "e".
    n0, n : sequence [n_species] of float
        Amounts fed and found. [mol]
    """
    change: dict[str, float] = {}
    total: dict[str, float] = {}
    for formula, fed, found in zip(formulas, n0, n, strict=True):
        if formula is None:
            if fed != found:
                return 0.0, ""
            continue
        moved = found - fed
        size = found if found > fed else fed
        for element, count in formula.items():
            number = count.numerator / count.denominator
            change[element] = change.get(element, 0.0) + number * moved
            total[element] = total.get(element, 0.0) + abs(number) * size
    worst, what = 0.0, ""
    for element, moved in change.items():
        if moved and abs(moved) > worst * total[element]:
            worst, what = abs(moved) / total[element], "charge" if element == "e" else f"element {element}"
    return worst, what
