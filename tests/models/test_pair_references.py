"""The pair's closed forms against values from outside the project and against laws that hold for any magnets.

The sources stand beside the values in ``references``. Where a case is a block or a disc, it is cut into cells of the
lattice, so that tables, displacements and signs are tested along with the kernel.
"""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest
from numpy.typing import NDArray
from polewright.models.blank import Disc
from polewright.models.kernels.square import KERNELS, sheet_kernels
from polewright.models.pair import Component, Row, pair_forms, pair_values
from polewright.models.part import Part
from scipy import optimize

from ..tolerances import (
    CANCELLED,
    EXACT,
    KERNEL,
    LATTICE,
    LIBRARY_FORCE,
    SERIES,
    SLOPE,
    TABLE_6,
    TABLE_8,
    TABLE_10,
    TRACE,
    worst,
)
from . import references as ref
from .library import library_force
from .parts import noise, ones, plate
from .references import MM

Array = NDArray[np.float64]

FORCE: tuple[Component, ...] = ("fx", "fy", "fz")
MOMENT: tuple[Component, ...] = ("mx", "my", "mz")


def values(
    base: Part,
    mover: Part,
    a: NDArray[np.int8],
    b: NDArray[np.int8],
    components: tuple[Component, ...],
    *pose: float,
) -> Array:
    """Several components at one pose (gap, dx, dy) [m]."""
    rows = [Row(component, *pose) for component in components]
    return pair_values(base, mover, a.astype(np.float64), b.astype(np.float64), rows)


def axial(base: Part, mover: Part, a: NDArray[np.int8], b: NDArray[np.int8], gaps_mm: Array) -> Array:
    """F_z at several gaps."""
    rows = [Row("fz", gap * MM) for gap in gaps_mm]
    return pair_values(base, mover, a.astype(np.float64), b.astype(np.float64), rows)


def attraction_matrix(part: Part, gap_mm: float) -> Array:
    """Matrix K of the attraction a' K b between flattened patterns of two equal parts [N]."""
    forms = pair_forms(part, part, [Row("fz", gap_mm * MM)])
    return np.stack([-forms.base_column(cell)[0].ravel() for cell in np.ndindex(part.shape)], axis=1)


# Akoun and Yonnet's magnets on a lattice of 4 mm.
AY_BASE = plate(5, 3, ref.AKOUN_YONNET_CELL_MM, 6.0, ref.AKOUN_YONNET_J)
AY_MOVER = plate(3, 5, ref.AKOUN_YONNET_CELL_MM, 6.0, ref.AKOUN_YONNET_J)


def akoun_yonnet(displacement_mm: float) -> Array:
    pose = (ref.AKOUN_YONNET_GAP_MM * MM, (displacement_mm - 4.0) * MM, -4.0 * MM)
    return values(AY_BASE, AY_MOVER, ones(AY_BASE), ones(AY_MOVER), FORCE, *pose)


# ---- outside values -------------------------------------------------------------------------------------------------


def test_akoun_yonnet_curve() -> None:
    received = [akoun_yonnet(x) for x in ref.AKOUN_YONNET[:, 0]]
    assert worst(received, ref.AKOUN_YONNET[:, 1:]) < TABLE_8


def test_akoun_yonnet_printed_graph() -> None:
    received = np.array([akoun_yonnet(2.0 * n) for n in range(15)])
    assert np.abs(received[:, 0] - ref.AKOUN_YONNET_PRINTED_FX).max() < ref.AKOUN_YONNET_READING_N
    assert np.abs(received[:, 2] - ref.AKOUN_YONNET_PRINTED_FZ).max() < ref.AKOUN_YONNET_READING_N


def test_akoun_yonnet_zero_crossings() -> None:
    fz = optimize.brentq(lambda x: akoun_yonnet(x)[2], 16.0, 18.0, xtol=1e-11)
    fx = [optimize.brentq(lambda x: akoun_yonnet(x)[0], *ends, xtol=1e-11) for ends in ((3.0, 5.5), (25.0, 27.0))]
    assert fz == pytest.approx(ref.AKOUN_YONNET_FZ_ZERO_MM, rel=TABLE_10)
    assert fx == pytest.approx(ref.AKOUN_YONNET_FX_ZEROS_MM, rel=TABLE_10)


@pytest.mark.parametrize(("centre", "expected"), ref.STIFFNESS)
def test_stiffness_of_cuboids(centre: tuple[float, float, float], expected: tuple[float, float, float]) -> None:
    x, y, z = centre
    pose = ((z - 6.0) * MM, x * MM, y * MM)
    received = values(AY_BASE, AY_MOVER, ones(AY_BASE), ones(AY_MOVER), ("kxx", "kyy", "kzz"), *pose)
    assert worst(-received, expected) < TABLE_8


