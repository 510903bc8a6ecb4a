"""Structured starts for a search: two textures, one inside a region and one outside, equal or opposed on both parts.

Force curves with character come from such pairs: textures that face each other with equal polarity attract and fade
over their own pole width, opposed ones repel, coarse ones reach further than fine ones. Drawn at random in numbers and
judged by the physics, the best of them are better starts than noise.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy import ndimage

from ..models.symmetry import IMAGES
from .layout import Layout
from .symmetry import orbits

Array = NDArray[np.float64]
Lattice = tuple[int, int]

_SYMMETRIC = 0.3
"""Share of structured starts that get a symmetry."""


def composites(layout: Layout, random: np.random.Generator, count: int) -> Array:
    """Variables of ``count`` structured pattern pairs, each rounded to -1 and +1, shape (count, n)."""
    return np.stack([_composite(layout, random) for _ in range(count)]) if count else np.zeros((0, layout.count))


def noise(layout: Layout, random: np.random.Generator, count: int) -> Array:
    """Smooth random variables of unit size, shape (count, n), each blurred over its own random width."""
    out = []
    for _ in range(count):
        sigma = random.uniform(0.5, 3.0)
        fields = [ndimage.gaussian_filter(random.normal(size=mask.shape), sigma) for mask in layout.masks]
        z = layout.variables(fields[0], fields[1])
        out.append(z / max(float(z.std()), 1e-12))
    return np.stack(out) if out else np.zeros((0, layout.count))


def _composite(layout: Layout, random: np.random.Generator) -> Array:
    """One structured pair: drawn on the base's lattice, carried over to the mover's centre to centre."""
    widths = (max(layout.brushes), max(max(layout.masks[0].shape) // 3, max(layout.brushes)))
    lattice = tuple(max(a, b) for a, b in zip(layout.masks[0].shape, layout.masks[1].shape, strict=True))
    size = (lattice[0], lattice[1])
    inside = _region(size, random)
    textures = [_texture(size, widths, random) for _ in range(2)]
    signs = random.choice([-1.0, 1.0], size=2)
    base = np.where(inside, textures[0], textures[1])
    mover = np.where(inside, signs[0] * textures[0], signs[1] * textures[1])
    if random.random() < _SYMMETRIC:
        base, mover = _symmetrized((base, mover), random)
    patterns = [_centred(face, mask.shape) for face, mask in zip((base, mover), layout.masks, strict=True)]
    return np.where(layout.variables(patterns[0], patterns[1]) >= 0.0, 1.0, -1.0)


def _symmetrized(faces: tuple[Array, Array], random: np.random.Generator) -> tuple[Array, Array]:
    """Give both faces one symmetry, even or odd: odd ones cancel moments exactly."""
    names = [name for name in IMAGES if name != "quarter-turn" or faces[0].shape[0] == faces[0].shape[1]]
    root, sign = orbits((faces[0].shape[0], faces[0].shape[1]), names[int(random.integers(1, len(names)))])
    even = np.where(sign == 0.0, 1.0, sign)
    return faces[0].ravel()[root] * even, faces[1].ravel()[root] * even


def _region(size: Lattice, random: np.random.Generator) -> NDArray[np.bool_]:
    """A random part of the face: blotches, one side of a line, a disc or a square at an edge, corner or the centre."""
    y, x = np.meshgrid(*(np.linspace(-0.5, 0.5, cells) for cells in size), indexing="ij")
    kind = random.integers(4)
    centre = random.choice([-0.5, 0.0, 0.5], size=2) + random.uniform(-0.1, 0.1, size=2)
    if kind == 0:
        level = ndimage.gaussian_filter(random.normal(size=size), random.uniform(0.08, 0.3) * max(size))
    elif kind == 1:
        angle = random.integers(8) * np.pi / 4.0
        level = np.cos(angle) * x + np.sin(angle) * y
    elif kind == 2:
        level = -np.hypot(x - centre[0], y - centre[1])
    else:
        level = -np.maximum(np.abs(x - centre[0]), np.abs(y - centre[1]))
    return np.asarray(level > np.quantile(level, random.uniform(0.1, 0.9)))


def _texture(size: Lattice, widths: tuple[int, int], random: np.random.Generator) -> Array:
    """Uniform, stripes, checker, rings or blotches of a random pole width."""
    kind = random.integers(5)
    width = int(random.integers(widths[0], widths[1] + 1))
    shift = random.integers(2 * width, size=2)
    y, x = np.meshgrid(*(np.arange(cells) for cells in size), indexing="ij")
    rows, columns = ((y + shift[0]) // width) % 2, ((x + shift[1]) // width) % 2
    if kind == 0:
        return np.ones(size)
    if kind == 1:
        return np.where((rows if random.integers(2) else columns) == 0, 1.0, -1.0)
    if kind == 2:
        return np.where(rows == columns, 1.0, -1.0)
    if kind == 3:
        radius = np.hypot(y - (size[0] - 1) / 2.0, x - (size[1] - 1) / 2.0)
        return np.where(((radius + shift[0]) // width) % 2 == 0, 1.0, -1.0)
    return np.where(ndimage.gaussian_filter(random.normal(size=size), 0.5 * width) >= 0.0, 1.0, -1.0)


def _centred(face: Array, shape: tuple[int, ...]) -> Array:
    """Cut the middle ``shape`` out of a face."""
    y, x = ((big - small) // 2 for big, small in zip(face.shape, shape, strict=True))
    return face[y : y + shape[0], x : x + shape[1]]


def perturbed(layout: Layout, z: Array, random: np.random.Generator) -> Array:
    """Disturb a rounded design in one window: on one part or both, reversed, set to one pole or shuffled."""
    patterns = [pattern.copy() for pattern in layout.patterns(z)]
    low, high = max(layout.brushes), max(max(layout.masks[0].shape) // 3, max(layout.brushes) + 1)
    height, width = (int(cells) for cells in random.integers(low, high + 1, size=2))
    at = random.uniform(size=2)
    kind = random.integers(4)
    touched = (0, 1) if kind in (1, 2) else (int(random.integers(2)),)
    flips = random.choice([-1.0, 1.0], size=(height, width))
    value = random.choice([-1.0, 1.0])
    for number in touched:
        rows, columns = patterns[number].shape
        tall, wide = min(height, rows), min(width, columns)
        y, x = int(at[0] * (rows - tall + 1)), int(at[1] * (columns - wide + 1))
        window = patterns[number][y : y + tall, x : x + wide]
        if kind == 3:
            window[:] = value
        else:
            window *= flips[:tall, :wide] if kind == 2 else -1.0
    out = layout.variables(patterns[0], patterns[1])
    return np.where(out == 0.0, z, np.where(out > 0.0, 1.0, -1.0))


def crossed(layout: Layout, z: Array, other: Array, random: np.random.Generator) -> Array:
    """Put a window of another design into a rounded one, on both parts alike."""
    patterns = [pattern.copy() for pattern in layout.patterns(z)]
    sources = layout.patterns(other)
    share, at = random.uniform(0.25, 0.65, size=2), random.uniform(size=2)
    for pattern, source in zip(patterns, sources, strict=True):
        rows, columns = pattern.shape
        tall, wide = max(int(share[0] * rows), 1), max(int(share[1] * columns), 1)
        y, x = int(at[0] * (rows - tall + 1)), int(at[1] * (columns - wide + 1))
        pattern[y : y + tall, x : x + wide] = source[y : y + tall, x : x + wide]
    out = layout.variables(patterns[0], patterns[1])
    return np.where(out == 0.0, z, np.where(out > 0.0, 1.0, -1.0))
