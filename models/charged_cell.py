"""Field of one uniformly charged unit square, by its solid angle and the logarithms of its edges."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

# In the square's plane the normal field jumps, and beside it the half-angle is lost in rounding: points nearer than
# this [cells] are lifted away from the plane, to the side where they are.
_LIFT = 1e-8


def cell_field(x: Array, y: Array, z: Array | float) -> tuple[Array, Array, Array]:
    """Integral of r / |r|^3 over the square |x'|, |y'| <= 1/2 at z' = 0.

    Times charge density over 4 pi it is the field. The normal component is the solid angle of the square, from the
    half-angle formula for triangles (A. van Oosterom, J. Strackee, IEEE Trans. Biomed. Eng. 30(2), 125-126, 1983)
    multiplied over its two triangles as complex numbers; no term cancels far away. The tangential components are
    differences of the potentials of two opposite edges, each ln((r1 + r2 + 1) / (r1 + r2 - 1)), with r1 + r2 - 1
    written so that it does not cancel beside an edge.

    Args:
        x: Where, relative to the square's centre, in its side lengths; arrays broadcast.
        y: As x.
        z: Height above the square, in its side lengths; 0 is the limit from above.

    Returns:
        (x, y, z) components, dimensionless, each of the broadcast shape.
    """
    z = np.copysign(np.maximum(np.abs(z), _LIFT), z)
    left, right, low, high = x + 0.5, x - 0.5, y + 0.5, y - 0.5
    zz = z * z
    to_left, to_right, to_low, to_high = (d * d + zz for d in (left, right, low, high))
    r00, r10 = np.sqrt(to_left + low * low), np.sqrt(to_right + low * low)
    r01, r11 = np.sqrt(to_left + high * high), np.sqrt(to_right + high * high)
    bx = _edge(r10, r11, low, high, to_right) - _edge(r00, r01, low, high, to_left)
    by = _edge(r01, r11, left, right, to_high) - _edge(r00, r10, left, right, to_low)
    # Dot products of the vectors from the corners to the point; the diagonal runs from corner 00 to corner 11.
    d00_11 = left * right + low * high + zz
    d00_10, d10_11 = left * right + to_low, low * high + to_right
    d00_01, d01_11 = low * high + to_left, left * right + to_high
    both = r00 * r11 + d00_11
    one = both * r10 + d00_10 * r11 + d10_11 * r00
    two = both * r01 + d00_01 * r11 + d01_11 * r00
    # The half-angle lies in [0, pi] on either side; its sine is 0 on the plane, where rounding must not turn it round.
    half = np.arctan2(np.abs(z * (one + two)), one * two - zz)
    return bx, by, np.copysign(2.0 * half, z)


def _edge(r1: Array, r2: Array, s1: Array, s2: Array, square: Array) -> Array:
    """Potential of a unit edge: s1 - s2 = 1 run along it from its ends, square is the distance to its line squared."""
    return np.asarray(np.log1p(2.0 / (_beyond(r1, s1, square) + _beyond(r2, -s2, square))))


def _beyond(r: Array, s: Array, square: Array) -> Array:
    """Return r - s where r^2 = s^2 + square, without cancelling at s near r."""
    return np.where(s > 0, square / (r + np.abs(s)), r - s)
