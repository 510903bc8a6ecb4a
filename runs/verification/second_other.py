"""The second path for what is no force: fields by solid angles, the moment by a flux integral, poles by plain loops."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from ...models.peak import peak
from ...models.second_path import MU0, field
from ...models.stray import Placed
from ...models.surfaces import Surface
from ...optimizer.seeds import generator
from .asked import Asked
from .checks import Check
from .state import State, field_points, field_values, net_moment

Array = NDArray[np.float64]
Pattern = NDArray[np.int8]

_POINTS = 200
_WORK = 4_000_000  # random points times cells, at most
_REACH_TOLERANCE = 1e-5  # the reach is found to 1e-6 of itself, and B falls with its third power
_RINGS = 16


def second_field(sources: list[Placed], points: Array) -> Array:
    """B of several magnets at points (n, 3), shape (n, 3) [T], by the second path."""
    return np.asarray(sum(field(source.part, source.pattern, source.origin, points) for source in sources))


def leak_checks(entry: Asked, state: State, reported: Array, seed: int) -> tuple[list[Check], Array]:
    """Check a field, a reach or a moment; returns the checks and the second path's values [SI], shape (elements,)."""
    keys = entry.params
    if entry.name == "net_moment":
        return _moment(entry, state, reported)
    gap = float(keys["gap"]) if keys["of"] == "pair" else 0.0
    sources = state.sources(keys["of"], gap)
    shown = gap if keys["of"] == "pair" else None
    if entry.name == "field_at":
        B = second_field(sources, field_points(entry))
        values = field_values(B, keys["component"])
        sizes = np.maximum(np.sqrt((B * B).sum(-1)), 1e-9)
        checks = [
            Check(label, entry.unit, shown, float(kernel), float(value), float(size), "the size of the field there")
            for label, kernel, value, size in zip(entry.labels, reported, values, sizes, strict=True)
        ]
        return checks, values
    if entry.name == "stray_field":
        surface = state.surface(keys["of"], gap, keys["side"], keys["distance"])
        return _peak(entry, sources, surface, shown, float(reported[0]), seed)
    return _reach(entry, state, sources, shown, float(reported[0]), seed)


def _peak(
    entry: Asked, sources: list[Placed], surface: Surface, gap: float | None, reported: float, seed: int
) -> tuple[list[Check], Array]:
    _, place = peak(sources, surface)
    there = float(np.linalg.norm(second_field(sources, np.array([place]))))
    elsewhere = _largest(sources, surface, seed)
    words = "the peak"
    checks = [
        Check(f"{entry.label}: at the peak", entry.unit, gap, reported, there, max(reported, 1e-12), words),
        Check(f"{entry.label}: largest of random places", entry.unit, gap, reported, elsewhere, max(reported, 1e-12),
              words, ceiling=True),
    ]  # fmt: skip
    return checks, np.array([max(there, elsewhere)])


def _reach(
    entry: Asked, state: State, sources: list[Placed], gap: float | None, reported: float, seed: int
) -> tuple[list[Check], Array]:
    """Compare the field at the reported reach with the level; the reach itself follows from its fall."""
    level, of = float(entry.params["field"]), entry.params["of"]
    distance = reported if reported > 0.0 else 1e-3 * state.base.cell
    surface = state.surface(of, gap or 0.0, "around", distance)
    elsewhere = _largest(sources, surface, seed)
    checks = [
        Check(f"{entry.label}: largest of random places there", "mT", gap, level, elsewhere, level, "the level",
              _REACH_TOLERANCE, ceiling=True)
    ]  # fmt: skip
    top = elsewhere
    if reported > 0.0:
        _, place = peak(sources, surface)
        there = float(np.linalg.norm(second_field(sources, np.array([place]))))
        top = max(top, there)
        checks.append(
            Check(f"{entry.label}: field at the reach", "mT", gap, level, there, level, "the level", _REACH_TOLERANCE)
        )
    # a dipole's law, the slowest a magnet's field can fall, turns the field there into the reach it stands for
    return checks, np.array([reported * (top / level) ** (1.0 / 3.0)])


