"""The second path's value of every quantity of the pair: charge times field, differences, quadrature, zeros found anew.

No number here comes from the design kernels. They only say where to look: the gap of a reported stand-off or peak, the
zeros of the force between which work is counted.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from itertools import pairwise
from typing import final

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import brentq, minimize_scalar

from ...models.pair import Row
from ...models.part import Part
from ...models.second_path import pair_force, pair_moment
from ...objectives.gaps import FINE, crossings, gap_grid
from .asked import Asked
from .checks import CONTACT_TOLERANCE, NEAR, TOLERANCE, Check
from .state import State, measured_value

Array = NDArray[np.float64]
Curve = Callable[[Array], Array]

_STENCIL = ((1, 3.0 / 4.0), (2, -3.0 / 20.0), (3, 1.0 / 60.0))
"""Central first derivative of sixth order: step, weight of f(+step) - f(-step)."""
_STEP = 0.06
"""Step of a difference, as a share of the distance of the magnets (at most a cell's)."""
_SLOPE_FROM = 0.02
"""Distance of the magnets [cells] below which the slope of the force is not checked: it diverges in contact."""
_GRID = 9
"""Places at which a whole range is looked at again beside the reported one."""
_WORK_NODES = 20
_BESIDE = 2e-3
"""How far from a reported stand-off its zero may be found again, relatively."""


@final
class SecondPath:
    """Pair physics by the second path: each pose is computed once."""

    def __init__(self, base: Part, mover: Part, a: NDArray[np.int8], b: NDArray[np.int8]) -> None:
        self._pair = (base, mover, a, b)
        self._coatings = base.coating + mover.coating
        self._cell = base.cell
        self._forces: dict[tuple[float, float, float], Array] = {}

    def force(self, gap: float, dx: float = 0.0, dy: float = 0.0) -> Array:
        """(Fx, Fy, Fz) on the mover [N]."""
        pose = (float(gap), float(dx), float(dy))
        if pose not in self._forces:
            self._forces[pose] = pair_force(*self._pair, *pose)
        return self._forces[pose]

    def axial(self, gaps: Array) -> Array:
        """F_z [N] at centred poses, shape of ``gaps`` [m]."""
        return np.array([self.force(float(gap))[2] for gap in gaps])

    def measure(self, rows: Sequence[Row]) -> Array:
        """Values of pair rows [SI], shape (row,)."""
        return np.array([self._row(row) for row in rows], dtype=np.float64)

    def _row(self, row: Row) -> float:
        pose = (row.gap, row.dx, row.dy)
        if row.component in ("fx", "fy", "fz"):
            return float(self.force(*pose)["xyz".index(row.component[1])])
        if row.component in ("mx", "my"):
            return float(pair_moment(*self._pair, *pose)["xy".index(row.component[1])])
        of, along = row.component[1], row.component[2]
        step = _STEP * min(row.gap + self._coatings, self._cell)
        way = step * np.array([along == "z", along == "x", along == "y"])
        total = 0.0
        for n, weight in _STENCIL:
            ahead, behind = (self.force(*(np.array(pose) + sign * n * way)) for sign in (1.0, -1.0))
            total += weight * float((ahead - behind)["xyz".index(of)])
        return total / step


def pair_checks(
    entry: Asked, state: State, second: SecondPath, reported: Array, largest: float
) -> tuple[list[Check], Array, str]:
    """Check one quantity of the pair.

    Args:
        entry: What is asked.
        state: The pair by the design path, without errors.
        second: The same by the second path.
        reported: The stored values [SI], shape (elements,).
        largest: Largest force on the curve [N]: what differences of forces are relative to.

    Returns:
        The checks, the second path's values [SI], shape (elements,), and why there are none, if so.
    """
    nearest = _nearest(entry) + state.base.coating + state.mover.coating
    slope = any(row.component[0] == "k" for row in entry.rows)
    if slope and nearest < _SLOPE_FROM * state.base.cell:
        return [], reported, "the slope of the force diverges in contact"
    search = {"stand_off": _stand_off, "peak_force": _peak, "slide_force": _slide, "opening_work": _work}
    if entry.name in search:
        value, scale, words = search[entry.name](entry, state, second, float(reported[0]), largest)
        values, scales = np.array([value]), np.array([scale])
    else:
        values = measured_value(entry, state.base, state.mover, state.a, state.b, second.measure)
        scales, words = _scale(entry, state, second, reported, largest)
    tolerance = TOLERANCE if nearest >= NEAR * state.base.cell else CONTACT_TOLERANCE
    gaps = np.broadcast_to(np.asarray(entry.params.get("gap", np.nan), np.float64), values.shape)
    checks = [
        Check(label, entry.unit, None if np.isnan(gap) else float(gap), float(kernel), float(value), float(scale),
              words, tolerance)
        for label, gap, kernel, value, scale in zip(entry.labels, gaps, reported, values, scales, strict=True)
    ]  # fmt: skip
    return checks, values, ""


def _nearest(entry: Asked) -> float:
    keys = entry.params
    return float(np.min(np.asarray(keys["gap"] if "gap" in keys else keys["between"], dtype=np.float64)))


def _scale(entry: Asked, state: State, second: SecondPath, reported: Array, largest: float) -> tuple[Array, str]:
    """What a difference of each element is relative to [SI], and in words."""
    ones = np.ones(entry.elements)
    cell = state.base.cell
    xmin, xmax, ymin, ymax = state.mover.blank.bounds
    arm = float(np.hypot(xmax - xmin, ymax - ymin)) / 2.0
    match entry.name:
        case "tilt_moment":
            return ones * largest * arm, "the largest force times half the mover's diagonal"
        case "peel_force":
            return ones * largest * arm / entry.params["arm"], "the largest force, at the arm of the face's corner"
        case "axial_stiffness" | "lateral_stiffness":
            return ones * largest / cell, "the largest force over a cell"
        case "force_sensitivity":
            force = np.abs(second.measure([row._replace(component="fz") for row in entry.rows[: entry.elements]]))
            size = (largest / cell + np.abs(reported) * largest) / np.maximum(force, 1e-300)
            return size, "the largest force over a cell, over the force itself"
    return ones * largest, "the largest force on the curve"


def _kernel_curve(state: State) -> Curve:
    return lambda gaps: state.pair([Row("fz", float(gap)) for gap in gaps])


def _stand_off(
    entry: Asked, state: State, second: SecondPath, reported: float, largest: float
) -> tuple[float, float, str]:
    """The zero of the net force, found again beside the reported one; NaN if an earlier one stands in its way."""
    between, load = entry.params["between"], entry.params["load"]
    words = "the gap that the allowed force difference stands for there, and 1e-9 of the range"

    def net(gap: float) -> float:
        return float(second.force(gap)[2]) - float(load)

    grid = gap_grid(between, state.base.cell, _GRID)
    until = grid if np.isnan(reported) else grid[grid < reported * (1.0 - _BESIDE)]
    signs = np.array([net(float(gap)) > 0.0 for gap in until])
    if (signs[:-1] & ~signs[1:]).any():
        found = float(until[1:][signs[:-1] & ~signs[1:]][0])
        return found, 0.0, words
    if np.isnan(reported):
        return np.nan, 1.0, words
    low, high = max(reported * (1.0 - _BESIDE), between[0]), min(reported * (1.0 + _BESIDE), between[1])
    if net(low) * net(high) > 0.0:
        return np.nan, 1.0, words
    zero = float(brentq(net, low, high, xtol=1e-10 * reported))
    slope = abs(net(high) - net(low)) / (high - low)
    return zero, largest / max(slope, 1e-300) + 1e-3 * between[1], words


def _peak(entry: Asked, state: State, second: SecondPath, reported: float, largest: float) -> tuple[float, float, str]:
    """Largest force of the asked sign on a modest grid and where the design path has its extreme."""
    sign = 1.0 if entry.params["which"] == "repulsion" else -1.0
    curve = _kernel_curve(state)
    grid = gap_grid(entry.params["between"], state.base.cell, FINE)
    top = _top(lambda gaps: sign * curve(gaps), grid)
    value = float(np.max(sign * second.axial(np.append(grid[:: FINE // _GRID], top))))
    if value <= 0.0 or (np.isnan(reported) and value < TOLERANCE * largest):
        value = np.nan
    return value, largest, "the largest force on the curve"


def _slide(entry: Asked, state: State, second: SecondPath, reported: float, largest: float) -> tuple[float, float, str]:
    """Largest resistance on a modest grid of offsets and where the design path has its extreme."""
    del reported
    keys = entry.params
    axis = 0 if keys["axis"] == "x" else 1

    def pose(offset: float) -> tuple[float, float, float]:
        gap = float(keys["gap"])
        return (gap, offset, 0.0) if axis == 0 else (gap, 0.0, offset)

    def kernel(offsets: Array) -> Array:
        lateral, axial = (
            state.pair([Row(component, *pose(float(offset))) for offset in offsets])
            for component in (("fx", "fy")[axis], "fz")
        )
        return np.asarray(-lateral - keys["friction"] * axial)

    grid = np.linspace(0.0, keys["travel"], 8 * (_GRID - 1) + 1)
    places = np.append(grid[::8], _top(kernel, grid))
    forces = np.array([second.force(*pose(float(offset))) for offset in places])
    value = float(np.max(-forces[:, axis] - keys["friction"] * forces[:, 2]))
    return value, largest * (1.0 + keys["friction"]), "the largest force on the curve, friction added"


def _work(entry: Asked, state: State, second: SecondPath, reported: float, largest: float) -> tuple[float, float, str]:
    """Gauss quadrature of the second path's hold where it is positive, between the zeros of the force."""
    del reported
    low, high = entry.params["between"]
    curve = _kernel_curve(state)
    grid = gap_grid((low, high), state.base.cell, FINE)
    ends = np.unique(np.concatenate([[low], crossings(curve, grid, curve(grid)), [high]]))
    nodes, weights = np.polynomial.legendre.leggauss(_WORK_NODES)
    total = 0.0
    for left, right in pairwise(ends.tolist()):
        # nodes crowd toward contact, where the force has a gap * log(gap) in it
        share = (nodes + 1.0) / 2.0
        start, stop = np.cbrt(left), np.cbrt(right)
        root = start + (stop - start) * share
        steps = weights / 2.0 * (stop - start) * 3.0 * root**2
        total += max(-float(steps @ second.axial(root**3)), 0.0)
    return total, largest * max(high - low, state.base.cell), "the largest force times the range of gaps"


def _top(curve: Curve, grid: Array) -> float:
    """Where a curve is largest: the best place of a grid, refined between its neighbours."""
    best = int(np.argmax(curve(grid)))
    low, high = grid[max(best - 1, 0)], grid[min(best + 1, grid.size - 1)]

    def fall(at: float) -> float:
        return -float(curve(np.array([at]))[0])

    inside = minimize_scalar(fall, bounds=(low, high), method="bounded", options={"xatol": 1e-6 * high})
    return float(inside.x if -inside.fun > curve(grid[best : best + 1])[0] else grid[best])
