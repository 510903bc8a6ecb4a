"""Sentences that a user must read beside the numbers."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from ..models.making import narrowest_pole
from ..models.pair import Row
from ..models.part import Part
from ..models.units import from_si
from ..objectives.problem import Problem
from ..optimizer.stopping import StopReason
from .judged import number
from .records import Column, Design
from .resolve import columns_of
from .spec import CellFile, PartSpec, Spec

_RIM = 1e-9


def warnings_of(spec: Spec, problem: Problem, designs: Sequence[Design], reason: StopReason) -> tuple[str, ...]:
    """Return what the spec and its outcome call for, most important first."""
    found = ["IDEAL: sharp pole edges and full magnetization depth are assumed; a real part is weaker at its edges."]
    if designs and not designs[0].feasible and reason is not StopReason.GIVEN:
        found.append(
            "No pattern pair on these cells meets every requirement: all were looked at."
            if reason is StopReason.PROVEN
            else "The best design misses a requirement; nothing says that no better one exists."
        )
    if reason is StopReason.SECONDS:
        found.append("The cap in seconds ended the run: it is not reproducible.")
    entries = (*spec.require, *spec.improve)
    if any(entry.quantity == "stand_off" for entry in entries):
        found.append(
            "A stand-off is stable only on a guide: rigid magnets that rest axially are unstable sideways or in tilt "
            "(Earnshaw)." + _at_stand_off(problem, designs, columns_of(spec))
        )
    if spec.conditions.rotation == "free":
        found.append(
            "The mover may turn, but this version judges the angle 0 alone: hold its angle, or check others yourself."
        )
    if spec.conditions.lateral == "free":
        found.append("The mover is free sideways: ask for lateral_stiffness, or it may slide off the pose judged here.")
    of_base, of_mover = _of_part(problem.base, spec.base), _of_part(problem.mover, spec.mover)
    found += [f"{'base and mover' if text in of_mover else 'base'}: {text}" for text in of_base]
    found += [f"mover: {text}" for text in of_mover if text not in of_base]
    if any(np.isnan(design.values).any() for design in designs[:1]):
        found.append("A value that does not exist (no stand-off, no peak) counts as a missed requirement.")
    return tuple(found)


def _at_stand_off(problem: Problem, designs: Sequence[Design], columns: Sequence[Column]) -> str:
    """Tilt moment and lateral stiffness of the best design where it stands off."""
    gaps = [float(v) for v, column in zip(designs[0].values, columns, strict=True) if column.name == "stand_off"]
    if not gaps or not np.isfinite(gaps[0]):
        return ""
    rows: list[Row] = [Row(component, gaps[0]) for component in ("mx", "my", "kxx", "kyy", "kxy")]
    mx, my, kxx, kyy, kxy = problem.case(designs[0].base, designs[0].mover).pair(rows)
    stiffness = -(kxx + kyy) / 2.0 - float(np.hypot((kxx - kyy) / 2.0, kxy))
    tilt = from_si(float(np.hypot(mx, my)), "N mm")
    return (
        f" At {number(from_si(gaps[0], 'mm'))} mm the tilt moment is {number(tilt)} N mm and the lateral "
        f"stiffness {number(from_si(stiffness, 'N/mm'))} N/mm (negative pushes off the centre)."
    )


def _of_part(part: Part, spec: PartSpec) -> list[str]:
    """What one part's blank and material call for."""
    found = []
    rim = [from_si(width, "mm") for width in part.rim]
    if max(part.rim) > _RIM and spec.shape == "rectangle":
        found.append(f"{rim[0]:.3g} mm in x and {rim[1]:.3g} mm in y beyond whole cells stay unmagnetized.")
    if spec.material.from_memory:
        found.append(f"the numbers of {spec.material.name} are from memory; check them with your supplier.")
    width = from_si(np.ceil(spec.pole_width_min_mm / spec.cell_mm - 1e-9) * part.cell, "mm")
    if spec.pattern == "free" and width > spec.pole_width_min_mm * (1.0 + 1e-9):
        found.append(f"poles are whole cells wide: {spec.pole_width_min_mm:g} mm becomes {width:g} mm.")
    if isinstance(spec.pattern, CellFile):
        narrowest = from_si(narrowest_pole(spec.pattern.values, part.mask, part.cell), "mm")
        if narrowest < spec.pole_width_min_mm * (1.0 - 1e-9):
            found.append(
                f"the given pattern has poles of {number(narrowest)} mm, narrower than the "
                f"{spec.pole_width_min_mm:g} mm of pole_width_min_mm."
            )
    if spec.material.recoil_permeability > 1.0:
        found.append(
            f"recoil permeability {spec.material.recoil_permeability:g} is stored but not modelled yet: the "
            "magnet is taken as rigid."
        )
    return found
