"""Pair physics of many pairs with errors, from tables interpolated over the axial and the lateral way.

The force between two magnets is that of four pairs of charged sheets, and a pair of sheets knows of three numbers only:
its axial distance and its lateral offset. Errors of gap and thickness change the distances, errors of place the offset,
and errors of remanence and of N against S are factors of the four correlations a b, |a| b, a |b|, |a| |b|. So each
sheet kernel, summed over the correlations, is tabulated at Chebyshev nodes in a box of (distance, dx, dy) that holds
every pair, once; a value of any pair at any gap is then four readings of a polynomial.

Cells that are far apart see little of a small lateral way: they are summed at fewer nodes.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import final

import numpy as np
from numpy.typing import NDArray

from ...models.kernels.square import FAR_SWITCH, sheet_kernels
from ...models.pair import Row
from ...models.second_path import correlation
from ...models.units import MU0
from .draws import Draws, thickness
from .state import State

Array = NDArray[np.float64]
Span = tuple[float, float]

KERNELS = {"energy": "e", "fx": "x", "fy": "y", "fz": "z", "kxx": "xx", "kyy": "yy", "kxy": "xy", "kzz": "zz"}
_WEIGHTS = (("1", "1"), ("x", "1"), ("1", "x"), ("y", "1"), ("1", "y"))
_BELOW, _ABOVE = np.array([0.0, 1.0, 0.0, 1.0]), np.array([0.0, 0.0, 1.0, 1.0])
_SIGNS = np.array([-1.0, 1.0, 1.0, -1.0])
_BLOCK = 200
_SHARED = 9
"""More offsets than these in one quantity are a travel, and share one box."""
_LOG_AT = 0.05
"""Nodes in the axial distance are even in log(distance + this many cells)."""
_AXIAL = (8, 5.0)
"""Nodes in the axial distance: at least, and for each unit of that logarithm."""
_LATERAL = (5, 4.0)
"""Nodes along an offset: at least, and for each cell of the box's width (where it has any)."""
_CLOSE = (0.2, 4)
"""More nodes along an offset where the magnets come closer than this [cells], where the force turns sharper."""
_LATERAL_FAR = (3, 0.5)


@final
@dataclass(frozen=True)
class Box:
    """What rows need: kernels over offsets (x, y) and gaps, all nominal [m]."""

    x: Span
    y: Span
    gap: Span
    components: frozenset[str]

    def holds(self, row: Row) -> bool:
        """Is the row's pose inside?"""
        inside = self.x[0] <= row.dx <= self.x[1] and self.y[0] <= row.dy <= self.y[1]
        return inside and self.gap[0] <= row.gap <= self.gap[1] and row.component in self.components


def boxes_of(groups: Iterable[Sequence[Row]]) -> tuple[Box, ...]:
    """Boxes that hold the rows of every quantity (one group each): one for each offset, one for a whole travel."""
    found: dict[tuple[Span, Span], list[Row]] = {}
    for rows in groups:
        x, y = (sorted({row[axis] for row in rows}) for axis in (2, 3))
        if len({(row.dx, row.dy) for row in rows}) > _SHARED:
            found.setdefault(((float(x[0]), float(x[-1])), (float(y[0]), float(y[-1]))), []).extend(rows)
            continue
        for row in rows:
            found.setdefault(((row.dx, row.dx), (row.dy, row.dy)), []).append(row)
    return tuple(
        Box(x, y, (min(row.gap for row in rows), max(row.gap for row in rows)),
            frozenset(row.component for row in rows))
        for (x, y), rows in found.items()
    )  # fmt: skip


@final
class _Axis:
    """Chebyshev nodes over a span and the polynomials at any place; a span of no width has one node."""

    def __init__(self, low: float, high: float, count: int) -> None:
        self._middle, self._half = (low + high) / 2.0, (high - low) / 2.0
        self.count = count if self._half > 0.0 else 1
        unit = np.cos(np.pi * (np.arange(self.count) + 0.5) / self.count)
        self.nodes = self._middle + self._half * unit
        self.back = np.linalg.inv(self._at(unit))

    def basis(self, at: Array) -> Array:
        """Polynomials at places of any shape, shape (..., count)."""
        if self.count == 1:
            return np.ones((*at.shape, 1))
        return self._at(np.clip((at - self._middle) / self._half, -1.0, 1.0))

    def _at(self, unit: Array) -> Array:
        return np.cos(np.arccos(unit)[..., None] * np.arange(self.count))


