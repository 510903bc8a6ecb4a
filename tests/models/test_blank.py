"""Blanks: what is inside, how far outside a point is, and which outlines are refused."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.typing import NDArray
from polewright.models.blank import Blank, Disc, Polygon, Rectangle, Ring
from polewright.models.errors import InputError
from polewright.models.outline import Contour
from polewright.models.part import Part

from .references import MM

Points = NDArray[np.float64]

DENSE = 2e-4
"""Distances against a cloud of 20000 outline points: half their spacing squared over twice the least distance."""


def loop(*corners: tuple[float, float]) -> Points:
    return np.array(corners) * MM


ELL = Polygon((loop((0, 0), (20, 0), (20, 10), (10, 10), (10, 20), (0, 20)),))
DIAMOND = Polygon((loop((10, 0), (20, 10), (10, 20), (0, 10)),))
FRAME = Polygon((loop((0, 0), (0, 20), (20, 20), (20, 0)), loop((5, 5), (15, 5), (15, 15), (5, 15))))
EVERY: dict[str, Blank] = {
    "rectangle": Rectangle(20 * MM, 12 * MM),
    "disc": Disc(20 * MM),
    "ring": Ring(20 * MM, 9 * MM),
    "ell": ELL,
    "diamond": DIAMOND,
    "frame": FRAME,
}


def scatter(seed: int, count: int = 400) -> tuple[Points, Points]:
    x, y = np.random.default_rng(seed).uniform(-18 * MM, 18 * MM, (2, count))
    return x, y


@pytest.mark.parametrize(
    ("blank", "cells"),
    [
        (Rectangle(20 * MM, 12 * MM), 240),
        (ELL, 300),
        (FRAME, 300),
        # Points of the half-integer lattice in a circle (Gauss): 316 within radius 10, 32 within 3.5.
        (Disc(20 * MM), 316),
        (Ring(20 * MM, 7 * MM), 316 - 32),
        # The diamond's edge passes through cell centres, which count: rows of 2, 4, ... 20 cells, twice.
        (DIAMOND, 220),
    ],
    ids=["rectangle", "ell", "frame", "disc", "ring", "diamond"],
)
def test_cells_on_a_blank_are_counted(blank: Blank, cells: int) -> None:
    x, y = np.meshgrid(np.arange(-9.5, 10.0), np.arange(-9.5, 10.0))
    assert int(blank.contains(x * MM, y * MM).sum()) == cells


@pytest.mark.parametrize("size", [19.2, 20.0, 20.4, 26.0, 26.001])
@pytest.mark.parametrize("name", ["rectangle", "disc", "ring", "diamond"])
def test_masks_are_symmetric_even_where_the_outline_passes_through_cell_centres(name: str, size: float) -> None:
    blank = {
        "rectangle": Rectangle(size * MM, size * MM),
        "disc": Disc(size * MM),
        "ring": Ring(size * MM, size / 2 * MM),
        "diamond": Polygon((loop((0.1, 0), (size / 2 + 0.1, size / 2), (0.1, size), (0.1 - size / 2, size / 2)),)),
    }[name]
    mask = Part(blank, 1 * MM, 3 * MM, 1.3).mask
    for turned in (mask[::-1], mask[:, ::-1], mask.T, np.rot90(mask)):
        np.testing.assert_array_equal(turned, mask)


@pytest.mark.parametrize("name", EVERY)
def test_distance_is_that_to_the_nearest_point_of_the_outline(name: str) -> None:
    blank = EVERY[name]
    u = np.linspace(0.0, 1.0, 20001)
    cloud = np.concatenate([Contour(pieces, 1 * MM).at(u)[0] for pieces in blank.pieces()])
    x, y = scatter(3)
    expected = np.array([np.hypot(cloud[:, 0] - px, cloud[:, 1] - py).min() for px, py in zip(x, y, strict=True)])
    received = blank.distance(x, y)
    outside = ~blank.contains(x, y)
    np.testing.assert_array_equal(received[~outside], 0.0)
    assert outside.any()
    np.testing.assert_allclose(received[outside], expected[outside], rtol=DENSE, atol=DENSE * MM)


@pytest.mark.parametrize("name", EVERY)
def test_moved_outline_stands_at_its_distance_or_closer_where_corners_are_concave(name: str) -> None:
    blank, distance = EVERY[name], 2 * MM
    for pieces in blank.pieces():
        points, normals = Contour(pieces, distance).at(np.linspace(0.0, 1.0, 1001))
        np.testing.assert_allclose(np.hypot(*normals.T), 1.0, rtol=1e-14)
        away = blank.distance(*(points + distance * normals).T)
        assert away.max() <= distance * (1 + 1e-12)
        if name not in {"ell", "frame"}:
            np.testing.assert_allclose(away, distance, rtol=1e-9)


@pytest.mark.parametrize("name", EVERY)
def test_contour_raster_covers_the_loop_in_steps(name: str) -> None:
    for pieces in EVERY[name].pieces():
        contour = Contour(pieces, 2 * MM)
        u = contour.raster(0.7 * MM, quarter=8)
        points, normals = contour.at(u)
        moved = points + 2 * MM * normals
        apart = np.hypot(*np.diff(moved, axis=0).T)
        # Round a hole the moved curve is shorter than the step allows, never longer.
        assert apart.max() <= 0.7 * MM * (1 + 1e-9) or name in {"ell", "frame"}
        assert (u[0], u[-1]) == (0.0, 1.0)


def test_a_polygon_is_centred_oriented_and_read_only() -> None:
    clockwise = Polygon((loop((105, 7), (105, 27), (125, 27), (125, 7), (105, 7)),))
    assert clockwise.bounds == pytest.approx((-10 * MM, 10 * MM, -10 * MM, 10 * MM))
    assert len(clockwise.loops[0]) == 4
    with pytest.raises(ValueError, match="read-only"):
        clockwise.loops[0][0, 0] = 1.0
    x, y = scatter(4)
    np.testing.assert_array_equal(clockwise.contains(x, y), Rectangle(20 * MM, 20 * MM).contains(x, y))
    np.testing.assert_allclose(clockwise.distance(x, y), Rectangle(20 * MM, 20 * MM).distance(x, y), atol=1e-15)


def test_a_loop_in_a_hole_is_material_again() -> None:
    island = Polygon((*FRAME.loops, loop((-2, -2), (2, -2), (2, 2), (-2, 2))))
    inside = island.contains(np.array([0.0, 3.0, 7.0]) * MM, np.zeros(3))
    np.testing.assert_array_equal(inside, [True, False, True])


@pytest.mark.parametrize(
    ("corners", "message"),
    [
        ([(0, 0), (10, 10), (10, 0), (0, 10)], "must not cross or touch itself"),
        ([(0, 0), (20, 0), (20, 20), (10, 0), (0, 20)], "must not cross or touch itself"),
        ([(0, 0), (10, 0), (20, 0)], "runs back over itself"),
        ([(0, 0), (10, 0), (10, 10), (10, 5), (0, 5)], "must not cross or touch itself"),
        ([(0, 0), (10, 10), (5, 5 + 1e-9)], "encloses no area"),
        ([(0, 0), (10, 0)], "at least 3"),
        ([(0, 0), (10, 0), (10, 0), (0, 10)], "same corner twice"),
        ([(0, 0), (10, 0), (float("nan"), 10)], "finite"),
        ([(0, 0, 0), (10, 0, 0), (0, 10, 0)], r"\[x, y\] pairs"),
    ],
)
def test_outlines_that_enclose_no_face_are_refused(corners: list[tuple[float, ...]], message: str) -> None:
    with pytest.raises(InputError, match=message):
        Polygon((np.array(corners) * MM,))


def test_loops_that_cross_or_are_missing_are_refused() -> None:
    square = loop((0, 0), (10, 0), (10, 10), (0, 10))
    with pytest.raises(InputError, match="loops 1 and 2"):
        Polygon((square, square + 5 * MM))
    with pytest.raises(InputError, match="at least one loop"):
        Polygon(())
    with pytest.raises(InputError, match="pairs of numbers"):
        Polygon(([["a", "b"]],))  # type: ignore[arg-type]


@pytest.mark.parametrize("size", [0.0, -1.0, float("nan"), float("inf")])
def test_sizes_must_be_positive(size: float) -> None:
    for make in (
        lambda: Rectangle(size, 1.0),
        lambda: Rectangle(1.0, size),
        lambda: Disc(size),
        lambda: Ring(size, 1.0),
        lambda: Ring(1.0, size),
    ):
        with pytest.raises(InputError):
            make()
    with pytest.raises(InputError, match="smaller than the outer"):
        Ring(1.0, 1.0)
