"""The peak of |B| near a place on a surface, followed from a raster point to full precision.

In a box of the patch's two parameters around the place B is interpolated by Chebyshev polynomials, and the peak of the
interpolant among the points that belong to the surface is found by ever narrower rasters. Where the surface ends
inside the box, at the crease between two parts, the raster's lines are also followed to the very end: a peak in a
crease falls off in proportion to the way from it, and no raster would meet it. Then the box shrinks around the peak
until the closed form agrees with the interpolant there.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from typing import final

import numpy as np
from numpy.typing import NDArray

from .stray import Placed, field
from .surfaces import Patch, Surface

Points = NDArray[np.float64]

# After a box (the first is good to 2e-4 on smooth pieces) only those this close to the best go on.
_CLOSE = 2e-3

# Interpolation nodes along each parameter; how much smaller the next box is; most boxes; the agreement with the closed
# form that ends the search.
_NODES = 6
_SHRINK = 8.0
_BOXES = 12
_AGREE = 1e-9

# Lines of the raster each way. It narrows to a spacing on either side of the best point, or to two where the surface
# ends in it, down to this share of the box: a smooth peak is flat at its top, an end in a corner of creases is not.
_LINES = np.linspace(-1.0, 1.0, 17)
_NARROW, _NARROW_AT_END = 1.0 / 8.0, 1.0 / 4.0
_NARROWEST, _NARROWEST_AT_END = 1e-3, 1e-5

# Halvings of a raster's spacing to find the end of the surface.
_HALVINGS = 12

# Values this close are a tie; places this close in value are mirror images of each other.
_TIE = 1e-11
_SAME_VALUE = 1e-9


@final
@dataclass(frozen=True)
class Spot:
    """A place on a patch with a box around it.

    Attributes:
        patch: The patch.
        u: First parameter of the place.
        v: Second parameter.
        half_u: Half the width of the box in u.
        half_v: Half its width in v.
        value: |B| there [T], exact or an estimate.
    """

    patch: Patch
    u: float
    v: float
    half_u: float
    half_v: float
    value: float


@final
@dataclass(frozen=True)
class _Box:
    """B interpolated in a spot's box; s_u and s_v run from -1 to 1 across it."""

    surface: Surface
    patch: Patch
    middle: tuple[float, float]
    wide: tuple[float, float]
    series: Points

    def size(self, s: Points) -> Points:
        """Interpolated |B| (n,) [T] at s (n, 2)."""
        partial = (_chebyshev(s[:, 1])[:, :, None, None] * self.series).sum(axis=1)
        B = (_chebyshev(s[:, 0])[:, :, None] * partial).sum(axis=1)
        size: Points = np.sqrt((B * B).sum(axis=1))
        return size

    def size_on(self, s_u: Points, s_v: Points) -> Points:
        """Interpolated |B| (n * m,) [T] on the raster of s_v (n,) by s_u (m,)."""
        partial = _chebyshev(s_v) @ self.series.reshape(_NODES, -1)
        B = _chebyshev(s_u) @ partial.reshape(s_v.size, _NODES, 3)
        size: Points = np.sqrt((B * B).sum(axis=2)).ravel()
        return size

    def holds(self, s: Points) -> NDArray[np.bool_]:
        """Which points s (n, 2) belong to the surface."""
        u, v = self.middle[0] + self.wide[0] * s[:, 0], self.middle[1] + self.wide[1] * s[:, 1]
        return self.surface.holds(self.patch.at(u, v))


def rank(spot: Spot) -> float:
    """Sort key: the largest |B| first."""
    return -spot.value


def distinct(spots: list[Spot]) -> list[Spot]:
    """Return the spots, best first, without those that agree to 1e-9 with another on a patch of the same kind.

    They are its mirror images. (On patches of different kinds they may be one point of a border that both share.)
    """
    kept: list[Spot] = []
    last: dict[type[Patch], float] = {}
    for spot in sorted(spots, key=rank):
        if spot.value < last.get(type(spot.patch), np.inf) * (1.0 - _SAME_VALUE):
            kept.append(spot)
            last[type(spot.patch)] = spot.value
    return kept


def refined(sources: Sequence[Placed], surface: Surface, spots: list[Spot]) -> Spot:
    """Return the best of the spots' peaks, each followed until the closed form agrees with the interpolant.

    The returned spot's value is the closed form's |B| [T].
    """
    best: Spot | None = None
    for _ in range(_BOXES):
        guesses = _interpolated_peaks(sources, surface, spots)
        places = np.concatenate([guess.patch.at(np.array([guess.u]), np.array([guess.v])) for guess in guesses])
        exact = np.linalg.norm(field(sources, places), axis=1)
        followed = []
        for spot, guess, value in zip(spots, guesses, exact.tolist(), strict=True):
            here = replace(guess, value=value)
            best = min([here, best], key=rank) if best else here
            if _at_border(spot, guess):
                followed.append(replace(here, half_u=spot.half_u, half_v=spot.half_v))
            elif abs(value - guess.value) > _AGREE * value:
                followed.append(here)
        spots = distinct([spot for spot in followed if best and spot.value >= (1.0 - _CLOSE) * best.value])
        if not spots:
            break
    if best is None:
        raise ValueError("needs at least one spot")
    return best