@final
class _Sheets:
    """One kernel of two sheets over a box: summed over the correlations, as Chebyshev coefficients."""

    def __init__(self, kernel: str, axes: tuple[_Axis, _Axis, _Axis], distances: Array, state: State, counts: Array,
                 reach: Span) -> None:  # fmt: skip
        self.axes = axes
        base, mover, cell = state.base, state.mover, state.base.cell
        u = mover.x[0] - base.x[0] + np.arange(-(base.x.size - 1), mover.x.size) * cell
        v = mover.y[0] - base.y[0] + np.arange(-(base.y.size - 1), mover.y.size) * cell
        _, axis_y, axis_x = axes
        near_x = np.abs(u + (axis_x.nodes.max() + axis_x.nodes.min()) / 2.0) <= FAR_SWITCH * cell + reach[0]
        near_y = np.abs(v + (axis_y.nodes.max() + axis_y.nodes.min()) / 2.0) <= FAR_SWITCH * cell + reach[1]
        far = counts.copy()
        self.coefficients = np.zeros((counts.shape[0], *(axis.count for axis in axes)))
        if near_x.any() and near_y.any():
            far[:, np.ix_(near_y, near_x)[0], np.ix_(near_y, near_x)[1]] = 0.0
            some = counts[:, near_y][:, :, near_x]
            self._add(kernel, (u[near_x], v[near_y]), distances, cell, some, axes)
        if np.any(far):
            thin = tuple(
                _Axis(float(axis.nodes.min()), float(axis.nodes.max()),
                      min(axis.count, _count(_LATERAL_FAR, float(np.ptp(axis.nodes)) / cell)))
                for axis in axes[1:]
            )  # fmt: skip
            self._add(kernel, (u, v), distances, cell, far, (axes[0], thin[0], thin[1]))

    def _add(self, kernel: str, cells: tuple[Array, Array], distances: Array, cell: float, counts: Array,
             axes: tuple[_Axis, _Axis, _Axis]) -> None:  # fmt: skip
        """Sum over the cells at every node and add the coefficients; of coarser axes, on the finer ones' nodes."""
        _, coarse_y, coarse_x = axes
        values = np.empty((counts.shape[0], distances.size, coarse_y.count, coarse_x.count))
        for j, dy in enumerate(coarse_y.nodes):
            for i, dx in enumerate(coarse_x.nodes):
                table = sheet_kernels((kernel,), cells[0] + dx, cells[1] + dy, distances, cell)[kernel]
                values[:, :, j, i] = np.tensordot(counts, table, axes=((1, 2), (1, 2)))
        values = np.einsum("cwyx,vw,zy,ux->cvzu", values, axes[0].back, coarse_y.back, coarse_x.back, optimize=True)
        on_y = self.axes[1].back @ coarse_y.basis(self.axes[1].nodes)
        on_x = self.axes[2].back @ coarse_x.basis(self.axes[2].nodes)
        self.coefficients += np.einsum("cwyx,zy,ux->cwzu", values, on_y, on_x, optimize=True)


def _count(rule: tuple[int, float], size: float) -> int:
    return rule[0] + int(np.ceil(rule[1] * size))


