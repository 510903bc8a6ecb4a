"""Surfaces around parts on which a stray field is judged: planes beside a face, and everything at a distance.

A surface is a list of patches, each with two parameters from 0 to 1, and a rule which of their points belong to it.
Around a part the patches are those of the offset surface of a prism: its two faces moved outward, its walls, and the
rounded edges between them; the walls run round every loop of the outline, convex corners included as arcs. Where such
patches of one part or of a pair cut into each other, points closer than the distance to any part do not belong.

A coating is taken as a layer of equal thickness, rounded on edges, so the distance from the magnet itself is the
distance plus the coating.
"""

from __future__ import annotations

from abc import ABC, abstractmethod
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal, final

import numpy as np
from numpy.typing import NDArray

from .outline import Contour
from .stray import Located

Points = NDArray[np.float64]

# Points of a patch that stand within this fraction of the distance from where they should are on the surface.
_ON_SURFACE = 1e-9

# Steps of a raster on a quarter turn, at least: the field far away varies with the direction.
_QUARTER = 8

# Steps of a raster along a side of a flat patch, at least: enough to tell its middle from its border.
_FLAT = 4


class Patch(ABC):
    """A piece of surface with parameters u and v from 0 to 1."""

    @property
    @abstractmethod
    def closed(self) -> bool:
        """Does u = 1 meet u = 0 again?"""

    @abstractmethod
    def at(self, u: Points, v: Points) -> Points:
        """Return points (n, 3) [m] at parameters (n,)."""

    @abstractmethod
    def raster(self, step: float) -> tuple[Points, Points]:
        """Return parameters u (m,) and v (n,), 0 and 1 included, whose points are at most ``step`` [m] apart."""


@final
@dataclass(frozen=True)
class Flat(Patch):
    """A rectangle parallel to the faces.

    Attributes:
        bounds: (xmin, xmax, ymin, ymax) [m]; u runs along x, v along y.
        z: Height [m].
    """

    bounds: tuple[float, float, float, float]
    z: float

    @property
    def closed(self) -> bool:
        """A rectangle does not close on itself."""
        return False

    def at(self, u: Points, v: Points) -> Points:
        """Return points (n, 3) [m] at parameters (n,)."""
        xmin, xmax, ymin, ymax = self.bounds
        return np.stack((xmin + u * (xmax - xmin), ymin + v * (ymax - ymin), np.full(u.shape, self.z)), axis=1)

    def raster(self, step: float) -> tuple[Points, Points]:
        """Return parameters u (m,) and v (n,), 0 and 1 included, whose points are at most ``step`` [m] apart."""
        xmin, xmax, ymin, ymax = self.bounds
        return _even(xmax - xmin, step, _FLAT), _even(ymax - ymin, step, _FLAT)


@final
@dataclass(frozen=True)
class Wall(Patch):
    """The wall of a prism moved outward.

    Attributes:
        contour: A loop of the outline, relative to ``centre``; u runs round it.
        centre: Lateral centre of the part (x, y) [m].
        low: Height at v = 0 [m].
        high: Height at v = 1 [m].
        distance: How far outside the outline the wall is [m].
    """

    contour: Contour
    centre: tuple[float, float]
    low: float
    high: float
    distance: float

    @property
    def closed(self) -> bool:
        """A wall runs all the way round."""
        return True

    def at(self, u: Points, v: Points) -> Points:
        """Return points (n, 3) [m] at parameters (n,)."""
        points, normals = self.contour.at(u)
        lateral = points + np.array(self.centre) + self.distance * normals
        return np.concatenate((lateral, (self.low + v * (self.high - self.low))[:, None]), axis=1)

    def raster(self, step: float) -> tuple[Points, Points]:
        """Return parameters u (m,) and v (n,), 0 and 1 included, whose points are at most ``step`` [m] apart."""
        return self.contour.raster(step, _QUARTER), _even(self.high - self.low, step, 1)


@final
@dataclass(frozen=True)
class Edge(Patch):
    """The rounded edge between the wall and a face of a prism's offset surface.

    Attributes:
        contour: A loop of the outline, relative to ``centre``; u runs round it.
        centre: Lateral centre of the part (x, y) [m].
        z: Height of the face [m].
        distance: Radius of the rounding [m], signed: positive at an upper face, negative at a lower one.
    """

    contour: Contour
    centre: tuple[float, float]
    z: float
    distance: float

    @property
    def closed(self) -> bool:
        """An edge runs all the way round."""
        return True

    def at(self, u: Points, v: Points) -> Points:
        """Return points (n, 3) [m] at parameters (n,); v = 0 is the wall's end, v = 1 the face's."""
        points, normals = self.contour.at(u)
        angle = (v * (np.pi / 2.0))[:, None]
        lateral = points + np.array(self.centre) + abs(self.distance) * np.cos(angle) * normals
        return np.concatenate((lateral, self.z + self.distance * np.sin(angle)), axis=1)

    def raster(self, step: float) -> tuple[Points, Points]:
        """Return parameters u (m,) and v (n,), 0 and 1 included, whose points are at most ``step`` [m] apart."""
        turned = abs(self.distance) * np.pi / 2.0
        return self.contour.raster(step, _QUARTER), _even(turned, step, _QUARTER)


