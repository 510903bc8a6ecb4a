"""Small parts and patterns for physics tests."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from polewright.models.blank import Rectangle
from polewright.models.part import Part

from .references import MM


def plate(nx: int, ny: int, cell_mm: float = 1.0, thickness_mm: float = 3.0, remanence: float = 1.3) -> Part:
    """Rectangle of nx by ny cells, lengths in mm, remanence in T."""
    return Part(Rectangle(nx * cell_mm * MM, ny * cell_mm * MM), cell_mm * MM, thickness_mm * MM, remanence)


def noise(part: Part, seed: int) -> NDArray[np.int8]:
    """Random +-1 on the cells of the part, 0 elsewhere."""
    return np.where(part.mask, np.random.default_rng(seed).choice([-1, 1], part.shape), 0).astype(np.int8)


def ones(part: Part) -> NDArray[np.int8]:
    """+1 on the cells of the part, 0 elsewhere."""
    return part.mask.astype(np.int8)
