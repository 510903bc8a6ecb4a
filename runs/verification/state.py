"""A pair as it was made and put together, with its errors, and the exact value of everything asked of it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal, cast

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import brentq

from ...models.pair import Row, pair_values
from ...models.part import Part
from ...models.peak import field_reach, peak
from ...models.stray import Placed, Seat, field, seat_base, seat_mover
from ...models.surfaces import Surface, around, plane
from ...models.units import MU0
from ...objectives.case import Case, Measure
from ...objectives.plan import Response
from .asked import Asked

Array = NDArray[np.float64]
Way = tuple[float, float]
Source = Literal["base", "mover", "pair"]

_WIDEN = 0.3
"""First half width, in the logarithm of the distance, of the bracket about a guessed reach."""


@dataclass(frozen=True, eq=False)
class State:
    """One pair as built.

    Attributes:
        base: The base with its true thickness and remanence.
        mover: The mover likewise.
        a: Magnetization of the base's cells in units of its remanence, shape (ny, nx).
        b: The same of the mover, shape (my, mx).
        slip_base: Where the pattern's centre lies on the base's blank (x, y) [m].
        slip_mover: The same on the mover [m].
        offset: Lateral error of every pose: the mover's blank stands this far from where it should (x, y) [m].
        gap: Error of every gap [m]; parts in contact cannot come closer.
    """

    base: Part
    mover: Part
    a: Array
    b: Array
    slip_base: Way = (0.0, 0.0)
    slip_mover: Way = (0.0, 0.0)
    offset: Way = (0.0, 0.0)
    gap: float = 0.0

    def seat(self, part: Literal["base", "mover"], of: Source, gap: float) -> Seat | None:
        """Where the blank of a part stands, None when it is not there; a mover alone stands on z = 0."""
        if of not in (part, "pair"):
            return None
        if part == "base":
            return seat_base(self.base)
        if of == "mover":
            return Seat(self.mover, (0.0, 0.0, 0.0))
        return seat_mover(self.mover, max(gap + self.gap, 0.0), *self.offset, self.base.coating)

    def sources(self, of: Source, gap: float) -> list[Placed]:
        """The magnets whose field is asked for, their patterns at their true places."""
        found = []
        for name, pattern, slip in (("base", self.a, self.slip_base), ("mover", self.b, self.slip_mover)):
            seat = self.seat(cast(Literal["base", "mover"], name), of, gap)
            if seat is not None:
                x, y, z = seat.origin
                found.append(Placed(seat.part, pattern, (x + slip[0], y + slip[1], z)))
        return found

    def surface(self, of: Source, gap: float, side: Literal["back", "front", "around"], distance: float) -> Surface:
        """The surface at ``distance`` [m] from what is there; it belongs to the blanks, wherever the patterns lie."""
        below, above = self.seat("base", of, gap), self.seat("mover", of, gap)
        if side == "around":
            return around([seat for seat in (below, above) if seat is not None], distance)
        return plane(side, distance, base=below, mover=above)

    def pair(self, rows: Sequence[Row]) -> Array:
        """Exact values of pair rows at poses as the spec names them [SI], shape (row,)."""
        dx = self.offset[0] + self.slip_mover[0] - self.slip_base[0]
        dy = self.offset[1] + self.slip_mover[1] - self.slip_base[1]

        def moved(row: Row) -> Row:
            return Row(row.component, max(row.gap + self.gap, 0.0), row.dx + dx, row.dy + dy)

        values = pair_values(self.base, self.mover, self.a, self.b, [moved(row) for row in rows])
        # Rows take moments about the pattern's centre; asked for are those about the blank's.
        tilting = [n for n, row in enumerate(rows) if row.component in ("mx", "my")]
        if tilting and any(self.slip_mover):
            pull = pair_values(
                self.base, self.mover, self.a, self.b, [moved(rows[n])._replace(component="fz") for n in tilting]
            )
            arm = [self.slip_mover[1] if rows[n].component == "mx" else -self.slip_mover[0] for n in tilting]
            values[tilting] += pull * np.array(arm)
        return values


def measured_value(entry: Asked, base: Part, mover: Part, a: Array, b: Array, measure: Measure) -> Array:
    """Value of a pair quantity [SI], shape (elements,), its rows measured by ``measure``."""
    if entry.quantity is None:
        message = f"{entry.name} is not computed from pair rows"
        raise ValueError(message)
    if entry.quantity.of_pattern:
        a, b = np.sign(a), np.sign(b)
    response = Response(np, measure(entry.rows), np.zeros(0), a, b)
    return entry.quantity.exact(Case(base, mover, response, measure))


def exact_value(entry: Asked, state: State, guess: float | None = None) -> Array:
    """Exact value of anything asked [SI], shape (elements,).

    Args:
        entry: What is asked.
        state: The pair as built.
        guess: A field reach to look near [m], which saves time.
    """
    if entry.quantity is not None:
        return measured_value(entry, state.base, state.mover, state.a, state.b, state.pair)
    keys = entry.params
    if entry.name == "net_moment":
        return np.array([net_moment(state, keys["of"])])
    of: Source = keys["of"]
    gap = float(keys["gap"]) if of == "pair" else 0.0
    sources = state.sources(of, gap)
    if entry.name == "field_at":
        return field_values(field(sources, field_points(entry)), keys["component"])
    if entry.name == "stray_field":
        return np.array([peak(sources, state.surface(of, gap, keys["side"], keys["distance"]))[0]])
    return np.array([_reach(state, of, gap, keys["field"], guess)])


def net_moment(state: State, of: str) -> float:
    """Size of a part's dipole moment; of both, the larger one [A m2]."""
    sizes = [
        abs(float(pattern.sum())) * part.remanence / MU0 * part.thickness * part.cell**2
        for name, part, pattern in (("base", state.base, state.a), ("mover", state.mover, state.b))
        if of in (name, "both")
    ]
    return max(sizes)


def field_points(entry: Asked) -> Array:
    """The points of a ``field_at``, shape (n, 3) [m]."""
    return np.array(entry.params["point"], dtype=np.float64).reshape(-1, 3)


def field_values(B: Array, component: str) -> Array:
    """A component of B (..., n, 3) or its size, shape (..., n) [T]."""
    if component == "size":
        return np.asarray(np.sqrt((B * B).sum(-1)))
    return B[..., "xyz".index(component)]


def _reach(state: State, of: Source, gap: float, level: float, guess: float | None) -> float:
    """Distance at which the peak around the blanks falls to a level [m]."""
    sources = state.sources(of, gap)
    if guess is None or not guess > 0.0:
        guess = field_reach(sources, level)
    if guess == 0.0:
        return 0.0

    def excess(log_distance: float) -> float:
        value, _ = peak(sources, state.surface(of, gap, "around", float(np.exp(log_distance))))
        return float(np.log(max(value, 1e-300) / level))

    low, high, step = np.log(guess), np.log(guess), _WIDEN / 4.0
    while excess(low) < 0.0:
        low, step = low - step, 2.0 * step
        if low < np.log(1e-3 * state.base.cell):
            return 0.0
    step = _WIDEN / 4.0
    while excess(high) > 0.0:
        high, step = high + step, 2.0 * step
    if low == high:
        return float(guess)
    return float(np.exp(brentq(excess, low, high, xtol=1e-6)))
