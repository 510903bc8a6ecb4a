"""The true peak of |B| over a surface, and the distance at which it falls to a level.

A raster finds where the peaks are: a step of half the clearance shows at least 0.99 of each (0.97 where the clearance
is so much smaller than a cell that the step stops at an eighth of a cell). The best of them are then refined, see
``local_peak``.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import brentq

from .local_peak import Spot, distinct, line_ends, rank, refined
from .stray import Placed, field, fitting_step, grid_field
from .surfaces import Flat, Patch, Surface, around

Points = NDArray[np.float64]

# The raster: steps a clearance, and the most steps a cell.
_PER_CLEARANCE = 2.0
_PER_CELL = 8.0

# A flat patch of more raster lines than this each way has a raster that suits Fourier transforms.
_UNIFORM = 8

# A raster value, sharpened by parabolas, is within this fraction of the peak beside it.
_RASTER_LOSS = 0.03

# Candidates are refined in batches of this many, best first, until the rest cannot win; at most this many batches.
_BATCH = 4
_BATCHES = 16

# The reach ends here, in cells: closer to a sharp pole edge |B| only grows with the logarithm of the distance.
_NEAREST = 1e-3

# The search for the reach: first distance, in cells; how far beyond the straight line in logarithms it steps, to have
# the reach between two distances; the least slope it believes.
_FIRST = 4.0
_OVERSHOOT = 1.2
_FLATTEST = -0.25


def peak(sources: Sequence[Placed], surface: Surface) -> tuple[float, tuple[float, float, float]]:
    """Return the largest |B| [T] on a surface outside the magnets, to 1e-6 of itself, and the point (x, y, z) [m].

    Where several points tie, as they do in symmetric patterns, which one is returned is arbitrary but repeatable.
    """
    spots = distinct([spot for patch in surface.patches for spot in _candidates(sources, surface, patch)])
    best: Spot | None = None
    for first in range(0, min(len(spots), _BATCH * _BATCHES), _BATCH):
        batch = [spot for spot in spots[first : first + _BATCH] if not best or _could_win(spot, best)]
        if not batch:
            break
        found = refined(sources, surface, batch)
        best = min([found, best], key=rank) if best else found
    if best is None:
        raise ValueError("the surface has no point at all: is its distance larger than 0?")
    x, y, z = best.patch.at(np.array([best.u]), np.array([best.v]))[0]
    return best.value, (float(x), float(y), float(z))


def field_reach(sources: Sequence[Placed], level: float) -> float:
    """Return the least distance [m] from the coated surface beyond which |B| stays under ``level`` [T] all around.

    |B|^2 is subharmonic where there is no source, so its peak over everything beyond a distance stands at that
    distance, and falls with it: the reach is where the peak passes the level, found to 1e-6 of itself. 0 where |B|
    is under the level already at a thousandth of a cell.
    """
    if level <= 0.0:
        raise ValueError(f"level must be positive, received {level}")
    charged = [source for source in sources if np.any(source.pattern)]
    if not charged:
        return 0.0

    known: dict[float, float] = {}

    def excess(log_distance: float) -> float:
        if log_distance not in known:
            value, _ = peak(charged, around(sources, float(np.exp(log_distance))))
            known[log_distance] = float(np.log(max(value, 1e-300) / level))
        return known[log_distance]

    nearest = float(np.log(_NEAREST * min(source.part.cell for source in sources)))
    # Far away |B| falls with the third power of the distance at least; close by the slope so far shows how fast.
    here, slope = float(np.log(_FIRST * max(source.part.cell for source in sources))), -3.0
    while True:
        ahead = max(here - _OVERSHOOT * excess(here) / slope, nearest)
        if excess(here) * excess(ahead) <= 0.0:
            return float(np.exp(brentq(excess, min(here, ahead), max(here, ahead), xtol=2e-7, rtol=1e-12)))
        if ahead == nearest:
            return 0.0
        slope = min((excess(ahead) - excess(here)) / (ahead - here), _FLATTEST)
        here = ahead


def _could_win(spot: Spot, best: Spot) -> bool:
    return spot.value * (1.0 + _RASTER_LOSS) > best.value


def _candidates(sources: Sequence[Placed], surface: Surface, patch: Patch) -> list[Spot]:
    """Raster points of a patch that no neighbour exceeds, with |B| sharpened by parabolas."""
    u, v, size = _raster(sources, surface, patch)
    size, at = _with_ends(sources, surface, patch, np.stack(np.meshgrid(u, v), axis=2), size)
    below, above = _neighbours(size)
    left, right = (near.T for near in _neighbours(size.T))
    if patch.closed:
        left[:, 0], right[:, -1] = size[:, -2], size[:, 1]
    top = (size >= np.maximum(left, right)) & (size >= np.maximum(below, above)) & (size >= 0.0)
    sharp = size + _parabola(left, size, right) + _parabola(below, size, above)
    half_u, half_v = _spacing(u), _spacing(v)
    return [
        Spot(patch, float(at[i, j, 0]), float(at[i, j, 1]), float(half_u[j]), float(half_v[i]), float(sharp[i, j]))
        for i, j in zip(*np.nonzero(top), strict=True)
    ]


def _with_ends(
    sources: Sequence[Placed], surface: Surface, patch: Patch, grid: Points, size: Points
) -> tuple[Points, Points]:
    """Let raster points beside an end of the surface stand for the larger |B| [T] there: values and places (u, v)."""
    good = size >= 0.0
    if good.all() or not good.any():
        return size, grid
    ends, inner = line_ends(lambda at: surface.holds(patch.at(at[:, 0], at[:, 1])), grid, good)
    there = np.linalg.norm(field(sources, patch.at(ends[:, 0], ends[:, 1])), axis=1)
    values, places = size.ravel().copy(), grid.reshape(-1, 2).copy()
    for i, value, end in zip(inner, there, ends, strict=True):
        if value > values[i]:
            values[i], places[i] = value, end
    return values.reshape(size.shape), places.reshape(grid.shape)


def _raster(sources: Sequence[Placed], surface: Surface, patch: Patch) -> tuple[Points, Points, Points]:
    """Parameters u (m,), v (n,) and |B| (n, m) [T] on a patch, -1 where a point is not on the surface."""
    cell = min(source.part.cell for source in sources)
    step = max(surface.clearance / _PER_CLEARANCE, cell / _PER_CELL)
    u, v = patch.raster(step)
    if isinstance(patch, Flat) and min(u.size, v.size) > _UNIFORM:
        return _flat_raster(sources, surface, patch, fitting_step(cell, step))
    grid_u, grid_v = np.meshgrid(u, v)
    points = patch.at(grid_u.ravel(), grid_v.ravel())
    good = surface.holds(points)
    size = np.full(good.shape, -1.0)
    size[good] = np.linalg.norm(field(sources, points[good]), axis=1)
    return u, v, size.reshape(grid_u.shape)


def _flat_raster(
    sources: Sequence[Placed], surface: Surface, patch: Flat, step: float
) -> tuple[Points, Points, Points]:
    """The same for a flat patch many steps wide, on a uniform raster that suits the cells.

    The outermost lines may lie up to half a step outside the patch; their values stand in for its border.
    """
    xmin, xmax, ymin, ymax = patch.bounds
    x, y = _spanning(xmin, xmax, step), _spanning(ymin, ymax, step)
    size = np.linalg.norm(grid_field(sources, x, y, patch.z), axis=2)
    u, v = np.clip((x - xmin) / (xmax - xmin), 0.0, 1.0), np.clip((y - ymin) / (ymax - ymin), 0.0, 1.0)
    grid_u, grid_v = np.meshgrid(u, v)
    good = surface.holds(patch.at(grid_u.ravel(), grid_v.ravel())).reshape(size.shape)
    return u, v, np.where(good, size, -1.0)


def _spanning(low: float, high: float, step: float) -> Points:
    count = int(np.ceil((high - low) / step * (1.0 - 1e-12))) + 1
    return (low + high) / 2.0 + (np.arange(count, dtype=np.float64) - (count - 1) / 2.0) * step


def _spacing(raster: Points) -> Points:
    """The larger of the distances from each raster parameter to its neighbours."""
    apart = np.diff(raster)
    spacing: Points = np.maximum(np.append(apart, apart[-1]), np.insert(apart, 0, apart[0]))
    return spacing


def _neighbours(size: Points) -> tuple[Points, Points]:
    """Values one row before and one row after, -1 beyond the border."""
    border = np.full((1, size.shape[1]), -1.0)
    return np.concatenate((border, size[:-1])), np.concatenate((size[1:], border))


def _parabola(before: Points, here: Points, after: Points) -> Points:
    """How far the parabola through three values rises above the middle one, where all three are on the surface."""
    bend = 2.0 * here - before - after
    whole = (before >= 0.0) & (after >= 0.0) & (bend > 0.0)
    return np.where(whole, (after - before) ** 2 / (8.0 * np.where(whole, bend, 1.0)), 0.0)