def _largest(sources: list[Placed], surface: Surface, seed: int) -> float:
    """Largest |B| at random places of a surface [T]."""
    random = generator(seed, "verify", "places")
    cells = sum(int(np.count_nonzero(source.pattern)) for source in sources)
    count = int(np.clip(_WORK // max(cells, 1), 16, _POINTS))
    share = -(-count // len(surface.patches))
    points = np.concatenate([patch.at(random.random(share), random.random(share)) for patch in surface.patches])
    points = points[surface.holds(points)]
    return float(np.linalg.norm(second_field(sources, points), axis=1).max(initial=0.0))


def _moment(entry: Asked, state: State, reported: Array) -> tuple[list[Check], Array]:
    """The dipole moment as an integral of the radial field over a sphere about the part."""
    found, ceiling = [], []
    for name, part, pattern in (("base", state.base, state.a), ("mover", state.mover, state.b)):
        if entry.params["of"] in (name, "both"):
            found.append(abs(_flux_moment(Placed(part, pattern, (0.0, 0.0, -part.thickness / 2.0)))))
            ceiling.append(net_moment(State(part, part, np.abs(pattern), np.abs(pattern)), "base"))
    value = max(found)
    words = "the moment of the part with one pole"
    return [Check(entry.label, entry.unit, None, float(reported[0]), value, max(ceiling), words)], np.array([value])


def _flux_moment(source: Placed) -> float:
    """Moment along z [A m2]: outside a sphere, the part of B_r that goes with cos(theta) is 2 mu0 m / (4 pi r^3).

    The product rule integrates the other multipoles to zero up to order 2 * _RINGS - 2; at three times the part's
    radius what is left of higher ones is 3^-30.
    """
    xmin, xmax, ymin, ymax = source.part.blank.bounds
    radius = 1.5 * float(np.sqrt((xmax - xmin) ** 2 + (ymax - ymin) ** 2 + source.part.thickness**2))
    heights, weights = np.polynomial.legendre.leggauss(_RINGS)
    turns = 2.0 * np.pi * np.arange(2 * _RINGS) / (2 * _RINGS)
    height, turn = (grid.ravel() for grid in np.meshgrid(heights, turns, indexing="ij"))
    across = np.sqrt(1.0 - height**2)
    outward = np.stack((across * np.cos(turn), across * np.sin(turn), height), axis=1)
    radial = (second_field([source], radius * outward) * outward).sum(axis=1)
    mean = float((np.repeat(weights, turns.size) / (2.0 * turns.size) * radial * height).sum())
    return mean * 3.0 * 4.0 * np.pi * radius**3 / (2.0 * MU0)


def making_checks(entry: Asked, state: State, reported: Array) -> tuple[list[Check], Array]:
    """Count poles, edges and widths again by plain loops."""
    found = []
    for name, part, pattern in (("base", state.base, state.a), ("mover", state.mover, state.b)):
        if entry.params["of"] not in (name, "both"):
            continue
        polarity = pattern.astype(np.int8)
        if entry.name == "pole_count":
            found.append(float(_count_poles(polarity)))
        elif entry.name == "pole_edge_length":
            found.append(_count_edges(polarity) * part.cell)
        else:
            found.append(_widest_brush(polarity, part.mask) * part.cell)
    value = min(found) if entry.name == "narrowest_pole" else max(found)
    scale = max(abs(value), state.base.cell if entry.unit == "mm" else 1.0)
    return [Check(entry.label, entry.unit, None, float(reported[0]), value, scale, "itself")], np.array([value])


def _count_poles(pattern: Pattern) -> int:
    """Flood every pole from its first cell, in reading order."""
    seen = pattern == 0
    rows, columns = pattern.shape
    count = 0
    for start in zip(*np.nonzero(pattern), strict=True):
        if seen[start]:
            continue
        count += 1
        seen[start] = True
        stack = [(int(start[0]), int(start[1]))]
        while stack:
            y, x = stack.pop()
            for v, u in ((y - 1, x), (y + 1, x), (y, x - 1), (y, x + 1)):
                if 0 <= v < rows and 0 <= u < columns and not seen[v, u] and pattern[v, u] == pattern[y, x]:
                    seen[v, u] = True
                    stack.append((v, u))
    return count


def _count_edges(pattern: Pattern) -> int:
    rows, columns = pattern.shape
    total = 0
    for y in range(rows):
        for x in range(columns):
            here = int(pattern[y, x])
            total += x + 1 < columns and here * int(pattern[y, x + 1]) < 0
            total += y + 1 < rows and here * int(pattern[y + 1, x]) < 0
    return total


def _widest_brush(pattern: Pattern, mask: NDArray[np.bool_]) -> int:
    """Cells of the widest brush that, like all narrower ones, paints every pole: block by block."""
    if not (pattern[mask] != 0).any():
        return 0
    k = 1
    while k < min(mask.shape) and _paints_all(pattern, mask, k + 1):
        k += 1
    return k


def _paints_all(pattern: Pattern, mask: NDArray[np.bool_], k: int) -> bool:
    bare = (pattern != 0) & mask
    for y in range(mask.shape[0] - k + 1):
        for x in range(mask.shape[1] - k + 1):
            block = (slice(y, y + k), slice(x, x + k))
            inside = pattern[block][mask[block]]
            if 2 * inside.size >= k * k and abs(int(inside.sum())) == inside.size:
                bare[block] = False
    return not bool(bare.any())
