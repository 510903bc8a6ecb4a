"""One magnetized part on a square lattice: blank, cells, thickness and remanence."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from .blank import Blank


@dataclass(frozen=True, eq=False)
class Part:
    """A blank cut into square cells, all lengths in metres.

    The lattice is centred on the blank's bounding box, whose centre is the part's lateral origin. A cell belongs to
    the part when its centre lies inside the outline; what the size leaves over beyond whole cells is an
    unmagnetized rim.

    Attributes:
        blank: The outline.
        cell: Cell pitch [m].
        thickness: Thickness of the magnet, without coating [m].
        remanence: Remanence at working temperature [T].
        coating: Thickness of the coating on every surface [m].
    """

    blank: Blank
    cell: float
    thickness: float
    remanence: float
    coating: float = 0.0

    @cached_property
    def shape(self) -> tuple[int, int]:
        """Cells along (y, x)."""
        xmin, xmax, ymin, ymax = self.blank.bounds
        return _whole_cells(ymax - ymin, self.cell), _whole_cells(xmax - xmin, self.cell)

    @cached_property
    def x(self) -> NDArray[np.float64]:
        """Cell centres along x, shape (nx,) [m]."""
        return _centres(self.shape[1], self.cell)

    @cached_property
    def y(self) -> NDArray[np.float64]:
        """Cell centres along y, shape (ny,) [m]."""
        return _centres(self.shape[0], self.cell)

    @cached_property
    def mask(self) -> NDArray[np.bool_]:
        """Which cells belong to the part, shape (ny, nx)."""
        x, y = np.meshgrid(self.x, self.y)
        return self.blank.contains(x, y)

    @property
    def cells(self) -> int:
        """Number of cells on the part."""
        return int(self.mask.sum())

    @property
    def rim(self) -> tuple[float, float]:
        """Unmagnetized width left over along (x, y), both sides together [m]."""
        xmin, xmax, ymin, ymax = self.blank.bounds
        return (xmax - xmin) - self.shape[1] * self.cell, (ymax - ymin) - self.shape[0] * self.cell


def _whole_cells(length: float, cell: float) -> int:
    return int(np.floor(length / cell * (1.0 + 1e-12) + 1e-9))


def _centres(count: int, cell: float) -> NDArray[np.float64]:
    return np.asarray((np.arange(count, dtype=np.float64) - (count - 1) / 2.0) * cell)
