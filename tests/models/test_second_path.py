"""The second path against values from outside, and against its own identities."""

from __future__ import annotations

import numpy as np
import pytest
from polewright.models.blank import Disc
from polewright.models.errors import InputError
from polewright.models.part import Part
from polewright.models.second_path import correlation, field, pair_force, pair_moment
from scipy import signal

from ..tolerances import CONTACT, EXACT, LIBRARY_FIELD, LIBRARY_FORCE, TABLE_8, TABLE_10, TWO_PATHS, worst
from . import references as ref
from .library import library_field, library_force
from .parts import noise, ones, plate
from .references import MM


def test_akoun_yonnet_curve() -> None:
    base = plate(5, 3, ref.AKOUN_YONNET_CELL_MM, 6.0, ref.AKOUN_YONNET_J)
    mover = plate(3, 5, ref.AKOUN_YONNET_CELL_MM, 6.0, ref.AKOUN_YONNET_J)
    received = [
        pair_force(base, mover, ones(base), ones(mover), ref.AKOUN_YONNET_GAP_MM * MM, (x - 4.0) * MM, -4.0 * MM)
        for x in ref.AKOUN_YONNET[:, 0]
    ]
    assert worst(received, ref.AKOUN_YONNET[:, 1:]) < TABLE_8


@pytest.mark.parametrize("cells", [1, 2, 5])
def test_cubes_attract_and_do_not_depend_on_the_lattice(cells: int) -> None:
    cube = plate(cells, cells, 10.0 / cells, 10.0)
    received = [pair_force(cube, cube, ones(cube), ones(cube), gap * MM)[2] for gap in ref.CUBES[:, 0]]
    np.testing.assert_allclose(received, ref.CUBES[:, 1], rtol=TABLE_10)


def test_contact_does_not_depend_on_the_lattice() -> None:
    """At gap 0 as well: partition invariance, and no jump from 1e-7 of a cell to contact."""
    one, many = plate(1, 1, 6.0), plate(6, 6)
    for dx in (0.0, 2.0 * MM, 2.3 * MM):
        whole = pair_force(one, one, ones(one), ones(one), 0.0, dx)
        parts = pair_force(many, many, ones(many), ones(many), 0.0, dx)
        assert worst(parts, whole) < CONTACT
    a, b = noise(many, 1), noise(many, 2)
    near = pair_force(many, many, a, b, 1e-7 * many.cell)
    assert worst(near, pair_force(many, many, a, b, 0.0)) < 1e-5  # forces fall like gap * log(gap)


def test_contact_of_equal_plates_is_half_the_charge_pressure() -> None:
    """Thick plates in contact: Br^2 A / (2 mu0), the pull of two charged sheets on each other (Maxwell)."""
    thick = plate(1, 1, 1.0, 1000.0, 1.2)
    pressure = -pair_force(thick, thick, ones(thick), ones(thick), 0.0)[2] / thick.cell**2
    assert pressure == pytest.approx(1.2**2 / (2 * ref.MU0), rel=CONTACT)


@pytest.mark.parametrize("gap_mm", [0.1, 1.0, 7.0])
def test_action_is_reaction(gap_mm: float) -> None:
    """Turn the scene over (z -> -z): the base becomes the mover and feels the opposite of force and moment."""
    base, mover = plate(7, 5, 1.0, 3.0, 1.3), plate(4, 6, 1.0, 2.0, 1.1)
    a, b = noise(base, 3), noise(mover, 4)
    gap, dx, dy = gap_mm * MM, 0.7 * MM, -1.9 * MM
    force = pair_force(base, mover, a, b, gap, dx, dy)
    back = pair_force(mover, base, b, a, gap, -dx, -dy)
    assert worst(back * [1, 1, -1], -force) < TWO_PATHS
    moment = pair_moment(base, mover, a, b, gap, dx, dy) + np.cross([dx, dy, gap], force)
    turned = pair_moment(mover, base, b, a, gap, -dx, -dy) * [-1, -1, 1]
    assert worst(turned, -moment) < TWO_PATHS


def test_moment_of_offset_blocks() -> None:
    """Two equal blocks are point symmetric: the moment about the mover's own centre is -(d / 2) x F."""
    block = plate(1, 1, 40.0, 20.0)
    offset = np.array([20.0, 0.0, 30.0]) * MM
    force = pair_force(block, block, ones(block), ones(block), 10.0 * MM, offset[0])
    assert worst(force, ref.TORQUE_FORCE) < LIBRARY_FORCE[20000]
    own_centre = pair_moment(block, block, ones(block), ones(block), 10.0 * MM, offset[0]) - np.cross(
        [0.0, 0.0, block.thickness / 2], force
    )
    assert worst(own_centre, -np.cross(offset / 2, force)) < TWO_PATHS
    assert own_centre[1] == pytest.approx(ref.TORQUE_OWN_CENTRE, rel=LIBRARY_FORCE[1000])


