"""Lateral quantities against the strip series, Earnshaw's theorem, dense scans and the second path."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.typing import NDArray
from polewright.models.blank import Rectangle
from polewright.models.pair import Row
from polewright.models.part import Part
from polewright.models.patterns import checker, stripes, uniform
from polewright.models.second_path import pair_moment

from ..models.parts import plate
from ..models.references import MM, STRIP_PITCH_MM, STRIP_REMANENCE, STRIP_THICKNESS_MM, STRIPS
from ..tolerances import SERIES, SLOPE, TRACE
from .examples import BASE, MOVER, closed, exact, problem, rounded, value

Array = NDArray[np.float64]


def strips(count: int, length_mm: float) -> Part:
    blank = Rectangle(count * STRIP_PITCH_MM * MM, length_mm * MM)
    return Part(blank, STRIP_PITCH_MM * MM, STRIP_THICKNESS_MM * MM, STRIP_REMANENCE)


def alternating(part: Part) -> NDArray[np.int8]:
    """Strips of alternating polarity, shape (nx,); the one right of the middle is +1."""
    return np.where(np.floor(part.x / part.cell) % 2 == 0, 1, -1).astype(np.int8)


@pytest.mark.parametrize(("gap_mm", "shear"), STRIPS[:, [0, 2]])
def test_lateral_force_of_strips(gap_mm: float, shear: float) -> None:
    """Matched strips a quarter period apart are pulled back by the series' shear.

    One period over 120 strips; the difference of two lengths takes the ends out.
    """
    quarter = (STRIP_PITCH_MM / 2.0, 0.0)
    forces = []
    for length_mm in (100.0, 200.0):
        base, mover = strips(120, length_mm), strips(2, length_mm)
        a, b = (np.broadcast_to(alternating(part), part.shape) for part in (base, mover))
        forces.append(value("lateral_force", base, mover, a, b, gap_mm=gap_mm, offset_mm=quarter))
    area = 100.0 * MM * 2.0 * STRIP_PITCH_MM * MM
    assert (forces[1] - forces[0]) / area == pytest.approx(shear, rel=SERIES)


def test_lateral_force_points_back_from_either_side() -> None:
    part = plate(8, 8)
    a = uniform(part.mask)
    offsets_mm = ((1.0, 0.0), (-1.0, 0.0), (0.0, 1.0), (0.7, 0.7), (-0.7, 0.7))
    force = exact(problem("lateral_force", part, part, gap_mm=0.5, offset_mm=offsets_mm), a, a)
    assert (force > 0.0).all()
    assert force[1:3] == pytest.approx(force[0], rel=1e-9)
    assert force[4] == pytest.approx(force[3], rel=1e-9)
    assert (exact(problem("lateral_force", part, part, gap_mm=0.5, offset_mm=offsets_mm), a, -a) < 0.0).all()


def test_lateral_force_is_taken_along_the_offset() -> None:
    a, b = rounded(BASE, 1), rounded(MOVER, 2)
    fx, fy = closed(BASE, MOVER, a, b, [Row(c, 0.7 * MM, 0.9 * MM, -1.2 * MM) for c in ("fx", "fy")])
    received = value("lateral_force", BASE, MOVER, a, b, offset_mm=(0.9, -1.2))
    assert received == pytest.approx(-(0.6 * fx - 0.8 * fy), rel=1e-9)


def test_lateral_force_needs_a_direction() -> None:
    with pytest.raises(ValueError, match=r"differ from \[0, 0\]"):
        problem("lateral_force", offset_mm=(0.0, 0.0))


@pytest.mark.parametrize("width", [1, 3, 6])
def test_lateral_stiffness_by_earnshaw(width: int) -> None:
    """A pattern with the symmetry of the square: K_xx = K_yy = -K_zz / 2, and K_xy = 0."""
    part = plate(6, 6)
    a = checker(part.mask, width)
    axial = value("axial_stiffness", part, part, a, a, offset_mm=(0.0, 0.0))
    assert value("lateral_stiffness", part, part, a, a) == pytest.approx(-axial / 2.0, rel=TRACE)
    assert value("lateral_stiffness", part, part, a, -a) == pytest.approx(axial / 2.0, rel=TRACE)


def test_lateral_stiffness_is_the_least_eigenvalue() -> None:
    """Of the slopes of both forces, by central differences; the pattern has no symmetry."""
    a, b = rounded(BASE, 3), rounded(MOVER, 4)
    step = 1e-3 * MM
    slopes = np.zeros((2, 2))
    for axis in (0, 1):
        ahead = []
        for k in (-2, -1, 1, 2):
            offset = np.eye(2)[axis] * k * step
            ahead.append(closed(BASE, MOVER, a, b, [Row(c, 0.7 * MM, *offset) for c in ("fx", "fy")]))
        slopes[:, axis] = (ahead[0] - 8.0 * ahead[1] + 8.0 * ahead[2] - ahead[3]) / (12.0 * step)
    least = np.linalg.eigvalsh(-(slopes + slopes.T) / 2.0)[0]
    assert value("lateral_stiffness", BASE, MOVER, a, b) == pytest.approx(least, rel=10 * SLOPE)


@pytest.mark.parametrize("axis", ["x", "y"])
@pytest.mark.parametrize("friction", [0.0, 0.3])
def test_slide_force_is_the_largest_of_a_dense_scan(axis: str, friction: float) -> None:
    a, b = stripes(BASE.mask, 2, axis=1 if axis == "x" else 0), stripes(MOVER.mask, 2, axis=1 if axis == "x" else 0)
    offsets = np.linspace(0.0, 3.0 * MM, 301)
    poses = [(0.7 * MM, d, 0.0) if axis == "x" else (0.7 * MM, 0.0, d) for d in offsets]
    lateral = closed(BASE, MOVER, a, b, [Row("fx" if axis == "x" else "fy", *pose) for pose in poses])
    axial = closed(BASE, MOVER, a, b, [Row("fz", *pose) for pose in poses])
    received = value("slide_force", BASE, MOVER, a, b, axis=axis, friction=friction)
    # a parabola of 301 samples has its top within 1e-4 of the best of them
    assert received == pytest.approx((-lateral - friction * axial).max(), rel=1e-4)
    assert received >= (-lateral - friction * axial).max() * (1.0 - 1e-9)


def test_tilt_moment_by_the_second_path() -> None:
    a, b = rounded(BASE, 5), rounded(MOVER, 6)
    expected = np.hypot(*pair_moment(BASE, MOVER, a, b, 0.7 * MM, 1.0 * MM, 0.5 * MM)[:2])
    assert value("tilt_moment", BASE, MOVER, a, b) == pytest.approx(expected, rel=1e-8)


def test_symmetric_parts_do_not_tilt() -> None:
    part = plate(6, 6)
    a = uniform(part.mask)
    hold = value("holding_force", part, part, a, a, offset_mm=(0.0, 0.0))
    assert value("tilt_moment", part, part, a, a, offset_mm=(0.0, 0.0)) < 1e-9 * hold * 6.0 * MM
