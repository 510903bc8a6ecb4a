"""Magnetic field of magnetized parts in the space around them: at points, on planes, and per cell.

Surface-charge model: rigid axial magnetization, charge on the two faces of every cell. The charge of neighbouring
cells joins into larger rectangles, so B is a sum over the corners where the pattern's mixed second difference does not
vanish. The results hold outside the magnets (inside one, J is missing: they are mu0 H). Absolute error about 1e-15 of
the remanence at any distance.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Protocol, final

import numpy as np
from numpy.typing import NDArray
from scipy import fft

from .kernels.plate import plate_corner
from .part import Part

Points = NDArray[np.float64]
Pattern = NDArray[np.float64] | NDArray[np.int8]

# Points x corners of one block: its temporaries stay in cache and below the allocator's threshold for fresh pages.
_BLOCK = 4096


class Located(Protocol):
    """Anything with a part and the place it is at."""

    @property
    def part(self) -> Part:
        """The part."""

    @property
    def origin(self) -> tuple[float, float, float]:
        """Lateral centre and height of the magnet's lower face, (x, y, z_low) [m]."""


@final
@dataclass(frozen=True)
class Seat:
    """A part at its place, whatever its pattern.

    Attributes:
        part: The part.
        origin: Lateral centre and height of the magnet's lower face, (x, y, z_low) [m].
    """

    part: Part
    origin: tuple[float, float, float]


@final
@dataclass(frozen=True, eq=False)
class Placed:
    """A magnetized part at its place.

    Attributes:
        part: The part.
        pattern: Polarity of each cell, shape (ny, nx), +1 magnetized along +z, 0 unmagnetized; any float is allowed.
        origin: Lateral centre and height of the magnet's lower face, (x, y, z_low) [m].
    """

    part: Part
    pattern: Pattern
    origin: tuple[float, float, float]

    def __post_init__(self) -> None:
        """Refuse a pattern that is not one number a cell."""
        if np.shape(self.pattern) != self.part.shape:
            raise ValueError(f"pattern must have the part's shape {self.part.shape}, received {np.shape(self.pattern)}")


def seat_base(part: Part) -> Seat:
    """Return where the base stands: centred, its magnet in z from -thickness to 0."""
    return Seat(part, (0.0, 0.0, -part.thickness))


def seat_mover(part: Part, gap: float, dx: float, dy: float, base_coating: float) -> Seat:
    """Return where the mover stands, its coated face ``gap`` [m] above the base's, moved by (dx, dy) [m]."""
    return Seat(part, (dx, dy, gap + base_coating + part.coating))


def place_base(part: Part, pattern: Pattern) -> Placed:
    """Return the magnetized base at its place: centred, its magnet in z from -thickness to 0."""
    return Placed(part, pattern, seat_base(part).origin)


def place_mover(part: Part, pattern: Pattern, gap: float, dx: float, dy: float, base_coating: float) -> Placed:
    """Return the magnetized mover, its coated face ``gap`` [m] above the base's, moved by (dx, dy) [m]."""
    return Placed(part, pattern, seat_mover(part, gap, dx, dy, base_coating).origin)


