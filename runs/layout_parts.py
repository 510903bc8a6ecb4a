"""Layout of one part's geometry: outline, lattice, mask and material as named arrays, and back."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..models.blank import Blank, Disc, Polygon, Rectangle, Ring
from ..models.part import Part


@dataclass(frozen=True)
class Variable:
    """One named array.

    Attributes:
        name: Its name in its group.
        data: Numbers, or strings as an object array; any shape.
        dims: One dimension an axis.
        units: SI unit, "1" when dimensionless, "" for text.
        attributes: Further attributes.
    """

    name: str
    data: NDArray[Any]
    dims: tuple[str, ...]
    units: str = ""
    attributes: Mapping[str, Any] = field(default_factory=dict)


def strings(words: Iterable[str]) -> NDArray[Any]:
    """Return ``words`` as an object array of str, shape (word,)."""
    listed = list(words)
    array = np.empty(len(listed), object)
    array[:] = listed
    return array


def part_variables(part: Part) -> tuple[dict[str, str | int], tuple[Variable, ...]]:
    """Return the attributes and variables of a part; its outline is stored whole, so no spec is needed to read it."""
    shape, outline = _outline(part.blank)
    return {"lattice": "square", "shape": shape}, (
        Variable("y", part.y, ("y",), "m"),
        Variable("x", part.x, ("x",), "m"),
        Variable("mask", part.mask.astype(np.int8), ("y", "x"), "1", {"dtype": "bool"}),
        _scalar("cell", part.cell, "m", "cell pitch"),
        _scalar("thickness", part.thickness, "m", "thickness of the magnet without coating"),
        _scalar("remanence", part.remanence, "T", "remanence at working temperature"),
        _scalar("coating", part.coating, "m", "thickness of the coating on every surface"),
        *outline,
    )


def part_from(attributes: Mapping[str, str | int], data: Mapping[str, NDArray[Any]]) -> Part:
    """Return the part of a geometry group.

    Raises:
        KeyError: When an attribute or a variable is missing.
        ValueError: When the shape is unknown or the outline does not give the stored mask.
    """
    part = Part(
        blank=_blank(str(attributes["shape"]), data),
        cell=float(data["cell"]),
        thickness=float(data["thickness"]),
        remanence=float(data["remanence"]),
        coating=float(data["coating"]),
    )
    if not np.array_equal(part.mask, data["mask"].astype(bool)):
        message = "the stored outline does not give the stored mask"
        raise ValueError(message)
    return part


def _scalar(name: str, value: float, units: str, long_name: str) -> Variable:
    return Variable(name, np.array(value, np.float64), (), units, {"long_name": long_name})


def _outline(blank: Blank) -> tuple[str, tuple[Variable, ...]]:
    if isinstance(blank, Rectangle):
        return "rectangle", (
            _scalar("size_x", blank.size_x, "m", "size of the blank along x"),
            _scalar("size_y", blank.size_y, "m", "size of the blank along y"),
        )
    if isinstance(blank, Disc):
        return "disc", (_scalar("diameter", blank.diameter, "m", "diameter of the blank"),)
    if isinstance(blank, Ring):
        return "ring", (
            _scalar("outer", blank.outer, "m", "outer diameter of the blank"),
            _scalar("inner", blank.inner, "m", "inner diameter of the blank"),
        )
    if isinstance(blank, Polygon):
        loops = [np.asarray(loop, np.float64) for loop in blank.loops]
        owner = np.concatenate([np.full(len(loop), n, np.int32) for n, loop in enumerate(loops)])
        return "polygon", (
            Variable("vertex", np.arange(len(owner), dtype=np.int64), ("vertex",), "1"),
            Variable("axis", strings(("x", "y")), ("axis",)),
            Variable("outline", np.concatenate(loops), ("vertex", "axis"), "m"),
            Variable("outline_loop", owner, ("vertex",), "1", {"long_name": "loop that a vertex belongs to"}),
        )
    message = f"a blank must be a rectangle, disc, ring or polygon; received {type(blank).__name__}"
    raise ValueError(message)


def _blank(shape: str, data: Mapping[str, NDArray[Any]]) -> Blank:
    if shape == "rectangle":
        return Rectangle(float(data["size_x"]), float(data["size_y"]))
    if shape == "disc":
        return Disc(float(data["diameter"]))
    if shape == "ring":
        return Ring(float(data["outer"]), float(data["inner"]))
    if shape == "polygon":
        owner = data["outline_loop"]
        return Polygon(tuple(data["outline"][owner == n] for n in range(int(owner.max()) + 1)))
    message = f"unknown shape {shape!r}"
    raise ValueError(message)