@pytest.mark.parametrize("cells", [1, 2, 5])
def test_cubes(cells: int) -> None:
    cube = plate(cells, cells, 10.0 / cells, 10.0)
    np.testing.assert_allclose(
        axial(cube, cube, ones(cube), ones(cube), ref.CUBES[:, 0]), ref.CUBES[:, 1], rtol=TABLE_10
    )


def test_dipole_limit() -> None:
    cube = plate(1, 1, 10.0, 10.0)
    distance = ref.DIPOLE_RATIO[:, 0]
    moment = 1.3 / ref.MU0 * (10.0 * MM) ** 3
    dipoles = -3.0 * ref.MU0 * moment**2 / (2.0 * np.pi * (distance * MM) ** 4)
    ratio = axial(cube, cube, ones(cube), ones(cube), distance - 10.0) / dipoles
    np.testing.assert_allclose(ratio, ref.DIPOLE_RATIO[:, 1], rtol=TABLE_6)


@pytest.mark.parametrize("cells", [1, 2, 3, 6, 24])
def test_partition_invariance(cells: int) -> None:
    block = plate(cells, cells, 6.0 / cells)
    received = axial(block, block, ones(block), ones(block), np.array([1.0]))
    np.testing.assert_allclose(received, [ref.BLOCK_6X6X3_AT_1MM], rtol=TABLE_10)


@pytest.mark.parametrize("cells", [2, 8])
def test_every_component_is_partition_invariant(cells: int) -> None:
    """A block in one cell and the same block in many: energy, forces, stiffnesses and moments."""
    one, many = plate(1, 1, 8.0), plate(cells, cells, 8.0 / cells)
    pose = (0.9 * MM, 1.7 * MM, -0.6 * MM)
    for components in (("energy",), FORCE, MOMENT, ("kxx", "kyy", "kxy", "kzz")):
        whole = values(one, one, ones(one), ones(one), components, *pose)
        parts = values(many, many, ones(many), ones(many), components, *pose)
        assert worst(parts, whole) < KERNEL, components


def test_moment_of_offset_blocks() -> None:
    block = plate(2, 2, 20.0, 20.0)
    offset = np.array([20.0, 0.0, 30.0]) * MM
    pose = (10.0 * MM, offset[0], 0.0)
    force = values(block, block, ones(block), ones(block), FORCE, *pose)
    moment = values(block, block, ones(block), ones(block), MOMENT, *pose)
    own_centre = moment - np.cross([0.0, 0.0, block.thickness / 2], force)
    assert worst(force, ref.TORQUE_FORCE) < LIBRARY_FORCE[20000]
    assert own_centre[1] == pytest.approx(ref.TORQUE_OWN_CENTRE, rel=LIBRARY_FORCE[1000])
    assert worst(own_centre, -np.cross(offset / 2, force)) < CANCELLED


def strip_pressure(component: Component, gap_mm: float, phase: float) -> float:
    """Pressure on one period of strips above 120 strips: length 200 mm minus length 100 mm removes the end effect."""
    cell = ref.STRIP_PITCH_MM
    total = 0.0
    for cells, sign in ((40, 1.0), (20, -1.0)):
        base = plate(120, cells, cell, ref.STRIP_THICKNESS_MM, ref.STRIP_REMANENCE)
        mover = plate(2, cells, cell, ref.STRIP_THICKNESS_MM, ref.STRIP_REMANENCE)
        a = np.tile(np.array([1, -1], dtype=np.int8), (cells, 60))
        b = a[:, 59:61]  # what it faces when centred
        dx = phase / np.pi * cell * MM
        total += sign * values(base, mover, a, b, (component,), gap_mm * MM, dx)[0]
    return total / (100.0 * MM * 2.0 * cell * MM)


@pytest.mark.parametrize(("gap_mm", "normal", "shear"), ref.STRIPS)
def test_strips(gap_mm: float, normal: float, shear: float) -> None:
    """Aligned equal strips attract; shifted by half a pole they are pulled back."""
    assert strip_pressure("fz", gap_mm, 0.0) == pytest.approx(-normal, rel=SERIES)
    assert strip_pressure("fx", gap_mm, np.pi / 2) == pytest.approx(-shear, rel=SERIES)


@pytest.mark.parametrize(("gap_mm", "normal"), ref.STRIPS_45)
def test_strips_shifted_by_a_quarter(gap_mm: float, normal: float) -> None:
    assert strip_pressure("fz", gap_mm, np.pi / 4) == pytest.approx(-normal, rel=SERIES)


