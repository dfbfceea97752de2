"""Ammonia at equilibrium under pressure beside what was measured: ideal and real gas, a table and a plot.

Run from the project's folder: `python -m tests.reports.ammonia`. The table is printed, the plot goes to
build/ammonia.svg and build/ammonia.png.
"""

from __future__ import annotations

import csv
from dataclasses import dataclass
from pathlib import Path

from xleq.functions import call

REFERENCE = Path(__file__).parents[1] / "reference" / "ammonia.tsv"
BUILD = Path(__file__).parents[2] / "build"


@dataclass(frozen=True, slots=True)
class Point:
    """A measurement, and what the two models make of it; amounts of ammonia in mol%."""

    id: str
    table: str
    t_celsius: float
    p_atm: float
    measured: float
    allow: float
    reason: str
    ideal: float
    real: float

    @property
    def ideal_off(self) -> float:
        """Relative deviation of the ideal gas."""
        return self.ideal / self.measured - 1.0

    @property
    def real_off(self) -> float:
        """Relative deviation of the Peng-Robinson gas."""
        return self.real / self.measured - 1.0


def percent(t_celsius: float, p_atm: float, options: str) -> float:
    """Mol% of ammonia from three parts of hydrogen and one of nitrogen, by the worksheet function."""
    feed = ["N2 + 3 H2 = 2 NH3", "data", "N2; H2; NH3", "1; 3; 0"]
    found = call(
        "XLEQ_COMPOSITION_P",
        [*feed, f"{t_celsius!r} degC", f"{p_atm!r} atm", "fractions NH3", options],
    )
    assert isinstance(found, float), found
    return 100.0 * found


def points(table: str) -> list[Point]:
    """The rows of one of the published tables, computed."""
    with REFERENCE.open(encoding="utf-8") as file:
        rows = list(csv.DictReader((line for line in file if not line.startswith("#")), delimiter="\t"))
    found = []
    for row in rows:
        if row["table"] != table:
            continue
        t, p = float(row["t_degC"]), float(row["p_atm"])
        found.append(
            Point(
                row["id"], table, t, p, float(row["nh3_percent"]), float(row["allow"]), row["reason"],
                percent(t, p, ""), percent(t, p, "gas=PR"),
            )
        )  # fmt: skip
    return found


def table_of(rows: list[Point]) -> str:
    """The deviations, a line for each measurement."""
    lines = ["  T/°C   p/atm  measured     ideal    gas=PR   ideal off  gas=PR off   allowed"]
    for r in rows:
        mark = f"  {r.reason}" if r.reason else ""
        lines.append(
            f"{r.t_celsius:6.0f}{r.p_atm:8.0f}{r.measured:10.2f}{r.ideal:10.2f}{r.real:10.2f}"
            f"{r.ideal_off:12.1%}{r.real_off:12.1%}{r.allow:10.0%}{mark}"
        )
    return "\n".join(lines)


def draw(rows: list[Point], folder: Path) -> list[Path]:
    """The plot as SVG and PNG: composition on the left, deviation on the right."""
    import matplotlib as mpl

    mpl.use("Agg")
    from matplotlib import pyplot as plt

    figure, (left, right) = plt.subplots(1, 2, figsize=(12.0, 5.5), layout="constrained")
    temperatures = sorted({r.t_celsius for r in rows})
    colors = dict(zip(temperatures, plt.get_cmap("viridis")([i / 6.5 for i in range(7)]), strict=True))
    pressures = [10.0 ** (1.0 + 2.0 * k / 40.0) for k in range(41)]
    for t in temperatures:
        here, color = [r for r in rows if r.t_celsius == t], colors[t]
        p = [r.p_atm for r in here]
        left.plot(p, [r.measured for r in here], "o", color=color, label=f"{t:.0f} °C")
        left.plot(pressures, [percent(t, x, "") for x in pressures], "--", color=color, linewidth=0.9)
        left.plot(pressures, [percent(t, x, "gas=PR") for x in pressures], "-", color=color, linewidth=1.2)
        right.plot(
            p, [100.0 * r.ideal_off for r in here], "s--", color=color, fillstyle="none", linewidth=0.9
        )
        right.plot(p, [100.0 * r.real_off for r in here], "o-", color=color, linewidth=1.2)
    left.set(xscale="log", xlabel="pressure, atm", ylabel="ammonia at equilibrium, mol%", ylim=(0.0, 80.0))
    left.legend(title="measured", loc="upper left")
    right.axhspan(-5.0, 5.0, color="0.9", zorder=0)
    right.axhline(0.0, color="0.4", linewidth=0.8)
    right.set(xscale="log", xlabel="pressure, atm", ylabel="deviation from measured, %")
    right.plot([], [], "ks--", fillstyle="none", label="ideal gas")
    right.plot([], [], "ko-", label="Peng–Robinson, kij = 0")
    right.legend(loc="lower left", title="grey: ±5 %")
    figure.suptitle(
        "3 H2 : 1 N2, constants from formation data, beside Larson and Dodge (1923), Larson (1924)"
    )
    folder.mkdir(exist_ok=True)
    paths = [folder / "ammonia.svg", folder / "ammonia.png"]
    for path in paths:
        figure.savefig(path, dpi=110)
    plt.close(figure)
    return paths


def main() -> None:
    """Prints the table and draws the plot."""
    rows = points("larson")
    print(table_of(rows))
    for path in draw(rows, BUILD):
        print(path)


if __name__ == "__main__":
    main()
