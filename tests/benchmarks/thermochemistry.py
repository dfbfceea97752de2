"""Times constants from formation data and a carbonate water, beside what an engineer writes by hand.

Run from the project's folder: `python -m tests.benchmarks.thermochemistry`. Every peer is timed in the same
run, on the same numbers, and its result is compared: a ratio of times of different answers means nothing.
"""

from __future__ import annotations

import math
import time
from collections.abc import Callable

import numpy as np

from xleq.activity import debye_huckel_a
from xleq.functions import call
from xleq.reactions import parse_reaction
from xleq.thermo import reaction_data, standard_table
from xleq.units import R

REACTION = "CH4 + H2O = CO + 3 H2"
NU = {"CH4(g)": -1.0, "H2O(g)": -1.0, "CO(g)": 1.0, "H2(g)": 3.0}
INSTANCES = 10_000
WATER_REACTIONS = (
    "CO2(aq) + H2O = HCO3- + H+; HCO3- = CO3-2 + H+; H2O = H+ + OH-; Ca+2 + HCO3- = CaHCO3+; "
    "Ca+2 + CO3-2 = CaCO3(aq)"
)
#: L. N. Plummer and E. Busenberg, Geochim. Cosmochim. Acta 46 (1982) 1011, at 25 °C; log10.
WATER_K = (-6.352, -10.329, -13.995, 1.106, 3.224)
WATER_SPECIES = "CO2(aq); HCO3-; CO3-2; H+; OH-; Ca+2; CaHCO3+; CaCO3(aq); Na+; Cl-"
#: Total carbonate, calcium, sodium and chloride. [mol/L]
CARBON, CALCIUM, SODIUM, CHLORIDE = 4e-3, 1e-3, 3e-3, 2e-3


def best(run: Callable[[int], object], count: int, rounds: int = 7) -> float:
    """Time of one call [s]: the least mean of some rounds, each call with a number of its own."""
    times = []
    for r in range(rounds):
        start = time.perf_counter()
        for i in range(count):
            run(r * count + i)
        times.append((time.perf_counter() - start) / count)
    return min(times)


def by_hand() -> Callable[[float], float]:
    """Ln K from coefficients of heat capacity typed into a script: a loop over species."""
    table = standard_table()
    rows = [(nu, [tuple(i) for i in table.find(key).intervals]) for key, nu in NU.items()]

    def ln_k(t: float) -> float:
        x, total = t / 1000.0, 0.0
        for nu, intervals in rows:
            for low, high, a, b, c, d, e, f, g in intervals:
                if low <= t <= high:
                    h = a * x + b * x**2 / 2 + c * x**3 / 3 + d * x**4 / 4 - e / x + f
                    s = a * math.log(x) + b * x + c * x**2 / 2 + d * x**3 / 3 - e / (2 * x**2) + g
                    total += nu * (h * 1000.0 - t * s)
                    break
        return -total / (R * t)

    return ln_k


def many_by_hand(t: np.ndarray) -> np.ndarray:
    """The same for an array of temperatures, masked by interval."""
    table = standard_table()
    x, total = t / 1000.0, np.zeros_like(t)
    for key, nu in NU.items():
        for low, high, a, b, c, d, e, f, g in table.find(key).intervals:
            at = (t >= low) & (t < high)
            y = x[at]
            h = a * y + b * y**2 / 2 + c * y**3 / 3 + d * y**4 / 4 - e / y + f
            s = a * np.log(y) + b * y + c * y**2 / 2 + d * y**3 / 3 - e / (2 * y**2) + g
            total[at] += nu * (h * 1000.0 - t[at] * s)
    return -total / (R * t)