def all_patterns(cells: int) -> Array:
    """Every +-1 pattern, shape (2^cells, cells)."""
    bits = np.arange(2**cells)[:, None] >> np.arange(cells)[None, :] & 1
    return np.asarray(1.0 - 2.0 * bits)


@pytest.mark.parametrize(("gap_mm", "best", "text", "least"), ref.ENUMERATED_3X3)
def test_enumerated_3x3(gap_mm: float, best: float, text: str, least: float | None) -> None:
    matrix = attraction_matrix(plate(3, 3, 2.0), gap_mm)
    patterns = all_patterns(9)
    attraction = np.einsum("ni,ij,nj->n", patterns, matrix, patterns)
    chosen = ref.pattern(text).ravel()
    assert attraction.max() == pytest.approx(best, rel=TABLE_6)
    assert chosen @ matrix @ chosen == pytest.approx(attraction.max(), rel=EXACT)
    if least is not None:
        assert attraction.min() == pytest.approx(least, rel=TABLE_6)


@pytest.mark.parametrize(("gap_mm", "best", "text"), ref.ENUMERATED_4X4)
def test_enumerated_4x4(gap_mm: float, best: float, text: str) -> None:
    matrix = attraction_matrix(plate(4, 4, 2.0), gap_mm)
    patterns = all_patterns(16)
    attraction = ((patterns @ matrix) * patterns).sum(axis=1)
    chosen = ref.pattern(text).ravel()
    assert attraction.max() == pytest.approx(best, rel=TABLE_6)
    assert chosen @ matrix @ chosen == pytest.approx(attraction.max(), rel=EXACT)
    assert attraction.min() > 0.0


def test_checker_and_uniform_3x3() -> None:
    part = plate(3, 3, 2.0)
    checker, gaps = ref.pattern("+-+-+-+-+"), np.array([0.1, 0.5])
    assert -axial(part, part, checker, checker, gaps)[0] == pytest.approx(ref.CHECKER_3X3_AT_01MM, rel=TABLE_6)
    assert -axial(part, part, ones(part), ones(part), gaps)[1] == pytest.approx(ref.UNIFORM_3X3_AT_05MM, rel=TABLE_6)


def test_given_partner_4x4() -> None:
    """With the partner given, the best pattern is the sign of K b and reaches the sum of its sizes."""
    matrix = attraction_matrix(plate(4, 4), 1.0)
    partner = ref.pattern(ref.LINEAR_PARTNER).ravel()
    product = matrix @ partner
    np.testing.assert_array_equal(np.sign(product), ref.pattern(ref.LINEAR_BEST).ravel())
    assert np.abs(product).sum() == pytest.approx(ref.LINEAR_BEST_N, rel=TABLE_8)
    assert (all_patterns(16) @ product).max() == pytest.approx(ref.LINEAR_BEST_N, rel=TABLE_8)
    assert partner @ product == pytest.approx(ref.LINEAR_COPY_N, rel=TABLE_8)


def round_part(cells: int) -> tuple[Part, Array]:
    """Disc of 20 mm cut into ``cells`` cells across, and the radius of each cell [mm]."""
    part = Part(Disc(20.0 * MM), 20.0 * MM / cells, 3.0 * MM, 1.3)
    x, y = np.meshgrid(part.x, part.y)
    return part, np.hypot(x, y) / MM


def core(part: Part, radius: Array, core_mm: float) -> NDArray[np.int8]:
    """+1 inside the core, -1 in the ring round it."""
    return np.where(part.mask, np.where(radius < core_mm, 1, -1), 0).astype(np.int8)


def test_discs_and_rings() -> None:
    part, radius = round_part(160)
    uniform = axial(part, part, ones(part), ones(part), ref.DISCS[:, 0])
    assert worst(uniform, ref.DISCS[:, 1]) < LATTICE
    ringed = core(part, radius, 10.0 / np.sqrt(2.0))
    assert worst(axial(part, part, ringed, ringed, ref.CORE_RING[:, 0]), ref.CORE_RING[:, 1]) < LATTICE
    a, b = (core(part, radius, core_mm) for core_mm in ref.TWO_RADII_CORES_MM)
    assert worst(axial(part, part, a, b, ref.TWO_RADII[:, 0]), ref.TWO_RADII[:, 1]) < LATTICE
    around = np.array([0.98, 1.02]) * ref.TWO_RADII_ZERO_MM
    near, far = axial(part, part, a, b, around)
    assert near < 0.0 < far


