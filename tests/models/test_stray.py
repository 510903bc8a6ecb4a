"""Field at points, per cell and on planes against an outside library, published values and itself."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.typing import NDArray
from polewright.models.blank import Rectangle
from polewright.models.part import Part
from polewright.models.stray import (
    Placed,
    field,
    field_matrix,
    fitting_step,
    grid_field,
    place_base,
    place_mover,
    plane_field,
)

from ..tolerances import EXACT, LIBRARY_FIELD, worst
from .library import library_field
from .parts import noise, ones, plate
from .references import MM

Points = NDArray[np.float64]

SAME_SUM = 1e-13
"""The same closed form summed in another order or through Fourier transforms, of the largest field."""

FINITE_STRIPS = 1e-6
"""120 strips 2 m long against the endless series [T]: the ends of the array leave 5e-7 (REFERENCES: tolerance 1e-4)."""

PRINTED = 6e-9
"""Against values printed to 1e-8 T."""

OF_REMANENCE = 1e-14
"""Absolute error of sums over thousands of corners [T]: rounding of terms of the size of the remanence."""


def scatter(part: Part, seed: int, count: int = 60) -> Points:
    """Points outside the magnet of a centred base: above, below and beside."""
    generator = np.random.default_rng(seed)
    points: Points = generator.uniform(-1.5, 1.5, (count, 3)) * np.array([part.shape[1], part.shape[0], 6.0])
    points *= part.cell
    third = count // 3
    points[:third, 2] = np.abs(points[:third, 2]) + 0.1 * part.cell
    points[third : 2 * third, 2] = -part.thickness - 0.1 * part.cell - np.abs(points[third : 2 * third, 2])
    points[2 * third :, 0] = np.copysign(0.6 * part.shape[1] * part.cell, points[2 * third :, 0])
    return points


def test_field_equals_the_library_of_cuboids() -> None:
    # magpylib 6, closed-form field of a cuboid.
    part = plate(7, 5, cell_mm=0.8)
    pattern = noise(part, 1)
    pattern[2, 3] = 0
    origin = (1.3 * MM, -0.4 * MM, 0.7 * MM)
    points = scatter(part, 2) + np.array(origin) + np.array([0.0, 0.0, part.thickness])
    received = field([Placed(part, pattern, origin)], points)
    assert worst(received, library_field(part, pattern, origin, points)) < LIBRARY_FIELD


def test_field_on_the_axis_of_a_block() -> None:
    # 10 x 10 x 3 mm, 1.3 T, above the centre of the face: arc-tangent closed form, equal to magpylib to 1e-14.
    part = plate(5, 5, cell_mm=2.0)
    heights = np.array([1e-6, 1.0 * MM, 5.0 * MM, 20.0 * MM])
    points = np.stack((np.zeros(4), np.zeros(4), heights), axis=1)
    received = field([place_base(part, ones(part))], points)
    np.testing.assert_allclose(received[:, 2], [0.30811941, 0.26350828, 0.09884435, 0.00567565], rtol=1e-6)
    np.testing.assert_allclose(received[:, :2], 0.0, atol=1e-15)


@pytest.mark.parametrize(
    ("x_mm", "z_mm", "series", "library"),
    [
        (2.5, 1.0, 0.31264526, 0.31264578),
        (2.5, 2.5, 0.13247348, 0.13247401),
        (2.5, 5.0, 0.02797999, 0.02798052),
        (1.25, 1.0, 0.26630010, None),
    ],
)
def test_field_above_alternating_strips(x_mm: float, z_mm: float, series: float, library: float | None) -> None:
    # Furlani, Permanent Magnet and Electromechanical Devices, 2001: Bz of endless strips, the sum over odd n of
    # 2 Br / (n pi) (1 - exp(-n k t)) exp(-n k z) sin(n k x); Br 1.2 T, pole pitch 5 mm, t 3 mm. And magpylib's value
    # for 120 strips 2 m long, which here are rows of 400 cells.
    part = Part(Rectangle(600 * MM, 2000 * MM), 5 * MM, 3 * MM, 1.2)
    pattern = np.where(np.arange(120) % 2 == 0, 1.0, -1.0) * np.ones((400, 1))
    received = field([place_base(part, pattern)], np.array([[x_mm * MM, 0.0, z_mm * MM]]))[0, 2]
    assert received == pytest.approx(series, abs=FINITE_STRIPS)
    if library is not None:
        assert received == pytest.approx(library, abs=PRINTED)


def test_one_block_is_the_same_however_it_is_cut() -> None:
    points = scatter(plate(6, 6), 5)
    coarse, fine = plate(2, 2, cell_mm=3.0), plate(12, 12, cell_mm=0.5)
    received = field([place_base(coarse, ones(coarse))], points)
    assert worst(received, field([place_base(fine, ones(fine))], points)) < EXACT


def test_field_has_neither_divergence_nor_curl() -> None:
    part = plate(4, 3)
    source = [place_base(part, noise(part, 8))]
    points = scatter(part, 9, 12)
    step = 1e-4 * MM
    jacobian = np.stack(
        [(field(source, points + step * e) - field(source, points - step * e)) / (2 * step) for e in np.eye(3)], axis=2
    )
    size = np.abs(jacobian).max()
    # Central differences: rounding of 1e-16 T over the step is the larger error.
    assert np.abs(np.trace(jacobian, axis1=1, axis2=2)).max() < 1e-7 * size
    assert np.abs(jacobian - np.swapaxes(jacobian, 1, 2)).max() < 1e-7 * size


def test_field_is_finite_and_continuous_on_lines_through_edges() -> None:
    part = plate(3, 3)
    source = [place_base(part, np.array([[1, -1, 1], [1, 1, -1], [-1, 1, 1]], dtype=np.int8))]
    half = 1.5 * MM
    points = np.array(
        [
            [half, 5 * MM, 0.0],  # along an edge of the upper face
            [-7 * MM, half, -3 * MM],  # along an edge of the lower face
            [half, half, 4 * MM],  # above a corner
            [-half, -half, -9 * MM],
            [0.5 * MM, 0.5 * MM, 2 * MM],  # above a corner of cells
            [0.5 * MM, 6 * MM, 0.0],  # along a line between cells
            [half + 1 * MM, 0.2 * MM, 0.0],  # level with the face
        ]
    )
    with np.errstate(all="raise"):
        on = field(source, points)
        beside = field(source, points + np.array([1e-9, -1e-9, 1e-9]) * MM)
        edges = field(source, np.array([[half, half, 0.0], [0.5 * MM, 0.0, 0.0], [half, 0.0, -3 * MM]]))
    np.testing.assert_allclose(on, beside, atol=1e-9)
    assert np.isfinite(edges).all()


def test_a_point_on_a_face_is_just_outside_it() -> None:
    # A wide plate alone: B just above its face is half its remanence less what the far face takes.
    part = plate(41, 41)
    face, above = field([place_base(part, ones(part))], np.array([[0.0, 0.0, 0.0], [0.0, 0.0, 1e-9]]))
    np.testing.assert_allclose(face, above, atol=1e-6)
    back, below = field([place_base(part, ones(part))], np.array([[0, 0, -3 * MM], [0, 0, -3 * MM - 1e-9]]))
    np.testing.assert_allclose(back, below, atol=1e-6)
    np.testing.assert_allclose(face, back * np.array([-1, -1, 1]), atol=1e-12)


def test_matrix_times_pattern_is_the_field() -> None:
    part = plate(6, 4, cell_mm=0.7)
    origin = (0.2 * MM, -1.1 * MM, 2 * MM)
    points = scatter(part, 11) + np.array([0.0, 0.0, 2 * MM + part.thickness])
    matrix = field_matrix(part, origin, points)
    assert matrix.shape == (len(points), 3, 4, 6)
    pattern = noise(part, 12).astype(np.float64)
    received = np.einsum("ncyx,yx->nc", matrix, pattern)
    assert worst(received, field([Placed(part, pattern, origin)], points)) < SAME_SUM


def test_sources_add_and_poses_shift() -> None:
    part = plate(4, 4)
    other = Part(Rectangle(3 * MM, 5 * MM), 0.5 * MM, 2 * MM, 0.4, coating=0.02 * MM)
    a, b = place_base(part, noise(part, 1)), place_mover(other, noise(other, 2), 1 * MM, 0.3 * MM, -0.2 * MM, 0.03 * MM)
    assert b.origin == pytest.approx((0.3 * MM, -0.2 * MM, 1.05 * MM))
    points = scatter(part, 3) + np.array([0.0, 0.0, 12 * MM])
    np.testing.assert_allclose(field([a, b], points), field([a], points) + field([b], points), atol=1e-16)
    moved = Placed(part, a.pattern, (1 * MM, 2 * MM, 3 * MM))
    shift = np.array(moved.origin) - np.array(a.origin)
    assert worst(field([moved], points + shift), field([a], points)) < EXACT


@pytest.mark.parametrize("step_mm", [0.1, 0.35, 0.8, 2.0])
def test_plane_by_transforms_equals_points(step_mm: float) -> None:
    part = plate(12, 9, cell_mm=0.8)
    mover = place_mover(plate(8, 8, cell_mm=0.8), noise(plate(8, 8, cell_mm=0.8), 5), 4 * MM, 0.13 * MM, 0.0, 0.0)
    sources = [place_base(part, noise(part, 4)), mover]
    bounds = (-7 * MM, 9 * MM, -6 * MM, 6 * MM)
    x, y, received = plane_field(sources, 2.1 * MM, bounds, step_mm * MM)
    assert np.diff(x).max() <= step_mm * MM * (1 + 1e-12)
    assert (x[0] + x[-1]) / 2 == pytest.approx(1 * MM)
    grid_x, grid_y = np.meshgrid(x, y)
    points = np.stack((grid_x.ravel(), grid_y.ravel(), np.full(grid_x.size, 2.1 * MM)), axis=1)
    assert worst(received.reshape(-1, 3), field(sources, points)) < SAME_SUM


def test_a_raster_that_suits_no_cell_still_equals_points() -> None:
    part = plate(6, 6, cell_mm=0.8)
    source = [place_base(part, noise(part, 4))]
    x, y = np.linspace(0.0, 12.09 * MM, 40), np.array([0.5 * MM])
    points = np.stack((x, np.full(40, y[0]), np.full(40, 1 * MM)), axis=1)
    np.testing.assert_allclose(grid_field(source, x, y, 1 * MM)[0], field(source, points), atol=1e-16)
    square = grid_field(source, x, x, 1 * MM)
    np.testing.assert_allclose(square[3], field(source, points + np.array([0, x[3] - y[0], 0])), atol=1e-15)


def test_steps_fit_the_cell_from_below() -> None:
    assert fitting_step(0.8, 0.3) == pytest.approx(0.8 / 3)
    assert fitting_step(0.8, 0.8) == pytest.approx(0.8)
    assert fitting_step(0.8, 2.0) == pytest.approx(1.6)


def test_a_pattern_of_another_shape_is_refused() -> None:
    with pytest.raises(ValueError, match=r"shape \(3, 4\)"):
        place_base(plate(4, 3), np.ones((4, 3)))


def test_many_corners_are_summed_in_blocks() -> None:
    part = plate(80, 80, cell_mm=0.5)
    pattern = noise(part, 6)
    points = scatter(part, 7, 6)
    matrix = field_matrix(part, (0.0, 0.0, -part.thickness), points)
    received = field([place_base(part, pattern)], points)
    np.testing.assert_allclose(received, np.einsum("ncyx,yx->nc", matrix, pattern), atol=OF_REMANENCE)