def field(sources: Sequence[Placed], points: Points) -> Points:
    """Return B (n, 3) [T] of the sources together at points (n, 3) [m] outside the magnets."""
    total: Points = np.zeros((len(points), 3))
    for source in sources:
        charge, x, y = _corner_charges(source)
        block = max(1, _BLOCK // max(1, min(charge.size, _BLOCK)))
        for at in range(0, charge.size, _BLOCK):
            part_of = slice(at, at + _BLOCK)
            for first in range(0, len(points), block):
                some = points[first : first + block]
                z = some[:, 2:] - source.origin[2]
                corner = plate_corner(some[:, :1] - x[part_of], some[:, 1:2] - y[part_of], z, z - source.part.thickness)
                for axis in range(3):
                    total[first : first + block, axis] += corner[axis] @ charge[part_of]
    return total


def field_matrix(part: Part, origin: tuple[float, float, float], points: Points) -> Points:
    """Return B per unit polarity of each cell, (n, 3, ny, nx) [T], at points (n, 3) [m] outside the magnet.

    ``einsum("ncyx,yx->nc", matrix, pattern)`` is what ``field`` returns. Cells that are not on the part have none.

    Args:
        part: The part.
        origin: Lateral centre and height of its lower face, (x, y, z_low) [m].
        points: Where the field is wanted.
    """
    x, y = _corner_lines(part, origin)
    matrix = np.empty((len(points), 3, *part.shape))
    for row, (px, py, pz) in enumerate(points):
        corners = _corner_grid(px - x, py - y, pz - origin[2], part.thickness)
        matrix[row] = np.diff(np.diff(corners, axis=1), axis=2)
    matrix *= part.mask.astype(np.float64) * (part.remanence / (4.0 * np.pi))
    return matrix


def plane_field(
    sources: Sequence[Placed], z: float, bounds: tuple[float, float, float, float], step: float
) -> tuple[Points, Points, Points]:
    """Return x (m,) [m], y (n,) [m] and B (n, m, 3) [T] on a raster of the plane at height ``z`` [m].

    The raster is centred in ``bounds``; its step is the largest whole fraction or multiple of the smallest cell that
    is not above ``step``, so that Fourier transforms can be used.

    Args:
        sources: The magnetized parts; the plane must pass outside their magnets.
        z: Height of the plane [m].
        bounds: (xmin, xmax, ymin, ymax) [m].
        step: Largest step of the raster [m].
    """
    fitted = fitting_step(min(source.part.cell for source in sources), step)
    x = _raster(bounds[0], bounds[1], fitted)
    y = _raster(bounds[2], bounds[3], fitted)
    return x, y, grid_field(sources, x, y, z)


def fitting_step(cell: float, step: float) -> float:
    """Return the largest whole fraction or multiple of ``cell`` [m] that is not above ``step`` [m]."""
    if step >= cell:
        return cell * float(np.floor(step / cell * (1.0 + 1e-12)))
    return cell / float(np.ceil(cell / step * (1.0 - 1e-12)))


def grid_field(sources: Sequence[Placed], x: Points, y: Points, z: float) -> Points:
    """Return B (n, m, 3) [T] on the raster of uniform x (m,) and y (n,) [m] at height ``z`` [m].

    Sources whose cell is a whole multiple or fraction of the step go through Fourier transforms where that is
    cheaper; the others, and those, agree with ``field`` to about 1e-15 of the remanence.
    """
    total = np.zeros((y.size, x.size, 3))
    for source in sources:
        plan = _phases(source, x, y)
        if plan is None:
            grid_x, grid_y = np.meshgrid(x, y)
            points = np.stack((grid_x.ravel(), grid_y.ravel(), np.full(grid_x.size, z)), axis=1)
            total += field([source], points).reshape(total.shape)
        else:
            total += _polyphase(source, x, y, z, *plan)
    return total


def _corner_charges(source: Placed) -> tuple[Points, Points, Points]:
    """Corners of the pattern that carry charge: charge / (4 pi) [T], x [m], y [m]."""
    mixed = np.diff(np.diff(np.pad(np.asarray(source.pattern, dtype=np.float64), 1), axis=0), axis=1)
    row, column = np.nonzero(mixed)
    x, y = _corner_lines(source.part, source.origin)
    return source.part.remanence / (4.0 * np.pi) * mixed[row, column], x[column], y[row]


def _corner_lines(part: Part, origin: tuple[float, float, float]) -> tuple[Points, Points]:
    """The lines between cells, borders included: x (nx + 1,) and y (ny + 1,) [m]."""
    ny, nx = part.shape
    x = origin[0] + (np.arange(nx + 1, dtype=np.float64) - nx / 2.0) * part.cell
    y = origin[1] + (np.arange(ny + 1, dtype=np.float64) - ny / 2.0) * part.cell
    return x, y


def _corner_grid(x: Points, y: Points, above_low: float, thickness: float) -> Points:
    """Corner functions (3, n, m) on the raster of ways x (m,) and y (n,) [m] from the corner."""
    out = np.empty((3, y.size, x.size))
    rows = max(1, _BLOCK // x.size)
    for first in range(0, y.size, rows):
        some = slice(first, first + rows)
        bx, by, bz = plate_corner(x[None, :], y[some, None], above_low, above_low - thickness)
        out[0, some], out[1, some], out[2, some] = bx, by, bz
    return out


def _raster(low: float, high: float, step: float) -> Points:
    count = int(np.floor((high - low) / step * (1.0 + 1e-12))) + 1
    return (low + high) / 2.0 + (np.arange(count, dtype=np.float64) - (count - 1) / 2.0) * step


def _phases(source: Placed, x: Points, y: Points) -> tuple[int, int] | None:
    """Return (raster points a cell, cells a raster step), one of them 1; None where the closed form is cheaper."""
    if min(x.size, y.size) < 2:
        return None
    step, cell = float(x[1] - x[0]), source.part.cell
    fine, coarse = max(1, round(cell / step)), max(1, round(step / cell))
    if abs(step * fine - cell * coarse) > 1e-9 * max(step, cell) or min(fine, coarse) > 1:
        return None
    ny, nx = source.part.shape
    kernel = fine**2 * (x.size * coarse / fine + nx) * (y.size * coarse / fine + ny)
    corners = np.count_nonzero(np.diff(np.diff(np.pad(source.pattern, 1), axis=0), axis=1))
    # A corner function costs about as much as the transforms spend on one raster point twice over.
    return None if 3.0 * kernel > x.size * y.size * corners else (fine, coarse)


def _polyphase(source: Placed, x: Points, y: Points, z: float, fine: int, coarse: int) -> Points:
    """Field on a raster whose points fall on ``fine`` x ``fine`` places of a cell, one convolution for each place."""
    part = source.part
    ny, nx = part.shape
    step = float(x[1] - x[0])
    count_x, count_y = (-(-((size - 1) * coarse + 1) // fine) for size in (x.size, y.size))
    shape = (fft.next_fast_len(count_y + ny - 1, real=True), fft.next_fast_len(count_x + nx - 1, real=True))
    pattern = fft.rfft2(np.asarray(source.pattern, dtype=np.float64), shape)
    line_x, line_y = _corner_lines(part, source.origin)
    # From the corner lines to the raster: lag 0 of the convolution is the last cell before the first raster point.
    way_x = x[0] - line_x[-1] + part.cell * np.arange(count_x + nx)
    way_y = y[0] - line_y[-1] + part.cell * np.arange(count_y + ny)
    out = np.empty((count_y * fine, count_x * fine, 3))
    for i in range(fine):
        for j in range(fine):
            corners = _corner_grid(way_x + j * step, way_y + i * step, z - source.origin[2], part.thickness)
            kernel = np.diff(np.diff(corners, axis=1), axis=2)
            whole = fft.irfft2(fft.rfft2(kernel, shape) * pattern, shape)
            part_of = whole[:, ny - 1 : ny - 1 + count_y, nx - 1 : nx - 1 + count_x]
            out[i::fine, j::fine] = np.moveaxis(part_of, 0, -1)
    out *= part.remanence / (4.0 * np.pi)
    return out[::coarse, ::coarse][: y.size, : x.size]
