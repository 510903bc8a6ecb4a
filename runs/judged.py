"""What a design reaches against what is asked, entry by entry in the spec's units: the one source of every table."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal

from ..models.errors import InputError
from ..models.units import from_si
from .records import Column, Design, Run

Kind = Literal["at_least", "at_most", "equal_to", "improve"]
_NOISE = 1e-9
"""What cancels exactly on paper leaves less than this in any unit of the specs."""
_SIGNS = {"at_least": "≥", "at_most": "≤"}


@dataclass(frozen=True)
class Judged:
    """One require or improve of a spec and what a design reaches there.

    Attributes:
        name: Quantity ("axial_force").
        label: What people read ("axial_force at 3, 4, 5 mm").
        unit: Unit of all numbers here.
        kind: How it is judged.
        values: One value an element of the entry; NaN where the quantity does not exist.
        bounds: Bound or target an element; None for an improve without a target.
        within: Half width of the band of an "equal_to", or None.
        sense: "maximize", "minimize" or "toward" for an improve, "" for a require.
        margin: Relative margin of the worst element; None for an improve and where a value does not exist.
        ok: Is the requirement met? True for an improve.
        columns: Indices of its elements in the run's columns.
    """

    name: str
    label: str
    unit: str
    kind: Kind
    values: tuple[float, ...]
    bounds: tuple[float | None, ...]
    within: float | None
    sense: str
    margin: float | None
    ok: bool
    columns: tuple[int, ...]


def judge(run: Run, design: Design) -> tuple[Judged, ...]:
    """Return every require, then every improve, of ``run`` for ``design``, in the order of the spec."""
    groups: dict[int, list[int]] = {}
    for n, column in enumerate(run.columns):
        groups.setdefault(column.entry, []).append(n)
    members = enumerate(groups.values())
    return tuple(_entry(run.columns, design, tuple(indices), position) for position, indices in members)


def tightest_first(entries: tuple[Judged, ...]) -> tuple[Judged, ...]:
    """Return the requires of ``entries``, missing values first, then the least margin first; then the improves."""
    requires = [entry for entry in entries if entry.kind != "improve"]
    requires.sort(key=lambda entry: -math.inf if entry.margin is None else entry.margin)
    return (*requires, *(entry for entry in entries if entry.kind == "improve"))


def find_design(run: Run, design_id: str | None) -> Design:
    """Return the design called ``design_id``, the best one when None.

    Raises:
        InputError: When the run holds no such design.
    """
    known = [design.id for design in run.designs]
    if not known:
        raise InputError("the run holds no design: it was interrupted before the first one; run it again with --resume")
    if design_id is None:
        return run.designs[0]
    if design_id not in known:
        raise InputError(f"no design {design_id!r} in this run; give one of {', '.join(known)}")
    return run.designs[known.index(design_id)]


def number(value: float) -> str:
    """Return a value for people: four significant digits, "none" where it does not exist, 0 for rounding noise."""
    if math.isnan(value):
        return "none"
    if abs(value) < _NOISE:
        return "0"
    if value != 0.0 and abs(value) < 1e-4:
        return f"{value:.3g}"
    return f"{value:.4g}" if abs(value) < 9999.5 else f"{value:.0f}"


def numbers(values: tuple[float, ...]) -> str:
    """Return several values for people, separated by commas."""
    return ", ".join(number(value) for value in values)


def bound_text(entry: Judged) -> str:
    """Return what is asked, without the unit ("≥ 20", "2 ± 0.2", "minimize")."""
    if entry.kind == "improve" and entry.sense != "toward":
        return entry.sense
    targets = [bound for bound in entry.bounds if bound is not None]
    listed = numbers(tuple(targets[:1] if len(set(targets)) == 1 else targets))
    if entry.kind == "improve":
        return f"toward {listed}"
    if entry.kind == "equal_to":
        return f"{listed} ± {number(entry.within or 0.0)}"
    return f"{_SIGNS[entry.kind]} {listed}"


def percent(margin: float | None) -> str:
    """Return a relative margin for people ("+12.3 %", "none")."""
    if margin is None:
        return "none"
    # a margin that rounds to nothing must still show on which side of the bound it lies
    return f"{100.0 * margin:+.1f} %" if abs(margin) >= 5e-4 or margin == 0.0 else f"{100.0 * margin:+.0e} %"


def finite(value: float) -> float | None:
    """Return a margin, None where it does not exist."""
    return float(value) if math.isfinite(value) else None


def _entry(columns: tuple[Column, ...], design: Design, members: tuple[int, ...], position: int) -> Judged:
    first = columns[members[0]]

    def shown(value: float | None) -> float | None:
        return None if value is None else from_si(float(value), first.unit)

    margin = None if first.kind == "improve" else finite(float(design.margins[position]))
    return Judged(
        name=first.name,
        label=merged_label([columns[n].label for n in members]),
        unit=first.unit,
        kind=first.kind,
        values=tuple(from_si(float(design.values[n]), first.unit) for n in members),
        bounds=tuple(shown(columns[n].bound) for n in members),
        within=shown(first.within),
        sense=first.sense,
        margin=margin,
        ok=first.kind == "improve" or (margin is not None and margin >= 0.0),
        columns=members,
    )


def merged_label(labels: list[str]) -> str:
    """Return one label for the elements of an entry: what differs between their labels is listed in its place."""
    words = [label.split(" ") for label in labels]
    if len(labels) == 1 or len({len(parts) for parts in words}) != 1:
        return labels[0] if len(labels) == 1 else "; ".join(labels)
    merged = []
    for parts in zip(*words, strict=True):
        distinct = list(dict.fromkeys(parts))
        merged.append(distinct[0] if len(distinct) == 1 else _listed(list(parts)))
    return " ".join(merged)


def _listed(parts: list[str]) -> str:
    if len(parts) > 8:
        parts = [*parts[:3], "...", parts[-1]]
    return ", ".join(part.rstrip(",") for part in parts)
