"""Stray-field maps of a design: behind the base, the planes that the spec asks about, and a cut through the pair."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np

from ...models.blank import Disc, Polygon, Ring
from ...models.part import Part
from ...models.stray import Placed, field, place_base, place_mover, plane_field
from ...models.units import from_si, to_si
from ..judged import number
from ..records import Design, Run
from ..spec import Entry, Spec
from .extras import Array, FieldMap, Outline

_DISTANCE = 0.01  # [m], of the plane behind the base where the spec names none
_WANTED = 0.4e-3  # [T]: the map should reach out to where the 0.5 mT line has closed
_STEPS = 96
_LARGEST_TASK = 8e6  # points times corners of poles
_MOST_PLANES = 3
_LENGTHS = ("distance_mm", "gap_mm")
_SLIM = 0.6  # of the part's size: the narrowest margin about it
_WIDENINGS = 4
_FRAME = 25  # points a side

Bounds = tuple[float, float, float, float]
Plane = tuple[str, str, float, float | None]
"""Of what, which side, distance [m], gap of the pair [m] if given."""


def stray_maps(spec: Spec, run: Run, design: Design) -> tuple[FieldMap, ...]:
    """Return the maps of one design."""
    planes = _planes_asked(spec) or [("base", "back", _DISTANCE, None)]
    gap = _working_gap(spec)
    return (*(_plane_map(run, design, plane, gap) for plane in planes[:_MOST_PLANES]), _cut(run, design, gap))


def _planes_asked(spec: Spec) -> list[Plane]:
    asked: list[Plane] = []
    for entry in _entries(spec):
        settings = entry.settings
        if entry.quantity == "stray_field" and settings["side"] != "around":
            lengths = {key: to_si(float(np.asarray(settings[key])), "mm") for key in _LENGTHS if key in settings}
            plane = (str(settings["of"]), str(settings["side"]), lengths["distance_mm"], lengths.get("gap_mm"))
            if plane not in asked:
                asked.append(plane)
    return asked


def _plane_map(run: Run, design: Design, plane: Plane, working_gap: float) -> FieldMap:
    of, side, distance, gap = plane
    at_gap = working_gap if gap is None else gap
    named = _sources(run, design, of, at_gap)
    sources = list(named.values())
    z = _plane_height(run, of, side, distance, at_gap)

    def frame(margin: float) -> Array:
        u, v = _frame(_widened(sources, margin))
        return np.stack((u, v, np.full(u.size, z)), axis=1)

    bounds = _widened(sources, _margin(sources, frame))
    x, y, B = plane_field(sources, z, bounds, max(bounds[1] - bounds[0], bounds[3] - bounds[2]) / _STEPS)
    outlines = tuple(Outline(_outline(source.part), name, dashed=True) for name, source in named.items())
    where = {"back": "Behind", "front": "Before"}[side]
    what = f"the pair at {_mm(at_gap)} gap" if of == "pair" else f"the {of}"
    return FieldMap(
        title=f"{where} {what}, {_mm(distance)} from its {'back' if side == 'back' or of == 'pair' else 'face'}",
        x=x,
        y=y,
        size=np.linalg.norm(B, axis=2),
        x_label="x",
        y_label="y",
        outlines=outlines,
        note=f"Plane z = {_mm(z)} seen from +z. Dashed: outline of the part, off this plane.",
    )


def _plane_height(run: Run, of: str, side: str, distance: float, gap: float) -> float:
    """Height of a plane beside a part alone at its place, or beside the pair [m]."""
    base, mover = run.base, run.mover
    below = -base.thickness - base.coating - distance
    mover_face = gap + base.coating
    above = mover_face + 2.0 * mover.coating + mover.thickness + distance
    if of == "mover":
        return above if side == "back" else mover_face - distance
    if of == "base" and side == "front":
        return base.coating + distance
    return below if side == "back" else above


def _cut(run: Run, design: Design, gap: float) -> FieldMap:
    named = _sources(run, design, "pair", gap)
    sources = list(named.values())
    top = gap + run.base.coating + run.mover.coating + run.mover.thickness

    def limits_at(margin: float) -> Bounds:
        xmin, xmax, _, _ = _widened(sources, margin)
        return xmin, xmax, -run.base.thickness - margin, top + margin

    def frame(margin: float) -> Array:
        u, v = _frame(limits_at(margin))
        return np.stack((u, np.zeros(u.size), v), axis=1)

    limits = limits_at(_margin(sources, frame))
    corners = sum(int(np.count_nonzero(np.diff(np.diff(np.pad(s.pattern, 1), axis=0), axis=1))) for s in sources)
    steps = int(np.clip(np.sqrt(_LARGEST_TASK / max(corners, 1)), 32, _STEPS))
    x = np.linspace(limits[0], limits[1], steps + 1)
    z = np.linspace(limits[2], limits[3], steps + 1)
    grid_x, grid_z = np.meshgrid(x, z)
    points = np.stack((grid_x.ravel(), np.zeros(grid_x.size), grid_z.ravel()), axis=1)
    inside = np.zeros(grid_x.shape, bool)
    outlines: list[Outline] = []
    for name, source in named.items():
        low = source.origin[2]
        high = low + source.part.thickness
        inside |= source.part.blank.contains(grid_x, np.zeros_like(grid_x)) & (grid_z >= low) & (grid_z <= high)
        outlines += _rectangles(source.part, low, high, name)
    size = np.full(grid_x.shape, np.nan)
    size[~inside] = np.linalg.norm(field(sources, points[~inside.ravel()]), axis=1)
    return FieldMap(
        title=f"Beside the pair at {_mm(gap)} gap, cut through y = 0",
        x=x,
        y=z,
        size=size,
        x_label="x",
        y_label="z",
        outlines=tuple(outlines),
        note="Plane y = 0 seen from -y. White: inside the magnets.",
    )


def _sources(run: Run, design: Design, of: str, gap: float) -> dict[str, Placed]:
    base = place_base(run.base, design.base.astype(np.float64))
    mover = place_mover(run.mover, design.mover.astype(np.float64), gap, 0.0, 0.0, run.base.coating)
    return {name: placed for name, placed in (("base", base), ("mover", mover)) if of in (name, "pair")}


def _margin(sources: Sequence[Placed], frame: Callable[[float], Array]) -> float:
    """Width of the map beyond the parts [m]: widened until the field on its frame, points (n, 3), is weak."""
    bounds = [source.part.blank.bounds for source in sources]
    margin = _SLIM * max(max(b[1] - b[0], b[3] - b[2]) for b in bounds)
    for _ in range(_WIDENINGS):
        if float(np.linalg.norm(field(sources, frame(margin)), axis=1).max()) < _WANTED:
            break
        margin *= 1.6
    return margin


def _frame(limits: Bounds) -> tuple[Array, Array]:
    """Points along the border of a rectangle (umin, umax, vmin, vmax): u (n,) and v (n,)."""
    u = np.linspace(limits[0], limits[1], _FRAME)
    v = np.linspace(limits[2], limits[3], _FRAME)
    ends = np.full(_FRAME, 1.0)
    return (
        np.concatenate((u, u, limits[0] * ends, limits[1] * ends)),
        np.concatenate((limits[2] * ends, limits[3] * ends, v, v)),
    )


def _widened(sources: Sequence[Placed], margin: float) -> Bounds:
    bounds = [source.part.blank.bounds for source in sources]
    half_x, half_y = max(b[1] for b in bounds) + margin, max(b[3] for b in bounds) + margin
    return -half_x, half_x, -half_y, half_y


def _outline(part: Part) -> Array:
    """Corners of a part's outer outline, closed curves as polygons, (n, 2) [m]."""
    if isinstance(part.blank, Polygon):
        return np.asarray(part.blank.loops[0], np.float64)
    xmin, xmax, ymin, ymax = part.blank.bounds
    if isinstance(part.blank, Disc | Ring):
        turn = np.linspace(0.0, 2.0 * np.pi, 73)[:-1]
        return xmax * np.stack((np.cos(turn), np.sin(turn)), axis=1)
    return np.array([[xmin, ymin], [xmax, ymin], [xmax, ymax], [xmin, ymax]])


