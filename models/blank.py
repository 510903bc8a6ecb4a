"""Blanks: the outline of a part's flat face, centred on its own bounding box.

Whether a point on the outline is inside is decided with a tolerance of 1e-9 of the size, far above rounding and far
below any dimension on a drawing: so a cell centre exactly on an edge counts as inside, whichever way the blank is
turned or mirrored.
"""

from __future__ import annotations

from abc import ABC, abstractmethod
from dataclasses import dataclass
from typing import final

import numpy as np
from numpy.typing import NDArray

from . import polygon
from .errors import InputError
from .outline import Piece, circle, closed_loop

Points = NDArray[np.float64]

_ON_EDGE = 1e-9


class Blank(ABC):
    """An outline in the plane of the face; the origin is the centre of its bounding box, all lengths in metres."""

    @property
    @abstractmethod
    def bounds(self) -> tuple[float, float, float, float]:
        """Bounding box (xmin, xmax, ymin, ymax) [m]."""

    @abstractmethod
    def contains(self, x: Points, y: Points) -> NDArray[np.bool_]:
        """Return which points (x, y of one shape) [m] lie inside or on the outline."""

    @abstractmethod
    def distance(self, x: Points, y: Points) -> Points:
        """Distance in the plane from points (x, y of one shape) [m] to the blank, in m: 0 inside, > 0 in a hole."""

    @abstractmethod
    def pieces(self) -> tuple[tuple[Piece, ...], ...]:
        """Loops of the outline, each a tuple of segments and arcs in order with the material on the left."""


@final
@dataclass(frozen=True)
class Rectangle(Blank):
    """A rectangle of ``size_x`` by ``size_y`` [m]."""

    size_x: float
    size_y: float

    def __post_init__(self) -> None:
        """Refuse sizes that are no positive number."""
        _positive("rectangle: size along x", self.size_x)
        _positive("rectangle: size along y", self.size_y)

    @property
    def bounds(self) -> tuple[float, float, float, float]:
        """Bounding box (xmin, xmax, ymin, ymax) [m]."""
        return -self.size_x / 2.0, self.size_x / 2.0, -self.size_y / 2.0, self.size_y / 2.0

    def contains(self, x: Points, y: Points) -> NDArray[np.bool_]:
        """Return which points (x, y of one shape) [m] lie inside or on the outline."""
        edge = _ON_EDGE * max(self.size_x, self.size_y)
        inside: NDArray[np.bool_] = (np.abs(x) <= self.size_x / 2.0 + edge) & (np.abs(y) <= self.size_y / 2.0 + edge)
        return inside

    def distance(self, x: Points, y: Points) -> Points:
        """Distance in the plane from points (x, y of one shape) [m] to the blank, in m; 0 inside."""
        beyond_x = np.maximum(np.abs(x) - self.size_x / 2.0, 0.0)
        beyond_y = np.maximum(np.abs(y) - self.size_y / 2.0, 0.0)
        return np.hypot(beyond_x, beyond_y)

    def pieces(self) -> tuple[tuple[Piece, ...], ...]:
        """Loops of the outline: one, of four edges and four corners."""
        x, y = self.size_x / 2.0, self.size_y / 2.0
        return (closed_loop(np.array([[-x, -y], [x, -y], [x, y], [-x, y]])),)


@final
@dataclass(frozen=True)
class Disc(Blank):
    """A round disc of ``diameter`` [m]."""

    diameter: float

    def __post_init__(self) -> None:
        """Refuse a diameter that is no positive number."""
        _positive("disc: diameter", self.diameter)

    @property
    def bounds(self) -> tuple[float, float, float, float]:
        """Bounding box (xmin, xmax, ymin, ymax) [m]."""
        radius = self.diameter / 2.0
        return -radius, radius, -radius, radius

    def contains(self, x: Points, y: Points) -> NDArray[np.bool_]:
        """Return which points (x, y of one shape) [m] lie inside or on the outline."""
        inside: NDArray[np.bool_] = _radius(x, y) <= self.diameter / 2.0 + _ON_EDGE * self.diameter
        return inside

    def distance(self, x: Points, y: Points) -> Points:
        """Distance in the plane from points (x, y of one shape) [m] to the blank, in m; 0 inside."""
        return np.maximum(_radius(x, y) - self.diameter / 2.0, 0.0)

    def pieces(self) -> tuple[tuple[Piece, ...], ...]:
        """Loops of the outline: one circle."""
        return (circle(self.diameter / 2.0),)


