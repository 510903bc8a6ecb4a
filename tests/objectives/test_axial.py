"""Axial quantities against cases with a known answer and against the second path."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray
from polewright.models.blank import Disc
from polewright.models.pair import Row
from polewright.models.part import Part
from polewright.models.patterns import checker, stripes, uniform
from polewright.models.second_path import pair_force, pair_moment
from polewright.objectives.axial import StandOff
from polewright.objectives.case import Case
from polewright.objectives.gaps import crossings
from polewright.objectives.plan import Plan, Response
from polewright.objectives.quantity import Bound
from scipy.integrate import quad
from scipy.optimize import brentq

from ..models.parts import plate
from ..models.references import MM, TWO_RADII_CORES_MM, TWO_RADII_ZERO_MM
from ..tolerances import EXACT, SLOPE, TWO_PATHS, worst
from .examples import BASE, MOVER, closed, exact, problem, rounded, value

Array = NDArray[np.float64]
Pattern = NDArray[np.int8]

# REFERENCES: two discs with cores of unequal radius; the largest repulsion and where (closed form of coaxial rings).
TWO_RADII_PEAK_N = 0.284830
TWO_RADII_PEAK_MM = 12.9148


def second(a: Pattern, b: Pattern, gap: float, base: Part = BASE, mover: Part = MOVER) -> float:
    return float(pair_force(base, mover, a, b, gap)[2])


def two_radii() -> tuple[Part, Pattern, Pattern]:
    """Discs whose cores attract near and whose net moments repel far."""
    part = Part(Disc(20.0 * MM), 0.5 * MM, 3.0 * MM, 1.3)
    radius = np.hypot(part.x[None, :], part.y[:, None])
    a, b = (np.where(part.mask, np.where(radius < core * MM, 1, -1), 0).astype(np.int8) for core in TWO_RADII_CORES_MM)
    return part, a, b


def test_equal_poles_face_to_face_hold() -> None:
    """+1 shows N on the base's mating face and S on the mover's."""
    a, b = uniform(BASE.mask), uniform(MOVER.mask)
    assert value("axial_force", BASE, MOVER, a, b, offset_mm=(0.0, 0.0)) < 0.0
    assert value("holding_force", BASE, MOVER, a, b, offset_mm=(0.0, 0.0)) > 0.0
    assert value("axial_force", BASE, MOVER, a, -b, offset_mm=(0.0, 0.0)) > 0.0


def test_a_profile_is_the_force_at_every_gap() -> None:
    gaps_mm = (0.1, 0.5, 1.5, 4.0)
    a, b = rounded(BASE, 1), rounded(MOVER, 2)
    expected = [second(a, b, gap * MM) for gap in gaps_mm]
    profile = exact(problem("axial_force", gap_mm=gaps_mm, offset_mm=(0.0, 0.0)), a, b)
    assert worst(profile, expected) < TWO_PATHS
    assert worst(exact(problem("holding_force", gap_mm=gaps_mm, offset_mm=(0.0, 0.0)), a, b), -profile) < EXACT


@pytest.mark.parametrize(("edge", "pivot"), [("-x", (-1, 0)), ("+x", (1, 0)), ("-y", (0, -1)), ("+y", (0, 1))])
def test_peel_balances_the_moment_about_the_edge(edge: str, pivot: tuple[int, int]) -> None:
    """Moments about the edge by the second path; a closing moment turns the far side down."""
    a, b = rounded(BASE, 3), rounded(MOVER, 4)
    gap, arm_mm = 0.4 * MM, 9.0
    to_centre = -np.array([*pivot, 0.0]) * 3.5 * MM
    about_edge = pair_moment(BASE, MOVER, a, b, gap) + np.cross(to_centre, pair_force(BASE, MOVER, a, b, gap))
    # a force down at the far side has the moment (far x down); the closing moment is the share along that axis
    axis = np.cross(to_centre, [0.0, 0.0, -1.0]) / np.linalg.norm(to_centre)
    expected = about_edge @ axis / (arm_mm * MM)
    assert value("peel_force", BASE, MOVER, a, b, gap_mm=0.4, arm_mm=arm_mm, edge=edge) == pytest.approx(
        expected, rel=1e-8
    )


def test_peel_of_a_centred_hold_is_a_lever() -> None:
    part = plate(6, 6)
    a = uniform(part.mask)
    hold = value("holding_force", part, part, a, a, gap_mm=0.5, offset_mm=(0.0, 0.0))
    assert value("peel_force", part, part, a, a, gap_mm=0.5, arm_mm=12.0) == pytest.approx(hold * 3.0 / 12.0, rel=1e-9)


def test_opening_work_is_the_difference_of_energy() -> None:
    a, b = uniform(BASE.mask), uniform(MOVER.mask)
    near, far = closed(BASE, MOVER, a, b, [Row("energy", 0.2 * MM), Row("energy", 5.0 * MM)])
    assert value("opening_work", BASE, MOVER, a, b) == pytest.approx(far - near, rel=1e-12)
    assert value("opening_work", BASE, MOVER, a, -b) == 0.0


def test_opening_work_counts_the_hold_alone() -> None:
    """Across the zero of the force: its positive part, integrated along the second path."""
    coarse = Part(Disc(20.0 * MM), 1.0 * MM, 3.0 * MM, 1.3)
    radius = np.hypot(coarse.x[None, :], coarse.y[:, None])
    a, b = (np.where(coarse.mask, np.where(radius < core * MM, 1, -1), 0).astype(np.int8) for core in (5.1, 8.5))
    zero = brentq(lambda gap: second(a, b, gap, coarse, coarse), 4.0 * MM, 15.0 * MM, xtol=1e-9)
    expected, _ = quad(lambda gap: -second(a, b, gap, coarse, coarse), 2.0 * MM, zero, epsrel=1e-8)
    received = value("opening_work", coarse, coarse, a, b, between_mm=(2.0, 15.0))
    assert received == pytest.approx(expected, rel=1e-6)


def test_stand_off_carries_its_load() -> None:
    a, b = uniform(BASE.mask), -uniform(MOVER.mask)
    expected = brentq(lambda gap: second(a, b, gap) - 2.0, 0.2 * MM, 5.0 * MM, xtol=1e-12)
    assert value("stand_off", BASE, MOVER, a, b, load_N=2.0) == pytest.approx(expected, rel=1e-7)
    further = value("stand_off", BASE, MOVER, a, b, load_N=1.5)
    assert further > expected


def test_no_stand_off_is_nan() -> None:
    a, b = uniform(BASE.mask), uniform(MOVER.mask)
    assert np.isnan(value("stand_off", BASE, MOVER, a, b))  # attracts everywhere
    assert np.isnan(value("stand_off", BASE, MOVER, a, -b, load_N=0.0))  # repels everywhere
    assert np.isnan(value("stand_off", BASE, MOVER, a, -b, load_N=1e6))


def test_an_unstable_zero_is_no_stand_off() -> None:
    """These parts attract near and repel far: pushed either way they leave the zero."""
    part, a, b = two_radii()
    assert np.isnan(value("stand_off", part, part, a, b, between_mm=(2.0, 12.0), load_N=0.0))
    reversed_pair = value("stand_off", part, part, a, -b, between_mm=(2.0, 12.0), load_N=0.0)
    assert reversed_pair == pytest.approx(TWO_RADII_ZERO_MM * MM, rel=0.03)


def curve(force: Callable[[Array], Array]) -> Case:
    """A case whose force is a given function of the gap."""
    ones = (np.ones(BASE.shape), np.ones(MOVER.shape))
    response = Response(np, np.zeros(0), np.zeros(0), *ones)
    return Case(BASE, MOVER, response, lambda rows: np.asarray(force(np.array([row.gap for row in rows]))))


def stand_off(low_mm: float, high_mm: float, load: float = 0.0) -> StandOff:
    return StandOff({"between": (low_mm * MM, high_mm * MM), "load": load}, Plan(BASE, MOVER))


def test_of_several_stand_offs_the_innermost_counts() -> None:
    """A sine falls through zero at pi, 3 pi, ...: here at 1, 3, 5 mm."""
    wave = curve(lambda gaps: np.sin(np.pi * gaps / MM))
    assert stand_off(0.2, 6.5).exact(wave) == pytest.approx([1.0 * MM], rel=1e-8)
    assert stand_off(1.2, 6.5).exact(wave) == pytest.approx([3.0 * MM], rel=1e-8)
    assert np.isnan(stand_off(1.2, 2.8).exact(wave)).all()


def test_a_stand_off_on_the_last_sample_is_found() -> None:
    falling = curve(lambda gaps: 2.0 * MM - gaps)
    assert stand_off(0.5, 2.0).exact(falling) == pytest.approx([2.0 * MM], rel=1e-8)


@pytest.mark.parametrize(
    ("kind", "bound_mm", "within_mm", "met"),
    [
        ("equal_to", 2.0, 0.2, True),
        ("equal_to", 3.0, 0.2, False),
        ("at_least", 1.5, 0.0, True),
        ("at_least", 2.5, 0.0, False),
        ("at_most", 2.5, 0.0, True),
        ("at_most", 1.5, 0.0, False),
    ],
)
def test_conditions_of_a_stand_off(kind: Any, bound_mm: float, within_mm: float, met: bool) -> None:
    """Evaluated on a force that falls through zero at 2 mm."""
    plan = Plan(BASE, MOVER)
    quantity = StandOff({"between": (0.2 * MM, 6.0 * MM), "load": 0.5}, plan)
    bound = Bound(kind, np.array([bound_mm * MM]), np.array([within_mm * MM]))
    conditions = quantity.conditions(bound, plan)
    force = np.array([0.5 + (2.0 * MM - row.gap) / MM for row in plan.rows])
    held = (conditions.factors * force[conditions.rows]).sum(-1) + conditions.constant >= 0.0
    assert bool(held.all()) is met
    assert conditions.counts is (kind != "equal_to")


def test_axial_stiffness_is_minus_the_slope_of_the_force() -> None:
    a, b = rounded(BASE, 5), rounded(MOVER, 6)
    gap, step, dx, dy = 0.7 * MM, 0.7e-3 * MM, 1.0 * MM, 0.5 * MM
    rows = [Row("fz", gap + k * step, dx, dy) for k in (-2, -1, 1, 2)]
    f = closed(BASE, MOVER, a, b, rows)
    slope = (f[0] - 8.0 * f[1] + 8.0 * f[2] - f[3]) / (12.0 * step)
    assert value("axial_stiffness", BASE, MOVER, a, b) == pytest.approx(-slope, rel=SLOPE)


def test_force_sensitivity_is_the_relative_slope() -> None:
    a, b = rounded(BASE, 5), rounded(MOVER, 6)
    stiffness = value("axial_stiffness", BASE, MOVER, a, b)
    force = value("axial_force", BASE, MOVER, a, b)
    assert value("force_sensitivity", BASE, MOVER, a, b) == pytest.approx(-stiffness / force, rel=1e-9)


def test_force_sensitivity_of_fine_stripes_is_their_decay() -> None:
    """Over stripes of pole pitch p, far from their ends, the force on whole periods falls as exp(-pi gap / p)."""
    base, mover = plate(64, 64, cell_mm=0.5), plate(16, 16, cell_mm=0.5)
    a, b = stripes(base.mask, 2), stripes(mover.mask, 2)
    relative = value("force_sensitivity", base, mover, a, b, gap_mm=0.9, offset_mm=(0.0, 0.0))
    assert relative == pytest.approx(-np.pi / (1.0 * MM), rel=0.01)


def test_force_sensitivity_without_a_force_is_nan() -> None:
    nothing = np.zeros(BASE.shape, dtype=np.int8)
    assert np.isnan(value("force_sensitivity", BASE, MOVER, nothing, uniform(MOVER.mask)))


def test_peak_repulsion_of_two_radii() -> None:
    part, a, b = two_radii()
    peak = value("peak_force", part, part, a, b, which="repulsion", between_mm=(1.0, 30.0))
    assert peak == pytest.approx(TWO_RADII_PEAK_N, rel=0.05)  # the staircase outline of cores that almost cancel
    gaps = np.linspace(10.0, 16.0, 241) * MM
    scan = closed(part, part, a, b, [Row("fz", gap) for gap in gaps])
    assert scan.max() <= peak < scan.max() * 1.00001  # refined between the samples of the scan
    assert gaps[scan.argmax()] == pytest.approx(TWO_RADII_PEAK_MM * MM, rel=0.03)


def test_peak_attraction_at_the_end_of_the_range() -> None:
    part, a, b = two_radii()
    peak = value("peak_force", part, part, a, b, which="attraction", between_mm=(1.0, 30.0))
    assert peak == pytest.approx(value("holding_force", part, part, a, b, gap_mm=1.0, offset_mm=(0.0, 0.0)), rel=1e-9)


def test_a_peak_that_is_not_there_is_nan() -> None:
    a, b = checker(BASE.mask, 1), uniform(MOVER.mask)
    a = uniform(BASE.mask)
    assert np.isnan(value("peak_force", BASE, MOVER, a, b, which="repulsion"))
    assert value("peak_force", BASE, MOVER, a, b, which="attraction") > 0.0


def test_a_sign_of_rounding_noise_is_no_failure() -> None:
    # sampled together the noise changes its sign, computed one by one it does not
    found = crossings(lambda gaps: np.full(gaps.shape, 1e-17), np.array([1e-3, 2e-3]), np.array([1e-17, -1e-17]))
    assert found.shape == (1,)
    assert 1e-3 <= found[0] <= 2e-3
