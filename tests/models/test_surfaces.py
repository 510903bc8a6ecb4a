"""Surfaces at a distance, the peaks on them and the reach of a field, against ways of finding them without patches."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.typing import NDArray
from polewright.models.blank import Blank, Disc, Polygon, Rectangle, Ring
from polewright.models.far import net_moment
from polewright.models.part import Part
from polewright.models.peak import field_reach, peak
from polewright.models.stray import Located, Placed, Seat, field, place_base, place_mover, seat_base, seat_mover
from polewright.models.surfaces import Flat, Surface, around, magnet_distance, plane
from polewright.models.units import MU0
from scipy import optimize

from .parts import noise, ones, plate
from .references import MM

Points = NDArray[np.float64]

PEAK = 1e-6
"""What a peak promises, relative."""

CLOUD = 3e-3
"""Distance to a cloud of points on the magnet's surface, relative: half the spacing squared over the distance."""

FRAME = Polygon(
    (
        np.array([[0, 0], [12, 0], [12, 12], [0, 12]]) * MM,
        np.array([[4, 4], [8, 4], [8, 8], [4, 8]]) * MM,
    )
)
BLANKS: dict[str, Blank] = {
    "rectangle": Rectangle(12 * MM, 8 * MM),
    "disc": Disc(12 * MM),
    "ring": Ring(14 * MM, 5 * MM),
    "ell": Polygon((np.array([[0, 0], [12, 0], [12, 5], [5, 5], [5, 12], [0, 12]]) * MM,)),
    "frame": FRAME,
}


def part_of(blank: Blank, coating: float = 0.0, cell_mm: float = 1.0) -> Part:
    return Part(blank, cell_mm * MM, 3 * MM, 1.3, coating)


def spread(surface: Surface) -> Points:
    """Points all over a surface, borders of the patches included."""
    everything = []
    for patch in surface.patches:
        u, v = np.meshgrid(*patch.raster(surface.clearance / 2.0))
        points = patch.at(u.ravel(), v.ravel())
        everything.append(points[surface.holds(points)])
    return np.concatenate(everything)


def cloud(part: Part, spacing: float) -> Points:
    """Points on the surface of a centred base's magnet, found by trying a raster of the plane."""
    xmin, xmax, ymin, ymax = part.blank.bounds
    grid = np.meshgrid(
        np.linspace(xmin, xmax, round((xmax - xmin) / spacing * 2) + 1),
        np.linspace(ymin, ymax, round((ymax - ymin) / spacing * 2) + 1),
    )
    x, y = grid[0].ravel(), grid[1].ravel()
    inside = part.blank.contains(x, y)
    near_edge = inside & (
        ~part.blank.contains(x + spacing, y)
        | ~part.blank.contains(x - spacing, y)
        | ~part.blank.contains(x, y + spacing)
        | ~part.blank.contains(x, y - spacing)
    )
    levels = np.linspace(-part.thickness, 0.0, round(part.thickness / spacing) + 1)
    layers = [(inside, 0.0), (inside, -part.thickness), *((near_edge, float(z)) for z in levels)]
    return np.concatenate([np.stack((x[some], y[some], np.full(some.sum(), z)), axis=1) for some, z in layers])


