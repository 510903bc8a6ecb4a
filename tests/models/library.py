"""The field library (magpylib) as an outside judge: every magnetized cell is one of its cuboids.

Its forces come from a mesh of the target: their error does not fall steadily with ``meshing``, see the tolerances.
"""

from __future__ import annotations

from importlib import import_module
from typing import Any

import numpy as np
from numpy.typing import NDArray
from polewright.models.part import Part

Array = NDArray[np.float64]
Pattern = NDArray[np.int8]

_library: Any = import_module("magpylib")  # it ships no annotations


def library_field(part: Part, pattern: Pattern, origin: tuple[float, float, float], points: Array) -> Array:
    """B at points (n, 3), shape (n, 3) [T]; ``origin`` is the part's lateral centre and lower magnet face [m]."""
    return np.asarray(_library.getB(_cuboids(part, pattern, origin), points, sumup=True)).reshape(-1, 3)


def library_force(
    base: Part, mover: Part, a: Pattern, b: Pattern, gap: float, dx: float, dy: float, meshing: int
) -> tuple[Array, Array]:
    """Force [N] and moment about the centre of the mover's mating face [N m] on the mover, shape (3,) each."""
    centre = np.array([dx, dy, gap + base.coating + mover.coating])
    sources = _cuboids(base, a, (0.0, 0.0, -base.thickness))
    targets = _cuboids(mover, b, (centre[0], centre[1], centre[2]))
    result = np.asarray(_library.getFT(sources, targets, pivot=tuple(centre), meshing=meshing))
    force, moment = result.reshape(2, -1, 3).sum(axis=1)
    return force, moment


def _cuboids(part: Part, pattern: Pattern, origin: tuple[float, float, float]) -> list[Any]:
    size = (part.cell, part.cell, part.thickness)
    return [
        _library.magnet.Cuboid(
            polarization=(0.0, 0.0, float(pattern[row, column]) * part.remanence),
            dimension=size,
            position=(part.x[column] + origin[0], part.y[row] + origin[1], origin[2] + part.thickness / 2),
        )
        for row, column in zip(*np.nonzero(pattern), strict=True)
    ]
