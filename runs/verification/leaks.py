"""Fields outside many pairs with errors, from the fields of their parts at points that follow the surface.

At a point that moves with the surface B is a sum of up to four fields (the base with its pattern and with all its cells
alike, the mover likewise), each with a factor that the errors of remanence and of N against S make. How each field
changes with an error of place, gap or thickness is taken to second order from the fields at its two limits. The points
are those of a raster over the surface at which any of many sampled pairs comes near its peak.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal, final

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import PchipInterpolator

from ...models.stray import Placed, field
from ...models.surfaces import Surface
from ...models.units import MU0
from .asked import Asked
from .draws import VARIABLES, Draws, state_of
from .state import Source, State, exact_value, field_points, field_values

Array = NDArray[np.float64]
Places = Callable[[State], Array]

_MOVES = {
    "base": ("slip_base_x", "slip_base_y", "thickness_base"),
    "mover": ("slip_mover_x", "slip_mover_y", "thickness_mover"),
    "pair": ("slip_base_x", "slip_base_y", "thickness_base", "slip_mover_x", "slip_mover_y", "thickness_mover",
             "offset_x", "offset_y", "gap"),
}  # fmt: skip
_RASTER = 12_000
_KEPT = 3_000
_LOOKED_AT = 60
"""Pairs by whose fields the raster is thinned out."""
_SHARES = (0.93, 0.98)
"""A raster point stays when a field comes to this share of its peak there, before each refinement by three."""
_FULL = 10_000
"""Cells a part up to which all those points are used; for larger parts their number falls as cells grow."""
_STEPS = 3.0
"""Raster steps in the clearance of a surface."""
_DISTANCES = 5
"""Distances at which a reach is interpolated."""
_BLOCK = 100


@final
@dataclass(frozen=True, eq=False)
class Spots:
    """Places on the patches of a surface, in parameters that stay when the surface moves.

    Attributes:
        patch: Number of the patch, shape (n,).
        u: First parameter, shape (n,).
        v: Second parameter.
        step_u: Distance to the next place in u.
        step_v: The same in v.
    """

    patch: NDArray[np.intp]
    u: Array
    v: Array
    step_u: Array
    step_v: Array

    def some(self, chosen: NDArray[np.intp]) -> Spots:
        """Some of the places."""
        return Spots(self.patch[chosen], self.u[chosen], self.v[chosen], self.step_u[chosen], self.step_v[chosen])

    def finer(self, closed: list[bool]) -> Spots:
        """Nine places for each, a third of the way to its neighbours."""
        ways = np.array([(i, j) for i in (-1, 0, 1) for j in (-1, 0, 1)]) / 3.0
        turns = np.array(closed)[self.patch][:, None]
        u = self.u[:, None] + self.step_u[:, None] * ways[:, 0]
        u = np.where(turns, u % 1.0, np.clip(u, 0.0, 1.0))
        v = np.clip(self.v[:, None] + self.step_v[:, None] * ways[:, 1], 0.0, 1.0)
        steps = [np.repeat(step / 3.0, len(ways)) for step in (self.step_u, self.step_v)]
        return Spots(np.repeat(self.patch, len(ways)), u.ravel(), v.ravel(), steps[0], steps[1])


@final
class Fields:
    """B of every drawn pair at points that follow the geometry.

    Args:
        nominal: The pair without errors.
        draws: The errors.
        of: Which parts are there.
        gap: Nominal gap of a pair [m].
        places: What gives the points (n, 3) [m] for a pair as built.
    """

    def __init__(self, nominal: State, draws: Draws, of: Source, gap: float, places: Places) -> None:
        self._draws, self._of = draws, of
        self._moves = [name for name in _MOVES[of] if draws.limits[list(VARIABLES).index(name)] > 0.0]

        def fields(move: str | None, side: float) -> Array:
            share = np.zeros((1, len(VARIABLES)))
            if move is not None:
                share[0, list(VARIABLES).index(move)] = side
            return unit_fields(state_of(nominal, Draws(draws.limits, share), 0), of, gap, places)

        self._middle = fields(None, 0.0)
        # The two limits of an error that contact cuts short are no longer alike; the second order takes that too.
        sides = [(fields(move, -1.0), fields(move, 1.0)) for move in self._moves]
        self._slopes = [(after - before) / 2.0 for before, after in sides]
        self._bends = [(after + before) / 2.0 - self._middle for before, after in sides]

    def at(self, pairs: slice) -> Array:
        """B of some pairs, shape (pair, point, 3) [T]."""
        draws = self._draws.some(pairs)
        strength = strengths(draws, self._of)
        shares = draws.share[:, [list(VARIABLES).index(move) for move in self._moves]]
        ways = np.concatenate([np.ones((draws.count, 1)), shares, shares**2], axis=1)
        terms = np.stack([self._middle, *self._slopes, *self._bends])
        weights = ways[:, :, None] * strength[:, None, :]
        found = weights.reshape(draws.count, -1) @ terms.reshape(weights.shape[1] * weights.shape[2], -1)
        return np.asarray(found.reshape(draws.count, -1, 3))


def unit_fields(state: State, of: Source, gap: float, places: Places) -> Array:
    """Fields of each part with its pattern, then with all its cells alike, shape (2 or 4, point, 3) [T]."""
    points = places(state)
    alone = [
        Placed(source.part, pattern, source.origin)
        for source in state.sources(of, gap)
        for pattern in (source.pattern, np.abs(source.pattern))
    ]
    return np.array([field([source], points) for source in alone])


def strengths(draws: Draws, of: Source) -> Array:
    """Factors of the ``unit_fields``, shape (pair, 2 or 4)."""
    found = []
    for name in ("base", "mover"):
        if of in (name, "pair"):
            strength = 1.0 + draws.column(f"remanence_{name}")
            found += [strength, strength * draws.column(f"imbalance_{name}") / 2.0]
    return np.stack(found, axis=1)


@final
class Peaks:
    """Peak of |B| over a surface for every drawn pair."""

    def __init__(self, nominal: State, draws: Draws, of: Source, gap: float,
                 side: Literal["back", "front", "around"], distance: float) -> None:  # fmt: skip
        self._draws = draws

        def surface(state: State) -> Surface:
            return state.surface(of, gap, side, distance)

        def places(state: State, spots: Spots) -> Array:
            points = np.empty((spots.patch.size, 3))
            for n, patch in enumerate(surface(state).patches):
                mine = spots.patch == n
                points[mine] = patch.at(spots.u[mine], spots.v[mine])
            return points

        looked = strengths(draws.some(slice(0, _LOOKED_AT)), of)
        # the fields one by one too: where a nominal leak cancels, what an error brings peaks elsewhere
        factors = np.concatenate([np.eye(looked.shape[1]), looked])

        def nearest(spots: Spots, share: float) -> Spots:
            """Those spots at which the field of any of the pairs comes to a share of its peak."""
            every = unit_fields(nominal, of, gap, lambda state: places(state, spots))
            sizes = np.linalg.norm(np.tensordot(factors, every, axes=1), axis=2)
            closeness = (sizes / np.maximum(sizes.max(axis=1, keepdims=True), 1e-300)).max(axis=0)
            best = np.argsort(-closeness, kind="stable")[: int(_KEPT / coarser)]
            return spots.some(np.sort(best[closeness[best] >= share]))

        coarser = max(1.0, max(nominal.a.size, nominal.b.size) / _FULL)
        spots = _raster(surface(nominal), int(_RASTER / coarser))
        for share in _SHARES:
            spots = nearest(spots, share)
            finer = spots.finer([patch.closed for patch in surface(nominal).patches])
            spots = finer.some(np.flatnonzero(surface(nominal).holds(places(nominal, finer))))
        spots = nearest(spots, _SHARES[-1])
        self._fields = Fields(nominal, draws, of, gap, lambda state: places(state, spots))

    def values(self) -> Array:
        """Peaks, shape (pair,) [T]."""
        found = []
        for first in range(0, self._draws.count, _BLOCK):
            B = self._fields.at(slice(first, first + _BLOCK))
            found.append(np.sqrt((B * B).sum(-1).max(-1)))
        return np.concatenate(found)


def leak_values(entry: Asked, nominal: State, draws: Draws, reported: float) -> Array:
    """Value of a field, a reach or a moment for every drawn pair [SI], shape (pair, elements).

    Args:
        entry: What is asked.
        nominal: The pair without errors.
        draws: The errors; the first few are evaluated exactly where a reach needs to know its range.
        reported: The exact value of the pair without errors [SI].
    """
    keys = entry.params
    if entry.name == "net_moment":
        return _moments(nominal, draws, keys["of"])[:, None]
    of: Source = keys["of"]
    gap = float(keys["gap"]) if of == "pair" else 0.0
    if entry.name == "field_at":
        points = field_points(entry)
        B = Fields(nominal, draws, of, gap, lambda _: points).at(slice(0, draws.count))
        return np.asarray(field_values(B, keys["component"]))
    if entry.name == "stray_field":
        return Peaks(nominal, draws, of, gap, keys["side"], keys["distance"]).values()[:, None]
    return _reaches(entry, nominal, draws, gap, reported)[:, None]


def _raster(surface: Surface, count: int) -> Spots:
    """Raster points on a surface, hardly more than ``count``."""
    step = surface.clearance / _STEPS
    while True:
        rasters = [patch.raster(step) for patch in surface.patches]
        if sum(u.size * v.size for u, v in rasters) <= max(count, 64 * len(surface.patches)):
            break
        step *= 1.25
    found = []
    for n, (patch, (u, v)) in enumerate(zip(surface.patches, rasters, strict=True)):
        grid_u, grid_v = (grid.ravel() for grid in np.meshgrid(u, v))
        good = surface.holds(patch.at(grid_u, grid_v))
        count = int(good.sum())
        found.append(
            Spots(np.full(count, n, dtype=np.intp), grid_u[good], grid_v[good],
                  np.full(count, float(np.diff(u).max())), np.full(count, float(np.diff(v).max())))
        )  # fmt: skip
    return Spots(*(np.concatenate([getattr(spots, name) for spots in found]) for name in Spots.__dataclass_fields__))


def _moments(nominal: State, draws: Draws, of: str) -> Array:
    """Dipole moment of every pair; of both parts the larger one (pair,) [A m2]."""
    found = []
    for name, part, pattern in (("base", nominal.base, nominal.a), ("mover", nominal.mover, nominal.b)):
        if of in (name, "both"):
            thick = 1.0 + draws.column(f"thickness_{name}") / part.thickness
            strength = (1.0 + draws.column(f"remanence_{name}")) * np.maximum(thick, 0.0)
            cells = pattern.sum() + draws.column(f"imbalance_{name}") / 2.0 * np.abs(pattern).sum()
            found.append(np.abs(strength * cells) * (part.remanence / MU0 * part.thickness * part.cell**2))
    return np.asarray(np.max(found, axis=0))


def _reaches(entry: Asked, nominal: State, draws: Draws, gap: float, reported: float) -> Array:
    """Distance at which each pair's peak passes the level, interpolated between a few distances in logarithms."""
    of, level = entry.params["of"], float(entry.params["field"])
    probes = [float(exact_value(entry, state_of(nominal, draws, n), reported)[0]) for n in range(min(4, draws.count))]
    known = [value for value in (reported, *probes) if value > 0.0]
    if not known:
        return np.zeros(draws.count)
    low, high = 0.8 * min(known), 1.25 * max(known)
    for _ in range(4):
        distances = np.geomspace(low, high, _DISTANCES)
        peaks = np.stack([Peaks(nominal, draws, of, gap, "around", float(d)).values() for d in distances], axis=1)
        above, below = peaks[:, 0] < level, peaks[:, -1] > level
        if not (above.any() or below.any()):
            break
        low, high = (0.6 * low if above.any() else low), (1.6 * high if below.any() else high)
    logs = np.log(np.maximum(peaks, 1e-300) / level)
    found = np.empty(draws.count)
    for n, row in enumerate(logs):
        falling = np.minimum.accumulate(row)
        falling -= 1e-9 * np.arange(_DISTANCES)
        found[n] = np.exp(float(PchipInterpolator(-falling, np.log(distances), extrapolate=True)(0.0)))
    return found
