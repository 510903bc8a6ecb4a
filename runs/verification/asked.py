"""What a spec asks of a design, entry by entry in SI, with the quantities that read pair physics ready to be used."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ...models.pair import Row
from ...models.part import Part
from ...objectives.goals import relative_margins
from ...objectives.plan import Plan
from ...objectives.quantity import Bound, Quantity
from ...objectives.registry import QUANTITIES
from ..judged import merged_label
from ..resolve import bound_of, columns_of, params
from ..spec import Require, Spec

Array = NDArray[np.float64]

LEAKS = ("stray_field", "field_at", "field_reach", "net_moment")
"""Quantities of the field outside; all others are computed from pair rows or from the patterns alone."""


@dataclass(frozen=True, eq=False)
class Asked:
    """One require or improve.

    Attributes:
        name: Quantity ("axial_force").
        label: What people read.
        labels: The same for each element.
        unit: Unit in specs and reports.
        params: Its keys in SI, without the unit suffix.
        bound: The bound in SI; None for an improve.
        columns: Which of the run's columns are its elements.
        quantity: Its class set up on the pair; None for a leak.
        rows: The pair rows that the quantity reads where it is a direct function of them, else none.
    """

    name: str
    label: str
    labels: tuple[str, ...]
    unit: str
    params: Mapping[str, Any]
    bound: Bound | None
    columns: slice
    quantity: Quantity | None
    rows: tuple[Row, ...]

    @property
    def elements(self) -> int:
        """How many values it has."""
        return len(self.labels)

    def margins(self, values: Array) -> Array:
        """Relative margin of the worst of values (..., elements) [SI], shape (...); -inf where one is missing."""
        if self.bound is None:
            message = f"{self.label} has no bound"
            raise ValueError(message)
        return np.asarray(relative_margins(self.bound, values, self.unit).min(-1))


def asked_of(spec: Spec, base: Part, mover: Part) -> tuple[Asked, ...]:
    """Return the requires, then the improves, of a spec for a pair, in spec order."""
    columns = columns_of(spec)
    found: list[Asked] = []
    first = 0
    for entry in (*spec.require, *spec.improve):
        part_of = slice(first, first + entry.count)
        labels = tuple(column.label for column in columns[part_of])
        bound = bound_of(entry) if isinstance(entry, Require) else None
        quantity: Quantity | None = None
        rows: tuple[Row, ...] = ()
        if entry.quantity not in LEAKS:
            plan = Plan(base, mover)
            quantity = QUANTITIES[entry.quantity](params(entry), plan)
            rows = plan.rows if quantity.exact_surrogate else ()
        found.append(
            Asked(entry.quantity, merged_label(list(labels)), labels, entry.info.unit, params(entry), bound, part_of,
                  quantity, rows)
        )  # fmt: skip
        first += entry.count
    return tuple(found)


def poses_of(asked: tuple[Asked, ...]) -> list[tuple[float, float, float]]:
    """Every pose (gap, dx, dy) [m] at which a spec asks for something of the pair, without repeating any."""
    poses: dict[tuple[float, float, float], None] = {}
    for entry in asked:
        if entry.name in LEAKS or "gap" not in entry.params:
            continue
        for row in entry.rows:
            poses[row.gap, row.dx, row.dy] = None
        if not entry.rows:
            poses[float(entry.params["gap"]), 0.0, 0.0] = None
    return list(poses)
