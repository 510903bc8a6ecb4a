"""Curves over the gap: the grid a search reads, and exact crossings and extremes found on the true curve."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import brentq, minimize_scalar

Array = NDArray[np.float64]
Curve = Callable[[Array], Array]

FINE = 97
"""Points of the grid on which an exact curve is looked at before its features are refined."""


def gap_grid(between: tuple[float, float], cell: float, count: int) -> Array:
    """Gaps over a range, denser near contact, both ends included [m].

    The force falls off over about a cell near contact and over the face's size further out, so steps grow with the
    gap.
    """
    low, high = between
    return np.asarray(np.expm1(np.linspace(np.log1p(low / cell), np.log1p(high / cell), count)) * cell)


def crossings(curve: Curve, gaps: Array, values: Array) -> Array:
    """Gaps where a sampled curve changes sign, refined on the curve itself to 1e-9 of the range [m]."""
    found = []
    for left, right, at_left, at_right in zip(gaps[:-1], gaps[1:], values[:-1], values[1:], strict=True):
        if at_left == 0.0:
            found.append(left)
        elif at_left * at_right < 0.0:
            # a force that cancels is rounding noise: computed anew, its sign at the ends could be another one
            ends = {float(left): float(at_left), float(right): float(at_right)}
            found.append(brentq(_between(curve, ends), left, right, xtol=1e-9 * gaps[-1]))
    return np.array(found)


def _between(curve: Curve, ends: dict[float, float]) -> Callable[[float], float]:
    """The curve at one gap, as sampled at its ``ends``."""
    return lambda gap: ends[gap] if gap in ends else float(curve(np.array([gap]))[0])


def extreme(curve: Curve, gaps: Array, values: Array) -> float:
    """Largest value of a curve over its range, refined between the samples beside the best one."""
    best = int(np.argmax(values))
    low, high = gaps[max(best - 1, 0)], gaps[min(best + 1, gaps.size - 1)]
    inside = minimize_scalar(
        lambda gap: -float(curve(np.array([gap]))[0]),
        bounds=(low, high),
        method="bounded",
        options={"xatol": 1e-6 * high},
    )
    return float(max(values[best], -inside.fun))
