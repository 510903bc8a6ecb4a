"""Small problems and layouts for search tests, and symmetries written down once more, cell by cell."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray
from polewright.models.blank import Disc, Ring
from polewright.models.part import Part
from polewright.objectives.goals import Improve, Require
from polewright.objectives.problem import Problem
from polewright.objectives.quantity import Bound
from polewright.optimizer.layout import Face, Layout, layout

from ..models.parts import plate

Array = NDArray[np.float64]
Kind = Literal["at_least", "at_most", "equal_to"]
MM = 1e-3

# DESIGN section 7: what a pattern with each symmetry satisfies, as (image of the cell (y, x) on a lattice, sign)
Shape = tuple[int, ...]
Image = tuple[Callable[[int, int, Shape], tuple[int, int]], int]


def _across_x(y: int, x: int, shape: Shape) -> tuple[int, int]:
    return y, shape[1] - 1 - x


def _across_y(y: int, x: int, shape: Shape) -> tuple[int, int]:
    return shape[0] - 1 - y, x


def _half_turn(y: int, x: int, shape: Shape) -> tuple[int, int]:
    return shape[0] - 1 - y, shape[1] - 1 - x


def _quarter_turn(y: int, x: int, shape: Shape) -> tuple[int, int]:
    return shape[1] - 1 - x, y


RULES: dict[str, tuple[Image, ...]] = {
    "none": (),
    "half-turn": ((_half_turn, 1),),
    "quarter-turn": ((_quarter_turn, 1),),
    "even-x": ((_across_x, 1),),
    "even-y": ((_across_y, 1),),
    "odd-x": ((_across_x, -1),),
    "odd-y": ((_across_y, -1),),
    "odd-xy": ((_across_x, -1), (_across_y, -1)),
}


def disc(diameter_mm: float, cell_mm: float = 1.0) -> Part:
    """Disc of 3 mm, 1.3 T."""
    return Part(Disc(diameter_mm * MM), cell_mm * MM, 3.0 * MM, 1.3)


def ring(outer_mm: float, inner_mm: float, cell_mm: float = 1.0) -> Part:
    """Ring of 3 mm, 1.3 T."""
    return Part(Ring(outer_mm * MM, inner_mm * MM), cell_mm * MM, 3.0 * MM, 1.3)


def free(part: Part, symmetry: str = "none", brush: int = 1) -> Face:
    """A face of which nothing is given."""
    return Face(part.mask, np.full(part.shape, np.nan), symmetry, brush)


def given(part: Part, pattern: NDArray[Any]) -> Face:
    """A face of which all is given."""
    return Face(part.mask, np.asarray(pattern, dtype=np.float64))


def both_free(base: Part, mover: Part, symmetry: str = "none", brush: int = 1) -> Layout:
    """Layout of two free faces."""
    return layout(free(base, symmetry, brush), free(mover, symmetry, brush))


def require(quantity: str, kind: Kind, value: float, within: float = 0.0, **params: Any) -> Require:
    """A require of one element [SI]."""
    return Require(quantity, params, Bound(kind, np.array([value]), np.array([within])))


def axial(kind: Kind, gap_mm: float, value: float, within: float = 0.0) -> Require:
    """A require of F_z [N] at one gap."""
    return require("axial_force", kind, value, within, gap=gap_mm * MM, offset=(0.0, 0.0))


def most_held(gap_mm: float) -> Improve:
    """Largest holding force at one gap."""
    return Improve("holding_force", {"gap": gap_mm * MM, "offset": (0.0, 0.0)}, "maximize")


def near_far(base: Part, mover: Part) -> Problem:
    """Pull together near and push apart far: two linear conditions without an improve."""
    return Problem(base, mover, [axial("at_most", 0.3, -2.0), axial("at_least", 4.0, 0.05)], [])


def profile(base: Part, mover: Part) -> Problem:
    """Bounds, a band and an improve, all linear."""
    requires = [axial("at_most", 0.3, -1.0), axial("at_least", 3.0, 0.02), axial("equal_to", 1.5, -0.3, 0.2)]
    return Problem(base, mover, requires, [most_held(0.5)])


def curved(base: Part, mover: Part) -> Problem:
    """A problem that is not linear: lateral stiffness and tilt beside a force."""
    requires = [
        axial("at_most", 0.5, -1.0),
        require("lateral_stiffness", "at_least", 100.0, gap=0.5 * MM),
        require("tilt_moment", "at_most", 1e-3, gap=0.5 * MM, offset=(0.0, 0.0)),
    ]
    return Problem(base, mover, requires, [])


def signs(random: np.random.Generator, *shape: int) -> Array:
    """Random -1 and +1."""
    return np.asarray(random.choice([-1.0, 1.0], size=shape))


SQUARE = plate(6, 6)
WIDE, NARROW = plate(7, 5), plate(4, 6)
