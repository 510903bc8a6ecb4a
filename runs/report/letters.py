"""Where the letters N and S go: one on every pole, more on large ones, each as tall as its pole allows."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import ndimage

Array = NDArray[np.float64]

_TALLEST = 4.0  # mm on paper
_SMALLEST = 0.45  # mm on paper; nobody reads less
_FILL = 0.72  # of the pole's width
_SPACING = 13.0  # mm on paper between letters of one pole
_MOST_A_POLE = 16
_MOST = 2500


@dataclass(frozen=True)
class Letter:
    """A letter on a pole.

    Attributes:
        row: Row of its centre [cells]; a half between two rows.
        column: Column of its centre [cells].
        polarity: +1 or -1.
        height: Height of a capital [mm on paper].
    """

    row: float
    column: float
    polarity: int
    height: float


def place_letters(pattern: NDArray[np.int8], cell_mm: float) -> list[Letter]:
    """Return the letters of a pattern drawn with cells of ``cell_mm`` on paper; poles too small to read get none."""
    letters: list[Letter] = []
    for polarity in (1, -1):
        numbered, _ = ndimage.label(pattern == polarity)
        for number, box in enumerate(ndimage.find_objects(numbered), start=1):
            letters += _on_pole(numbered[box] == number, (box[0].start, box[1].start), polarity, cell_mm)
    letters.sort(key=lambda letter: -letter.height)
    return letters[:_MOST]


def _on_pole(pole: NDArray[np.bool_], corner: tuple[int, int], polarity: int, cell_mm: float) -> list[Letter]:
    widest = _widest_block(pole)
    height = min(_TALLEST, _FILL * widest * cell_mm)
    if height < _SMALLEST:
        return []
    # blocks somewhat smaller than the widest leave room to spread, blocks much smaller would crowd the edges
    side = min(widest, max(int(np.ceil(height / _FILL / cell_mm)), int(np.ceil(0.7 * widest))))
    places: Array = np.argwhere(_blocks(pole, side)).astype(np.float64) + (side - 1) / 2.0
    chosen = [int(np.argmin(((places - places.mean(axis=0)) ** 2).sum(axis=1)))]
    away = _distance(places, chosen[0])
    while len(chosen) < _MOST_A_POLE and away.max() * cell_mm > max(_SPACING, 4.0 * height):
        chosen.append(int(np.argmax(away)))
        away = np.minimum(away, _distance(places, chosen[-1]))
    return [Letter(float(places[n, 0]) + corner[0], float(places[n, 1]) + corner[1], polarity, height) for n in chosen]


def _widest_block(pole: NDArray[np.bool_]) -> int:
    """Side of the largest square of cells on the pole."""
    room = int(ndimage.distance_transform_cdt(np.pad(pole, 1), "chessboard").max())
    return 2 * room if _blocks(pole, 2 * room).any() else 2 * room - 1


def _blocks(pole: NDArray[np.bool_], side: int) -> NDArray[np.bool_]:
    """Which squares of ``side`` cells lie on the pole, by their lowest cell."""
    sums = np.pad(pole.astype(np.int64).cumsum(axis=0).cumsum(axis=1), ((1, 0), (1, 0)))
    if min(pole.shape) < side:
        return np.zeros((0, 0), bool)
    counts = sums[side:, side:] - sums[:-side, side:] - sums[side:, :-side] + sums[:-side, :-side]
    full: NDArray[np.bool_] = counts == side * side
    return full


def _distance(places: Array, chosen: int) -> Array:
    distance: Array = np.linalg.norm(places - places[chosen], axis=1)
    return distance