@final
@dataclass(frozen=True)
class Ring(Blank):
    """A flat ring between the diameters ``inner`` and ``outer`` [m]."""

    outer: float
    inner: float

    def __post_init__(self) -> None:
        """Refuse diameters that make no ring."""
        _positive("ring: outer diameter", self.outer)
        _positive("ring: inner diameter", self.inner)
        if self.inner >= self.outer:
            raise InputError(
                f"ring: the inner diameter must be smaller than the outer one, received "
                f"{self.inner * 1e3:.6g} and {self.outer * 1e3:.6g} mm"
            )

    @property
    def bounds(self) -> tuple[float, float, float, float]:
        """Bounding box (xmin, xmax, ymin, ymax) [m]."""
        radius = self.outer / 2.0
        return -radius, radius, -radius, radius

    def contains(self, x: Points, y: Points) -> NDArray[np.bool_]:
        """Return which points (x, y of one shape) [m] lie between or on the two circles."""
        r, edge = _radius(x, y), _ON_EDGE * self.outer
        inside: NDArray[np.bool_] = (r <= self.outer / 2.0 + edge) & (r >= self.inner / 2.0 - edge)
        return inside

    def distance(self, x: Points, y: Points) -> Points:
        """Distance in the plane from points (x, y of one shape) [m] to the ring, in m: 0 on it, > 0 in its hole."""
        r = _radius(x, y)
        return np.maximum(r - self.outer / 2.0, 0.0) + np.maximum(self.inner / 2.0 - r, 0.0)

    def pieces(self) -> tuple[tuple[Piece, ...], ...]:
        """Loops of the outline: the outer circle and the hole."""
        return circle(self.outer / 2.0), circle(self.inner / 2.0, hole=True)


@final
@dataclass(frozen=True, eq=False)
class Polygon(Blank):
    """A polygon of one or more closed loops, filled by the even-odd rule (a loop inside another is a hole).

    The loops may be given in any position and direction: they are moved so that the centre of the bounding box is the
    origin, and turned so that the material is on their left.

    Attributes:
        loops: Corners of each loop, arrays (n, 2) [m], read-only.
    """

    loops: tuple[Points, ...]

    def __post_init__(self) -> None:
        """Refuse loops that make no outline, then centre and orient them."""
        if len(self.loops) == 0:
            raise InputError("polygon: needs at least one loop of corners")
        loops = [polygon.tidy(loop, number) for number, loop in enumerate(self.loops)]
        polygon.check(loops)
        every = np.concatenate(loops)
        centre = (every.min(axis=0) + every.max(axis=0)) / 2.0
        centred = tuple(loop - centre for loop in polygon.orient(loops))
        for loop in centred:
            loop.setflags(write=False)
        object.__setattr__(self, "loops", centred)

    @property
    def bounds(self) -> tuple[float, float, float, float]:
        """Bounding box (xmin, xmax, ymin, ymax) [m]."""
        every = np.concatenate(self.loops)
        (xmin, ymin), (xmax, ymax) = every.min(axis=0), every.max(axis=0)
        return float(xmin), float(xmax), float(ymin), float(ymax)

    def contains(self, x: Points, y: Points) -> NDArray[np.bool_]:
        """Return which points (x, y of one shape) [m] lie inside or on the outline."""
        xmin, xmax, ymin, ymax = self.bounds
        return polygon.inside(self.loops, x, y, _ON_EDGE * max(xmax - xmin, ymax - ymin))

    def distance(self, x: Points, y: Points) -> Points:
        """Distance in the plane from points (x, y of one shape) [m] to the blank, in m: 0 inside, > 0 in a hole."""
        return np.where(self.contains(x, y), 0.0, polygon.edge_distance(self.loops, x, y))

    def pieces(self) -> tuple[tuple[Piece, ...], ...]:
        """Loops of the outline, holes included."""
        return tuple(closed_loop(loop) for loop in self.loops)


def _radius(x: Points, y: Points) -> Points:
    # The sum of squares is the same to the last bit however x and y are mirrored or swapped.
    return np.sqrt(x * x + y * y)


def _positive(name: str, length: float) -> None:
    if not (np.isfinite(length) and length > 0.0):
        raise InputError(f"{name} must be a positive length, received {length * 1e3:.6g} mm")