@final
class Sampled:
    """Pair physics of every drawn pair at the poses of some boxes."""

    def __init__(self, state: State, draws: Draws, boxes: Sequence[Box]) -> None:
        self._state, self._draws, self._boxes = state, draws, tuple(boxes)
        self._cell = state.base.cell
        self._dx = draws.column("offset_x") + draws.column("slip_mover_x") - draws.column("slip_base_x")
        self._dy = draws.column("offset_y") + draws.column("slip_mover_y") - draws.column("slip_base_y")
        self._gap = draws.column("gap")
        self._thick = np.array(
            [
                [thickness(part.thickness, float(error)) for error in draws.column(f"thickness_{name}")]
                for name, part in (("base", state.base), ("mover", state.mover))
            ]
        )
        ib, im = draws.column("imbalance_base") / 2.0, draws.column("imbalance_mover") / 2.0
        strength = (1.0 + draws.column("remanence_base")) * (1.0 + draws.column("remanence_mover"))
        strength = strength * (state.base.remanence * state.mover.remanence / (4.0 * np.pi * MU0))
        self._factors = strength[:, None] * np.stack([np.ones_like(ib), ib, im, ib * im], axis=1)
        self.tables = [self._build(box) for box in self._boxes]
        self._last = np.zeros(0, dtype=np.intp)
        self._mixed: dict[tuple[int, str, int], Array] = {}

    def values(self, rows: Sequence[Row], pairs: NDArray[np.intp]) -> Array:
        """Value of every row for some pairs [SI], shape (pair, row)."""
        out = np.empty((pairs.size, len(rows)))
        groups: dict[tuple[int, str], list[int]] = {}
        for n, row in enumerate(rows):
            groups.setdefault((self._box(row), row.component), []).append(n)
        for first in range(0, pairs.size, _BLOCK):
            block = slice(first, first + _BLOCK)
            for (box, component), numbers in groups.items():
                poses = np.array([rows[n][1:] for n in numbers], dtype=np.float64)
                out[block, numbers] = self._component(box, component, poses, pairs[block])
        return out

    def _box(self, row: Row) -> int:
        for n, box in enumerate(self._boxes):
            if box.holds(row):
                return n
        message = f"no table holds {row}"
        raise ValueError(message)

    def _build(self, box: Box) -> dict[str, _Sheets]:
        """Tables of the kernels that the rows of a box read; z with moments where tilt is asked for."""
        coatings = self._state.base.coating + self._state.mover.coating
        low = max(box.gap[0] + float(self._gap.min()), 0.0) + coatings
        high = max(box.gap[1] + float(self._gap.max()), 0.0) + coatings + float(self._thick.sum(axis=0).max())
        scale = _LOG_AT * self._cell
        axial = _Axis(float(np.log(low + scale)), float(np.log(high + scale)),
                      _count(_AXIAL, float(np.log((high + scale) / (low + scale)))))  # fmt: skip
        more = _CLOSE[1] if low < _CLOSE[0] * self._cell else 0
        x, y = self._lateral(box.x, self._dx, more), self._lateral(box.y, self._dy, more)
        tilts = bool(box.components & {"mx", "my"})
        kernels = {KERNELS[name] for name in box.components & set(KERNELS)}
        kernels |= {"z", "x", "y"} if tilts else set()
        distances = np.maximum(np.exp(axial.nodes) - scale, 0.0)
        reach = (float(np.ptp(x.nodes)) / 2.0, float(np.ptp(y.nodes)) / 2.0)
        return {
            kernel: _Sheets(kernel, (axial, y, x), distances, self._state, self._counts(tilts and kernel == "z"), reach)
            for kernel in sorted(kernels)
        }

    def _lateral(self, span: Span, ways: Array, more: int) -> _Axis:
        low, high = span[0] + float(ways.min()), span[1] + float(ways.max())
        return _Axis(low, high, _count(_LATERAL, (high - low) / self._cell) + more)

    def _counts(self, weighted: bool) -> Array:
        """Correlations of the patterns and of their sizes, plain or weighted with the cells' coordinates."""
        state, found = self._state, []
        for on_base, on_mover in _WEIGHTS if weighted else _WEIGHTS[:1]:
            for a, b in ((state.a, state.b), (np.abs(state.a), state.b), (state.a, np.abs(state.b)),
                         (np.abs(state.a), np.abs(state.b))):  # fmt: skip
                found.append(
                    correlation(a * _coordinate(on_base, state.base.x, state.base.y),
                                b * _coordinate(on_mover, state.mover.x, state.mover.y))
                )  # fmt: skip
        return np.array(found)

    def _component(self, box: int, component: str, poses: Array, pairs: NDArray[np.intp]) -> Array:
        """A component at poses (row, [gap, dx, dy]), shape (pair, row)."""
        read = _Reading(self, box, poses, pairs)
        if component in KERNELS:
            return read.plate(KERNELS[component])
        about_y = component == "my"
        across = "x" if about_y else "y"
        pull, arm = read.plate("z"), read.plate(across, arm=True)
        shift = (poses[:, 1] + self._dx[pairs, None]) if about_y else (poses[:, 2] + self._dy[pairs, None])
        weight = 1 if about_y else 3
        leaned = read.plate("z", weight) + read.plate("z", weight + 1)
        # asked for is the moment about the blank's centre, not the pattern's
        slip = self._draws.column("slip_mover_" + across)[pairs, None]
        moment = arm + 0.5 * shift * pull - 0.5 * leaned - slip * pull
        return np.asarray(moment if about_y else -moment)

    def mixed(self, box: int, kernel: str, weight: int, pairs: NDArray[np.intp]) -> Array:
        """Coefficients of a kernel with each pair's own factors, shape (pair, axial, y, x).

        Kept for the pairs asked for last: a search along one pair's curve reads the same again and again.
        """
        if not np.array_equal(self._last, pairs):
            self._last, self._mixed = pairs.copy(), {}
        key = (box, kernel, weight)
        if key not in self._mixed:
            part_of = self.tables[box][kernel].coefficients[4 * weight : 4 * weight + 4]
            found = self._factors[pairs] @ part_of.reshape(4, -1)
            self._mixed[key] = found.reshape(pairs.size, *part_of.shape[1:])
        return self._mixed[key]

    def places(self, poses: Array, pairs: NDArray[np.intp]) -> tuple[Array, Array, Array]:
        """Axial distance of every two sheets (pair, row, 4), and dx and dy (pair, row) [m]."""
        coatings = self._state.base.coating + self._state.mover.coating
        faces = np.maximum(poses[:, 0] + self._gap[pairs, None], 0.0) + coatings
        thick = self._thick[0, pairs, None] * _BELOW + self._thick[1, pairs, None] * _ABOVE
        return (
            faces[:, :, None] + thick[:, None, :],
            poses[:, 1] + self._dx[pairs, None],
            poses[:, 2] + self._dy[pairs, None],
        )

    def mover_thickness(self, pairs: NDArray[np.intp]) -> Array:
        """Thickness of the mover, shape (pair,) [m]."""
        return np.asarray(self._thick[1, pairs])

    def log_distance(self, distance: Array) -> Array:
        """The coordinate that axial nodes are even in."""
        return np.asarray(np.log(distance + _LOG_AT * self._cell))


