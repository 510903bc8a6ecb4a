"""Exact measures of how a rounded pattern would be made: its poles, their edges and the narrowest pole.

Patterns hold -1 (S up), 0 (unmagnetized) and +1 (N up); the mask says which cells lie on the blank.

The pole width is measured with a brush, the way a magnetizing head of a given width would paint the face:

- The brush is a block of k x k cells that lies inside the lattice's array.
- It may paint where all of its cells that lie on the blank carry one polarity (an unmagnetized cell on the blank blocks
  it), and where at least half of its cells lie on the blank. Cells off the blank count as belonging to every pole, so a
  curved outline does not make a pole narrow.
- A brush fits a pattern when every cell of every pole is painted by some block.

The narrowest pole is the largest k for which the brushes of 1, 2, ... k cells all fit, times the cell. On a full
rectangle a brush fits whenever a larger one does (each block is the union of the smaller ones inside it); on other
outlines the half-on-the-blank rule could break that, hence "all". When the brush of k cells fits a full rectangle,
each run of one polarity along a row or a column is at least k cells long. The reverse does not hold: a diagonal
staircase has long runs and still is narrow.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy import ndimage

Pattern = NDArray[np.int8]
Mask = NDArray[np.bool_]


def poles(pattern: Pattern) -> NDArray[np.int32]:
    """Number the poles: cells of one polarity that touch along an edge (not at a corner) are one pole.

    Args:
        pattern: Polarities, shape (ny, nx).

    Returns:
        Labels, shape (ny, nx): 0 where unmagnetized, then the +1 poles from 1 on, then the -1 poles.
    """
    north, count = ndimage.label(pattern > 0)
    south, _ = ndimage.label(pattern < 0)
    labels: NDArray[np.int32] = np.where(south > 0, south + count, north).astype(np.int32)
    return labels


def pole_count(pattern: Pattern) -> int:
    """Count the poles, N and S together; unmagnetized areas are none.

    Args:
        pattern: Polarities, shape (ny, nx).
    """
    return int(poles(pattern).max(initial=0))


def pole_edge_length(pattern: Pattern, cell: float) -> float:
    """Length of the boundary between +1 and -1 cells; edges to unmagnetized cells and the outline do not count.

    Args:
        pattern: Polarities, shape (ny, nx).
        cell: Cell pitch [m].

    Returns:
        Length [m].
    """
    # -1 * -1 and +1 * +1 are not -1: only neighbours of opposite polarity are.
    across_x = np.count_nonzero(pattern[:, 1:] * pattern[:, :-1] == -1)
    across_y = np.count_nonzero(pattern[1:, :] * pattern[:-1, :] == -1)
    return float(across_x + across_y) * cell


def unpainted(pattern: Pattern, mask: Mask, k: int) -> Mask:
    """Find the pole cells that a brush of k x k cells cannot paint (see the module's text for the rule).

    Args:
        pattern: Polarities, shape (..., ny, nx); leading axes are independent patterns.
        mask: Cells on the blank, shape (ny, nx).
        k: Width of the brush [cells], at least 1.

    Returns:
        True where a pole cell stays unpainted, shape of ``pattern``.
    """
    polarity = np.asarray(np.where(mask, pattern, 0))
    on_pole: Mask = polarity != 0
    if k > min(mask.shape):
        return on_pole
    on_blank = _box_sums(mask, k)
    # A sum of polarities as large as the number of cells on the blank means that all of them are equal.
    paints = (np.abs(_box_sums(polarity, k)) == on_blank) & (2 * on_blank >= k * k)
    # A block that paints holds one polarity only, so what it covers on the blank is painted right.
    spread = np.zeros((*polarity.shape[:-2], *(count + k - 1 for count in mask.shape)), dtype=np.int32)
    spread[..., k - 1 : mask.shape[0], k - 1 : mask.shape[1]] = paints
    painted: Mask = _box_sums(spread, k) > 0
    return on_pole & ~painted


def brush_ok(pattern: Pattern, mask: Mask, k: int) -> bool:
    """Tell whether a brush of k x k cells paints every pole without loss.

    Args:
        pattern: Polarities, shape (ny, nx).
        mask: Cells on the blank, shape (ny, nx).
        k: Width of the brush [cells], at least 1.
    """
    return not bool(unpainted(pattern, mask, k).any())


def narrowest_pole(pattern: Pattern, mask: Mask, cell: float) -> float:
    """Width of the narrowest pole: the largest brush that, like all smaller ones, paints every pole without loss.

    Args:
        pattern: Polarities, shape (ny, nx).
        mask: Cells on the blank, shape (ny, nx).
        cell: Cell pitch [m].

    Returns:
        Width [m]; the shorter side of the lattice for a uniform rectangle, 0 for a part without poles.
    """
    if not np.any(pattern[mask]):
        return 0.0
    k = 1
    while k < min(mask.shape) and brush_ok(pattern, mask, k + 1):
        k += 1
    return k * cell


def _box_sums(values: NDArray[np.generic], k: int) -> NDArray[np.int32]:
    """Sums over all k x k blocks that lie inside the last two axes, by running sums."""
    columns = np.cumsum(values, axis=-1, dtype=np.int32)
    along_x = columns[..., k - 1 :].copy()
    along_x[..., 1:] -= columns[..., :-k]
    rows = np.cumsum(along_x, axis=-2, dtype=np.int32)
    total: NDArray[np.int32] = rows[..., k - 1 :, :].copy()
    total[..., 1:, :] -= rows[..., :-k, :]
    return total
