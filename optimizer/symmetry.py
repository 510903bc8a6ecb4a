"""Symmetries of a square lattice: which cells move together, and with which sign."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from ..models.symmetry import IMAGES

Index = NDArray[np.intp]
Array = NDArray[np.float64]


def orbits(shape: tuple[int, int], symmetry: str) -> tuple[Index, Array]:
    """Return for each cell the flat index of its orbit's first cell, and its sign against that cell.

    Args:
        shape: Cells (ny, nx).
        symmetry: A key of ``models.symmetry.IMAGES``.

    Returns:
        Index (ny, nx) and sign (ny, nx); the sign is 0 where the symmetry asks for a cell to be its own opposite.
    """
    cells = np.arange(shape[0] * shape[1], dtype=np.intp).reshape(shape)
    images = np.stack([cells, *(move(cells) for move, _ in IMAGES[symmetry])])
    signs = np.array([1.0, *(sign for _, sign in IMAGES[symmetry])])
    first = images.argmin(axis=0)
    torn = ((images == cells) & (signs < 0.0)[:, None, None]).any(axis=0)
    return images.min(axis=0), np.where(torn, 0.0, signs[first])
