"""Symmetries of a pattern on a square lattice: which cells share one polarity, or opposite ones."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
from numpy.typing import NDArray

Move = Callable[[NDArray[Any]], NDArray[Any]]


def _flip_x(array: NDArray[Any]) -> NDArray[Any]:
    return array[..., ::-1]


def _flip_y(array: NDArray[Any]) -> NDArray[Any]:
    return array[..., ::-1, :]


def _turn(quarters: int) -> Move:
    def turned(array: NDArray[Any]) -> NDArray[Any]:
        return np.rot90(array, quarters, axes=(-2, -1))

    return turned


IMAGES: dict[str, tuple[tuple[Move, int], ...]] = {
    "none": (),
    "half-turn": ((_turn(2), 1),),
    "quarter-turn": ((_turn(1), 1), (_turn(2), 1), (_turn(3), 1)),
    "even-x": ((_flip_x, 1),),
    "even-y": ((_flip_y, 1),),
    "odd-x": ((_flip_x, -1),),
    "odd-y": ((_flip_y, -1),),
    "odd-xy": ((_flip_x, -1), (_flip_y, -1), (_turn(2), 1)),
}
"""Every image of a pattern (y, x last axes) but itself, with its sign: ``sign * move(pattern)`` equals the pattern."""