def test_moment_does_not_depend_on_the_lattice() -> None:
    one, many = plate(1, 1, 6.0), plate(4, 4, 1.5)
    whole = pair_moment(one, one, ones(one), ones(one), 1.0 * MM, 2.0 * MM, 0.5 * MM)
    parts = pair_moment(many, many, ones(many), ones(many), 1.0 * MM, 2.0 * MM, 0.5 * MM)
    assert worst(parts, whole) < TWO_PATHS


def test_force_of_library() -> None:
    """The mesh force of magpylib (another integration of another field formula) on a random 3 x 3 pair."""
    base, mover = plate(3, 3), plate(2, 3, 1.0, 2.0)
    pose = (noise(base, 5), noise(mover, 7), 0.8 * MM, 0.6 * MM, 0.2 * MM)
    force, moment = library_force(base, mover, *pose, meshing=1000)
    assert worst(pair_force(base, mover, *pose), force) < LIBRARY_FORCE[1000]
    assert worst(pair_moment(base, mover, *pose), moment) < LIBRARY_FORCE[1000]


def test_field_of_library() -> None:
    part = Part(Disc(9.0 * MM), 1.0 * MM, 3.0 * MM, 1.25)
    a = noise(part, 7)
    origin = (1.0 * MM, -2.0 * MM, 0.5 * MM)
    rng = np.random.default_rng(8)
    points = np.concatenate(
        [
            rng.uniform(-8, 8, (40, 3)) * MM + [0.0, 0.0, 12.0 * MM],
            rng.uniform(-8, 8, (40, 3)) * MM - [0.0, 0.0, 8.0 * MM],
            rng.uniform(-8, 8, (40, 3)) * [MM, MM, 0.0] + [0.0, 0.0, 3.6 * MM],
        ]
    )
    assert worst(field(part, a, origin, points), library_field(part, a, origin, points)) < LIBRARY_FIELD


def test_field_far_away_is_a_dipole() -> None:
    part = plate(6, 6)
    moment = part.remanence / ref.MU0 * 36 * part.cell**2 * part.thickness
    height = 20.0
    received = field(part, ones(part), (0.0, 0.0, -part.thickness / 2), np.array([[0.0, 0.0, height]]))[0]
    assert received[2] == pytest.approx(ref.MU0 * moment / (2 * np.pi * height**3), rel=1e-6)  # (size / distance)^2


def test_field_on_a_face_is_the_limit_from_above() -> None:
    part = plate(2, 2)
    top = np.array([[0.3 * MM, 0.4 * MM, 0.0], [0.5 * MM, 0.5 * MM, 0.0], [0.0, 0.0, 0.0]])
    origin = (0.0, 0.0, -part.thickness)
    lifted = field(part, ones(part), origin, top + np.array([0.0, 0.0, 1e-9 * MM]))
    assert worst(field(part, ones(part), origin, top), lifted) < 1e-8


def test_coating_adds_to_the_gap() -> None:
    bare = plate(3, 3)
    coated = Part(bare.blank, bare.cell, bare.thickness, bare.remanence, coating=0.02 * MM)
    a, b = noise(bare, 9), noise(bare, 10)
    expected = pair_force(bare, bare, a, b, 0.54 * MM)
    assert worst(pair_force(coated, coated, a, b, 0.5 * MM), expected) < EXACT


def test_correlation_is_exact() -> None:
    """Whole numbers, compared with a direct sum."""
    rng = np.random.default_rng(11)
    a, b = rng.choice([-1, 0, 1], (9, 14)).astype(np.int8), rng.choice([-1, 0, 1], (12, 5)).astype(np.int8)
    expected = signal.correlate2d(b.astype(int), a.astype(int), mode="full")
    np.testing.assert_array_equal(correlation(a, b), expected)


def test_grey_patterns_are_linear() -> None:
    part = plate(4, 3)
    a, b, c = noise(part, 12), noise(part, 13), noise(part, 14)
    mixed = pair_force(part, part, a, 0.25 * b + 0.75 * c, 0.5 * MM)
    parts = 0.25 * pair_force(part, part, a, b, 0.5 * MM) + 0.75 * pair_force(part, part, a, c, 0.5 * MM)
    assert worst(mixed, parts) < EXACT


def test_misuse_is_explained() -> None:
    part, fine = plate(4, 4), plate(4, 4, 0.5)
    with pytest.raises(InputError, match="one cell pitch"):
        pair_force(part, fine, ones(part), ones(fine), 0.0)
    with pytest.raises(InputError, match="pattern of the mover must have shape"):
        pair_force(part, part, ones(part), ones(part)[:2], 0.0)
    with pytest.raises(InputError, match="gap must be at least 0"):
        pair_moment(part, part, ones(part), ones(part), float("nan"))
