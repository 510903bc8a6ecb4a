"""What leaks: peaks against brute force, fields against the field library, moments by hand."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray
from polewright.models.part import Part
from polewright.models.patterns import checker, stripes, uniform

from ..models.library import library_field
from ..models.parts import plate
from ..models.references import MM, MU0
from ..tolerances import EXACT, LIBRARY_FIELD
from .examples import BASE, MOVER, exact, problem, rounded, value

Array = NDArray[np.float64]
Pattern = NDArray[np.int8]
BASE_ORIGIN = (0.0, 0.0, -BASE.thickness)
MOVER_ORIGIN = (0.0, 0.0, 0.0)


def seat_of_mover(gap_mm: float) -> tuple[float, float, float]:
    """Lower magnet face of the mover: gaps are between coated faces."""
    return (0.0, 0.0, gap_mm * MM + BASE.coating + MOVER.coating)


def field(of: str, a: Pattern, b: Pattern, points: Array, gap_mm: float = 0.7) -> Array:
    """B of the field library."""
    if of == "base":
        return library_field(BASE, a, BASE_ORIGIN, points)
    if of == "mover":
        return library_field(MOVER, b, MOVER_ORIGIN, points)
    return library_field(BASE, a, BASE_ORIGIN, points) + library_field(MOVER, b, seat_of_mover(gap_mm), points)


@pytest.mark.parametrize("of", ["base", "mover", "pair"])
@pytest.mark.parametrize("component", ["x", "y", "z", "size"])
def test_field_at_of_the_library(of: str, component: str) -> None:
    a, b = rounded(BASE, 1), rounded(MOVER, 2)
    points_mm = ((1.0, -2.0, 9.0), (0.3, 0.2, -7.0), (12.0, 1.0, 1.0))
    b_field = field(of, a, b, np.array(points_mm) * MM)
    expected = np.linalg.norm(b_field, axis=1) if component == "size" else b_field[:, "xyz".index(component)]
    received = exact(problem("field_at", of=of, component=component, point_mm=points_mm), a, b)
    assert received == pytest.approx(expected, rel=LIBRARY_FIELD, abs=LIBRARY_FIELD * np.abs(b_field).max())


@pytest.mark.parametrize(
    ("of", "side", "height"),
    [
        ("base", "back", -BASE.thickness - BASE.coating - 2.0 * MM),
        ("base", "front", BASE.coating + 2.0 * MM),
        ("mover", "front", -MOVER.coating - 2.0 * MM),
        ("mover", "back", MOVER.thickness + MOVER.coating + 2.0 * MM),
        ("pair", "back", -BASE.thickness - BASE.coating - 2.0 * MM),
        ("pair", "front", seat_of_mover(0.7)[2] + MOVER.thickness + MOVER.coating + 2.0 * MM),
    ],
)
def test_stray_field_on_planes_is_the_largest_of_a_dense_raster(of: Any, side: Any, height: float) -> None:
    """2 mm from the outer coated surface, where a raster of 0.1 mm is within 0.2 % of the peak."""
    a, b = stripes(BASE.mask, 2), checker(MOVER.mask, 3)
    x, y = np.meshgrid(np.arange(-6.0, 6.01, 0.1) * MM, np.arange(-6.0, 6.01, 0.1) * MM)
    points = np.stack([x.ravel(), y.ravel(), np.full(x.size, height)], axis=1)
    scan = np.linalg.norm(field(of, a, b, points), axis=1).max()
    received = value("stray_field", BASE, MOVER, a, b, of=of, side=side, distance_mm=2.0)
    assert scan * (1.0 - 1e-9) <= received <= scan * 1.002


def test_stray_field_around_holds_the_planes() -> None:
    a, b = stripes(BASE.mask, 2), checker(MOVER.mask, 3)
    around, back, front = (
        value("stray_field", BASE, MOVER, a, b, of="base", side=side, distance_mm=3.0)
        for side in ("around", "back", "front")
    )
    assert around >= max(back, front) * (1.0 - 1e-6)


def test_stray_field_falls_with_the_distance() -> None:
    a, b = rounded(BASE, 3), rounded(MOVER, 4)
    peaks = [
        value("stray_field", BASE, MOVER, a, b, of="pair", side="around", distance_mm=d) for d in (1.0, 2.0, 5.0, 20.0)
    ]
    assert np.all(np.diff(peaks) < 0.0)


@pytest.mark.parametrize("of", ["base", "mover", "pair"])
def test_the_field_at_its_reach_is_the_level(of: str) -> None:
    a, b = stripes(BASE.mask, 2), checker(MOVER.mask, 3)
    reach = value("field_reach", BASE, MOVER, a, b, of=of, field_mT=1.5)
    peak = value("stray_field", BASE, MOVER, a, b, of=of, side="around", distance_mm=reach / MM)
    assert peak == pytest.approx(1.5e-3, rel=1e-4)


def test_reach_grows_as_the_level_falls() -> None:
    a, b = rounded(BASE, 3), rounded(MOVER, 4)
    reaches = [value("field_reach", BASE, MOVER, a, b, of="pair", field_mT=level) for level in (50.0, 5.0, 0.5, 0.05)]
    assert np.all(np.diff(reaches) > 0.0)


def test_a_blank_part_has_no_reach() -> None:
    nothing = np.zeros(BASE.shape, dtype=np.int8)
    assert value("field_reach", BASE, MOVER, nothing, rounded(MOVER, 4), of="base") == 0.0
    assert value("stray_field", BASE, MOVER, nothing, rounded(MOVER, 4), of="base") == 0.0


def moment_of_cell(part: Part) -> float:
    return part.remanence / MU0 * part.cell**2 * part.thickness


def test_net_moment_is_remanence_times_net_volume() -> None:
    part = plate(5, 4)
    a = uniform(part.mask)
    a[0, :3] = -1  # 17 cells against 3
    b = stripes(part.mask, 5)
    assert value("net_moment", part, part, a, b, of="base") == pytest.approx(14.0 * moment_of_cell(part), rel=EXACT)
    assert value("net_moment", part, part, -a, b, of="base") == pytest.approx(14.0 * moment_of_cell(part), rel=EXACT)
    assert value("net_moment", part, part, a, checker(part.mask, 1), of="mover") == 0.0


def test_net_moment_of_both_is_the_larger() -> None:
    a, b = uniform(BASE.mask), -uniform(MOVER.mask)
    base, mover = BASE.cells * moment_of_cell(BASE), MOVER.cells * moment_of_cell(MOVER)
    assert value("net_moment", BASE, MOVER, a, b, of="both") == pytest.approx(max(base, mover), rel=EXACT)
    assert value("net_moment", BASE, MOVER, a, b, of="mover") == pytest.approx(mover, rel=EXACT)
