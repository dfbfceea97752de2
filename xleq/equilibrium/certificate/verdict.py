"""What the parts of a certificate agree on: tolerances, and the record they hand to the front door."""

from __future__ import annotations

from typing import NamedTuple

#: Largest relative change that the residuals may make in an amount.
ERROR_TOLERANCE = 1e-10
#: Largest relative change that rounding of ln K and of the amounts may make before the answer is refused.
ROUNDING_TOLERANCE = 1e-6
#: Largest relative departure from a balance, in terms of the amounts at equilibrium.
BALANCE_TOLERANCE = 1e-11
#: Rounding of a logarithm or a product, with some room.
ROUNDING = 1e-15
#: ln of the amount below which 0 is given instead.
LN_SMALLEST = -690.0


class Verdict(NamedTuple):
    """Result of a part: empty reason when nothing failed."""

    reason: str
    residuals: tuple[float, ...]
    balance: float
    error: float
