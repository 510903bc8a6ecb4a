"""The field far from a magnetized part: multipole moments of its face charges up to the octupole.

Every moment is linear in the pattern. About the middle of the magnet, with m the magnetic moment of a cell of width p
and thickness t at (x, y), the charge moments that do not vanish are

    dipole     z: sum m
    quadrupole xz, yz: sum m x, sum m y
    octupole   xxz, yyz: sum m (x^2 + p^2/12) and the same in y;  xyz: sum m x y;  zzz: sum m t^2/4

(written here for one order of the indices). The field of the moments is used from about ten times the part's size on;
closer, ``stray.field`` is exact and as cheap.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import permutations
from typing import final

import numpy as np
from numpy.typing import NDArray

from .stray import Placed
from .units import MU0

Points = NDArray[np.float64]

# A moment below this fraction of what the same cells could have together is rounding.
_ROUNDING = 1e-9


@final
@dataclass(frozen=True, eq=False)
class Moments:
    """Charge moments of one part about the middle of its magnet.

    Attributes:
        centre: The middle (x, y, z) [m].
        dipole: Magnetic moment (3,) [A m2], along z.
        quadrupole: Symmetric (3, 3) [A m3].
        octupole: Symmetric (3, 3, 3) [A m4].
        ceiling: Largest dipole [A m2], quadrupole [A m3] and octupole [A m4] the magnetized cells could have together.
    """

    centre: tuple[float, float, float]
    dipole: Points
    quadrupole: Points
    octupole: Points
    ceiling: tuple[float, float, float]


def moments(source: Placed) -> Moments:
    """Return the moments of a magnetized part."""
    part = source.part
    cell_moments = np.asarray(source.pattern, dtype=np.float64) * (part.remanence / MU0 * part.cell**2 * part.thickness)
    x, y = np.meshgrid(part.x, part.y)
    spread = part.cell**2 / 12.0
    quadrupole, octupole = np.zeros((3, 3)), np.zeros((3, 3, 3))
    _fill(quadrupole, (0, 2), float((cell_moments * x).sum()))
    _fill(quadrupole, (1, 2), float((cell_moments * y).sum()))
    _fill(octupole, (0, 0, 2), float((cell_moments * (x * x + spread)).sum()))
    _fill(octupole, (1, 1, 2), float((cell_moments * (y * y + spread)).sum()))
    _fill(octupole, (0, 1, 2), float((cell_moments * x * y).sum()))
    _fill(octupole, (2, 2, 2), float(cell_moments.sum()) * part.thickness**2 / 4.0)
    sizes, r2 = np.abs(cell_moments), x * x + y * y + spread
    ceiling = (float(sizes.sum()), float((sizes * np.sqrt(r2)).sum()), float((sizes * r2).sum()))
    middle = (source.origin[0], source.origin[1], source.origin[2] + part.thickness / 2.0)
    return Moments(middle, np.array([0.0, 0.0, cell_moments.sum()]), quadrupole, octupole, ceiling)


def net_moment(source: Placed) -> float:
    """Return the magnetic moment of a part along +z [A m2]."""
    part = source.part
    return float(np.sum(source.pattern)) * part.remanence / MU0 * part.cell**2 * part.thickness


def far_field(sources: Sequence[Moments], points: Points) -> Points:
    """Return B (n, 3) [T] of moments together at points (n, 3) [m] far outside the parts."""
    total = np.zeros((len(points), 3))
    for source in sources:
        way = points - np.array(source.centre)
        # With the trace taken out, S_l = Q_ab.. x_a x_b .. is harmonic and the potential is c_l S_l / r^(2 l + 1).
        quadrupole = source.quadrupole - np.eye(3) * np.trace(source.quadrupole) / 3.0
        octupole = _traceless(source.octupole)
        slopes = (
            np.broadcast_to(source.dipole, way.shape),
            2.0 * way @ quadrupole,
            3.0 * np.einsum("abc,nb,nc->na", octupole, way, way),
        )
        r2 = (way * way).sum(axis=1, keepdims=True)
        # (2 l - 1)!! / l! of the expansion of 1 / |x - x'|.
        for order, (factor, slope) in enumerate(zip((1.0, 1.5, 2.5), slopes, strict=True), start=1):
            harmonic = (slope * way).sum(axis=1, keepdims=True) / order
            scale = factor * MU0 / (4.0 * np.pi) / r2 ** (order + 0.5)
            total += scale * ((2 * order + 1) * harmonic * way / r2 - slope)
    return total


def leading_order(source: Moments) -> int:
    """Return which moment rules far away: 1 dipole, 2 quadrupole, 3 octupole, 4 for something higher.

    |B| falls with the distance to the power of this number plus 2.
    """
    strengths = (
        np.abs(source.dipole).max(),
        np.abs(source.quadrupole).max(),
        np.abs(_traceless(source.octupole)).max(),
    )
    for order, (strength, ceiling) in enumerate(zip(strengths, source.ceiling, strict=True), start=1):
        if strength > _ROUNDING * ceiling:
            return order
    return 4


def _fill(tensor: Points, index: tuple[int, ...], value: float) -> None:
    """Set an entry of a symmetric tensor in every order of its indices."""
    for order in set(permutations(index)):
        tensor[order] = value


def _traceless(octupole: Points) -> Points:
    trace = np.einsum("aac->c", octupole)
    unit = np.eye(3)
    traces = (
        np.einsum("ab,c->abc", unit, trace) + np.einsum("ac,b->abc", unit, trace) + np.einsum("bc,a->abc", unit, trace)
    )
    traceless: Points = octupole - traces / 5.0
    return traceless
