"""Tolerances as numbers: what varies from part to part, by how much, and the pair that a set of errors makes.

Every variable is drawn uniformly between minus and plus its half width, independent of the others. A half width is
the tolerance of the spec: remanence of each part; N against S cells of each part (cells of one polarity stronger by
half of it, the others weaker); the pattern on each blank, along x and y; the mover against the base, along x and y; the
gap; the thickness of each magnet (its mating face stays where it is).
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import final

import numpy as np
from numpy.typing import NDArray

from ...optimizer.seeds import generator
from ..spec import Spec
from .state import State

Array = NDArray[np.float64]

VARIABLES: dict[str, str] = {
    "remanence_base": "remanence", "remanence_mover": "remanence",
    "imbalance_base": "N/S imbalance", "imbalance_mover": "N/S imbalance",
    "slip_base_x": "pole position", "slip_base_y": "pole position",
    "slip_mover_x": "pole position", "slip_mover_y": "pole position",
    "offset_x": "offset", "offset_y": "offset", "gap": "gap",
    "thickness_base": "thickness", "thickness_mover": "thickness",
}  # fmt: skip
"""What varies, and the tolerance that each belongs to."""

TOLERANCES = tuple(dict.fromkeys(VARIABLES.values()))
_THINNEST = 0.01
"""No magnet gets thinner than this share of its nominal thickness, whatever the tolerance."""


@final
@dataclass(frozen=True, eq=False)
class Draws:
    """Errors of many pairs.

    Attributes:
        limits: Half width of each variable, in SI; relative for remanence and imbalance, shape (variable,).
        share: Error of each pair as a share of its half width, -1 to 1, shape (pair, variable).
    """

    limits: Array
    share: Array

    @property
    def count(self) -> int:
        """How many pairs."""
        return len(self.share)

    def column(self, name: str) -> Array:
        """Error of one variable, shape (pair,)."""
        n = list(VARIABLES).index(name)
        return np.asarray(self.share[:, n] * self.limits[n])

    def some(self, chosen: slice) -> Draws:
        """Some of the pairs."""
        return replace(self, share=self.share[chosen])

    def joined(self, other: Draws) -> Draws:
        """These pairs, then those of ``other``."""
        return replace(self, share=np.concatenate([self.share, other.share]))


def limits_of(spec: Spec) -> Array:
    """Half widths of the spec in SI, shape (variable,)."""
    asked = spec.tolerances
    widths = {
        "remanence": asked.remanence_percent / 100.0, "N/S imbalance": asked.imbalance_percent / 100.0,
        "pole position": asked.pole_position_mm * 1e-3, "offset": asked.offset_mm * 1e-3, "gap": asked.gap_mm * 1e-3,
        "thickness": asked.thickness_mm * 1e-3,
    }  # fmt: skip
    return np.array([widths[tolerance] for tolerance in VARIABLES.values()])


def draw(spec: Spec, seed: int) -> Draws:
    """Draw the spec's number of pairs."""
    random = generator(seed, "verify", "scatter")
    return Draws(limits_of(spec), random.uniform(-1.0, 1.0, (spec.tolerances.samples, len(VARIABLES))))


def extremes(spec: Spec) -> Draws:
    """The nominal pair, then each variable alone at minus and at plus its limit, in the order of ``VARIABLES``."""
    unit = np.eye(len(VARIABLES))
    share = np.concatenate([np.zeros((1, len(VARIABLES))), np.stack([-unit, unit], axis=1).reshape(-1, len(VARIABLES))])
    return Draws(limits_of(spec), share)


def unbalanced(spec: Spec) -> Draws:
    """Imbalance of both parts alone at its limit, in all four combinations of signs."""
    share = np.zeros((4, len(VARIABLES)))
    names = list(VARIABLES)
    share[:, names.index("imbalance_base")] = [1.0, 1.0, -1.0, -1.0]
    share[:, names.index("imbalance_mover")] = [1.0, -1.0, 1.0, -1.0]
    return Draws(limits_of(spec), share)


def state_of(nominal: State, draws: Draws, n: int) -> State:
    """The pair that the errors of draw ``n`` make of a nominal one."""
    error = {name: float(draws.column(name)[n]) for name in VARIABLES}

    base, mover = (
        replace(
            made,
            remanence=made.remanence * (1.0 + error[f"remanence_{name}"]),
            thickness=thickness(made.thickness, error[f"thickness_{name}"]),
        )
        for name, made in (("base", nominal.base), ("mover", nominal.mover))
    )
    return State(
        base=base,
        mover=mover,
        a=nominal.a + error["imbalance_base"] / 2.0 * np.abs(nominal.a),
        b=nominal.b + error["imbalance_mover"] / 2.0 * np.abs(nominal.b),
        slip_base=(error["slip_base_x"], error["slip_base_y"]),
        slip_mover=(error["slip_mover_x"], error["slip_mover_y"]),
        offset=(error["offset_x"], error["offset_y"]),
        gap=error["gap"],
    )


def thickness(nominal: float, error: float) -> float:
    """Thickness of a magnet with an error [m]."""
    return max(nominal + error, _THINNEST * nominal)


def worst_drops(draws_margins: Array) -> dict[str, float]:
    """How far each tolerance alone can lower a margin, from the margins of ``extremes``, shape (1 + 2 variables,).

    Its variables add up, each at its worse side.
    """
    nominal, sides = draws_margins[0], draws_margins[1:].reshape(-1, 2)
    drops: dict[str, float] = dict.fromkeys(TOLERANCES, 0.0)
    if np.isfinite(nominal):
        for tolerance, pair in zip(VARIABLES.values(), sides, strict=True):
            drops[tolerance] += max(float(nominal - pair.min()), 0.0)
    return drops


def costliest(drops: dict[str, float]) -> str:
    """The tolerance that can lower a margin most, "none" where none does."""
    name = max(drops, key=lambda tolerance: drops[tolerance])
    return name if drops[name] > 0.0 else "none"
