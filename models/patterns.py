"""The obvious patterns: uniform, stripes and checker, as baselines to compare with and as seeds of a search.

They are centred and respect the pole width where the outline lets them: slivers that a curved outline cuts off join the
pole next to them.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy import ndimage

from .making import unpainted

Pattern = NDArray[np.int8]
Mask = NDArray[np.bool_]


def uniform(mask: Mask) -> Pattern:
    """One pole: +1 on every cell of the blank.

    Args:
        mask: Cells on the blank, shape (ny, nx).

    Returns:
        Polarities, shape (ny, nx).
    """
    return mask.astype(np.int8)


def stripes(mask: Mask, width_cells: int, axis: int = 1) -> Pattern:
    """Stripes of alternating polarity, centred: what whole stripes leave over widens the two outer ones.

    Args:
        mask: Cells on the blank, shape (ny, nx).
        width_cells: Width of a stripe [cells], at least 1; a lattice narrower than this gets one stripe.
        axis: Array axis along which the polarity changes: 1 along x (stripes run along y), 0 along y.

    Returns:
        Polarities, shape (ny, nx); the stripe at the low end is +1.
    """
    sign = _signs(mask.shape[axis], width_cells)
    line = sign[None, :] if axis == 1 else sign[:, None]
    return _without_slivers(np.where(mask, line, 0).astype(np.int8), mask, width_cells)


def checker(mask: Mask, width_cells: int) -> Pattern:
    """Squares of alternating polarity, centred like ``stripes`` along both axes.

    Args:
        mask: Cells on the blank, shape (ny, nx).
        width_cells: Width of a square [cells], at least 1.

    Returns:
        Polarities, shape (ny, nx); the square at the low corner is +1.
    """
    rows, columns = (_signs(count, width_cells) for count in mask.shape)
    squares = np.where(mask, rows[:, None] * columns[None, :], 0).astype(np.int8)
    return _without_slivers(squares, mask, width_cells)


def _signs(count: int, width: int) -> Pattern:
    """Alternating +1 and -1 in runs of ``width``; the first and last run share what is left over."""
    whole = max(count // width, 1)
    first = (count - whole * width) // 2
    run = np.clip((np.arange(count) - first) // width, 0, whole - 1)
    return np.where(run % 2 == 0, 1, -1).astype(np.int8)


def _without_slivers(pattern: Pattern, mask: Mask, width: int) -> Pattern:
    """Give the cells that a brush of ``width`` cells cannot paint the polarity of the nearest cell that it can."""
    bad = unpainted(pattern, mask, width)
    good = mask & ~bad
    if not bad.any() or not good.any():
        return pattern
    rows, columns = ndimage.distance_transform_edt(~good, return_distances=False, return_indices=True)
    return np.where(bad, pattern[rows, columns], pattern).astype(np.int8)
