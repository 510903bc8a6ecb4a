"""What a quantity is: one measurable behaviour with a unit, computed from patterns and poses.

A quantity is complete on construction: it has asked the plan for all it reads. It has one exact value, reported on the
rounded pattern, and a surrogate that a search can differentiate; for smooth quantities both are the same function.
"""

from __future__ import annotations

from abc import ABC, abstractmethod
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, ClassVar, Literal, Protocol, final, runtime_checkable

import numpy as np
from numpy.typing import NDArray

from .case import Case
from .plan import Plan, Response

Array = NDArray[np.float64]
Params = Mapping[str, Any]
"""Keys of a spec entry without their unit suffix, in SI ("gap_mm" is "gap" in metres); lists are tuples."""


@dataclass(frozen=True, eq=False)
class LinearValue:
    """Values that are linear in the plan's pair rows: ``value[m] = sum_k factors[m, k] * pair[rows[m, k]]``."""

    rows: NDArray[np.intp]
    factors: Array


class Quantity(ABC):
    """Base of every quantity; subclasses are final and stand in the registry under their catalogue name.

    Attributes:
        elements: How many values it has (1, or the length of the one listed key).
        linear: Its values as a combination of pair rows where they are one, else None.
        exact_surrogate: Is the surrogate the exact value on a rounded pattern?
        of_pattern: Does it look at the pattern itself and not at the physics?
        flips_sign: Does its value change when both patterns are reversed together?
    """

    elements: int
    linear: LinearValue | None = None
    exact_surrogate: ClassVar[bool] = False
    of_pattern: ClassVar[bool] = False
    flips_sign: bool = False

    @abstractmethod
    def __init__(self, params: Params, plan: Plan) -> None:
        """Ask ``plan`` for all that the quantity reads."""

    @abstractmethod
    def surrogate(self, response: Response) -> Any:
        """Differentiable value [SI], shape (..., elements)."""

    @abstractmethod
    def exact(self, case: Case) -> Array:
        """Value [SI] of a rounded design, shape (elements,); NaN where it does not exist."""


class SmoothQuantity(Quantity):
    """A quantity whose surrogate is its exact value; subclasses write ``__init__`` and ``surrogate``."""

    exact_surrogate: ClassVar[bool] = True

    @final
    def exact(self, case: Case) -> Array:
        """The surrogate on the design's own numbers [SI], shape (elements,)."""
        return np.asarray(self.surrogate(case.response), dtype=np.float64)


class LinearQuantity(Quantity):
    """A quantity that is linear in the pair rows; subclasses write ``__init__`` and set ``linear`` there."""

    linear: LinearValue
    exact_surrogate: ClassVar[bool] = True

    @final
    def surrogate(self, response: Response) -> Any:
        """Value [SI], shape (..., elements)."""
        return (response.pair[..., self.linear.rows] * self.linear.factors).sum(-1)

    @final
    def exact(self, case: Case) -> Array:
        """The same sum on the design's own numbers [SI], shape (elements,)."""
        return np.asarray(self.surrogate(case.response), dtype=np.float64)


@dataclass(frozen=True)
class Bound:
    """What a require asks of a quantity, SI, one element each.

    Attributes:
        kind: How the value is judged.
        value: Bound or target, shape (elements,).
        within: Half width of the band of an "equal_to", shape (elements,), else zeros.
        scale: The spec's own scale for relative margins, or None.
    """

    kind: Literal["at_least", "at_most", "equal_to"]
    value: Array
    within: Array
    scale: float | None = None


@dataclass(frozen=True, eq=False)
class Conditions:
    """A require as conditions linear in the pair rows: met when ``factors @ pair + constant >= 0``.

    Attributes:
        rows: Pair rows read, shape (condition, k).
        factors: Their factors, shape (condition, k); divided by the scale, so that conditions are comparable.
        constant: shape (condition,).
        counts: Does the condition enter the worst margin that a design maximizes? An equality does not.
    """

    rows: NDArray[np.intp]
    factors: Array
    constant: Array
    counts: bool


@runtime_checkable
class Conditional(Protocol):
    """A quantity that has no smooth value but can say by linear conditions when a bound on it is met."""

    def conditions(self, bound: Bound, plan: Plan) -> Conditions:
        """Sufficient conditions for ``bound``; asks ``plan`` for the rows."""
        ...


def as_tuple(value: Any) -> tuple[Any, ...]:
    """A single value as a tuple of one, a list as a tuple."""
    return tuple(value) if isinstance(value, list | tuple) else (value,)


def gap_offsets(params: Params) -> list[tuple[float, float, float]]:
    """Poses (gap, dx, dy) of an entry that lists its gaps or its offsets."""
    gaps = as_tuple(params["gap"])
    offset = params.get("offset", (0.0, 0.0))
    offsets = [tuple(pair) for pair in offset] if isinstance(offset[0], list | tuple) else [tuple(offset)]
    return [(gap, dx, dy) for gap in gaps for dx, dy in offsets]


def linear_value(rows: list[list[int]], factors: list[list[float]]) -> LinearValue:
    """Build a ``LinearValue`` from lists of equal length."""
    return LinearValue(np.array(rows, dtype=np.intp), np.array(factors, dtype=np.float64))


def safe_norm(xp: Any, vectors: Any) -> Any:
    """Euclidean norm over the last axis whose gradient at zero is zero."""
    square = (vectors * vectors).sum(-1)
    tiny = square <= 1e-300
    return xp.where(tiny, 0.0, xp.sqrt(xp.where(tiny, 1.0, square)))


def smooth_maximum(xp: Any, values: Any, sharpness: float = 64.0) -> Any:
    """Smooth upper estimate of the maximum over the last axis, within log(n) / sharpness of it relatively.

    Values are taken on the scale of the largest size, so that units do not matter; 0, with a gradient of 0, where all
    of them vanish.
    """
    size = xp.abs(values).max(-1, keepdims=True)
    weights = sharpness * values / xp.where(size > 1e-150, size, 1.0)
    top = weights.max(-1, keepdims=True)
    total = xp.log(xp.exp(weights - top).sum(-1)) + top[..., 0]
    return total * size[..., 0] / sharpness