@pytest.mark.parametrize("seed", [1, 2])
def test_force_of_library(seed: int) -> None:
    base, mover = plate(3, 3), plate(3, 2, 1.0, 2.0)
    a, b = noise(base, seed), noise(mover, seed + 10)
    pose = (0.8 * MM, 0.6 * MM, 0.2 * MM)
    force, moment = library_force(base, mover, a, b, *pose, meshing=1000)
    assert worst(values(base, mover, a, b, FORCE, *pose), force) < LIBRARY_FORCE[1000]
    assert worst(values(base, mover, a, b, MOMENT, *pose), moment) < LIBRARY_FORCE[1000]


# ---- the kernel in extended precision -------------------------------------------------------------------------------


@pytest.mark.parametrize("name", KERNELS)
def test_kernel_in_extended_precision(name: str) -> None:
    """Near entries of a table, and the far switch with two cells of either form on both sides of it."""
    places = [(0, 0, 0.1), (1, 0, 0.1), (1, 1, 1.0), (3, 2, 0.5), (7, 0, 0.1), (8, 3, 2.0), (9, 0, 0.1), (10, 2, 1.0)]
    largest = {w: abs(_kernel(name, 0, 0, w)) + abs(_kernel(name, 1, 1, w)) for _, _, w in places}
    for u, v, w in places:
        expected = ref.sheet_kernel(name, u, v, w)
        assert abs(_kernel(name, u, v, w) - expected) < KERNEL * largest[w], (u, v, w)
        if abs(expected) > 1e-30:
            assert _kernel(name, u, v, w) == pytest.approx(expected, rel=KERNEL), (u, v, w)


@pytest.mark.parametrize("name", ["x", "z", "zz", "xy"])
def test_kernel_up_to_256_cells(name: str) -> None:
    """Relative error of each single entry of the sweep: nothing is lost with distance."""
    for u in (5, 8, 9, 10, 12, 16, 32, 64, 128, 256):
        for w in (0.2, 3.0, 12.0):
            assert _kernel(name, u, 1, w) == pytest.approx(ref.sheet_kernel(name, u, 1, w), rel=KERNEL), (u, w)


def _kernel(name: str, u: float, v: float, w: float) -> float:
    return float(sheet_kernels((name,), np.array([float(u)]), np.array([float(v)]), np.array([w]), 1.0)[name][0, 0, 0])


# ---- laws -----------------------------------------------------------------------------------------------------------

POSES = [(0.1, 0.0, 0.0), (0.5, 0.7, -1.3), (1.0, 2.0, 1.0), (4.0, 0.25, 3.5), (0.3, 40.0, -7.0)]


@pytest.mark.parametrize("pose_mm", POSES)
def test_action_is_reaction(pose_mm: tuple[float, float, float]) -> None:
    """Newton's third law: the scene turned over (z -> -z) has base and mover exchanged."""
    base, mover = plate(7, 5, 1.0, 3.0, 1.3), plate(4, 6, 1.0, 2.0, 1.1)
    a, b = noise(base, 3), noise(mover, 4)
    gap, dx, dy = np.array(pose_mm) * MM
    force = values(base, mover, a, b, FORCE, gap, dx, dy)
    assert worst(values(mover, base, b, a, FORCE, gap, -dx, -dy) * [1, 1, -1], -force) < KERNEL
    moment = values(base, mover, a, b, MOMENT, gap, dx, dy) + np.cross([dx, dy, gap], force)
    turned = values(mover, base, b, a, MOMENT, gap, -dx, -dy) * [-1, -1, 1]
    assert np.abs(turned + moment).max() < KERNEL * (np.abs(moment).max() + np.abs(turned).max())


@pytest.mark.parametrize("pose_mm", POSES)
def test_earnshaw(pose_mm: tuple[float, float, float]) -> None:
    base, mover = plate(7, 5), plate(4, 6, 1.0, 2.0)
    pose = np.array(pose_mm) * MM
    stiffness = values(base, mover, noise(base, 5), noise(mover, 6), ("kxx", "kyy", "kzz"), *pose)
    assert abs(stiffness.sum()) < TRACE * np.abs(stiffness).max()


