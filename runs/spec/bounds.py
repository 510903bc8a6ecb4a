"""Whether the requires and improves make sense: one bound each, one list each, no two that contradict."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping
from typing import Any

from ...models.errors import Issue
from ...objectives.catalogue import CATALOGUE
from .entries import BOUNDS, Entry, Improve, Require
from .messages import show

# The same number with another sign: bounds on the one are bounds on the other.
_MIRRORED = {"holding_force": "axial_force"}

Pose = tuple[Any, ...]


def check_shape(data: Mapping[str, Any]) -> list[Issue]:
    """Check what can be checked in the entries as written, so that no other error hides it."""
    issues: list[Issue] = []
    for table, check in (("require", _require_keys), ("improve", _improve_keys)):
        entries = data.get(table, [])
        for index, entry in enumerate(entries if isinstance(entries, list) else []):
            if isinstance(entry, dict):
                issues += check(f"{table}.{index}", entry)
                issues += _pair_keys(f"{table}.{index}", entry)
    return issues


def _require_keys(path: str, entry: dict[str, Any]) -> Iterator[Issue]:
    kinds = [kind for kind in BOUNDS if kind in entry]
    if len(kinds) != 1:
        received = " and ".join(kinds) or "none"
        yield Issue(f"needs exactly one of at_least, at_most and equal_to, received {received}", path)
    bands = [band for band in ("within", "within_percent") if band in entry]
    if kinds == ["equal_to"] and len(bands) != 1:
        received = " and ".join(bands) or "none"
        yield Issue(f"equal_to needs exactly one of within and within_percent, received {received}", path)
    if bands and kinds in (["at_least"], ["at_most"]):
        yield Issue(f"belongs to equal_to, received it with {kinds[0]}; drop it or use equal_to", f"{path}.{bands[0]}")


def _improve_keys(path: str, entry: dict[str, Any]) -> Iterator[Issue]:
    ways = [way for way in ("sense", "toward") if way in entry]
    if len(ways) != 1:
        received = " and ".join(ways) or "none"
        yield Issue(f'needs exactly one of sense ("maximize" or "minimize") and toward, received {received}', path)


def _pair_keys(path: str, entry: dict[str, Any]) -> Iterator[Issue]:
    name = entry.get("quantity")
    info = CATALOGUE.get(name) if isinstance(name, str) else None
    keys = {key.name: key for key in info.keys} if info else {}
    if info is None or "gap_mm" not in keys or keys["gap_mm"].required:
        return
    source = entry.get("of", keys["of"].default)
    if source == "pair" and "gap_mm" not in entry:
        yield Issue(
            'is required, as the field is that of the pair; add it, or set of = "base" or "mover"', f"{path}.gap_mm"
        )
    if source in ("base", "mover") and "gap_mm" in entry:
        yield Issue(f'belongs to of = "pair", received of = "{source}", a part alone; drop it', f"{path}.gap_mm")


def check_entry(path: str, entry: Entry) -> list[Issue]:
    """Check one entry whose keys are right by themselves."""
    issues = list(_lists(path, entry))
    for key in entry.info.keys:
        value = getattr(entry, key.name)
        if key.kind == "range" and not value[0] < value[1]:
            issues.append(Issue(f"must be two rising numbers, received {show(value)}", f"{path}.{key.name}"))
    if isinstance(entry, Require) and entry.within_percent is not None and not issues and 0.0 in entry.bounds:
        issues.append(Issue("is no band about a target of 0; use within", f"{path}.within_percent"))
    if isinstance(entry, Improve) and entry.log and min(entry.targets or (1.0,), default=1.0) <= 0.0:
        issues.append(Issue(f"needs targets larger than 0, received {show(entry.toward)}", f"{path}.log"))
    return issues


def _lists(path: str, entry: Entry) -> Iterator[Issue]:
    listed = [key for key, value in entry.settings.items() if _is_list(entry, key, value)]
    if len(listed) > 1:
        yield Issue(
            f"at most one key of an entry may be a list, received {' and '.join(listed)}", f"{path}.{listed[1]}"
        )
        return
    for key in ("at_least", "at_most", "equal_to", "toward"):
        value = getattr(entry, key, None)
        if not isinstance(value, tuple):
            continue
        if not listed:
            yield Issue(f"must be one number, as no other key is a list, received {show(value)}", f"{path}.{key}")
        elif len(value) != entry.count:
            yield Issue(
                f"must be one number or a list as long as {listed[0]} ({entry.count}), received {len(value)} numbers",
                f"{path}.{key}",
            )


def _is_list(entry: Entry, name: str, value: Any) -> bool:
    key = next(key for key in entry.info.keys if key.name == name)
    if key.kind == "numbers":
        return isinstance(value, tuple)
    return key.kind in ("pairs", "points") and isinstance(value[0], tuple)


def check_ids(requires: Mapping[int, Require]) -> list[Issue]:
    """Check that no two requires have the same id."""
    seen: dict[str, int] = {}
    issues = []
    for index, entry in requires.items():
        if entry.id is not None and seen.setdefault(entry.id, index) != index:
            where = f"require.{seen[entry.id]}"
            issues.append(Issue(f'must be unique, received "{entry.id}", which {where} has too', f"require.{index}.id"))
    return issues


def check_contradictions(requires: Mapping[int, Require], lines: Mapping[int, int | None]) -> list[Issue]:
    """Check that every pose leaves room between its bounds, over all requires.

    Args:
        requires: By their index in the spec; each is right by itself.
        lines: The line where each begins, None where unknown.
    """
    issues = []
    tightest: dict[Pose, tuple[tuple[float, str], tuple[float, str]]] = {}
    told: set[tuple[str, str]] = set()
    for index, entry in requires.items():
        here = f"require.{index}"
        line = lines.get(index)
        label = here if line is None else f"{here} (line {line})"
        for pose, low, high in _intervals(entry):
            floor, ceiling = tightest.get(pose, ((-math.inf, ""), (math.inf, "")))
            floor = max(floor, (low, label), key=lambda bound: bound[0])
            ceiling = min(ceiling, (high, label), key=lambda bound: bound[0])
            tightest[pose] = (floor, ceiling)
            if floor[0] <= ceiling[0] or (floor[1], ceiling[1]) in told:
                continue
            told.add((floor[1], ceiling[1]))
            issues.append(Issue(_contradiction(entry, pose, floor, ceiling), here))
    return issues


def _intervals(entry: Require) -> Iterator[tuple[Pose, float, float]]:
    """Yield the pose and the interval of every value, as bounds on the quantity itself or on the one it mirrors."""
    bands = entry.bands or (0.0,) * entry.count
    for position, (bound, band) in enumerate(zip(entry.bounds, bands, strict=True)):
        low = -math.inf if entry.kind == "at_most" else bound - band
        high = math.inf if entry.kind == "at_least" else bound + band
        pose = tuple(
            (key, value[position] if key == entry.listed and isinstance(value, tuple) else value)
            for key, value in entry.settings.items()
        )
        if entry.quantity in _MIRRORED:
            yield (_MIRRORED[entry.quantity], pose), 0.0 - high, 0.0 - low
        else:
            yield (entry.quantity, pose), low, high


def _contradiction(entry: Require, pose: Pose, floor: tuple[float, str], ceiling: tuple[float, str]) -> str:
    """Say it in the sign of ``entry``, where the contradiction shows."""
    where = ", ".join(f"{key} = {show(value)}" for key, value in pose[1])
    unit = entry.info.unit
    if entry.quantity in _MIRRORED:
        floor, ceiling = (0.0 - ceiling[0], ceiling[1]), (0.0 - floor[0], floor[1])
    return (
        f"contradictory bounds: {entry.quantity} at {where} must be at least {floor[0]:g} {unit} by {floor[1]} "
        f"and at most {ceiling[0]:g} {unit} by {ceiling[1]}; relax one of them"
    )