def _rectangles(part: Part, low: float, high: float, name: str) -> list[Outline]:
    """Where the plane y = 0 cuts a magnet between two heights: one rectangle, more where it has holes."""
    xmin, xmax = part.blank.bounds[:2]
    x = np.linspace(xmin, xmax, 801)
    inside = np.pad(part.blank.contains(x, np.zeros_like(x)), 1)
    starts, ends = np.flatnonzero(inside[1:] & ~inside[:-1]), np.flatnonzero(inside[:-1] & ~inside[1:]) - 1
    return [
        Outline(np.array([[x[a], low], [x[b], low], [x[b], high], [x[a], high]]), name if n == 0 else "")
        for n, (a, b) in enumerate(zip(starts, ends, strict=True))
    ]


def _working_gap(spec: Spec) -> float:
    """Smallest gap that the spec speaks of [m]."""
    for key in ("gap_mm", "between_mm"):
        given = [entry.settings[key] for entry in _entries(spec) if key in entry.settings]
        if given:
            return to_si(min(float(np.min(np.asarray(value, float))) for value in given), "mm")
    return 0.0


def _entries(spec: Spec) -> tuple[Entry, ...]:
    return (*spec.require, *spec.improve)


def _mm(length: float) -> str:
    return f"{number(from_si(length, 'mm'))} mm"
