"""Goals of a spec: requires (hard bounds) and improves (directions), with their relative margins."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from ..models.units import FACTORS
from .quantity import Bound, Params

Array = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Require:
    """A hard bound on a quantity: its name, its keys and the bound, all in SI."""

    quantity: str
    params: Params
    bound: Bound


@dataclass(frozen=True, eq=False)
class Improve:
    """A quantity to push in one direction.

    Attributes:
        quantity: Name.
        params: Keys in SI.
        sense: Direction; "toward" minimizes the rms deviation from ``target``.
        target: Target of each element [SI], or None.
        log: Is its logarithm what counts (a quantity that spans decades)?
    """

    quantity: str
    params: Params
    sense: Literal["maximize", "minimize", "toward"]
    target: Array | None = None
    log: bool = False


def relative_margins(bound: Bound, values: Array, unit: str) -> Array:
    """Relative margin of each element; >= 0 is met, -inf where the value does not exist.

    (value - bound) / max(|bound|, scale), mirrored for a ceiling; (within - |value - target|) / max(|target|, scale)
    for a target. Without a scale of its own, an element whose bound is 0 takes the largest size seen on the list.

    Args:
        bound: What is asked [SI].
        values: Exact values [SI], shape (..., elements).
        unit: The quantity's unit in specs; its size stands in where every value on the list is 0.
    """
    size = np.abs(bound.value)
    if bound.scale is not None:
        size = np.maximum(size, bound.scale)
    else:
        seen = np.nan_to_num(np.abs(values)).max(-1, keepdims=True)
        size = np.where(size > 0.0, size, np.where(seen > 0.0, seen, FACTORS[unit]))
    if bound.kind == "at_least":
        margins = (values - bound.value) / size
    elif bound.kind == "at_most":
        margins = (bound.value - values) / size
    else:
        margins = (bound.within - np.abs(values - bound.value)) / size
    return np.where(np.isnan(margins), -np.inf, margins)


def improvement(improve: Improve, values: Any, xp: Any) -> Any:
    """What an improve counts, larger is better, shape (...): the worst of a list, or minus the rms deviation."""
    if improve.sense == "toward":
        return -xp.sqrt(((values - improve.target) ** 2).mean(-1) + 1e-300)
    if improve.log:
        values = xp.log(xp.abs(values) + 1e-300)
    return values.min(-1) if improve.sense == "maximize" else -values.max(-1)
