"""Multipole moments and the field far away, against the exact field and published numbers."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.typing import NDArray
from polewright.models.blank import Rectangle
from polewright.models.far import far_field, leading_order, moments, net_moment
from polewright.models.part import Part
from polewright.models.stray import Placed, field, place_base, place_mover
from polewright.models.units import MU0

from ..tolerances import worst
from .parts import noise, ones, plate
from .references import MM

Points = NDArray[np.float64]

DECAY = 0.01
"""Tolerance of the exponents between 0.5 and 1 m: the next moments still count a little (REFERENCES h)."""

# Patterns of four 5 x 5 x 3 mm blocks, 1.3 T: the moment that rules, and |B| over distance 0.5 to 1 m as an exponent
# (computed with magpylib 6 and mpmath).
FOUR_BLOCKS = {
    "uniform": ([[1, 1], [1, 1]], 1, 2.99980),
    "halves": ([[1, -1], [1, -1]], 2, 3.99985),
    "checker": ([[1, -1], [-1, 1]], 3, 5.00008),
}


def four_blocks(name: str) -> Placed:
    return place_base(plate(2, 2, cell_mm=5.0), np.array(FOUR_BLOCKS[name][0], dtype=np.int8))


def directions(count: int, seed: int) -> Points:
    way = np.random.default_rng(seed).normal(size=(count, 3))
    unit: Points = way / np.linalg.norm(way, axis=1, keepdims=True)
    return unit


@pytest.mark.parametrize("name", FOUR_BLOCKS)
def test_field_decays_with_the_power_of_the_leading_moment(name: str) -> None:
    source = four_blocks(name)
    _, order, exponent = FOUR_BLOCKS[name]
    assert leading_order(moments(source)) == order
    way = np.array([[1.0, 0.7, 1.3]]) / np.linalg.norm([1.0, 0.7, 1.3])
    middle = np.array(moments(source).centre)
    near, far = (np.linalg.norm(field([source], middle + r * way)) for r in (0.5, 1.0))
    assert np.log2(near / far) == pytest.approx(exponent, abs=DECAY)


def test_field_of_the_uniform_blocks_on_their_axis() -> None:
    # |B| half a metre from the centre, on the axis: 4.9647e-7 T (magpylib 6 and mpmath).
    source = four_blocks("uniform")
    at = np.array([moments(source).centre]) + np.array([0.0, 0.0, 0.5])
    assert np.linalg.norm(field([source], at)) == pytest.approx(4.9647e-7, abs=6e-12)
    assert np.linalg.norm(far_field([moments(source)], at)) == pytest.approx(4.9647e-7, abs=6e-12)


@pytest.mark.parametrize(("level", "distance", "moment"), [(0.5e-3, 0.1, 2.5), (1e-3, 0.05, 0.625)])
def test_dipole_equivalents_of_the_implant_limits(level: float, distance: float, moment: float) -> None:
    # 0.5 mT at 0.1 m and 1 mT at 0.05 m on the axis of a dipole: m = 2 pi r^3 B / mu0 (exact). A small cube has it.
    remanence = 1.0
    side = 1 * MM
    part = Part(Rectangle(side, side), side, side, remanence)
    scale = moment / (remanence / MU0 * side**3)
    source = place_base(part, np.full((1, 1), scale))
    assert net_moment(source) == pytest.approx(moment, rel=1e-12)
    at = np.array([moments(source).centre]) + np.array([0.0, 0.0, distance])
    np.testing.assert_allclose(far_field([moments(source)], at)[0], [0.0, 0.0, level], rtol=1e-6, atol=1e-18)


def test_each_moment_brings_the_far_field_closer_to_the_exact_one() -> None:
    part = plate(32, 32)
    source = place_base(part, noise(part, 4))
    whole = moments(source)
    zero2, zero3 = np.zeros((3, 3)), np.zeros((3, 3, 3))
    parts = [
        type(whole)(whole.centre, whole.dipole, zero2, zero3, whole.ceiling),
        type(whole)(whole.centre, whole.dipole, whole.quadrupole, zero3, whole.ceiling),
        whole,
    ]
    errors = []
    for radius in (0.1, 0.3, 1.0):
        points = np.array(whole.centre) + radius * directions(100, 6)
        errors.append([worst(far_field([some], points), field([source], points)) for some in parts])
    table = np.array(errors)
    assert (np.diff(table, axis=1) < 0.0).all()
    # The first moment left out is as many orders beyond the dipole: (0.3)^1, ^2, ^3 from 0.3 to 1 m.
    np.testing.assert_allclose(np.log(table[1] / table[2]) / np.log(1.0 / 0.3), [1.0, 2.0, 3.0], atol=0.3)
    assert table[1, 2] < 2e-3  # ten sizes away


def test_fields_of_several_parts_add_about_their_own_centres() -> None:
    part, other = plate(6, 4), plate(3, 5, remanence=0.4)
    sources = [place_base(part, noise(part, 1)), place_mover(other, ones(other), 2 * MM, 1 * MM, -3 * MM, 0.0)]
    points = 0.5 * directions(50, 2)
    received = far_field([moments(source) for source in sources], points)
    assert worst(received, field(sources, points)) < 1e-5


def test_moments_of_one_block_are_those_of_its_charges() -> None:
    # A block of 6 x 4 x 3 mm is two charged rectangles: xxz of the charge is m a^2/12, zzz is m t^2/4.
    part = plate(6, 4)
    received = moments(place_base(part, ones(part)))
    m = 1.3 / MU0 * 6 * 4 * 3 * MM**3
    assert received.dipole[2] == pytest.approx(m, rel=1e-12)
    np.testing.assert_allclose(received.quadrupole, 0.0, atol=1e-12 * m * MM)
    assert received.octupole[0, 0, 2] == pytest.approx(m * (6 * MM) ** 2 / 12, rel=1e-12)
    assert received.octupole[1, 2, 1] == pytest.approx(m * (4 * MM) ** 2 / 12, rel=1e-12)
    assert received.octupole[2, 2, 2] == pytest.approx(m * (3 * MM) ** 2 / 4, rel=1e-12)
    assert received.centre == pytest.approx((0.0, 0.0, -1.5 * MM))


def test_a_pattern_whose_moments_cancel_has_a_higher_order() -> None:
    part = plate(8, 8)
    sign = np.array([1, -1, -1, 1, -1, 1, 1, -1])  # moments of order 0, 1 and 2 vanish (Thue and Morse)
    assert leading_order(moments(place_base(part, np.outer(sign, sign)))) == 4
    assert net_moment(place_base(part, np.outer(sign, sign))) == 0.0
