"""From a validated spec to what is computed: parts, problem and layout, all in SI."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from ..models.errors import InputError, Issue
from ..models.part import Part
from ..models.units import FACTORS
from ..objectives.catalogue import CATALOGUE, Key
from ..objectives.goals import Improve, Require
from ..objectives.problem import Problem
from ..objectives.quantity import Bound
from ..optimizer.layout import Face, Layout, layout
from .records import Column
from .spec import CellFile, Spec, part_of
from .spec import Entry as SpecEntry
from .spec import Require as SpecRequire
from .spec.entries import Improve as SpecImprove
from .spec.parts import PartSpec

Array = NDArray[np.float64]


def parts(spec: Spec) -> tuple[Part, Part]:
    """Base and mover at the spec's temperature."""
    temperature = spec.conditions.temperature_C
    return part_of(spec.base, temperature), part_of(spec.mover, temperature)


def problem_of(spec: Spec) -> Problem:
    """Everything that is required and to be improved.

    Raises:
        InputError: A quantity cannot be computed from its keys; says which require and why.
    """
    base, mover = parts(spec)
    return build_problem(spec, base, mover)


def build_problem(spec: Spec, base: Part, mover: Part) -> Problem:
    """The same with parts of one's own in place of the nominal ones."""
    requires = [Require(entry.quantity, params(entry), bound_of(entry)) for entry in spec.require]
    improves = [_improve(entry, FACTORS[entry.info.unit]) for entry in spec.improve]
    try:
        return Problem(base, mover, requires, improves)
    except ValueError as error:
        raise InputError(Issue(str(error), "require")) from None


def layout_of(spec: Spec, problem: Problem) -> Layout:
    """What is free in both patterns."""
    link: Literal["", "matched", "same"] = ""
    if spec.mover.pattern in ("matched", "same"):
        link = spec.mover.pattern
    faces = [
        _face(part_spec, part, problem.brush(name), upper=name == "mover")
        for name, part_spec, part in (("base", spec.base, problem.base), ("mover", spec.mover, problem.mover))
    ]
    return layout(faces[0], faces[1], link)


def columns_of(spec: Spec) -> tuple[Column, ...]:
    """One column for each judged number, requires first, in spec order."""
    found: list[Column] = []
    for number, entry in enumerate((*spec.require, *spec.improve)):
        factor = FACTORS[entry.info.unit]
        found += [_column(number, entry, element, factor) for element in range(entry.count)]
    return tuple(found)


def params(entry: SpecEntry) -> Mapping[str, Any]:
    """Keys of an entry without their unit suffix, in SI."""
    keys = {key.name: key for key in entry.info.keys}
    return {_bare(keys[name]): _to_si(value, FACTORS[keys[name].unit]) for name, value in entry.settings.items()}


def bound_of(entry: SpecRequire) -> Bound:
    """Bound of a require in SI."""
    factor = FACTORS[entry.info.unit]
    value = np.array(entry.bounds, dtype=np.float64) * factor
    within = np.array(entry.bands or (0.0,) * entry.count, dtype=np.float64) * factor
    return Bound(entry.kind, value, within, None if entry.scale is None else entry.scale * factor)


def _bare(key: Key) -> str:
    """Drop the unit: gap_mm becomes gap."""
    suffix = "_" + key.unit
    return key.name.removesuffix(suffix) if key.unit != "1" else key.name


def _to_si(value: Any, factor: float) -> Any:
    if isinstance(value, str):
        return value
    if isinstance(value, tuple | list):
        return tuple(_to_si(item, factor) for item in value)
    return value * factor


def _improve(entry: SpecImprove, factor: float) -> Improve:
    target = None if entry.targets is None else np.array(entry.targets, dtype=np.float64) * factor
    return Improve(entry.quantity, params(entry), entry.sense or "toward", target, entry.log)


def _face(spec: PartSpec, part: Part, asked: float, *, upper: bool) -> Face:
    given = np.full(part.shape, np.nan)
    if isinstance(spec.pattern, CellFile):
        given = spec.pattern.values.astype(np.float64)
    elif spec.pattern in ("plain-N", "plain-S"):
        # +1 shows N on the base's mating face, S on the mover's
        given[:] = 1.0 if (spec.pattern == "plain-N") != upper else -1.0
    elif isinstance(spec.fixed, CellFile):
        given = np.where(spec.fixed.given, spec.fixed.values.astype(np.float64), np.nan)
    width = max(spec.pole_width_min_mm * 1e-3, asked)
    brush = max(int(np.ceil(width / part.cell * (1.0 - 1e-12) - 1e-9)), 1)
    return Face(part.mask, given, spec.symmetry, brush)


def _column(number: int, entry: SpecEntry, element: int, factor: float) -> Column:
    words = _words(entry, element)
    if isinstance(entry, SpecRequire):
        bands = entry.bands
        return Column(
            number, entry.quantity, (f"{entry.id}: " if entry.id else "") + words, entry.info.unit, entry.kind,
            entry.bounds[element] * factor, None if bands is None else bands[element] * factor, "", entry.id or "",
        )  # fmt: skip
    if not isinstance(entry, SpecImprove):
        message = f"entry must be a require or an improve, received {type(entry).__name__}"
        raise TypeError(message)
    target = None if entry.targets is None else entry.targets[element] * factor
    return Column(number, entry.quantity, words, entry.info.unit, "improve", target, None, entry.sense or "toward", "")


def _words(entry: SpecEntry, element: int) -> str:
    """What people read: the quantity and those of its keys that were given or matter.

    A value of a list is one word, so that the labels of an entry's elements differ in one word and merge into one.
    """
    told = [entry.quantity]
    if entry.quantity == "stray_field":
        told.append(f"{_word(entry.settings['distance_mm'])} mm {_SIDES[str(entry.settings['side'])]}")
    for key in CATALOGUE[entry.quantity].keys:
        value = entry.settings.get(key.name)
        if key.name in ("side", "distance_mm") or value is None or (value == key.default and key.name not in _ALWAYS):
            continue
        if entry.listed == key.name and isinstance(value, tuple):
            value = value[element]
        told.append(_phrase(entry, key, value))
    return " ".join(told)


_ALWAYS = ("of", "edge", "axis", "field_mT")
_SIDES = {"back": "behind", "front": "in front of", "around": "all around"}
_PHRASES = {
    "gap": "at {} mm gap", "offset": "at {} mm offset", "between": "between {} mm", "load": "under {} N",
    "travel": "over {} mm", "axis": "along {}", "friction": "with friction {}", "arm": "at {} mm arm",
    "edge": "over edge {}", "which": "in {}", "point": "at {} mm", "component": "along {}", "field": "down to {} mT",
}  # fmt: skip


def _phrase(entry: SpecEntry, key: Key, value: Any) -> str:
    if key.name == "of":
        part = "both parts" if value == "both" else f"the {value}"
        return part if entry.quantity == "stray_field" else f"of {part}"
    text = f"{value[0]:g} and {value[1]:g}" if key.kind == "range" else _word(value)
    return _PHRASES[_bare(key)].format(text)


def _word(value: Any) -> str:
    if isinstance(value, tuple):
        return f"({','.join(_word(item) for item in value)})"
    return value if isinstance(value, str) else f"{value:g}"
