"""The published force of two cuboids in double precision: physics for brute force that shares no code with the tool.

G. Akoun, J.-P. Yonnet, IEEE Trans. Magn. 20(5), 1962-1964, 1984.
"""

from __future__ import annotations

import itertools

import numpy as np
from numpy.typing import NDArray

MU0 = 4e-7 * np.pi


def axial_force(remanence: float, cell: float, thickness: float, offset: tuple[float, float], gap: float) -> float:
    """F_z [N] on the upper of two equal cells of polarity +1, lateral centre offset and gap in m."""
    total = 0.0
    for i, j, k, m, p, q in itertools.product((0, 1), repeat=6):
        u = offset[0] + (j - i) * cell
        v = offset[1] + (m - k) * cell
        w = gap + thickness + (q - p) * thickness
        r = np.sqrt(u * u + v * v + w * w)
        value = -u * w * _log(r, u, v, w) - v * w * _log(r, v, u, w) + u * v * np.arctan2(u * v, r * w) - r * w
        total += (-1) ** (i + j + k + m + p + q) * value
    return float(remanence**2 / (4.0 * np.pi * MU0) * total)


def _log(r: float, one: float, other: float, w: float) -> float:
    """log(r - one) without cancellation."""
    return float(np.log(r - one) if one <= 0.0 else np.log((other * other + w * w) / (r + one)))


def axial_matrix(n: int, cell: float, thickness: float, remanence: float, gap: float) -> NDArray[np.float64]:
    """K with F_z = a K b for two n x n faces of cells, row-major, shape (n * n, n * n)."""
    cells = list(itertools.product(range(n), repeat=2))
    known = {
        (dy, dx): axial_force(remanence, cell, thickness, (dx * cell, dy * cell), gap)
        for dy in range(n)
        for dx in range(n)
    }
    return np.array([[known[abs(y - v), abs(x - u)] for v, u in cells] for y, x in cells])


def all_patterns(cells: int) -> NDArray[np.float64]:
    """Every pattern of -1 and +1, shape (2 ** cells, cells)."""
    return np.array(list(itertools.product((-1.0, 1.0), repeat=cells)))
