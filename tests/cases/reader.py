"""Reads the reference cases: 791 ideal equilibrium problems with answers from slow, exact arithmetic.

`single.jsonl.gz` (472), `multi.jsonl.gz` (186), `solids.jsonl.gz` (133): one JSON object a line. The
answers were found with 420-digit arithmetic by bisection or Newton, every set of solids tried, and confirmed
by a second program (largest residual 7e-60); 21 digits of them are kept. The values of K are illustrative.

Fields: `id`, `title`, `tags`; `species`; `phases`, a letter each, f fluid or p pure; `nu`, a text of exact
rationals for each reaction, products positive; `n0` [mol]; `ln_k`; `kind` P, V or C with `t` [K], `p` [bar]
or `v` [L]; and the answer: `status`, `n` [mol, decimal text], `kappa`, the relative condition number of each
amount: the sum of |d ln n_i / d ln n0_j| and of |d ln n_i / d ln K_r| |ln K_r|.
"""

from __future__ import annotations

import gzip
import json
from dataclasses import dataclass
from decimal import Decimal
from fractions import Fraction
from functools import lru_cache
from pathlib import Path

from xleq.equilibrium.problem import Phase, Problem, State

FAMILIES = ("single", "multi", "solids")
#: Amounts below this count as 0: a double holds them no longer with full precision.
VANISHING = 1e-300


@dataclass(frozen=True)
class Case:
    """A problem with its exact answer."""

    id: str
    family: str
    title: str
    tags: tuple[str, ...]
    problem: Problem
    status: str
    n: tuple[Decimal, ...]
    kappa: tuple[float, ...]

    def bars(self) -> tuple[float, ...]:
        """The relative error allowed: 1e-9; for single reactions 100 kappa 2.2e-16 where that is more."""
        if self.family == "single":
            return tuple(max(1e-9, 100.0 * k * 2.2e-16) for k in self.kappa)
        return (1e-9,) * len(self.n)

    def errors(self, n: tuple[float, ...]) -> tuple[float, ...]:
        """The relative error of each amount [n_species]; absolute below 1e-300 mol, where 0 is right too."""
        return tuple(_error(float_, exact) for float_, exact in zip(n, self.n, strict=True))

    def is_met_by(self, n: tuple[float, ...]) -> bool:
        """Whether every amount is within its bar."""
        return all(error <= bar for error, bar in zip(self.errors(n), self.bars(), strict=True))


def _error(found: float, exact: Decimal) -> float:
    if exact < Decimal(VANISHING):
        return 0.0 if 0.0 <= found < 2.0 * VANISHING else float("inf")
    if not found >= 0.0 or found == float("inf"):
        return float("inf")
    return float(abs(Decimal(found) - exact) / exact)


@lru_cache
def read(family: str) -> tuple[Case, ...]:
    """The cases of one family."""
    with gzip.open(Path(__file__).with_name(f"{family}.jsonl.gz"), "rt", encoding="utf-8") as lines:
        return tuple(_case(family, json.loads(line)) for line in lines)


def _case(family: str, row: dict) -> Case:
    phases: tuple[Phase, ...] = tuple("fluid" if letter == "f" else "pure" for letter in row["phases"])
    state = State(row["kind"], row["t"], row.get("p", float("nan")), row.get("v", 1.0))
    nu = tuple(tuple(Fraction(text) for text in line.split()) for line in row["nu"])
    problem = Problem(
        tuple(row["species"]), phases, nu, tuple(map(float, row["n0"])), tuple(map(float, row["ln_k"])), state
    )
    n = tuple(map(Decimal, row["n"].split()))
    return Case(
        row["id"],
        family,
        row["title"],
        tuple(row["tags"]),
        problem,
        row["status"],
        n,
        tuple(map(float, row["kappa"])),
    )