@pytest.mark.parametrize("pose_mm", POSES)
def test_forces_and_stiffnesses_are_slopes(pose_mm: tuple[float, float, float]) -> None:
    """Force = -grad energy; stiffness components are derivatives of the force along gap, x and y."""
    base, mover = plate(7, 5), plate(4, 6, 1.0, 2.0)
    a, b = noise(base, 7), noise(mover, 8)
    pose = np.array(pose_mm) * MM

    def slope(component: Component, axis: int) -> float:
        step = 2e-3 * pose_mm[0] * MM
        shifts = np.outer([-2.0, -1.0, 1.0, 2.0], step * np.eye(3)[axis])
        low2, low, high, high2 = (values(base, mover, a, b, (component,), *(pose + shift))[0] for shift in shifts)
        return float((8.0 * (high - low) - (high2 - low2)) / (12.0 * step))

    forces = [-slope("energy", axis) for axis in (1, 2, 0)]
    assert worst(forces, values(base, mover, a, b, FORCE, *pose)) < SLOPE
    stiffnesses = [slope("fx", 1), slope("fy", 2), slope("fx", 2), slope("fz", 0)]
    assert worst(stiffnesses, values(base, mover, a, b, ("kxx", "kyy", "kxy", "kzz"), *pose)) < SLOPE


@pytest.mark.parametrize("gap_mm", [0.05, 0.5, 1.0, 4.0])
def test_attraction_is_positive_definite(gap_mm: float) -> None:
    """Matched pairs attract at any gap: the kernel's spectrum exp(-k g) (1 - exp(-k t))^2 is positive."""
    matrix = attraction_matrix(plate(4, 4), gap_mm)
    np.testing.assert_allclose(matrix, matrix.T, rtol=0, atol=EXACT)
    eigenvalues = np.linalg.eigvalsh(matrix)
    assert eigenvalues.min() > 0.0
    if gap_mm == 1.0:
        ends = (eigenvalues.min(), eigenvalues.max())
        assert ends == pytest.approx(ref.LINEAR_EIGENVALUES, rel=0.01)  # printed with two digits


def test_cauchy_schwarz() -> None:
    part, gaps = plate(6, 6), np.array([0.2, 1.0, 3.0])
    for seed in range(20):
        a, b = noise(part, seed), noise(part, 100 + seed)
        unequal, first, second = (axial(part, part, p, q, gaps) for p, q in ((a, b), (a, a), (b, b)))
        assert (unequal**2 <= first * second * (1.0 + EXACT)).all()


def test_matched_pair_is_completely_monotone() -> None:
    """Attraction of a matched pair falls with the gap, convex to every order: differences alternate in sign."""
    part = plate(8, 8)
    gaps = np.linspace(0.1, 3.1, 13)
    for seed in range(10):
        a = noise(part, seed)
        difference = -axial(part, part, a, a, gaps)
        for _ in range(5):
            assert (difference > 0.0).all()
            difference = -np.diff(difference)


def test_force_stays_under_the_contact_pressure() -> None:
    """|F| <= Br^2 A / (2 mu0), the pull of fully charged faces in contact."""
    part = plate(6, 6)
    bound = 1.3**2 * 36 * part.cell**2 / (2 * ref.MU0)
    for seed in range(20):
        a, b = noise(part, seed), noise(part, 100 + seed)
        assert np.abs(axial(part, part, a, b, np.array([0.0, 0.1, 1.0]))).max() <= bound


def test_contact_of_thick_plates_reaches_that_pressure() -> None:
    thick = plate(1, 1, 1.0, 1000.0, 1.2)
    pressure = -axial(thick, thick, ones(thick), ones(thick), np.array([0.0]))[0] / thick.cell**2
    assert pressure == pytest.approx(1.2**2 / (2 * ref.MU0), rel=1e-5)  # what the far faces still do: (cell / t)^2


def test_similarity() -> None:
    """Twice the size: 8 times the energy, 4 times the force, twice the stiffness, 8 times the moment."""
    small, large = plate(5, 4), plate(5, 4, 2.0, 6.0)
    a, b = noise(small, 1), noise(small, 2)
    pose = np.array([0.4, 0.3, -1.1]) * MM
    for components, factor in ((("energy",), 8.0), (FORCE, 4.0), (MOMENT, 8.0), (("kxx", "kyy", "kxy", "kzz"), 2.0)):
        expected = factor * values(small, small, a, b, components, *pose)
        assert worst(values(large, large, a, b, components, *(2.0 * pose)), expected) < CANCELLED


def test_fine_gaps_are_continuous() -> None:
    """From contact on: no jump, no NaN."""
    part = plate(6, 6)
    a, b = noise(part, 1), noise(part, 2)
    curve = axial(part, part, a, b, np.array([0.0, 1e-9, 1e-6, 1e-4, 1e-3]))
    assert np.isfinite(curve).all()
    sizes = np.abs(np.diff(curve))
    assert all(first < second for first, second in pairwise(sizes))