def water_by_fsolve(carbon: float, options: str) -> np.ndarray:
    """The water on ln c: five laws, two totals and the charge; with options, Davies by its formula."""
    from scipy.optimize import fsolve

    ln_k = np.array(WATER_K) * math.log(10.0)
    slope = debye_huckel_a(298.15) * math.log(10.0) if options else 0.0
    z2 = np.array([0.0, 1.0, 4.0, 1.0, 1.0, 4.0, 1.0, 0.0])

    def residual(y: np.ndarray) -> np.ndarray:
        c = np.exp(y)
        strength = 0.5 * (float(z2 @ c) + SODIUM + CHLORIDE)
        root = math.sqrt(strength)
        co2, hco3, co3, h, oh, ca, cahco3, caco3 = y - slope * z2 * (root / (1.0 + root) - 0.3 * strength)
        charge = c[3] + 2 * c[5] + c[6] + SODIUM - c[1] - 2 * c[2] - c[4] - CHLORIDE
        return np.array(
            [
                hco3 + h - co2 - ln_k[0], co3 + h - hco3 - ln_k[1], h + oh - ln_k[2],
                cahco3 - ca - hco3 - ln_k[3], caco3 - ca - co3 - ln_k[4],
                math.log(max(c[0] + c[1] + c[2] + c[6] + c[7], 1e-300) / carbon),
                math.log(max(c[5] + c[6] + c[7], 1e-300) / CALCIUM), charge / CALCIUM,
            ]
        )  # fmt: skip

    start = np.log([1e-4, 3e-3, 1e-5, 1e-8, 1e-6, 1e-3, 1e-5, 1e-6])
    return np.array([*np.exp(fsolve(residual, start, xtol=1e-12)), SODIUM, CHLORIDE])


def water(carbon: float, options: str) -> np.ndarray:
    """The same by the worksheet function, from carbon dioxide, bicarbonate, calcium, sodium and chloride."""
    bicarbonate = 2 * CALCIUM + SODIUM - CHLORIDE
    initial = [[carbon - bicarbonate], [bicarbonate], *([0.0] for _ in "...")]
    initial += [[CALCIUM], [0.0], [0.0], [SODIUM], [CHLORIDE]]
    k = "; ".join(f"log10 {value}" for value in WATER_K)
    found = call(
        "XLEQ_COMPOSITION_C", [WATER_REACTIONS, k, WATER_SPECIES, initial, "concentrations", options]
    )
    assert isinstance(found, list), (found, getattr(found, "reason", ""))
    return np.array([row[0] for row in found])


def show(title: str, ours: float, hand: float, bar: float, unit: float = 1e6, name: str = "µs") -> None:
    """Prints one line: ours, the peer's, their ratio, and the bar."""
    met = "met" if ours <= bar else "MISSED"
    print(
        f"  {title:44}{unit * ours:10.2f}{unit * hand:12.2f} {name}{ours / hand:9.2f}x"
        f"   bar {unit * bar:g} {name} {met}"
    )


def main() -> None:
    """Prints the table."""
    print(f"{'':46}{'xleq':>10}{'by hand':>12}{'ratio':>13}")
    data, hand = reaction_data(parse_reaction(REACTION, "g")), by_hand()
    assert math.isclose(data.ln_k(1000.0), hand(1000.0), rel_tol=1e-9)
    hand_alone = best(lambda i: hand(600.0 + i * 0.01), 2000)
    show("K from data, alone, core", best(lambda i: data.ln_k(600.0 + i * 0.01), 2000), hand_alone, 40e-6)
    cell = best(lambda i: call("XLEQ_K_DATA", [REACTION, 600.0 + i * 0.01]), 2000)
    show("K from data, alone, XLEQ_K_DATA", cell, hand_alone, 40e-6)
    t = np.linspace(500.0, 1900.0, INSTANCES)
    assert np.allclose(data.ln_k_many(t), many_by_hand(t), rtol=1e-9, atol=1e-9)
    ours, theirs = (best(lambda _, f=f: f(t), 5) / INSTANCES for f in (data.ln_k_many, many_by_hand))
    show(f"K from data, batch of {INSTANCES:,}", ours, theirs, 3e-6)
    for options in ("", "activity=davies"):
        assert np.allclose(water(CARBON, options), water_by_fsolve(CARBON, options), rtol=1e-6), options
        theirs = best(lambda i, o=options: water_by_fsolve(CARBON + i * 1e-9, o), 30)
        ours = best(lambda i, o=options: water(CARBON + i * 1e-9, o), 30)
        title = f"carbonate water of 10 species, {options or 'ideal'}"
        show(title, ours, theirs, 10e-3, 1e3, "ms")


if __name__ == "__main__":
    main()
