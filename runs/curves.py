"""Curves of every design of a run: axial force over the gap, lateral force over the offset where it is asked for."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from ..models.pair import Row
from ..models.units import to_si
from ..objectives.gaps import gap_grid
from ..objectives.problem import Problem
from .records import Curve, Design
from .spec import Entry, Spec

Array = NDArray[np.float64]

_POINTS = 81
_OFFSETS = 61
_RANGE = 10e-3
"""A force-gap curve reaches at least this far [m]."""


def curves_of(spec: Spec, problem: Problem, designs: Sequence[Design]) -> dict[str, Curve]:
    """Return the curves by name; abscissas hold every gap that the spec names."""
    found = {"force_gap": _force_gap(spec, problem, designs)}
    if _asks_lateral(spec):
        found["lateral"] = _lateral(problem, designs, *lateral_path(spec))
    return found


def lateral_path(spec: Spec) -> tuple[float, float, Array]:
    """Gap [m], largest offset [m] and unit direction (x, y) of the lateral curve of a spec that asks for one."""
    asked = _asks_lateral(spec)
    gap = to_si(float(np.atleast_1d(asked[0].settings["gap_mm"])[0]), "mm")
    return gap, *_direction(asked)


def _asks_lateral(spec: Spec) -> list[Entry]:
    return [e for e in (*spec.require, *spec.improve) if e.quantity in ("slide_force", "lateral_force")]


def _force_gap(spec: Spec, problem: Problem, designs: Sequence[Design]) -> Curve:
    gaps: list[float] = []
    for entry in (*spec.require, *spec.improve):
        for key in ("gap_mm", "between_mm"):
            gaps += np.atleast_1d(entry.settings.get(key, [])).astype(np.float64).tolist()
    named = to_si(np.array(gaps, dtype=np.float64), "mm")
    reach = max(_RANGE, 1.5 * float(named.max(initial=0.0)))
    scale = np.unique(np.concatenate([gap_grid((0.0, reach), problem.base.cell, _POINTS), named]).round(12))
    rows = [Row("fz", float(gap)) for gap in scale]
    forces = [problem.case(d.base, d.mover).pair(rows) for d in designs]
    return Curve("gap", scale, "mm", np.array(forces).reshape(len(designs), scale.size), "N")


def _lateral(problem: Problem, designs: Sequence[Design], gap: float, travel: float, along: Array) -> Curve:
    """Restoring force along a direction, positive back to the centre."""
    scale = np.linspace(0.0, travel, _OFFSETS)
    poses = [(gap, float(offset * along[0]), float(offset * along[1])) for offset in scale]
    forces = []
    for design in designs:
        case = problem.case(design.base, design.mover)
        force = [case.pair([Row(component, *pose) for pose in poses]) for component in ("fx", "fy")]
        forces.append(-(along[0] * force[0] + along[1] * force[1]))
    return Curve("offset", scale, "mm", np.array(forces).reshape(len(designs), scale.size), "N")


def _direction(asked: Sequence[Entry]) -> tuple[float, Array]:
    """Largest offset that the entries name [m], and its direction."""
    offsets = []
    for entry in asked:
        if "travel_mm" in entry.settings:
            axis = np.array([1.0, 0.0]) if entry.settings["axis"] == "x" else np.array([0.0, 1.0])
            offsets.append(axis * np.asarray(entry.settings["travel_mm"], dtype=np.float64))
        else:
            offsets += list(np.asarray(entry.settings["offset_mm"], dtype=np.float64).reshape(-1, 2))
    largest = max(offsets, key=lambda offset: float(np.hypot(*offset)))
    length = float(np.hypot(*largest))
    return to_si(length, "mm"), largest / length
