"""Gauss-Legendre nodes over a unit cell, graded towards the edges of another cell where the integrand is sharp."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

# Half a panel may be this much of its distance to the nearest edge: with 9 nodes a panel errs by about 1e-10.
_OPEN = 0.6


@dataclass(frozen=True)
class Nodes:
    """A rule on [-1/2, 1/2]: where (n,) and weights (n,), summing to 1."""

    at: Array
    weight: Array


@lru_cache(maxsize=32)
def plain_nodes(count: int) -> Nodes:
    """One panel over the cell with ``count`` Gauss nodes."""
    at, weight = np.polynomial.legendre.leggauss(count)
    return Nodes(at / 2.0, weight / 2.0)


def graded_nodes(shift: float, height: float, count: int) -> Nodes:
    """Panels over a cell at ``shift`` above a cell at 0, broken at its edges and halved towards them.

    Args:
        shift: Centre of the cell along this axis [cells].
        height: Height above the other cell [cells]; the integrand is smooth on this scale.
        count: Gauss nodes a panel.

    Returns:
        The rule in the cell's own coordinate.
    """
    low, high = shift - 0.5, shift + 0.5
    breaks = [low, *(edge for edge in (-0.5, 0.5) if low < edge < high), high]
    panels: list[tuple[float, float]] = []
    waiting = list(pairwise(breaks))
    while waiting:
        start, stop = waiting.pop()
        distance = min(_distance(edge, start, stop) for edge in (-0.5, 0.5))
        if (stop - start) / 2.0 <= _OPEN * np.hypot(distance, height):
            panels.append((start, stop))
        else:
            middle = (start + stop) / 2.0
            waiting += [(start, middle), (middle, stop)]
    rule = plain_nodes(count)
    at = [(start + stop) / 2.0 - shift + (stop - start) * rule.at for start, stop in panels]
    weight = [(stop - start) * rule.weight for start, stop in panels]
    return Nodes(np.concatenate(at), np.concatenate(weight))


def _distance(point: float, start: float, stop: float) -> float:
    return max(start - point, point - stop, 0.0)
