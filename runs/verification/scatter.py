"""Scatter: what the tolerances of a spec make of a design, part by part, and which of them costs most.

Pairs are drawn by ``draws`` and evaluated by interpolation (``sheets`` for the pair, ``leaks`` for fields outside). The
first few are evaluated exactly as well; where the interpolation is off by more than ``_ALLOWED`` of the band between
the 5th and the 95th percentile, a requirement's figures come from exact evaluations of the first ``_EXACT`` pairs.
Turning errors (``angle_deg``) are not sampled on a square lattice; the result says so.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ...models.pair import Row
from ...models.units import from_si
from ..jsonable import jsonable
from ..records import Run
from ..spec import Spec
from .asked import LEAKS, Asked
from .draws import Draws, costliest, draw, extremes, state_of, unbalanced, worst_drops
from .leaks import leak_values
from .sheets import Sampled, boxes_of
from .state import State, exact_value, measured_value

Array = NDArray[np.float64]
Tell = Callable[[float], None]

LOW_LEAKAGE = ("stray_field", "field_reach", "net_moment")
_HELD_OUT = 4
_ALLOWED = 0.02
_EXACT = 100
_BAND_GAPS = 60


def scatter(run: Run, spec: Spec, asked: tuple[Asked, ...], state: State, tell: Tell) -> dict[str, Any]:
    """Sample the spec's tolerances about a design.

    Args:
        run: The run (its seed and the gaps of its curve).
        spec: Its spec.
        asked: What the spec asks for.
        state: The design's pair without errors.
        tell: Called with the share that is done.

    Returns:
        The record that reports and archives show, SI: ``samples``, ``seed``, ``share_all``, ``requirements`` (a row a
        require, in spec order), ``force_band``, ``imbalance_floor`` (spec's units, named in the keys) and ``notes``.
    """
    sampled = draw(spec, run.seed)
    draws = sampled.joined(extremes(spec)).joined(unbalanced(spec))
    requires = tuple(entry for entry in asked if entry.bound is not None)
    curve = run.curves.get("force_gap")
    gaps = np.zeros(0) if curve is None else curve.scale
    gaps = gaps[np.unique(np.linspace(0, gaps.size - 1, _BAND_GAPS).round().astype(int))] if gaps.size else gaps
    pair = _pair(requires, gaps, state, draws)
    tell(0.3)
    met = np.ones(sampled.count, dtype=bool)
    rows, floor = [], {}
    for n, entry in enumerate(requires):
        values = _values(entry, state, draws, pair)
        row, held, own = _row(entry, state, sampled, values)
        rows.append(row)
        met &= held
        if entry.name in LOW_LEAKAGE:
            floor[f"{entry.label} [{entry.unit}]"] = from_si(float(np.nanmax(own[-4:])), entry.unit)
        tell(0.3 + 0.7 * (n + 1) / len(requires))
    found: dict[str, Any] = {
        "samples": sampled.count,
        "seed": run.seed,
        "share_all": float(met.mean()),
        "requirements": rows,
        "notes": _notes(spec, floor),
    }
    if gaps.size:
        forces = pair.values([Row("fz", float(gap)) for gap in gaps], np.arange(sampled.count))
        low, high = np.percentile(forces, [5.0, 95.0], axis=0)
        found["force_band"] = {"gap": gaps, "p5": low, "p95": high}
    if floor:
        found["imbalance_floor"] = floor
    plain: dict[str, Any] = jsonable(found)
    return plain


def _pair(requires: tuple[Asked, ...], gaps: Array, state: State, draws: Draws) -> Sampled:
    """Tables that hold every row that the requires and the curve read."""
    groups: list[list[Row]] = [[Row("fz", float(gap)) for gap in gaps]]
    for entry in requires:
        if entry.name in LEAKS:
            continue
        read: list[Row] = []

        def note(rows: Any, read: list[Row] = read) -> Array:
            read.extend(rows)
            return state.pair(rows)

        measured_value(entry, state.base, state.mover, state.a, state.b, note)
        if not entry.rows and "between" in entry.params:
            # a curve's features lie elsewhere for other pairs, but within its range
            components = {row.component for row in read}
            read += [Row(component, gap) for component in components for gap in entry.params["between"]]
        groups.append(read)
    return Sampled(state, draws, boxes_of(group for group in groups if group))


def _values(entry: Asked, state: State, draws: Draws, pair: Sampled) -> Array:
    """Value of a require for every drawn pair, shape (pair, elements) [SI]."""
    if entry.name in LEAKS:
        return leak_values(entry, state, draws, float(exact_value(entry, state)[0]))
    if entry.quantity is None or entry.quantity.of_pattern:
        return np.tile(exact_value(entry, state), (draws.count, 1))
    every = np.arange(draws.count)
    if entry.rows:
        # a direct function of its rows takes all pairs at once
        return measured_value(entry, state.base, state.mover, state.a, state.b, lambda rows: pair.values(rows, every))
    return np.array(
        [
            measured_value(
                entry, state.base, state.mover, state.a, state.b,
                lambda rows, n=n: pair.values(rows, every[n : n + 1])[0],  # type: ignore[misc]
            )
            for n in range(draws.count)
        ]
    )  # fmt: skip


def _row(entry: Asked, state: State, sampled: Draws, values: Array) -> tuple[dict[str, Any], NDArray[np.bool_], Array]:
    """The record of one require, which pairs meet it, and its values for all draws."""
    count = sampled.count
    own, used = values, values[:count]
    error, method = _held_out(entry, state, sampled, values)
    if error > _ALLOWED:
        used = np.array([exact_value(entry, state_of(state, sampled, n)) for n in range(min(count, _EXACT))])
        method = f"exact evaluation of the first {len(used)} pairs"
    margins = entry.margins(used)
    met = entry.margins(values[:count]) >= 0.0
    met[: len(used)] = margins >= 0.0
    drops = worst_drops(entry.margins(own[count:-4]))
    low, high = _percentiles(used)
    return (
        {
            "label": entry.label, "unit": entry.unit, "share": float((margins >= 0.0).mean()), "p5": low, "p95": high,
            "costliest": costliest(drops), "cost": drops, "method": method, "error": error,
            "missing": float(np.isnan(used).any(axis=1).mean()),
        },
        met,
        own,
    )  # fmt: skip


def _held_out(entry: Asked, state: State, sampled: Draws, values: Array) -> tuple[float, str]:
    """Largest error of the interpolation over its band of the first pairs, evaluated exactly; and the method."""
    if entry.quantity is not None and entry.quantity.of_pattern:
        return 0.0, "does not change with tolerances"
    count = min(_HELD_OUT, sampled.count)
    reach = float(values[0, 0]) if entry.name == "field_reach" else None
    exact = np.array([exact_value(entry, state_of(state, sampled, n), reach) for n in range(count)])
    low, high = (np.array(ends) for ends in _percentiles(values[: sampled.count]))
    differs = np.isnan(exact) != np.isnan(values[:count])
    band = np.maximum(high - low, 1e-9 * np.nanmax(np.abs(values), axis=0, initial=1e-300))
    error = np.abs(values[:count] - exact) / band
    return float(np.where(differs, np.inf, np.nan_to_num(error)).max()), "interpolation, checked against exact pairs"


def _percentiles(values: Array) -> tuple[list[float], list[float]]:
    """5th and 95th percentile of each element over the pairs where it exists; NaN where it never does."""
    ends = []
    for element in values.T:
        there = element[~np.isnan(element)]
        ends.append(np.percentile(there, [5.0, 95.0]) if there.size else np.array([np.nan, np.nan]))
    return [float(low) for low, _ in ends], [float(high) for _, high in ends]


def _notes(spec: Spec, floor: dict[str, float]) -> list[str]:
    notes = [
        "Every tolerance is drawn uniformly within plus and minus its stated half width, independent of the others.",
        "The costliest tolerance is the one that alone, at its worse limits, lowers the margin most.",
    ]
    if spec.tolerances.angle_deg > 0.0:
        notes.append("Turning errors (angle_deg) are not sampled: the pairs stand at their nominal angle.")
    if floor:
        notes.append(
            "The imbalance floor is the nominal pair with the N/S imbalance of both parts alone at its worse limits."
        )
    return notes
