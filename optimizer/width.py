"""Patterns that keep the pole width: mending rounded ones, and the moves that a local search may try."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy import ndimage

from ..models.making import unpainted
from .layout import FaceMap, Layout

Array = NDArray[np.float64]
Index = NDArray[np.intp]

_ROUNDS = 30
_SMOOTHINGS = 12


def rounded(z: Array) -> Array:
    """Variables at -1 and +1, shape of z; +1 where one is exactly 0."""
    return np.where(z >= 0.0, 1.0, -1.0)


def keeps_width(layout: Layout, z: Array) -> NDArray[np.bool_]:
    """Which rounded sets of variables (m, n) give patterns that keep the pole width on both parts.

    Cells that are given are as wide as they are given; the free ones are held to the width.
    """
    good = np.ones(len(z), dtype=bool)
    for number, (face, pattern) in enumerate(zip((layout.base, layout.mover), layout.patterns(z), strict=True)):
        if layout.brushes[number] > 1 and not (number == 1 and layout.linked):
            bare = unpainted(pattern.astype(np.int8), layout.masks[number], layout.brushes[number])
            good &= ~(bare & (face.index >= 0)).any(axis=(-2, -1))
    return good


def mended(layout: Layout, z: Array) -> Array:
    """Round relaxed variables z (n,) and change as little as it takes to keep the pole width.

    Cells that no brush reaches are reversed, all at once so that symmetry stays; where that does not settle, the
    relaxed pattern is smoothed more and more before it is rounded.
    """
    for level in range(_SMOOTHINGS):
        candidate = rounded(_smoothed(layout, z, level))
        for _ in range(_ROUNDS):
            if keeps_width(layout, candidate[None])[0]:
                return candidate
            candidate = _reversed(layout, candidate)
    return candidate


def _reversed(layout: Layout, z: Array) -> Array:
    """Reverse the variables of all cells that no brush reaches."""
    out = z.copy()
    for number, (face, pattern) in enumerate(zip((layout.base, layout.mover), layout.patterns(z), strict=True)):
        if layout.brushes[number] == 1 or (number == 1 and layout.linked):
            continue
        bare = unpainted(pattern.astype(np.int8), layout.masks[number], layout.brushes[number])
        hit = np.unique(face.index[bare & (face.index >= 0)])
        out[hit] = -z[hit]
    return out


def _smoothed(layout: Layout, z: Array, level: int) -> Array:
    """Variables of the patterns blurred by ``level`` half pole widths."""
    if level == 0:
        return z
    blurred = []
    for pattern, mask, brush in zip(layout.patterns(z), layout.masks, layout.brushes, strict=True):
        sigma = 0.4 * level * brush
        weight = ndimage.gaussian_filter(mask.astype(np.float64), sigma, mode="constant")
        smooth = ndimage.gaussian_filter(pattern * mask, sigma, mode="constant")
        blurred.append(np.where(mask, smooth / np.maximum(weight, 1e-9), 0.0))
    return layout.variables(blurred[0], blurred[1])


def moves(layout: Layout, *, facing: bool = False) -> tuple[Index, Array]:
    """What a local search may set at once.

    At a pole width of one cell each variable alone; else windows one pole wide and one cell or a pole's width deep,
    each set to either polarity.

    Args:
        layout: What is free.
        facing: Also windows that face each other, set on both parts at once to equal or to opposite polarities.

    Returns:
        Variables of each move (m, w), padded by -1, and the value each is set to (m, w).
    """
    found: dict[tuple[tuple[int, float], ...], None] = {}
    for number, face in enumerate((layout.base, layout.mover)):
        if number == 1 and layout.linked:
            continue
        k = layout.brushes[number]
        for height, width in {(1, k), (k, 1), (k, k)}:
            for targets in _windows(face, height, width):
                found.setdefault(targets)
    if facing and not layout.linked and layout.base.index.shape == layout.mover.index.shape:
        k = max(layout.brushes)
        for height, width in {(1, k), (k, 1), (k, k)}:
            pairs = zip(_windows(layout.base, height, width), _windows(layout.mover, height, width), strict=False)
            for below, above in pairs:
                found.setdefault(below + above)
                found.setdefault(below + tuple((variable, -value) for variable, value in above))
    longest = max((len(targets) for targets in found), default=1)
    variables = np.full((len(found), longest), -1, dtype=np.intp)
    values = np.zeros((len(found), longest))
    for row, targets in enumerate(found):
        variables[row, : len(targets)] = [variable for variable, _ in targets]
        values[row, : len(targets)] = [value for _, value in targets]
    return variables, values


def _windows(face: FaceMap, height: int, width: int) -> list[tuple[tuple[int, float], ...]]:
    """Every window of a part as (variable, value) pairs, once for each polarity."""
    out = []
    rows, columns = face.index.shape
    for y in range(rows - height + 1):
        for x in range(columns - width + 1):
            index = face.index[y : y + height, x : x + width].ravel()
            sign = face.sign[y : y + height, x : x + width].ravel()
            for polarity in (1.0, -1.0):
                targets = {int(i): float(s * polarity) for i, s in zip(index, sign, strict=True) if i >= 0}
                if targets:
                    out.append(tuple(sorted(targets.items())))
    return out
