"""The plan: every pose and every probe that a spec's quantities need, each computed once per evaluation.

While quantities are set up they ask the plan for what they will read and keep the handle that they get. The physics
then returns one ``Response`` to an evaluation, and each quantity reads its own numbers out of it.
"""

from __future__ import annotations

from dataclasses import dataclass
from types import ModuleType
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from ..models.pair import Component, Row
from ..models.part import Part
from ..models.stray import field_matrix
from ..models.units import MU0
from .sites import Source, seats

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Response:
    """What the physics says of one design, or of many along leading axes.

    Attributes:
        xp: ``numpy`` or ``jax.numpy``: where the arrays live.
        pair: Values of the plan's pair rows [SI], shape (..., row).
        linear: Values of the plan's linear rows [SI], shape (..., linear row).
        base: Base pattern, shape (..., ny, nx).
        mover: Mover pattern, shape (..., my, mx).
    """

    xp: ModuleType
    pair: Any
    linear: Any
    base: Any
    mover: Any


class Plan:
    """Collects pair rows and linear rows (fields at probes, dipole moments) without repeating any."""

    def __init__(self, base: Part, mover: Part) -> None:
        self.base = base
        self.mover = mover
        self._rows: dict[Row, int] = {}
        self._on_base: list[Array] = []
        self._on_mover: list[Array] = []
        self._linear = 0
        self._known: dict[Any, NDArray[np.intp]] = {}

    @property
    def rows(self) -> tuple[Row, ...]:
        """The pair rows asked for, in the order of their numbers."""
        return tuple(self._rows)

    def row(self, component: Component, gap: float, dx: float = 0.0, dy: float = 0.0) -> int:
        """Number of the pair row of a component at a pose [m]."""
        return self._rows.setdefault(Row(component, float(gap), float(dx), float(dy)), len(self._rows))

    def field(self, of: Source, gap: float, points: Array) -> NDArray[np.intp]:
        """Numbers of the linear rows that hold B [T] at points (n, 3) [m]; shape (n, 3)."""
        key = ("field", of, gap if of == "pair" else 0.0, points.tobytes())
        if key not in self._known:
            on = []
            for part, seat in zip((self.base, self.mover), seats(self.base, self.mover, of, gap), strict=True):
                shape = (3 * len(points), part.mask.size)
                on.append(np.zeros(shape) if seat is None else field_matrix(part, seat.origin, points).reshape(shape))
            self._known[key] = self._add(on[0], on[1]).reshape(-1, 3)
        return self._known[key]

    def moment(self, of: Literal["base", "mover"]) -> int:
        """Number of the linear row that holds a part's dipole moment along z [A m2]."""
        if ("moment", of) not in self._known:
            part = self.base if of == "base" else self.mover
            cell = part.remanence / MU0 * part.thickness * part.cell**2
            on = np.full((1, part.mask.size), cell)
            other = np.zeros((1, (self.mover if of == "base" else self.base).mask.size))
            self._known["moment", of] = self._add(on, other) if of == "base" else self._add(other, on)
        return int(self._known["moment", of][0])

    def linear_matrices(self) -> tuple[Array, Array]:
        """Matrices of the linear rows on the base's cells (row, ny * nx) and on the mover's (row, my * mx)."""
        on_base = np.concatenate(self._on_base) if self._on_base else np.zeros((0, self.base.mask.size))
        on_mover = np.concatenate(self._on_mover) if self._on_mover else np.zeros((0, self.mover.mask.size))
        return on_base, on_mover

    def _add(self, on_base: Array, on_mover: Array) -> NDArray[np.intp]:
        self._on_base.append(on_base)
        self._on_mover.append(on_mover)
        first, self._linear = self._linear, self._linear + on_base.shape[0]
        return np.arange(first, self._linear)
