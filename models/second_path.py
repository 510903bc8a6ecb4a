"""The second path: forces of a pair by charge times field, to check the closed-form pair kernels.

Nothing here shares a formula or a line with the design kernels. Those differentiate an antiderivative of the force
between two sheets; here the mover is two sheets of charge in the field of the base. The field of one charged base cell
is taken from its solid angle (normal component) and from the logarithms of its edges (tangential components), and is
summed over each mover cell by Gauss-Legendre quadrature: graded panels where the two cells are close, a few nodes where
they are far. Cells are equal squares, so the result depends on their displacement alone: one table of displacements
times the cross-correlation of the two patterns gives the force and the moment of the pair.

Lengths inside are in cells, so that sums are of order one.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from .charged_cell import cell_field
from .errors import InputError
from .part import Part
from .quadrature import Nodes, graded_nodes, plain_nodes

Array = NDArray[np.float64]
Pattern = NDArray[np.int8] | NDArray[np.float64]
Values = NDArray[np.integer] | NDArray[np.float64]

MU0 = 4e-7 * np.pi

# (displacement in cells up to which they serve, Gauss nodes an axis). A panel of one cell at displacement d has its
# nearest singularity near 2 d - 1 half-widths, so the error falls like (4 d)^(-2 n): 1e-10 of the pair's own force.
_TIERS = ((3.0, 9), (6.0, 6), (16.0, 5), (64.0, 4), (np.inf, 3))
_NEAR = 2.0  # below this displacement [cells] cells touch or overlap in plan, and panels are graded
_NEAR_NODES = 9
_CHUNK = 1 << 16  # nodes evaluated at a time, so that work arrays stay in the cache
_FINEST = 1e-5  # panels are graded down to this height [cells]; in contact that leaves 1e-8 of the force


@dataclass(frozen=True)
class _Sheet:
    """Two charged faces: their distance [cells], the sign of their charges' product, is it the mover's upper face."""

    height: float
    sign: float
    upper: bool


@dataclass(frozen=True)
class _Table:
    """What one mover cell feels of one base cell at every displacement (ny', nx'), all charges of both parts.

    Attributes:
        force: (3, ny', nx'), force on both faces of the mover cell.
        upper: (3, ny', nx'), force on its upper face alone.
        moment: (3, ny', nx'), moment about the cell's own axis without the arm along z.
    """

    force: Array
    upper: Array
    moment: Array


def pair_force(base: Part, mover: Part, a: Pattern, b: Pattern, gap: float, dx: float = 0.0, dy: float = 0.0) -> Array:
    """Force on the mover, by charge times field.

    Args:
        base: The part that stays; its mating face is at z = 0.
        mover: The part above it.
        a: Polarities of the base, shape (ny, nx); integers are summed exactly.
        b: Polarities of the mover, shape (my, mx), as seen from +z.
        gap: Distance of the coated mating faces [m], at least 0.
        dx: Lateral offset of the mover's centre along x [m].
        dy: Lateral offset along y [m].

    Returns:
        (Fx, Fy, Fz), shape (3,) [N]; Fz > 0 pushes the parts apart.

    Raises:
        InputError: The parts have different cells, a pattern does not fit its part, or the gap is negative.
    """
    _check(base, mover, a, b, gap)
    table = _table(base, mover, gap, dx, dy)
    count = correlation(a, b)
    return _scale(base, mover) * _weigh(table.force, count)


def pair_moment(base: Part, mover: Part, a: Pattern, b: Pattern, gap: float, dx: float = 0.0, dy: float = 0.0) -> Array:
    """Moment on the mover about the centre of its mating face (the lower face of its magnet).

    Args and errors as for ``pair_force``.

    Returns:
        (Mx, My, Mz), shape (3,) [N m], right-handed about axes through the mover's lateral centre.
    """
    _check(base, mover, a, b, gap)
    table = _table(base, mover, gap, dx, dy)
    ny, nx = b.shape
    # Arms in half cells are whole numbers, so that integer patterns keep their exact sums.
    half_x = (2 * np.arange(nx) - (nx - 1)).astype(np.int64)
    half_y = (2 * np.arange(ny) - (ny - 1)).astype(np.int64)[:, None]
    count = correlation(a, b)
    fx_y, fz_y = (_weigh(table.force, correlation(a, b * half_y))[i] / 2 for i in (0, 2))
    fy_x, fz_x = (_weigh(table.force, correlation(a, b * half_x))[i] / 2 for i in (1, 2))
    top = _weigh(table.upper, count) * mover.thickness / mover.cell
    arms = np.array([fz_y - top[1], top[0] - fz_x, fy_x - fx_y])
    return _scale(base, mover) * base.cell * (arms + _weigh(table.moment, count))


def field(part: Part, pattern: Pattern, origin: tuple[float, float, float], points: Array) -> Array:
    """Field of one part outside its magnet, by solid angles and edge logarithms of its charged cells.

    Args:
        part: The magnet.
        pattern: Polarities, shape (ny, nx).
        origin: Lateral centre (x, y) and height of the lower face of the magnet [m].
        points: Where, shape (n, 3) [m]. On a face the limit from above is taken.

    Returns:
        B, shape (n, 3) [T].
    """
    at = (np.atleast_2d(points) - np.asarray(origin)) / part.cell
    rows, columns = np.nonzero(pattern)
    charge = np.asarray(pattern, dtype=np.float64)[rows, columns]
    x0, y0 = part.x[columns] / part.cell, part.y[rows] / part.cell
    result = np.zeros_like(at)
    step = max(1, _CHUNK // max(1, charge.size))
    for start in range(0, len(at), step):
        some = at[start : start + step]
        x, y = some[:, 0, None] - x0, some[:, 1, None] - y0
        for height, sign in ((part.thickness / part.cell, 1.0), (0.0, -1.0)):
            components = cell_field(x, y, some[:, 2, None] - height)
            result[start : start + step] += sign * np.stack([c @ charge for c in components], axis=1)
    return np.asarray(result * part.remanence / (4 * np.pi))


def correlation(a: Values, b: Values) -> Array:
    """How often each displacement of a mover cell from a base cell occurs, weighted with both values.

    Args:
        a: Values on the base, shape (ny, nx).
        b: Values on the mover, shape (my, mx).

    Returns:
        Sum over base cells i of a[i] b[i + d], shape (ny + my - 1, nx + mx - 1); entry 0 belongs to d = -(n - 1).
        Exact when both are integers.
    """
    shape = (a.shape[0] + b.shape[0] - 1, a.shape[1] + b.shape[1] - 1)
    turned = np.asarray(a, dtype=np.float64)[::-1, ::-1]
    spectrum = np.fft.rfft2(turned, shape) * np.fft.rfft2(np.asarray(b, dtype=np.float64), shape)
    total: Array = np.fft.irfft2(spectrum, shape)
    if np.issubdtype(a.dtype, np.integer) and np.issubdtype(b.dtype, np.integer):
        total = np.rint(total)
    return total


def _check(base: Part, mover: Part, a: Pattern, b: Pattern, gap: float) -> None:
    if not np.isclose(base.cell, mover.cell, rtol=1e-12, atol=0.0):
        message = f"the second path needs one cell pitch on both parts; received {base.cell} m and {mover.cell} m"
        raise InputError(message)
    for name, part, pattern in (("base", base, a), ("mover", mover, b)):
        if np.shape(pattern) != part.shape:
            message = f"the pattern of the {name} must have shape {part.shape}; received {np.shape(pattern)}"
            raise InputError(message)
    if not gap >= 0:
        message = f"the gap must be at least 0; received {gap} m"
        raise InputError(message)


def _scale(base: Part, mover: Part) -> float:
    return base.remanence * mover.remanence * base.cell**2 / (4 * np.pi * MU0)


def _weigh(table: Array, count: Array) -> Array:
    return np.asarray(np.einsum("kyx,yx->k", table, count))


def _sheets(base: Part, mover: Part, gap: float) -> list[_Sheet]:
    """The four pairs of charged faces: N up on the base's upper and the mover's upper face, S on the lower ones."""
    near = (gap + base.coating + mover.coating) / base.cell
    tb, tm = base.thickness / base.cell, mover.thickness / base.cell
    return [
        _Sheet(near, -1.0, upper=False),
        _Sheet(near + tb, 1.0, upper=False),
        _Sheet(near + tm, 1.0, upper=True),
        _Sheet(near + tm + tb, -1.0, upper=True),
    ]


def _table(base: Part, mover: Part, gap: float, dx: float, dy: float) -> _Table:
    """Integrate the force of every displacement that occurs between a base cell and a mover cell."""
    x = _displacements(base.shape[1], mover.shape[1], dx / base.cell)
    y = _displacements(base.shape[0], mover.shape[0], dy / base.cell)
    sx, sy = (values.ravel() for values in np.meshgrid(x, y))
    reach = np.maximum(np.abs(sx), np.abs(sy))
    sheets = _sheets(base, mover, gap)
    total = np.zeros((2, 6, sx.size))
    for index in np.flatnonzero(reach < _NEAR):
        for sheet in sheets:
            scale = max(sheet.height, _FINEST)
            nodes_x = graded_nodes(sx[index], scale, _NEAR_NODES)
            nodes_y = graded_nodes(sy[index], scale, _NEAR_NODES)
            value = _integrate(sx[index : index + 1], sy[index : index + 1], sheet.height, nodes_x, nodes_y)
            total[int(sheet.upper), :, index] += sheet.sign * value[:, 0]
    low = _NEAR
    for high, count in _TIERS:
        chosen = np.flatnonzero((reach >= low) & (reach < high))
        low = high
        nodes = plain_nodes(count)
        step = max(1, _CHUNK // count**2)
        for start in range(0, chosen.size, step):
            some = chosen[start : start + step]
            for sheet in sheets:
                value = _integrate(sx[some], sy[some], sheet.height, nodes, nodes)
                total[int(sheet.upper), :, some] += sheet.sign * value.T
    both = total.reshape(2, 6, y.size, x.size)
    return _Table(force=both.sum(axis=0)[:3], upper=both[1, :3], moment=both.sum(axis=0)[3:])


def _displacements(on_base: int, on_mover: int, offset: float) -> Array:
    """Mover cell minus base cell, centres, along one axis, ascending [cells]."""
    first = (on_base - on_mover) / 2.0 - (on_base - 1)
    return np.asarray(first + offset + np.arange(on_base + on_mover - 1))


def _integrate(sx: Array, sy: Array, height: float, nodes_x: Nodes, nodes_y: Nodes) -> Array:
    """Force and moment integrals over mover cells at (sx, sy) above one unit base cell.

    Returns:
        (6, n): integrals of the field (x, y, z), then of the moment (x, y, z) about the cell's own axis.
    """
    u, v = nodes_x.at, nodes_y.at[:, None]
    bx, by, bz = cell_field(sx[:, None, None] + u, sy[:, None, None] + v, height)
    weights_x, weights_y = nodes_x.weight, nodes_y.weight

    def integral(values: Array) -> Array:
        return (values @ weights_x) @ weights_y

    return np.stack(
        [
            integral(bx),
            integral(by),
            integral(bz),
            integral(bz * v),
            -integral(bz * u),
            integral(by * u) - integral(bx * v),
        ]
    )
