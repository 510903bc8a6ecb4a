"""Requires as conditions of a search: met where they are >= 0, on scales that can be compared."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .quantity import Bound, Conditions, LinearValue

Array = NDArray[np.float64]


def linear_conditions(value: LinearValue, bound: Bound, scale: Array) -> Conditions:
    """Conditions of a bound on a value that is linear in the pair rows; a target gives two, one for each end."""
    factors = value.factors / scale[:, None]
    floor = (factors, (bound.within - bound.value) / scale)
    ceiling = (-factors, (bound.within + bound.value) / scale)
    if bound.kind == "at_least":
        return Conditions(value.rows, *floor, counts=True)
    if bound.kind == "at_most":
        return Conditions(value.rows, *ceiling, counts=True)
    both = (np.concatenate([value.rows, value.rows]), np.concatenate([floor[0], ceiling[0]]))
    return Conditions(*both, np.concatenate([floor[1], ceiling[1]]), counts=False)


def smooth_conditions(bound: Bound, scale: Array) -> tuple[Callable[[Any, Any], Any], int]:
    """The same as a function of any quantity's values (..., elements) and the array module; and how many they are."""
    if bound.kind == "at_least":
        return lambda values, _: (values - bound.value) / scale, bound.value.size
    if bound.kind == "at_most":
        return lambda values, _: (bound.value - values) / scale, bound.value.size

    def both(values: Any, xp: Any) -> Any:
        away, width = (values - bound.value) / scale, bound.within / scale
        return xp.concatenate([width + away, width - away], axis=-1)

    return both, 2 * bound.value.size
