"""Where the field is looked at: which parts are there, and the surface that a spec names."""

from __future__ import annotations

from typing import Literal

from ..models.part import Part
from ..models.stray import Seat, seat_base, seat_mover
from ..models.surfaces import Surface, around, plane

Source = Literal["base", "mover", "pair"]
Side = Literal["back", "front", "around"]


def part_names(of: str) -> tuple[Literal["base", "mover"], ...]:
    """The parts that "base", "mover" or "both" stands for."""
    if of == "both":
        return ("base", "mover")
    return ("base",) if of == "base" else ("mover",)


def seats(base: Part, mover: Part, of: Source, gap: float) -> tuple[Seat | None, Seat | None]:
    """Places of (base, mover), None for a part that is not there; a mover alone stands on the plane z = 0.

    Args:
        base: The part below.
        mover: The part above.
        of: Which of them are there.
        gap: Gap between the coated mating faces of a pair [m].
    """
    if of == "base":
        return seat_base(base), None
    if of == "mover":
        return None, Seat(mover, (0.0, 0.0, 0.0))
    return seat_base(base), seat_mover(mover, gap, 0.0, 0.0, base.coating)


def surface(base: Part, mover: Part, of: Source, gap: float, side: Side, distance: float) -> Surface:
    """The surface of a stray field at ``distance`` [m] from the coated outside of what is there."""
    below, above = seats(base, mover, of, gap)
    if side == "around":
        return around([seat for seat in (below, above) if seat is not None], distance)
    return plane(side, distance, base=below, mover=above)