def _interpolated_peaks(sources: Sequence[Placed], surface: Surface, spots: list[Spot]) -> list[Spot]:
    """Return the peak of the interpolant in each spot's box, with the interpolated |B| and a smaller box."""
    nodes = np.cos(np.pi * (np.arange(_NODES) + 0.5) / _NODES)
    extents = [_extent(spot) for spot in spots]
    grids = []
    for spot, (mid_u, wide_u, mid_v, wide_v) in zip(spots, extents, strict=True):
        u, v = np.meshgrid(mid_u + wide_u * nodes, mid_v + wide_v * nodes)
        grids.append(spot.patch.at(u.ravel(), v.ravel()))
    values = field(sources, np.concatenate(grids)).reshape(len(spots), _NODES, _NODES, 3)
    # Discrete Chebyshev transform along both axes: B = sum T_i(s_v) T_j(s_u) c_ij.
    back = np.linalg.inv(_chebyshev(nodes))
    series = np.einsum("iv,ju,nvuc->nijc", back, back, values)
    peaks = []
    for spot, (mid_u, wide_u, mid_v, wide_v), terms in zip(spots, extents, series, strict=True):
        box = _Box(surface, spot.patch, (mid_u, mid_v), (wide_u, wide_v), terms)
        (s_u, s_v), value = _narrowed(box, np.array([(spot.u - mid_u) / wide_u, (spot.v - mid_v) / wide_v]))
        peaks.append(
            Spot(
                spot.patch,
                mid_u + wide_u * s_u,
                mid_v + wide_v * s_v,
                spot.half_u / _SHRINK,
                spot.half_v / _SHRINK,
                value,
            )
        )
    return peaks


def _narrowed(box: _Box, at: Points) -> tuple[Points, float]:
    """Return where in a box (2,) the interpolant peaks on the surface, and the peak [T]; ``at`` is where to begin."""
    # The first raster covers the box, the next ones a part of it around the best point so far.
    around, half, value = np.zeros(2), 1.0, -1.0
    while half >= _NARROWEST_AT_END:
        s_u, s_v = (np.clip(middle + half * _LINES, -1.0, 1.0) for middle in around)
        grid_u, grid_v = np.meshgrid(s_u, s_v)
        points = np.stack((grid_u.ravel(), grid_v.ravel()), axis=1)
        good = box.holds(points)
        sizes = box.size_on(s_u, s_v)[good]
        points = points[good]
        whole = bool(good.all())
        if not whole and good.any():
            ends, _ = line_ends(box.holds, np.stack((grid_u, grid_v), axis=2), good.reshape(grid_u.shape))
            points, sizes = np.concatenate((points, ends)), np.concatenate((sizes, box.size(ends)))
        if sizes.size and sizes.max() > value * (1.0 + _TIE):
            # A tie goes to where the search stands, lest it wander along a level line.
            way = ((points - at) ** 2).sum(axis=1)
            i = int(np.where(sizes >= sizes.max() * (1.0 - _TIE), way, np.inf).argmin())
            at, value = points[i], float(sizes[i])
        around = at
        half *= _NARROW if whole else _NARROW_AT_END
        if whole and half < _NARROWEST:
            break
    return at, value


def line_ends(
    holds: Callable[[Points], NDArray[np.bool_]], grid: Points, good: NDArray[np.bool_]
) -> tuple[Points, NDArray[np.int_]]:
    """Follow the lines of a raster to where they leave the surface.

    Args:
        holds: Which points (n, 2) of the raster's coordinates belong to the surface.
        grid: The raster (rows, columns, 2).
        good: Which of its points belong to the surface (rows, columns).

    Returns:
        The ends (n, 2), still on the surface, and the flat index of the raster point beside each, (n,).
    """
    index = np.arange(good.size).reshape(good.shape)
    pairs = []
    for numbers in (index, index.T):
        before, after = numbers[:, :-1].ravel(), numbers[:, 1:].ravel()
        pairs += [np.stack((before, after)), np.stack((after, before))]
    inner, outer = np.concatenate(pairs, axis=1)
    leaves = good.ravel()[inner] & ~good.ravel()[outer]
    inner, outer = inner[leaves], outer[leaves]
    on, off = grid.reshape(-1, 2)[inner], grid.reshape(-1, 2)[outer]
    for _ in range(_HALVINGS):
        middle = (on + off) / 2.0
        valid = holds(middle)[:, None]
        on, off = np.where(valid, middle, on), np.where(valid, off, middle)
    return on, inner


def _at_border(spot: Spot, guess: Spot) -> bool:
    """Did the search end at a border of its box that is not the patch's: may |B| rise further beyond?"""
    mid_u, wide_u, mid_v, wide_v = _extent(spot)
    out_u = abs(guess.u - mid_u) >= wide_u * (1.0 - 1e-9) and (spot.patch.closed or 0.0 < guess.u < 1.0)
    return out_u or (abs(guess.v - mid_v) >= wide_v * (1.0 - 1e-9) and 0.0 < guess.v < 1.0)


def _chebyshev(s: Points) -> Points:
    """Chebyshev polynomials T_0 to T_(_NODES - 1) at s (n,) from -1 to 1, shape (n, _NODES)."""
    values: Points = np.cos(np.arccos(s)[:, None] * np.arange(_NODES))
    return values


def _extent(spot: Spot) -> tuple[float, float, float, float]:
    """Middle and half width of a spot's box in u and in v, inside the patch."""
    low_u, high_u = spot.u - spot.half_u, spot.u + spot.half_u
    if not spot.patch.closed:
        low_u, high_u = max(low_u, 0.0), min(high_u, 1.0)
    low_v, high_v = max(spot.v - spot.half_v, 0.0), min(spot.v + spot.half_v, 1.0)
    return (low_u + high_u) / 2.0, (high_u - low_u) / 2.0, (low_v + high_v) / 2.0, (high_v - low_v) / 2.0
