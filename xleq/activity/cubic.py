"""Real roots of cubic equations z³ + c2 z² + c1 z + c0 = 0, one at a time and many at once."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


def cubic_roots(c2: float, c1: float, c0: float) -> tuple[float, ...]:
    """Real roots of z³ + c2 z² + c1 z + c0 in rising order.

    The largest is found in closed form and polished; it is divided out by the small coefficients, which keeps
    the small roots of a thin gas exact.
    """
    shift = c2 / 3.0
    p = c1 - c2 * shift
    q = c0 + shift * (2.0 * shift * shift - c1)
    discriminant = q * q / 4.0 + p**3 / 27.0
    if discriminant > 0.0:
        root = math.sqrt(discriminant)
        large = -q / 2.0 + (root if q < 0.0 else -root)
        u = math.copysign(abs(large) ** (1.0 / 3.0), large)
        z = u - p / (3.0 * u) - shift
    elif p == 0.0:
        z = -shift
    else:
        radius = 2.0 * math.sqrt(-p / 3.0)
        z = radius * math.cos(math.acos(max(-1.0, min(1.0, 3.0 * q / (p * radius)))) / 3.0) - shift
    for _ in range(4):
        slope = c1 + z * (2.0 * c2 + 3.0 * z)
        if slope:
            z -= (c0 + z * (c1 + z * (c2 + z))) / slope
    if z == 0.0:
        return (z,)
    q0 = -c0 / z
    q1 = (q0 - c1) / z
    inside = q1 * q1 - 4.0 * q0
    if inside < 0.0:
        return (z,)
    first = -0.5 * (q1 + math.copysign(math.sqrt(inside), q1))
    return tuple(sorted((z, first, q0 / first))) if first else (z,)


def cubic_extremes(c2: Array, c1: Array, c0: Array) -> tuple[Array, Array]:
    """The largest and the smallest real root of many cubics, by the same steps.

    Parameters
    ----------
    c2, c1, c0 : array [n]

    Returns
    -------
    largest, smallest : array [n]
        The same where there is one real root only.

    Examples
    --------
    >>> largest, smallest = cubic_extremes(np.array([-6.0]), np.array([11.0]), np.array([-6.0]))
    >>> round(float(largest[0]), 12), round(float(smallest[0]), 12)
    (3.0, 1.0)
    """
    shift = c2 / 3.0
    p = c1 - c2 * shift
    q = c0 + shift * (2.0 * shift * shift - c1)
    discriminant = q * q / 4.0 + p**3 / 27.0
    one = discriminant > 0.0
    root = np.sqrt(np.where(one, discriminant, 0.0))
    large = -q / 2.0 + np.where(q < 0.0, root, -root)
    u = np.cbrt(large)
    single = u - p / np.where(u == 0.0, 1.0, 3.0 * u)
    radius = 2.0 * np.sqrt(np.maximum(-p, 0.0) / 3.0)
    cosine = 3.0 * q / np.where(p * radius == 0.0, 1.0, p * radius)
    triple = radius * np.cos(np.arccos(np.clip(cosine, -1.0, 1.0)) / 3.0)
    z = np.where(one, single, triple) - shift
    for _ in range(4):
        slope = c1 + z * (2.0 * c2 + 3.0 * z)
        z = z - np.where(
            slope == 0.0, 0.0, (c0 + z * (c1 + z * (c2 + z))) / np.where(slope == 0.0, 1.0, slope)
        )
    safe = np.where(z == 0.0, 1.0, z)
    q0 = -c0 / safe
    q1 = (q0 - c1) / safe
    inside = q1 * q1 - 4.0 * q0
    first = -0.5 * (q1 + np.copysign(np.sqrt(np.maximum(inside, 0.0)), q1))
    second = q0 / np.where(first == 0.0, 1.0, first)
    more = (inside >= 0.0) & (first != 0.0) & (z != 0.0)
    smallest = np.where(more, np.minimum(np.minimum(first, second), z), z)
    return np.where(more, np.maximum(np.maximum(first, second), z), z), smallest
