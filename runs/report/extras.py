"""What a report shows beside the run itself; gathered by ``collect``, drawn by ``page``."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Baseline:
    """What an obvious pattern would reach on the same blanks.

    Attributes:
        name: "uniform", "stripes" or "checker".
        values: One value a column of the run [SI], NaN where it does not exist.
    """

    name: str
    values: Array


@dataclass(frozen=True)
class ForceMark:
    """A bound on the axial force at one gap, for the force-gap curve.

    Attributes:
        gap: Where [m].
        kind: "at_least" and "at_most" bound F_z from below and above; "equal_to" and "toward" are targets.
        force: Bound or target of F_z on the mover [N].
        within: Half width of the band of an "equal_to" [N].
    """

    gap: float
    kind: Literal["at_least", "at_most", "equal_to", "toward"]
    force: float
    within: float = 0.0


@dataclass(frozen=True)
class RestMark:
    """A bound on a stand-off, for the force-gap curve.

    Attributes:
        load: Load on the mover [N].
        low: Where the mover may come to rest, from [m].
        high: To [m].
    """

    load: float
    low: float
    high: float


Mark = ForceMark | RestMark


@dataclass(frozen=True)
class Outline:
    """A closed line on a field map: ``points`` (n, 2) [m], dashed when it lies off the plane that is shown."""

    points: Array
    label: str
    dashed: bool = False


@dataclass(frozen=True)
class FieldMap:
    """|B| on a plane.

    Attributes:
        title: What is shown.
        x: Abscissa of the raster, shape (m,) [m].
        y: Ordinate, shape (n,) [m].
        size: |B|, shape (n, m) [T]; NaN inside magnets.
        x_label: Name of the abscissa ("x").
        y_label: Name of the ordinate ("y" or "z").
        outlines: Where the parts are.
        note: One sentence below the map.
    """

    title: str
    x: Array
    y: Array
    size: Array
    x_label: str
    y_label: str
    outlines: tuple[Outline, ...] = ()
    note: str = ""


@dataclass(frozen=True)
class ReportExtras:
    """Everything a report adds to its run.

    Attributes:
        baselines: What obvious patterns would reach.
        marks: Bounds on the force-gap curve.
        maps: Stray-field maps.
        balances: Sentences on what the guide must take where the spec asks for a stand-off.
        needs_guide: Does the spec ask for a stand-off, so that "stable only on a guide" must be said?
        rotation: "locked" or "free": is the mover held at its angle?
        lateral: "guided" or "free": is it held sideways?
        spec_name: File name of the spec, for the lines that reproduce the run.
    """

    baselines: tuple[Baseline, ...] = ()
    marks: tuple[Mark, ...] = ()
    maps: tuple[FieldMap, ...] = ()
    balances: tuple[str, ...] = ()
    needs_guide: bool = False
    rotation: Literal["locked", "free"] = "locked"
    lateral: Literal["guided", "free"] = "guided"
    spec_name: str = "spec.toml"
