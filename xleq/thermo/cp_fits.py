"""Cp brought to one form: least squares on a function, or on single values of a NIST-JANAF table.

Only the maker of ``species.csv`` uses it; the package `janaf` is of the test extra.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


@dataclass(slots=True)
class Piece:
    """Cp on one interval: coefficients A to E, enthalpy of transition on entering it [kJ/mol], deviation."""

    t_min: float
    t_max: float
    coefficients: tuple[float, ...]
    dh_tr: float = 0.0
    fit: float = 0.0


def _basis(t: Array, terms: int = 5) -> Array:
    x = t / 1000.0
    return np.stack([np.ones_like(x), x, x**2, x**3, x**-2], axis=1)[:, [0, 1, 4, 2, 3][:terms]]


def _fit(t: Array, cp: Array, lows: Array, highs: Array, means: Array) -> tuple[tuple[float, ...], float]:
    """Coefficients A to E through Cp at points and its means over intervals; the worst relative deviation."""
    terms = max(1, min(5, (len(t) + len(means)) // 2))
    order = [0, 1, 4, 2, 3][:terms]
    x0, x1 = lows / 1000.0, highs / 1000.0
    width = x1 - x0
    integrals = np.stack(
        [width, (x1**2 - x0**2) / 2, (x1**3 - x0**3) / 3, (x1**4 - x0**4) / 4, 1 / x0 - 1 / x1], axis=1
    )[:, order]
    rows = np.vstack([_basis(t, terms) / cp[:, None], integrals / (width * means)[:, None]])
    weights = np.ones(len(rows))
    if (
        len(means) and terms > 1
    ):  # the enthalpy of the whole interval is kept, whatever Cp does inside (λ peaks)
        total = integrals.sum(axis=0) / float(np.sum(width * means))
        rows, weights = np.vstack([rows, total]), np.append(weights, 1e4)
    solution = np.linalg.lstsq(rows * weights[:, None], weights, rcond=None)[0]
    coefficients = [0.0] * 5
    for place, value in zip(order, solution, strict=True):
        coefficients[place] = float(f"{value:.7g}")
    worst = float(np.max(np.abs(rows @ solution - 1.0)))
    return tuple(coefficients), worst


def fit_function(
    cp: Callable[[float], float], t_min: float, t_max: float, tolerance: float = 1e-3
) -> list[Piece]:
    """Cp in as few intervals (at most four) as keep the worst deviation within the tolerance."""
    none = np.empty(0)
    best: list[Piece] = []
    for count in range(1, 5):
        ends = [t_min * (t_max / t_min) ** (i / count) for i in range(count + 1)]
        ends = [t_min, *(50.0 * round(e / 50.0) for e in ends[1:-1]), t_max]
        best = []
        for low, high in pairwise(ends):
            t = low + (high - low) * (1 - np.cos(np.linspace(0, math.pi, 61))) / 2
            values = np.array([cp(float(x)) for x in t])
            coefficients, worst = _fit(t, values, none, none, none)
            best.append(Piece(low, high, coefficients, fit=worst))
        if max(p.fit for p in best) <= tolerance:
            break
    return best


def fit_janaf(table: str, t_start: float, t_end: float, tolerance: float = 3e-3) -> list[Piece]:
    """Cp fitted to single values of a NIST-JANAF table, cut at its transitions."""
    points, jumps = janaf_points(table)
    pieces: list[Piece] = []
    low = 0
    for i in range(1, len(points) + 1):
        if i < len(points) and points[i][0] > points[i - 1][0]:
            continue
        group = [p for p in points[low:i] if t_start - 1e-6 <= p[0] <= t_end + 1e-6]
        low = i
        if len(group) > 1:
            pieces += _split(group, tolerance, jumps.get(group[0][0], 0.0) if pieces else 0.0)
    return pieces


def _split(group: list[tuple[float, float, float]], tolerance: float, jump: float) -> list[Piece]:
    t, cp, h = (np.array(column) for column in zip(*group, strict=True))
    means = np.diff(h) * 1000.0 / np.diff(t)
    keep = np.diff(t) > 5.0
    coefficients, worst = _fit(t, cp, t[:-1][keep], t[1:][keep], means[keep])
    if worst > tolerance and len(group) >= 6:
        peak = int(np.argmax(cp))
        lambda_like = 1 < peak < len(group) - 2 and cp[peak] > 1.2 * float(np.median(cp))
        middle = peak if lambda_like else len(group) // 2
        return _split(group[: middle + 1], tolerance, jump) + _split(group[middle:], tolerance, 0.0)
    return [Piece(float(t[0]), float(t[-1]), coefficients, jump, worst)]


def janaf_points(table: str) -> tuple[list[tuple[float, float, float]], dict[float, float]]:
    """Points (T, Cp, H − H(298.15)) of a table from 200 K up, and jumps of H at transitions [K, J, kJ]."""
    import janaf

    frame = janaf.Table(index=table).df
    points: list[tuple[float, float, float]] = []
    jumps: dict[float, float] = {}
    for row in frame.iter_rows(named=True):
        t, cp, h = row["T(K)"], row["Cp"], row["H-H(Tr)"]
        if t is None or cp is None or h is None or t < 200.0 or cp <= 0.0:
            continue
        if points and points[-1][0] == t:
            if abs(points[-1][1] - cp) < 0.01 and abs(points[-1][2] - h) < 1e-3:
                continue
            jumps[t] = round(h - points[-1][2], 6)
        points.append((t, cp, h))
    return points, jumps
