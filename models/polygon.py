"""Closed polygon loops: what is inside, how far outside a point is, and whether the loops make a valid outline."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from .errors import InputError

Points = NDArray[np.float64]
Loops = Sequence[Points]


def tidy(loop: object, number: int) -> Points:
    """Return a loop's corners (n, 2) [m] without a repeated closing point, or raise InputError."""
    name = f"polygon loop {number + 1}"
    try:
        corners = np.array(loop, dtype=np.float64)
    except (TypeError, ValueError) as error:
        raise InputError(f"{name}: must be a list of [x, y] pairs of numbers") from error
    if corners.ndim != 2 or corners.shape[1] != 2:
        raise InputError(f"{name}: must be a list of [x, y] pairs, received an array of shape {corners.shape}")
    if not np.isfinite(corners).all():
        raise InputError(f"{name}: every coordinate must be a finite number")
    if len(corners) > 1 and np.array_equal(corners[0], corners[-1]):
        corners = corners[:-1]
    if len(corners) < 3:
        raise InputError(f"{name}: needs at least 3 different corners, received {len(corners)}")
    return corners


def check(loops: Loops) -> None:
    """Raise InputError unless the loops are simple, of non-zero area and apart from each other."""
    for number, loop in enumerate(loops):
        step = np.hypot(*(np.roll(loop, -1, axis=0) - loop).T)
        if (step <= 1e-9 * np.ptp(loop, axis=0).max()).any():
            raise InputError(
                f"polygon loop {number + 1}: has the same corner twice in a row near "
                f"{_mm(loop[int(step.argmin())])}; drop one of the two"
            )
    starts = np.concatenate(list(loops))
    ends = np.concatenate([np.roll(loop, -1, axis=0) for loop in loops])
    owner = np.concatenate([np.full(len(loop), i) for i, loop in enumerate(loops)])
    following = np.concatenate([np.roll(np.arange(len(loop)), -1) for loop in loops])
    following += np.concatenate([[0], np.cumsum([len(loop) for loop in loops])])[owner]
    for i in range(len(starts)):
        _check_edge(i, starts, ends, owner, following)
    for number, loop in enumerate(loops):
        if abs(signed_area(loop)) <= 1e-9 * np.prod(np.ptp(loop, axis=0)):
            raise InputError(f"polygon loop {number + 1}: encloses no area")


def signed_area(loop: Points) -> float:
    """Area inside a loop (n, 2) [m] in m2, positive when it runs counter-clockwise."""
    x, y = (loop - loop[0]).T
    return float(0.5 * (x * np.roll(y, -1) - np.roll(x, -1) * y).sum())


def orient(loops: Loops) -> list[Points]:
    """Return the loops with the material on their left: outer ones counter-clockwise, holes clockwise."""
    turned = []
    for i, loop in enumerate(loops):
        others = [other for j, other in enumerate(loops) if j != i]
        depth = sum(bool(_crossings([other], loop[:1, 0], loop[:1, 1])[0]) for other in others)
        outer = depth % 2 == 0
        turned.append(loop if (signed_area(loop) > 0.0) == outer else loop[::-1])
    return turned


def inside(loops: Loops, x: Points, y: Points, tolerance: float) -> NDArray[np.bool_]:
    """Return which points (any shape) [m] lie inside by the even-odd rule, or within ``tolerance`` [m] of an edge."""
    return _crossings(loops, x, y) | (edge_distance(loops, x, y) <= tolerance)


def edge_distance(loops: Loops, x: Points, y: Points) -> Points:
    """Distance of points (any shape) [m] from the nearest edge, in m."""
    nearest = np.full(np.shape(x), np.inf)
    for x0, y0, x1, y1 in _edges(loops):
        dx, dy = x1 - x0, y1 - y0
        t = np.clip(((x - x0) * dx + (y - y0) * dy) / (dx * dx + dy * dy), 0.0, 1.0)
        nearest = np.minimum(nearest, np.hypot(x - x0 - t * dx, y - y0 - t * dy))
    return nearest


def _crossings(loops: Loops, x: Points, y: Points) -> NDArray[np.bool_]:
    """Even-odd rule with a ray along +x; an edge owns its lower end, so that corners count once."""
    odd = np.zeros(np.shape(x), dtype=bool)
    for x0, y0, x1, y1 in _edges(loops):
        if y0 == y1:
            continue
        spans = (y0 <= y) != (y1 <= y)
        odd ^= spans & (x < x0 + (y - y0) * ((x1 - x0) / (y1 - y0)))
    return odd


def _edges(loops: Loops) -> list[tuple[float, float, float, float]]:
    return [
        (float(a[0]), float(a[1]), float(b[0]), float(b[1]))
        for loop in loops
        for a, b in zip(loop, np.roll(loop, -1, axis=0), strict=True)
    ]


def _check_edge(i: int, starts: Points, ends: Points, owner: NDArray[np.int_], following: NDArray[np.int_]) -> None:
    """Raise InputError where edge ``i`` meets a later edge other than at the corner they share."""
    later = np.arange(i + 1, len(starts))
    neighbour = (following[i] == later) | (following[later] == i)
    others = later[~neighbour]
    touching = _meet(starts[i], ends[i], starts[others], ends[others])
    if touching.any():
        other = int(others[int(touching.argmax())])
        where = f"near {_mm(starts[i])} and {_mm(starts[other])}"
        if owner[i] == owner[other]:
            raise InputError(f"polygon loop {owner[i] + 1}: must not cross or touch itself; its edges meet {where}")
        raise InputError(
            f"polygon loops {owner[i] + 1} and {owner[other] + 1}: must not cross or touch; edges meet {where}"
        )
    for other in later[neighbour]:
        first, second = (i, int(other)) if following[i] == other else (int(other), i)
        back, ahead = starts[first] - ends[first], ends[second] - starts[second]
        if abs(_cross(back, ahead)) <= 1e-12 * np.hypot(*back) * np.hypot(*ahead) and back @ ahead > 0.0:
            raise InputError(f"polygon loop {owner[i] + 1}: runs back over itself at {_mm(ends[first])}")


def _meet(a: Points, b: Points, c: Points, d: Points) -> NDArray[np.bool_]:
    """Return whether segment ab (2,) has a point in common with each segment cd (n, 2)."""
    scale = 1e-12 * (np.hypot(*(b - a)) + np.hypot(*(d - c).T)) ** 2
    side_c, side_d = _sign(_cross(b - a, c - a), scale), _sign(_cross(b - a, d - a), scale)
    side_a, side_b = _sign(_cross(d - c, a - c), scale), _sign(_cross(d - c, b - c), scale)
    low = np.maximum(np.minimum(a, b), np.minimum(c, d))
    high = np.minimum(np.maximum(a, b), np.maximum(c, d))
    boxes = (low <= high + np.sqrt(scale)[:, None]).all(axis=1)
    met: NDArray[np.bool_] = (side_c * side_d <= 0) & (side_a * side_b <= 0) & boxes
    return met


def _sign(value: Points, scale: Points) -> Points:
    return np.sign(np.where(np.abs(value) <= scale, 0.0, value))


def _cross(a: Points, b: Points) -> Points:
    product: Points = a[..., 0] * b[..., 1] - a[..., 1] * b[..., 0]
    return product


def _mm(point: Points) -> str:
    return f"({point[0] * 1e3:.6g}, {point[1] * 1e3:.6g}) mm"
