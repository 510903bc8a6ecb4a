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
from .spec import Spec

Array = NDArray[np.float64]

_POINTS = 81
_OFFSETS = 61
_RANGE = 10e-3
"""A force-gap curve reaches at least this far [m]."""


def curves_of(spec: Spec, problem: Problem, designs: Sequence[Design]) -> dict[str, Curve]:
    """Return the curves by name; abscissas hold every gap that the spec names."""
    found = {"force_gap": _force_gap(spec, problem, designs)}
    asked = [e for e in (*spec.require, *spec.improve) if e.quantity in ("slide_force", "lateral_force")]
    if asked:
        found["lateral"] = _lateral(problem, designs, to_si(float(asked[0].settings["gap_mm"]), "mm"), _travel(asked))  # type: ignore[arg-type]
    return found


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


def _lateral(problem: Problem, designs: Sequence[Design], gap: float, travel: float) -> Curve:
    """Restoring force along x, positive back to the centre."""
    scale = np.linspace(0.0, travel, _OFFSETS)
    rows = [Row("fx", gap, float(offset)) for offset in scale]
    forces = [-problem.case(d.base, d.mover).pair(rows) for d in designs]
    return Curve("offset", scale, "mm", np.array(forces).reshape(len(designs), scale.size), "N")


def _travel(asked: Sequence[object]) -> float:
    """Largest offset that the entries name [m]."""
    largest = 0.0
    for entry in asked:
        settings = entry.settings  # type: ignore[attr-defined]
        named = settings.get("travel_mm", settings.get("offset_mm", 0.0))
        largest = max(largest, float(np.abs(np.array(named, dtype=np.float64)).max()))
    return to_si(largest, "mm")
