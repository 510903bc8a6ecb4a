"""Gathers what a report shows beside its run: obvious patterns, bounds on the curve, stray-field maps."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from ...models.pair import Row
from ...models.part import Part
from ...models.patterns import checker, stripes, uniform
from ...models.units import from_si, to_si
from ...objectives.problem import Evaluation, Problem
from ..judged import number
from ..records import Design, Run
from ..resolve import problem_of
from ..spec import Entry, Improve, PartSpec, Require, Spec, spec_from_json
from .extras import Baseline, ForceMark, Mark, ReportExtras, RestMark
from .maps import stray_maps

Pattern = NDArray[np.int8]
Pair = tuple[Pattern, Pattern]

_FORCES = {"axial_force": 1.0, "holding_force": -1.0}


def collect_extras(run: Run, design: Design) -> ReportExtras:
    """Return what the report on one design of ``run`` shows beside the run itself."""
    spec = spec_from_json(run.spec_json)
    problem = problem_of(spec)
    return ReportExtras(
        baselines=() if spec.is_given else baselines(spec, problem, design),
        marks=force_marks(spec),
        maps=stray_maps(spec, run, design),
        balances=_balances(run, problem, design),
        needs_guide=any(entry.quantity == "stand_off" for entry in _entries(spec)),
        rotation=spec.conditions.rotation,
        lateral=spec.conditions.lateral,
    )


def baselines(spec: Spec, problem: Problem, design: Design) -> tuple[Baseline, ...]:
    """Return what uniform, striped and checkered faces of the allowed pole width would reach.

    A given face keeps its pattern, a matched or identical mover follows its base. Where both are free, the base meets
    its like or its reverse, whichever comes closer to the spec.
    """
    out = []
    for name in ("uniform", "stripes", "checker"):
        found = [problem.exact(a, b) for a, b in _pairs(spec, problem, design, name)]
        out.append(Baseline(name, max(found, key=_rank).values))
    return tuple(out)


def force_marks(spec: Spec) -> tuple[Mark, ...]:
    """Return what the spec asks of the axial force with the mover centred, as bounds on F_z, and of stand-offs."""
    marks: list[Mark] = []
    for entry in _entries(spec):
        if entry.quantity == "stand_off" and isinstance(entry, Require):
            marks.append(_rest(entry))
        sign = _FORCES.get(entry.quantity)
        if sign is None or np.any(np.asarray(entry.settings.get("offset_mm", 0.0), float)):
            continue
        gaps = np.broadcast_to(to_si(np.asarray(entry.settings["gap_mm"], float), "mm"), entry.count).tolist()
        if isinstance(entry, Require):
            marks += _bounds(entry, sign, gaps)
        elif isinstance(entry, Improve) and entry.targets is not None:
            marks += [ForceMark(gap, "toward", sign * to) for gap, to in zip(gaps, entry.targets, strict=True)]
    return tuple(marks)


def _balances(run: Run, problem: Problem, design: Design) -> tuple[str, ...]:
    """What the guide of each stand-off of a design must take, a sentence a gap."""
    gaps = {
        float(value)
        for column, value in zip(run.columns, design.values, strict=True)
        if column.name == "stand_off" and not math.isnan(value)
    }
    found = []
    for gap in sorted(gaps):
        rows = [Row(component, gap) for component in ("kzz", "kxx", "kyy", "kxy", "mx", "my")]
        kzz, kxx, kyy, kxy, mx, my = problem.case(design.base, design.mover).pair(rows).tolist()
        lateral = -(kxx + kyy) / 2.0 - math.hypot((kxx - kyy) / 2.0, kxy)
        # a moment that symmetry cancels is left as rounding
        tilt = round(from_si(math.hypot(mx, my), "N mm"), 6)
        found.append(
            f"At the stand-off of {number(from_si(gap, 'mm'))} mm the axial stiffness is "
            f"{number(from_si(-kzz, 'N/mm'))} N/mm, the lateral stiffness {number(from_si(lateral, 'N/mm'))} N/mm "
            f"(negative pushes off the centre), the tilt moment {number(tilt)} N mm."
        )
    return tuple(found)


def _entries(spec: Spec) -> tuple[Entry, ...]:
    return (*spec.require, *spec.improve)


def _rest(entry: Require) -> RestMark:
    low, high = to_si(np.asarray(entry.settings["between_mm"], float), "mm").tolist()
    value = to_si(entry.bounds[0], "mm")
    within = to_si((entry.bands or (0.0,))[0], "mm")
    if entry.kind == "equal_to":
        low, high = value - within, value + within
    elif entry.kind == "at_least":
        low = value
    else:
        high = value
    return RestMark(float(np.asarray(entry.settings.get("load_N", 0.0))), low, high)


def _bounds(entry: Require, sign: float, gaps: list[float]) -> list[ForceMark]:
    if entry.kind == "equal_to":
        bands = entry.bands or (0.0,) * entry.count
        rows = zip(gaps, entry.bounds, bands, strict=True)
        return [ForceMark(gap, "equal_to", sign * target, band) for gap, target, band in rows]
    # a hold of at least 20 N is an axial force of at most -20 N
    is_lower = (entry.kind == "at_least") == (sign > 0.0)
    return [
        ForceMark(gap, "at_least" if is_lower else "at_most", sign * bound)
        for gap, bound in zip(gaps, entry.bounds, strict=True)
    ]


def _pairs(spec: Spec, problem: Problem, design: Design, name: str) -> list[Pair]:
    base = design.base if spec.base.is_given else _obvious(problem.base, spec.base, name)
    word = spec.mover.pattern
    if spec.mover.is_given:
        return [(base, design.mover)]
    if word == "matched":
        return [(base, base)]
    if word == "same":
        return [(base, -base[::-1])]
    mover = _obvious(problem.mover, spec.mover, name)
    return [(base, mover), (base, -mover)]


def _obvious(part: Part, asked: PartSpec, name: str) -> Pattern:
    if name == "uniform":
        return uniform(part.mask)
    width = max(1, math.ceil(to_si(asked.pole_width_min_mm, "mm") / part.cell - 1e-9))
    return stripes(part.mask, width) if name == "stripes" else checker(part.mask, width)


def _rank(evaluation: Evaluation) -> tuple[bool, int, float, float]:
    worst = evaluation.worst_margin
    met = int((evaluation.margins >= 0.0).sum())
    return evaluation.feasible, met, worst if math.isfinite(worst) else -math.inf, evaluation.score
