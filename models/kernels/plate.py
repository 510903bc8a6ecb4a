"""Field of one corner of an axially magnetized plate: the closed form all field maps are sums of.

A plate magnetized along z carries charge +J on its upper and -J on its lower face. The field of a charged rectangle
is the second difference, over its corners, of elementary functions of the way (x, y, z) from a corner to the point;
with R = |(x, y, z)|,

    Bx: -asinh(y / hypot(x, z)),   By: -asinh(x / hypot(y, z)),   Bz: atan(x y / (z R)),

all times J / (4 pi) (textbook integrals of Coulomb's law over a rectangle; checked against magpylib). The upper face
less the lower is taken inside one logarithm and one arc tangent, which keeps the precision of a small difference and
halves the cost.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Points = NDArray[np.float64]

# Where a line through an edge is met, the logarithms of its corners diverge and cancel; this much of a length^2 keeps
# them finite. On an edge itself, where the field of sharp charge really diverges, the result is large but finite.
_FLOOR = 1e-36


def plate_corner(
    x: Points, y: Points, above_low: Points | float, above_high: Points | float
) -> tuple[Points, Points, Points]:
    """Return the corner functions (bx, by, bz) of a plate, dimensionless: times J / (4 pi) they sum to B.

    A point level with a face counts as just outside the plate.

    Args:
        x: Way along x from the corner to the point [m], any shape.
        y: The same along y.
        above_low: Height of the point above the plate's lower face [m], of a shape that broadcasts with x.
        above_high: Height of the point above the plate's upper face [m].
    """
    xx, yy = x * x, y * y
    low2, high2 = above_low * above_low + _FLOOR, above_high * above_high + _FLOOR
    across = xx + yy
    r_low, r_high = np.sqrt(across + low2), np.sqrt(across + high2)
    bx = _along(y, xx, r_low, r_high, low2, high2)
    by = _along(x, yy, r_low, r_high, low2, high2)
    # atan(t_high) - atan(t_low) as the argument of one complex product: each angle is within +-90 deg.
    side_low, side_high = np.where(above_low > 0.0, 1.0, -1.0), np.where(above_high >= 0.0, 1.0, -1.0)
    leg_low, leg_high = np.abs(above_low) * r_low, np.abs(above_high) * r_high
    xy = x * y
    bz = np.arctan2(
        xy * (side_high * leg_low - side_low * leg_high), leg_low * leg_high + (side_low * side_high) * (xy * xy)
    )
    return bx, by, bz


def _along(
    edge: Points, other: Points, r_low: Points, r_high: Points, low2: Points | float, high2: Points | float
) -> Points:
    """-asinh(edge / rho) of the upper less that of the lower face; ``other`` is the squared way across the edge."""
    size = np.abs(edge)
    ratio = (r_high + size) / (r_low + size)
    logs: Points = np.log(ratio * ratio * ((other + low2) / (other + high2)))
    return -np.copysign(0.5, edge) * logs