@final
@dataclass(frozen=True)
class Surface:
    """Patches and the parts they must keep clear of.

    Attributes:
        patches: The patches.
        keep: The parts with the distance from each one's magnet that a point of the surface has at least [m], and from
            one of them exactly; none for a surface that belongs to no part.
        clearance: Least distance of the surface from any magnet [m].
    """

    patches: tuple[Patch, ...]
    keep: tuple[tuple[Located, float], ...]
    clearance: float

    def holds(self, points: Points) -> NDArray[np.bool_]:
        """Return which points (n, 3) [m] of the patches belong to the surface, (n,)."""
        if not self.keep:
            return np.ones(len(points), dtype=bool)
        spare = [magnet_distance(located, points) - distance for located, distance in self.keep]
        on_it: NDArray[np.bool_] = np.abs(np.min(spare, axis=0)) <= _ON_SURFACE * self.clearance
        return on_it

    def sample(self, max_points: int) -> Points:
        """Return at most ``max_points`` points (n, 3) [m] spread evenly over the surface, for a design to watch.

        They are the middles of the cells of the finest raster that keeps to the number, but of none finer than half
        the clearance.
        """
        if max_points < len(self.patches):
            raise ValueError(f"needs at least one point a patch, {len(self.patches)}, received {max_points}")
        rasters = [patch.raster(self.clearance / 2.0) for patch in self.patches]
        share = min(1.0, float(np.sqrt(2.0 * max_points / sum(u.size * v.size for u, v in rasters))))
        while True:
            points = np.concatenate(
                [self._middles(patch, u, v, share) for patch, (u, v) in zip(self.patches, rasters, strict=True)]
            )
            if len(points) <= max_points:
                return points
            share *= min(0.98, float(np.sqrt(max_points / len(points))))

    def _middles(self, patch: Patch, u: Points, v: Points, share: float) -> Points:
        """Middles (n, 3) [m] of the cells of a raster thinned out to a share: no patch repeats another's border."""
        u, v = np.meshgrid(_middle(u, share), _middle(v, share))
        points = patch.at(u.ravel(), v.ravel())
        return points[self.holds(points)]


def plane(
    side: Literal["back", "front"], distance: float, base: Located | None = None, mover: Located | None = None
) -> Surface:
    """Return the plane beside a part or a mated pair, parallel to its faces.

    It is as large as the blanks' bounding box plus three times the distance all round. "front" of the base alone is
    above its mating face, of the mover alone below its mating face, of a pair above the mover's back; "back" is the
    base's back, or the mover's where there is no base.

    Args:
        side: Which side.
        distance: From the coated outer surface on that side [m], > 0.
        base: The base, unless the mover alone is meant.
        mover: The mover, unless the base alone is meant.
    """
    parts = [part for part in (base, mover) if part is not None]
    if not parts:
        raise ValueError("a plane needs a base, a mover or both")
    above = side == "back" if base is None else side == "front"
    facing = parts[-1] if above else parts[0]
    clearance = distance + facing.part.coating
    low = facing.origin[2]
    z = low + facing.part.thickness + clearance if above else low - clearance
    boxes = np.array([_bounds(part) for part in parts])
    bounds = (
        float(boxes[:, 0].min()) - 3.0 * distance,
        float(boxes[:, 1].max()) + 3.0 * distance,
        float(boxes[:, 2].min()) - 3.0 * distance,
        float(boxes[:, 3].max()) + 3.0 * distance,
    )
    return Surface((Flat(bounds, float(z)),), (), clearance)


def around(parts: Sequence[Located], distance: float) -> Surface:
    """Return every point at ``distance`` [m] from the coated surface of a part, or of a mated pair together."""
    keep = tuple((located, distance + located.part.coating) for located in parts)
    patches: list[Patch] = []
    for located, reach in keep:
        x, y, low = located.origin
        high = low + located.part.thickness
        bounds = _bounds(located)
        patches += [Flat(bounds, high + reach), Flat(bounds, low - reach)]
        for loop in located.part.blank.pieces():
            contour = Contour(loop, reach)
            patches.append(Wall(contour, (x, y), low, high, reach))
            patches += [Edge(contour, (x, y), high, reach), Edge(contour, (x, y), low, -reach)]
    return Surface(tuple(patches), keep, min(reach for _, reach in keep))


def magnet_distance(located: Located, points: Points) -> Points:
    """Distance of points (n, 3) [m] from a part's magnet, without coating, in m; 0 inside."""
    x, y, low = located.origin
    above = np.maximum(points[:, 2] - low - located.part.thickness, low - points[:, 2])
    return np.hypot(located.part.blank.distance(points[:, 0] - x, points[:, 1] - y), np.maximum(above, 0.0))


def _bounds(located: Located) -> tuple[float, float, float, float]:
    x, y, _ = located.origin
    xmin, xmax, ymin, ymax = located.part.blank.bounds
    return x + xmin, x + xmax, y + ymin, y + ymax


def _even(length: float, step: float, least: int) -> Points:
    return np.linspace(0.0, 1.0, max(least, int(np.ceil(length / step * (1.0 - 1e-12)))) + 1)


def _middle(raster: Points, share: float) -> Points:
    count = max(1, round((raster.size - 1) * share))
    return np.interp((np.arange(count) + 0.5) / count, np.linspace(0.0, 1.0, raster.size), raster)
