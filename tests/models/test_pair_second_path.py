"""The two physics paths against each other: closed-form pair kernels, and charge times field (``second_path``).

They share no formula: antiderivatives of the sheet force with a far rule there, solid angles and edge logarithms under
Gauss quadrature here. Gaps from 0.1 cell up are held to far less than the contract's 1e-6 of the largest force.
"""

from __future__ import annotations

import numpy as np
import pytest
from numpy.typing import NDArray
from polewright.models.blank import Blank, Disc, Rectangle, Ring
from polewright.models.pair import Component, Row, pair_values
from polewright.models.part import Part
from polewright.models.second_path import pair_force, pair_moment

from ..tolerances import CONTACT, TWO_PATHS, worst
from .parts import noise, ones, plate
from .references import MM

Array = NDArray[np.float64]

COMPONENTS: tuple[Component, ...] = ("fx", "fy", "fz", "mx", "my", "mz")
OFFSETS_MM = [(0.0, 0.0), (3.0, -2.0), (0.5, 0.0), (0.37, -5.81), (19.25, 4.0)]


def closed(base: Part, mover: Part, a: NDArray[np.int8], b: NDArray[np.int8], *pose: float) -> tuple[Array, Array]:
    """Force and moment of the design kernels."""
    rows = [Row(component, *pose) for component in COMPONENTS]
    six = pair_values(base, mover, a.astype(np.float64), b.astype(np.float64), rows)
    return six[:3], six[3:]


def assert_paths_agree(
    base: Part, mover: Part, a: NDArray[np.int8], b: NDArray[np.int8], pose: Array, tier: float
) -> None:
    force, moment = closed(base, mover, a, b, *pose)
    assert worst(pair_force(base, mover, a, b, *pose), force) < tier
    assert worst(pair_moment(base, mover, a, b, *pose), moment) < tier


@pytest.mark.parametrize("offset_mm", OFFSETS_MM)
@pytest.mark.parametrize("gap_mm", [0.1, 0.3, 1.0, 4.0])
def test_random_plates(gap_mm: float, offset_mm: tuple[float, float]) -> None:
    base, mover = plate(12, 9), plate(12, 9)
    pose = np.array([gap_mm, *offset_mm]) * MM
    assert_paths_agree(base, mover, noise(base, 1), noise(mover, 2), pose, TWO_PATHS)


@pytest.mark.parametrize("offset_mm", OFFSETS_MM)
@pytest.mark.parametrize("gap_mm", [0.08, 0.8, 3.0])
def test_unequal_parts(gap_mm: float, offset_mm: tuple[float, float]) -> None:
    """Another number of cells, thickness, remanence and coating; odd against even: lattices half a cell apart."""
    base = Part(Rectangle(8.0 * MM, 5.6 * MM), 0.8 * MM, 3.0 * MM, 1.3, coating=0.01 * MM)
    mover = Part(Rectangle(5.0 * MM, 9.0 * MM), 0.8 * MM, 1.5 * MM, 0.4, coating=0.03 * MM)
    pose = np.array([gap_mm, *offset_mm]) * MM
    assert_paths_agree(base, mover, noise(base, 3), noise(mover, 4), pose, TWO_PATHS)


@pytest.mark.parametrize("mover_blank", [Disc(10.0 * MM), Ring(12.0 * MM, 5.0 * MM), Rectangle(4.0 * MM, 20.0 * MM)])
def test_discs_and_rings(mover_blank: Blank) -> None:
    base, mover = (Part(blank, 0.5 * MM, 2.0 * MM, 1.2) for blank in (Disc(12.0 * MM), mover_blank))
    for seed, pose_mm in enumerate([(0.05, 0.0, 0.0), (0.4, 0.25, -1.0), (2.0, 3.1, 0.7)]):
        a, b = noise(base, seed), noise(mover, 10 + seed)
        assert_paths_agree(base, mover, a, b, np.array(pose_mm) * MM, TWO_PATHS)


def test_three_levels() -> None:
    part = plate(8, 8)
    rng = np.random.default_rng(5)
    a, b = (rng.choice([-1, 0, 1], part.shape).astype(np.int8) for _ in range(2))
    assert_paths_agree(part, part, a, b, np.array([0.2, 0.3, 1.0]) * MM, TWO_PATHS)


def test_large_plates_near_and_far() -> None:
    """32 x 32 cells: far cell pairs, beyond the kernel's far switch, carry part of the force."""
    part = plate(32, 32)
    a, b = noise(part, 6), noise(part, 7)
    for pose_mm in ((0.1, 0.0, 0.0), (2.0, 11.3, -4.0)):
        assert_paths_agree(part, part, a, b, np.array(pose_mm) * MM, TWO_PATHS)
    for gap_mm in (0.5, 10.0):  # all charges of one sign: errors of far pairs add up instead of averaging out
        assert_paths_agree(part, part, ones(part), ones(part), np.array([gap_mm, 0.3, 0.2]) * MM, TWO_PATHS)


def test_curve_of_a_cancelling_pair() -> None:
    """The largest force on a force-gap curve is the yardstick of the contract: far out forces are tiny differences."""
    part = plate(16, 16)
    a, b = noise(part, 8), noise(part, 9)
    gaps = np.array([0.1, 0.2, 0.5, 1.0, 2.0, 5.0, 10.0, 20.0, 50.0]) * MM
    expected = [closed(part, part, a, b, gap)[0] for gap in gaps]
    assert worst([pair_force(part, part, a, b, gap) for gap in gaps], expected) < TWO_PATHS


@pytest.mark.parametrize("offset_mm", [(0.0, 0.0), (1.0, 0.0), (0.37, -1.21)])
def test_contact(offset_mm: tuple[float, float]) -> None:
    part = plate(6, 6)
    pose = np.array([0.0, *offset_mm]) * MM
    assert_paths_agree(part, part, noise(part, 10), noise(part, 11), pose, CONTACT)


@pytest.mark.parametrize("cells", [2, 4, 7, 8, 9, 10, 11, 16, 32, 64, 128, 256])
def test_single_cells_swept_apart(cells: int) -> None:
    """Two single cells up to 256 pitches apart, across the far switch: the smooth tail of both paths."""
    cell = plate(1, 1)
    for gap_mm, across in ((0.1, 0.0), (1.0, 0.5), (5.0, 3.0)):
        pose = np.array([gap_mm, cells, across]) * MM
        force, moment = closed(cell, cell, ones(cell), ones(cell), *pose)
        assert worst(pair_force(cell, cell, ones(cell), ones(cell), *pose), force) < TWO_PATHS
        assert worst(pair_moment(cell, cell, ones(cell), ones(cell), *pose), moment) < TWO_PATHS
