"""From a part of a spec to the part of the physics."""

from __future__ import annotations

from typing import assert_never

import numpy as np

from ...models.blank import Blank, Disc, Polygon, Rectangle, Ring
from ...models.material import REFERENCE_C, remanence_at
from ...models.part import Part
from ...models.units import to_si
from .parts import AnyPart, DiscPart, PolygonPart, RectanglePart, RingPart


def blank_of(spec: AnyPart) -> Blank:
    """Return the outline of a part, in metres.

    Raises:
        InputError: The polygon is none (it crosses itself, encloses no area, ...).
    """
    match spec:
        case RectanglePart():
            return Rectangle(to_si(spec.size_mm[0], "mm"), to_si(spec.size_mm[1], "mm"))
        case DiscPart():
            return Disc(to_si(spec.diameter_mm, "mm"))
        case RingPart():
            return Ring(to_si(spec.outer_mm, "mm"), to_si(spec.inner_mm, "mm"))
        case PolygonPart():
            return Polygon(tuple(to_si(np.array(loop, dtype=np.float64), "mm") for loop in spec.loops_mm))
        case _:
            assert_never(spec)


def part_of(spec: AnyPart, temperature_C: float = REFERENCE_C) -> Part:  # noqa: N803 (a unit)
    """Return a part of the spec as the physics sees it, in SI units, at a temperature [C].

    Raises:
        InputError: The polygon is none, or the remanence at the temperature is not known.
    """
    return Part(
        blank=blank_of(spec),
        cell=to_si(spec.cell_mm, "mm"),
        thickness=to_si(spec.thickness_mm, "mm"),
        remanence=remanence_at(spec.material.to_material(), temperature_C),
        coating=to_si(spec.coating_um, "um"),
    )
