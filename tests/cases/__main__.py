"""Prints how many reference cases are right, refused and wrong: `python -m tests.cases`."""

from __future__ import annotations

import statistics
import sys
from dataclasses import dataclass, field

from tests.cases.reader import FAMILIES, read
from xleq.equilibrium import solve
from xleq.errors import XleqError


@dataclass
class Tally:
    """What became of the cases of one family."""

    right: int = 0
    refused: list[str] = field(default_factory=list)
    wrong: list[str] = field(default_factory=list)
    remarks: list[str] = field(default_factory=list)
    steps: list[int] = field(default_factory=list)


def tally(family: str) -> Tally:
    """Solves every case of a family; wrong is what is certified and yet outside the bar."""
    result = Tally()
    for case in read(family):
        try:
            solution = solve(case.problem)
        except XleqError as error:
            result.refused.append(f"{case.id}: {error}")
            continue
        result.steps.append(solution.iterations)
        if not solution.certificate.ok:
            result.refused.append(f"{case.id}: {solution.certificate.reason}")
        elif case.is_met_by(solution.n):
            result.right += 1
            if solution.status != case.status:
                result.remarks.append(
                    f"{case.id}: called {solution.status}, the reference says {case.status}"
                )
        else:
            result.wrong.append(f"{case.id}: relative error {max(case.errors(solution.n)):.2g}")
    return result


def main() -> int:
    """Prints the table; 1 if a wrong answer was certified."""
    print(f"{'family':8}{'cases':>7}{'right':>7}{'refused':>9}{'wrong':>7}{'median steps':>14}{'worst':>7}")
    wrong = 0
    for family in FAMILIES:
        found = tally(family)
        wrong += len(found.wrong)
        steps = found.steps or [0]
        print(
            f"{family:8}{len(read(family)):7}{found.right:7}{len(found.refused):9}{len(found.wrong):7}"
            f"{statistics.median(steps):14g}{max(steps):7}"
        )
        for line in found.refused:
            print(f"    refused {line}")
        for line in found.remarks:
            print(f"    remark  {line}")
        for line in found.wrong:
            print(f"    WRONG   {line}")
    print(f"wrong answers given as certified: {wrong}")
    return 1 if wrong else 0


if __name__ == "__main__":
    sys.exit(main())
