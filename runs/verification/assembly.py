"""Wrong assembly: the mover turned, tipped over or shifted by a pole, and what the pair does then.

A turn about z by 90, 180 or 270 degrees is looked at where it brings the mover's outline onto itself; other angles of
a round blank are not. Tipped over, the mover's back faces the base: half a turn about an axis in the face, which
reverses its magnetization as seen from the base and mirrors its pattern. Shifts are by the narrowest pole.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace
from typing import Any, final

import numpy as np
from numpy.typing import NDArray

from ...models.making import narrowest_pole, pole_count
from ...models.pair import Row
from ...models.units import from_si
from ..jsonable import jsonable
from ..judged import number
from ..spec import Spec
from .asked import Asked, poses_of
from .state import State, exact_value

Array = NDArray[np.float64]
Tell = Callable[[float], None]

_UNCHANGED = 1e-7
"""Differences below this share of the largest force or of a value are rounding."""
_MATTERS = 0.02
"""A force below this share of the largest one has no sign to speak of."""
_TELLING = 10.0
"""A force this many times one near its zero tells nothing by its factor."""
_STRONGER = 1.5
"""A force this many times the nominal one is dangerous to those who do not expect it."""


@final
@dataclass(frozen=True, eq=False)
class Way:
    """One wrong way to put the pair together; ``likely`` when nothing that the spec names prevents it."""

    name: str
    state: State
    likely: bool


def assembly(spec: Spec, asked: tuple[Asked, ...], state: State, tell: Tell) -> list[dict[str, Any]]:
    """Evaluate the wrong ways to assemble a pair.

    Args:
        spec: What is asked, and whether the mover is guided sideways.
        asked: The same entry by entry.
        state: The pair as meant, without errors.
        tell: Called with the share that is done.

    Returns:
        A record a way: ``name``, ``text`` in words, ``values`` (label, unit, value in SI: the axial force at the spec's
        poses, then everything required), ``changes`` (does it change anything?), ``likely`` (can it happen, as far as
        the spec says?), ``dangerous``.
    """
    poses = poses_of(asked) or _own_poses(asked, state)
    rows = [Row("fz", *pose) for pose in poses]
    requires = tuple(entry for entry in asked if entry.bound is not None)
    nominal = state.pair(rows)
    meant = [exact_value(entry, state) for entry in requires]
    ways = list(_ways(spec, state))
    found = []
    for n, way in enumerate(ways):
        forces = way.state.pair(rows)
        values = [
            exact_value(entry, way.state, float(value[0]) if entry.name == "field_reach" else None)
            for entry, value in zip(requires, meant, strict=True)
        ]
        found.append(_record(way, rows, nominal, forces, requires, meant, values))
        tell((n + 1) / len(ways))
    plain: list[dict[str, Any]] = jsonable(found)
    return plain


def _ways(spec: Spec, state: State) -> Iterator[Way]:
    for turns in (1, 2, 3):
        if _same_outline(state, np.rot90(state.mover.mask, turns)):
            # a quarter turn counter-clockwise as seen from +z is np.rot90 the other way: rows run up the page
            yield Way(f"mover turned by {90 * turns} deg", replace(state, b=np.rot90(state.b, -turns)), likely=True)
    if _same_outline(state, state.mover.mask[::-1]):
        yield Way("mover upside down, tipped over about x", replace(state, b=-state.b[::-1]), likely=True)
    if _same_outline(state, state.mover.mask[:, ::-1]):
        yield Way("mover upside down, tipped over about y", replace(state, b=-state.b[:, ::-1]), likely=True)
    width = _pole(state)
    if width is None:
        return
    free = spec.conditions.lateral == "free"
    for axis in "xy":
        for sign, word in ((1.0, "+"), (-1.0, "-")):
            offset = (sign * width, 0.0) if axis == "x" else (0.0, sign * width)
            name = f"mover shifted by one pole ({number(from_si(width, 'mm'))} mm) along {word}{axis}"
            yield Way(name, replace(state, offset=offset), likely=free)


def _same_outline(state: State, image: NDArray[np.bool_]) -> bool:
    return image.shape == state.mover.mask.shape and bool((image == state.mover.mask).all())


def _pole(state: State) -> float | None:
    """Width of the narrowest pole of the parts that have more than one [m], None where neither has."""
    widths = [
        narrowest_pole(pattern.astype(np.int8), part.mask, part.cell)
        for part, pattern in ((state.base, state.a), (state.mover, state.b))
        if pole_count(pattern.astype(np.int8)) > 1
    ]
    return min(widths) if widths else None


def _own_poses(asked: tuple[Asked, ...], state: State) -> list[tuple[float, float, float]]:
    """Gaps to look at where the spec names none: the ends of its ranges, else some that suit the cells."""
    ends = [float(gap) for entry in asked for gap in entry.params.get("between", ())]
    return [(gap, 0.0, 0.0) for gap in sorted(set(ends)) or [share * state.base.cell for share in (0.3, 1.0, 3.0)]]


def _record(
    way: Way,
    rows: list[Row],
    nominal: Array,
    forces: Array,
    requires: tuple[Asked, ...],
    meant: list[Array],
    values: list[Array],
) -> dict[str, Any]:
    shown = [
        {"label": _pose_label(row), "unit": "N", "value": float(force)} for row, force in zip(rows, forces, strict=True)
    ]
    missed = []
    for entry, value in zip(requires, values, strict=True):
        shown += [
            {"label": label, "unit": entry.unit, "value": float(item)}
            for label, item in zip(entry.labels, value, strict=True)
        ]
        if float(entry.margins(value)) < 0.0:
            missed.append(entry.label)
    pairs = [(nominal, forces), *zip(meant, values, strict=True)]
    changes = not all(_unchanged(before, after) for before, after in pairs)
    if not changes:
        text, harm = "Changes nothing: it fits either way.", False
    else:
        words, harm = _forces_in_words(rows, nominal, forces)
        text = words + (f" It then misses {', '.join(missed)}." if missed else " It still meets every requirement.")
        if not way.likely:
            text += " A guide prevents this; it happens only where the guide is missing."
    return {
        "name": way.name, "text": text, "values": shown, "changes": changes, "likely": way.likely,
        "dangerous": harm and way.likely,
    }  # fmt: skip


def _unchanged(before: Array, after: Array) -> bool:
    gone = np.isnan(before) & np.isnan(after)
    size = np.abs(np.nan_to_num(before)).max(initial=0.0)
    return bool((gone | (np.abs(after - before) <= _UNCHANGED * size)).all())


def _forces_in_words(rows: list[Row], nominal: Array, forces: Array) -> tuple[str, bool]:
    """What changes about the axial force, the gravest change in numbers, and whether it is dangerous."""
    largest = float(np.abs(nominal).max(initial=0.0))
    matters = np.abs(forces) >= _MATTERS * largest
    flips = matters & (np.abs(nominal) >= _MATTERS * largest) & (nominal * forces < 0.0)
    # a force that the spec has at zero is no measure: one that rises from below the noise is compared with it
    floor = np.maximum(np.abs(nominal), _MATTERS * largest)
    stronger = matters & (np.abs(forces) > _STRONGER * floor) & ~flips
    grave = flips | stronger
    n = int(np.argmax(np.where(grave, np.abs(forces - nominal), -1.0) if grave.any() else np.abs(forces - nominal)))
    before, after = float(nominal[n]), float(forces[n])
    where = _where(rows[n])
    if flips[n]:
        words = f"It {_does(after)} {where} instead of {_doing(before)}."
    elif stronger[n]:
        words = f"It {_does(after)} {where} instead of {number(abs(before))} N{_times(after, before)}."
    elif matters[n]:
        words = f"It {_does(after)} {where} instead of {number(abs(before))} N."
    else:
        words = f"It neither holds nor repels {where} instead of {_doing(before)}."
    return words, bool(grave.any())


def _does(force: float) -> str:
    return f"{'repels with' if force > 0.0 else 'holds'} {number(abs(force))} N"


def _doing(force: float) -> str:
    return f"{'repelling with' if force > 0.0 else 'holding'} {number(abs(force))} N"


def _times(after: float, before: float) -> str:
    return f", {abs(after / before):.1f} times as much" if abs(after) < _TELLING * abs(before) else ", much more"


def _where(row: Row) -> str:
    text = f"at {number(from_si(row.gap, 'mm'))} mm"
    if row.dx or row.dy:
        text += f" and offset [{number(from_si(row.dx, 'mm'))}, {number(from_si(row.dy, 'mm'))}] mm"
    return text


def _pose_label(row: Row) -> str:
    return f"axial force {_where(row)}"