@pytest.mark.parametrize("distance_mm", [1.0, 4.0])
@pytest.mark.parametrize("name", BLANKS)
def test_every_point_around_a_part_is_at_the_distance(name: str, distance_mm: float) -> None:
    part = part_of(BLANKS[name], coating=0.1 * MM)
    surface = around([seat_base(part)], distance_mm * MM)
    points = spread(surface)
    reach = (distance_mm + 0.1) * MM
    np.testing.assert_allclose(magnet_distance(seat_base(part), points), reach, rtol=2e-9)
    # And measured without the blank's own distance: to a cloud of points on the magnet, 0.1 mm apart.
    some = points[:: max(1, len(points) // 60)]
    solid = cloud(part, 0.2 * MM)
    nearest = np.array([np.sqrt(((solid - point) ** 2).sum(axis=1).min()) for point in some])
    np.testing.assert_allclose(nearest, reach, rtol=CLOUD, atol=0.1 * MM)


@pytest.mark.parametrize("name", BLANKS)
def test_points_around_a_part_leave_no_hole(name: str) -> None:
    # From any outside point the way to the nearest point of the magnet crosses the surface: a point must be near there.
    part = part_of(BLANKS[name])
    seat, distance = seat_base(part), 2 * MM
    points = spread(around([seat], distance))
    generator = np.random.default_rng(5)
    probes = generator.uniform(-1, 1, (4000, 3)) * np.array([10, 10, 6]) * MM - np.array([0, 0, 1.5 * MM])
    on = probes[np.abs(magnet_distance(seat, probes) - distance) < 0.05 * MM]
    assert len(on) > 30
    gaps = np.array([np.sqrt(((points - probe) ** 2).sum(axis=1).min()) for probe in on])
    assert gaps.max() < 0.8 * MM  # the raster's step is 1 mm


def test_around_a_pair_keeps_clear_of_both_and_enters_a_wide_gap() -> None:
    base, mover = part_of(BLANKS["ring"]), part_of(Rectangle(6 * MM, 6 * MM), coating=0.2 * MM)
    seats: list[Located] = [seat_base(base), seat_mover(mover, 5 * MM, 4 * MM, 0.0, 0.0)]
    points = spread(around(seats, 1 * MM))
    to_base, to_mover = (magnet_distance(seat, points) for seat in seats)
    assert to_base.min() >= 1 * MM * (1 - 2e-9)
    assert to_mover.min() >= 1.2 * MM * (1 - 2e-9)
    np.testing.assert_allclose(np.minimum(to_base - 1 * MM, to_mover - 1.2 * MM), 0.0, atol=1e-9 * MM)
    between = (points[:, 2] > 0.5 * MM) & (points[:, 2] < 4.5 * MM) & (np.abs(points[:, 0] - 4 * MM) < 2 * MM)
    assert between.any()


@pytest.mark.parametrize(
    ("side", "parts", "height_mm"),
    [
        ("back", "base", -3.0 - 0.1 - 5.0),
        ("front", "base", 0.1 + 5.0),
        ("back", "mover", 2.0 + 0.1 + 0.3 + 4.0 + 0.3 + 5.0),
        ("front", "mover", 2.0 + 0.1 + 0.3 - 0.3 - 5.0),
        ("back", "pair", -3.0 - 0.1 - 5.0),
        ("front", "pair", 2.0 + 0.1 + 0.3 + 4.0 + 0.3 + 5.0),
    ],
)
def test_planes_stand_where_the_specification_says(side: str, parts: str, height_mm: float) -> None:
    base = seat_base(Part(Rectangle(12 * MM, 8 * MM), 1 * MM, 3 * MM, 1.3, 0.1 * MM))
    mover = seat_mover(Part(Disc(10 * MM), 1 * MM, 4 * MM, 1.3, 0.3 * MM), 2 * MM, 3 * MM, 1 * MM, 0.1 * MM)
    surface = plane(
        "back" if side == "back" else "front",
        5 * MM,
        base=None if parts == "mover" else base,
        mover=None if parts == "base" else mover,
    )
    (patch,) = surface.patches
    assert isinstance(patch, Flat)
    assert patch.z == pytest.approx(height_mm * MM)
    box = {"base": (-6, 6, -4, 4), "mover": (-2, 8, -4, 6), "pair": (-6, 8, -4, 6)}[parts]
    assert patch.bounds == pytest.approx(
        ((box[0] - 15) * MM, (box[1] + 15) * MM, (box[2] - 15) * MM, (box[3] + 15) * MM)
    )


def test_a_plane_of_nothing_is_refused() -> None:
    with pytest.raises(ValueError, match="a base, a mover or both"):
        plane("back", 1 * MM)


@pytest.mark.parametrize("most", [30, 400, 5000])
def test_samples_keep_to_their_number_and_belong(most: int) -> None:
    seats: list[Located] = [seat_base(part_of(FRAME)), seat_mover(part_of(FRAME), 1 * MM, 2 * MM, 0.0, 0.0)]
    surface = around(seats, 1 * MM)
    points = surface.sample(most)
    assert most / 3 <= len(points) <= most
    assert surface.holds(points).all()


def test_a_sample_of_less_than_a_point_a_patch_is_refused() -> None:
    with pytest.raises(ValueError, match="one point a patch"):
        around([seat_base(part_of(FRAME))], 1 * MM).sample(5)


def best_by_projection(sources: list[Placed], seat: Seat, distance: float, seed: int) -> float:
    """Peak of |B| around a rectangular part: points of space thrown onto the surface, then a simplex search."""
    xmin, xmax, ymin, ymax = seat.part.blank.bounds
    low, high = np.array([xmin, ymin, 0.0]) + seat.origin, np.array([xmax, ymax, seat.part.thickness]) + seat.origin

    def thrown(points: Points) -> Points:
        way = points - np.clip(points, low, high)
        length = np.linalg.norm(way, axis=1, keepdims=True)
        on: Points = np.clip(points, low, high) + distance * way / np.maximum(length, 1e-300)
        return on

    def size(points: Points) -> Points:
        outside = np.linalg.norm(points - np.clip(points, low, high), axis=1) > 0
        return np.where(outside, np.linalg.norm(field(sources, thrown(points)), axis=1), 0.0)

    generator = np.random.default_rng(seed)
    middle, reach = (low + high) / 2, (high - low) / 2 + 2 * distance
    points = middle + generator.uniform(-1, 1, (30000, 3)) * reach
    points = points[np.linalg.norm(points - np.clip(points, low, high), axis=1) > 0]
    values = size(points)
    starts = points[np.argsort(values)[-12:]]
    options = {"xatol": 1e-9, "fatol": 1e-14, "maxiter": 2000}
    found = [
        optimize.minimize(lambda p: -size(p[None, :])[0], s, method="Nelder-Mead", options=options) for s in starts
    ]
    return max(-float(result.fun) for result in found)


@pytest.mark.parametrize("kind", ["noise", "uniform", "stripes"])
@pytest.mark.parametrize("distance_mm", [0.5, 2.0, 12.0])
def test_peak_around_a_part_is_the_largest_that_a_blind_search_finds(kind: str, distance_mm: float) -> None:
    part = plate(8, 6)
    stripes = np.where(np.arange(8) // 2 % 2 == 0, 1, -1).astype(np.int8) * np.ones((6, 1), dtype=np.int8)
    source = place_base(part, {"noise": noise(part, 3), "uniform": ones(part), "stripes": stripes}[kind])
    value, point = peak([source], around([source], distance_mm * MM))
    blind = best_by_projection([source], seat_base(part), distance_mm * MM, 1)
    assert value >= blind * (1 - PEAK)
    at = np.array([point])
    assert np.linalg.norm(field([source], at)) == pytest.approx(value, rel=1e-12)
    np.testing.assert_allclose(magnet_distance(source, at), distance_mm * MM, rtol=1e-8)
    assert value <= blind * 1.02


@pytest.mark.parametrize("distance_mm", [0.2, 1.0, 5.0])
def test_peak_on_a_plane_is_that_of_a_dense_raster_polished(distance_mm: float) -> None:
    part = plate(9, 7)
    source = place_base(part, noise(part, 8))
    surface = plane("back", distance_mm * MM, base=source)
    value, point = peak([source], surface)
    z = -part.thickness - distance_mm * MM
    side = np.linspace(-7 * MM, 7 * MM, 281)
    x, y = np.meshgrid(side, side)
    dense = np.stack((x.ravel(), y.ravel(), np.full(x.size, z)), axis=1)
    sizes = np.linalg.norm(field([source], dense), axis=1)

    def minus(at: Points) -> float:
        return -float(np.linalg.norm(field([source], np.array([[at[0], at[1], z]]))))

    options = {"xatol": 1e-10, "fatol": 1e-15}
    starts = dense[np.argsort(sizes)[-5:], :2]
    polished = max(-optimize.minimize(minus, s, method="Nelder-Mead", options=options).fun for s in starts)
    assert value == pytest.approx(polished, rel=PEAK)
    assert point[2] == pytest.approx(z)


def test_peak_of_a_repelling_pair_stands_in_the_crease_between_them() -> None:
    # Two equal plates 2 mm apart, uniform and opposed: between them the field is pressed out sideways, and the largest
    # of it 4 mm away is where both offset surfaces meet, level with the middle of the gap.
    part = plate(24, 24, cell_mm=0.8)
    up = ones(part)
    sources = [place_base(part, up), place_mover(part, -up, 2 * MM, 0.0, 0.0, 0.0)]
    value, _ = peak(sources, around(sources, 4 * MM))
    half, out = 9.6 * MM, np.sqrt(15.0) * MM
    along = np.linspace(-half, half, 2001)
    crease = np.stack((np.full(2001, half + out), along, np.full(2001, 1 * MM)), axis=1)
    assert value == pytest.approx(np.linalg.norm(field(sources, crease), axis=1).max(), rel=PEAK)


@pytest.mark.parametrize("kind", ["noise", "checker"])
def test_peak_around_an_offset_pair_is_not_passed_by_points_of_its_creases(kind: str) -> None:
    # Points where both magnets are exactly as far: from a fine raster of one part's rounded wall, each line of it
    # cut with the other's distance by bisection. No crease is along a line of parameters here.
    part, distance = plate(10, 10), 3 * MM
    pattern = noise(part, 5) if kind == "noise" else (np.indices((10, 10)).sum(axis=0) // 2 % 2 * 2 - 1).astype(np.int8)
    sources = [place_base(part, pattern), place_mover(part, -pattern, 2 * MM, 1.3 * MM, -0.9 * MM, 0.0)]
    value, point = peak(sources, around(sources, distance))
    angle = np.linspace(0.0, 2 * np.pi, 4001)
    way = np.stack((np.cos(angle), np.sin(angle), np.zeros(4001)), axis=1)

    def spare(source: Placed, reach: Points, z: Points) -> Points:
        return magnet_distance(source, way * reach[:, None] + np.stack((0 * z, 0 * z, z), axis=1)) - distance

    def outermost(z: Points) -> tuple[Points, Points]:
        # Along each direction, how far out the surface of each part is at height z.
        reaches = []
        for source in sources:
            low, high = np.full(4001, 1 * MM), np.full(4001, 30 * MM)
            for _ in range(60):
                middle = (low + high) / 2
                outside = spare(source, middle, z) > 0
                low, high = np.where(outside, low, middle), np.where(outside, middle, high)
            reaches.append(high)
        return reaches[0], reaches[1]

    # The surface of each reaches 3 mm beyond its mating face, at z = 0 and z = 2 mm.
    low, high = np.full(4001, -0.999 * MM), np.full(4001, 2.999 * MM)
    for _ in range(60):
        middle = (low + high) / 2
        of_base, of_mover = outermost(middle)
        low, high = np.where(of_base > of_mover, middle, low), np.where(of_base > of_mover, high, middle)
    of_base, _ = outermost(high)
    crease = way * of_base[:, None] + np.stack((0 * high, 0 * high, high), axis=1)
    on_both = np.abs(magnet_distance(sources[1], crease) - distance) < 1e-6 * MM
    assert on_both.sum() > 2000
    assert value >= np.linalg.norm(field(sources, crease[on_both]), axis=1).max() * (1 - PEAK)
    everywhere = np.linalg.norm(field(sources, spread(around(sources, distance))), axis=1).max()
    assert everywhere <= value <= 1.3 * everywhere
    assert around(sources, distance).holds(np.array([point])).all()


def test_peak_of_no_field_and_of_no_surface() -> None:
    part = plate(4, 4)
    source = place_base(part, np.zeros((4, 4), dtype=np.int8))
    assert peak([source], around([source], 1 * MM))[0] == 0.0
    nowhere = Surface((Flat((0.0, 1 * MM, 0.0, 1 * MM), -1 * MM),), ((source, 1 * MM),), 1 * MM)
    with pytest.raises(ValueError, match="no point"):
        peak([source], nowhere)


def test_peak_is_the_same_to_the_last_bit_when_asked_again() -> None:
    part = plate(8, 8)
    source = place_base(part, np.indices((8, 8)).sum(axis=0) % 2 * 2 - 1)
    surface = around([source], 1 * MM)
    assert peak([source], surface) == peak([source], surface)


@pytest.mark.parametrize("name", BLANKS)
def test_peak_falls_with_the_distance(name: str) -> None:
    # |B|^2 is subharmonic outside the magnets, so its peak beyond a distance stands at that distance.
    part = part_of(BLANKS[name])
    source = place_base(part, noise(part, 2))
    peaks = [peak([source], around([source], distance * MM))[0] for distance in (0.3, 0.6, 1.2, 2.5, 5.0, 10.0, 40.0)]
    assert (np.diff(peaks) < 0.0).all()


def test_reach_is_where_the_peak_passes_the_level() -> None:
    part, thin = plate(8, 8), Part(Rectangle(8 * MM, 4 * MM), 1 * MM, 2 * MM, 0.4, coating=0.05 * MM)
    single = [place_base(part, noise(part, 2))]
    pair = [place_base(part, noise(part, 3)), place_mover(thin, noise(thin, 4), 0.5 * MM, 1 * MM, 0.0, 0.0)]
    for sources, level in ((single, 0.5e-3), (single, 0.3), (pair, 0.5e-3), (pair, 20e-3)):
        reach = field_reach(sources, level)
        # |B| falls at least as the distance near the part and as its third power far away.
        assert peak(sources, around(sources, reach))[0] == pytest.approx(level, rel=1e-5)
        assert peak(sources, around(sources, reach * (1 + 1e-4)))[0] < level
        assert peak(sources, around(sources, reach * (1 - 1e-4)))[0] > level


def test_reach_far_away_is_that_of_a_dipole() -> None:
    # mu0 m / (2 pi r^3) on the axis, r from the centre: 0.5 uT of a cube of four 5 x 5 x 3 blocks.
    part = plate(2, 2, cell_mm=5.0)
    source = place_base(part, ones(part))
    level = 0.5e-6
    distance = (MU0 * net_moment(source) / (2 * np.pi * level)) ** (1 / 3) - 1.5 * MM
    assert field_reach([source], level) == pytest.approx(distance, rel=1e-3)


def test_reach_of_nothing_and_of_a_level_never_reached() -> None:
    part = plate(4, 4)
    zero = place_base(part, np.zeros((4, 4), dtype=np.int8))
    assert field_reach([zero], 0.5e-3) == 0.0
    assert field_reach([place_base(part, ones(part))], 100.0) == 0.0
    with pytest.raises(ValueError, match="level must be positive"):
        field_reach([zero], 0.0)
