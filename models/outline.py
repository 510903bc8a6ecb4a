"""Outline pieces of a blank: straight segments and arcs, each with its outward normal.

A loop of the outline is a tuple of pieces in order, with the material on the left of the way they run. A convex
corner is an arc of radius 0 that turns from one edge's normal to the next one's: so the curve at a distance d
outside a loop is ``point + d * normal`` along its pieces, rounded corners included. At a concave corner the moved
edges cross; whoever uses the curve drops what is closer to the blank than d.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import final

import numpy as np
from numpy.typing import NDArray


@final
@dataclass(frozen=True)
class Segment:
    """A straight piece of outline from ``start`` to ``end`` [m], material on its left."""

    start: tuple[float, float]
    end: tuple[float, float]

    def length(self, distance: float) -> float:
        """Length of the piece moved outward by ``distance`` [m], in m."""
        del distance  # a straight piece keeps its length
        return float(np.hypot(self.end[0] - self.start[0], self.end[1] - self.start[1]))


@final
@dataclass(frozen=True)
class Arc:
    """A circular piece of outline.

    Attributes:
        centre: Centre (x, y) [m].
        radius: Radius [m]; 0 for a convex corner.
        start: Direction from the centre to the first point, counter-clockwise from +x [rad].
        sweep: Signed angle that the piece turns through [rad]: positive round the material, negative round a hole.
    """

    centre: tuple[float, float]
    radius: float
    start: float
    sweep: float

    def length(self, distance: float) -> float:
        """Length of the piece moved outward by ``distance`` [m], in m; round a hole, of the hole's own edge."""
        outside = distance if self.sweep > 0.0 else 0.0
        return (self.radius + outside) * abs(self.sweep)


Piece = Segment | Arc


@final
class Contour:
    """A closed loop of pieces with one parameter u from 0 to 1, uniform along the curve at a distance outside it.

    Attributes:
        length: Length of that curve [m]; round a hole, of the hole's own edge, whose curve inside may vanish.
    """

    def __init__(self, pieces: Sequence[Piece], distance: float) -> None:
        """Prepare the loop for points up to ``distance`` [m] outside it, > 0."""
        lengths = np.array([piece.length(distance) for piece in pieces])
        rows = np.array([_row(piece) for piece in pieces])
        self._base, self._along = rows[:, 0:2], rows[:, 2:4]
        self._radius, self._start, self._sweep, self._side = rows[:, 4:8].T
        self._lengths, self._ends = lengths, np.cumsum(lengths)
        self.length = float(self._ends[-1])

    def at(self, u: NDArray[np.float64]) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """Return points of the outline [m] and outward unit normals, both (n, 2), at ``u`` (n,), periodic in 1."""
        way = (u % 1.0) * self.length
        piece = np.minimum(np.searchsorted(self._ends, way, side="right"), self._ends.size - 1)
        t = (1.0 - (self._ends[piece] - way) / self._lengths[piece])[:, None]
        angle = self._start[piece] + self._sweep[piece] * t[:, 0]
        away = np.stack((np.cos(angle), np.sin(angle)), axis=1)
        points = self._base[piece] + t * self._along[piece] + self._radius[piece, None] * away
        return points, self._side[piece, None] * away

    def raster(self, step: float, quarter: int) -> NDArray[np.float64]:
        """Return parameters (n,) from 0 up to 1, both included, for points all along the loop.

        Args:
            step: Largest distance between points along the curve [m].
            quarter: Least number of intervals on a quarter turn.
        """
        wanted = np.maximum(self._lengths / step, np.abs(self._sweep) / (np.pi / 2.0) * quarter)
        ends = np.concatenate(([0.0], np.cumsum(wanted)))
        count = max(4, int(np.ceil(ends[-1] * (1.0 - 1e-12))))
        return np.interp(np.linspace(0.0, ends[-1], count + 1), ends, np.concatenate(([0.0], self._ends)) / self.length)


def closed_loop(corners: NDArray[np.float64]) -> tuple[Piece, ...]:
    """Return the pieces of a closed polygon: its edges, and an arc of radius 0 at each convex corner.

    Args:
        corners: Corners (n, 2) [m], material on the left of the way round.
    """
    ahead = np.roll(corners, -1, axis=0) - corners
    heading = np.arctan2(ahead[:, 1], ahead[:, 0])
    pieces: list[Piece] = []
    for i in range(len(corners)):
        j = (i + 1) % len(corners)
        pieces.append(Segment(_pair(corners[i]), _pair(corners[j])))
        turn = float(np.remainder(heading[j] - heading[i] + np.pi, 2.0 * np.pi) - np.pi)
        if turn > 0.0:
            pieces.append(Arc(_pair(corners[j]), 0.0, float(heading[i] - np.pi / 2.0), turn))
    return tuple(pieces)


def circle(radius: float, *, hole: bool = False) -> tuple[Piece, ...]:
    """Return the one piece of a circle of ``radius`` [m] about the origin, as an outer edge or as a hole."""
    return (Arc((0.0, 0.0), radius, 0.0, -2.0 * np.pi if hole else 2.0 * np.pi),)


def _row(piece: Piece) -> tuple[float, ...]:
    """Base point, way along, radius, start angle, sweep and side: point = base + t along + radius (cos, sin)."""
    if isinstance(piece, Arc):
        return *piece.centre, 0.0, 0.0, piece.radius, piece.start, piece.sweep, float(np.copysign(1.0, piece.sweep))
    along_x, along_y = piece.end[0] - piece.start[0], piece.end[1] - piece.start[1]
    return *piece.start, along_x, along_y, 0.0, float(np.arctan2(-along_x, along_y)), 0.0, 1.0


def _pair(point: NDArray[np.float64]) -> tuple[float, float]:
    return float(point[0]), float(point[1])