@final
class _Reading:
    """Sheet distances and polynomials of some pairs at some poses."""

    def __init__(self, sampled: Sampled, box: int, poses: Array, pairs: NDArray[np.intp]) -> None:
        self._sampled, self._box, self._pairs = sampled, box, pairs
        axial, axis_y, axis_x = next(iter(sampled.tables[box].values())).axes
        # rows of one offset share what is read across the face
        offsets, self._offset = np.unique(poses[:, 1:], axis=0, return_inverse=True)
        _, dx, dy = sampled.places(np.insert(offsets, 0, 0.0, axis=1), pairs)
        self._x, self._y = axis_x.basis(dx), axis_y.basis(dy)
        self._w, _, _ = sampled.places(poses, pairs)
        self._axial = axial.basis(sampled.log_distance(self._w))

    def plate(self, kernel: str, weight: int = 0, *, arm: bool = False) -> Array:
        """Four sheets together, shape (pair, row); with ``arm`` each weighted by its height less half the distance."""
        mixed = self._sampled.mixed(self._box, kernel, weight, self._pairs)
        pairs, axial, rows_y, _ = mixed.shape
        across = mixed.reshape(pairs, axial * rows_y, -1) @ self._x.transpose(0, 2, 1)
        across = across.reshape(pairs, axial, rows_y, -1) * self._y.transpose(0, 2, 1)[:, None]
        profile = across.sum(axis=2).transpose(0, 2, 1)[:, self._offset]
        sheets = (self._axial @ profile[..., None])[..., 0]
        if arm:
            height = _ABOVE * self._sampled.mover_thickness(self._pairs)[:, None, None]
            sheets = sheets * (height - 0.5 * self._w)
        return np.asarray(sheets @ _SIGNS)


def _coordinate(name: str, x: Array, y: Array) -> Array:
    ones = np.ones((y.size, x.size))
    return ones if name == "1" else ones * (x[None, :] if name == "x" else y[:, None])
