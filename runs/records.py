"""What a run is made of: plain records between execution, archive, report and result. SI units throughout."""

from __future__ import annotations

import hashlib
from dataclasses import dataclass, field
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from ..models.part import Part

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Column:
    """One judged number: one element of one require or improve.

    Attributes:
        entry: Index of the require, or of the improve counted on after the last require.
        name: Quantity ("axial_force").
        label: What people read ("axial_force at 3 mm", or the requirement's own id before it).
        unit: Unit in specs and reports ("N"); values are stored in SI.
        kind: How it is judged.
        bound: Bound or target [SI], None for an improve without a target.
        within: Half width of the band of an "equal_to" [SI].
        sense: "maximize", "minimize" or "toward" for an improve, "" for a require.
        id: The requirement's own name of the characteristic, or "".
    """

    entry: int
    name: str
    label: str
    unit: str
    kind: Literal["at_least", "at_most", "equal_to", "improve"]
    bound: float | None
    within: float | None = None
    sense: str = ""
    id: str = ""


@dataclass(frozen=True)
class Design:
    """One pattern pair and what it reaches.

    Attributes:
        id: Short name, unique in the run ("d1").
        origin: "gradient", "linear", "polish", "search", "given" or "enumerated".
        base: Polarity -1, 0, +1, int8, shape (base_y, base_x).
        mover: The same for the mover, as seen from +z in the base frame.
        values: One value a column [SI]; NaN where the quantity does not exist.
        margins: Relative margin a require (the worst of its elements); >= 0 is met.
        feasible: Are all requires met?
        worst_margin: Least of the margins that count; NaN without any require.
        on_front: Is it a member of the front of the run?
    """

    id: str
    origin: str
    base: NDArray[np.int8]
    mover: NDArray[np.int8]
    values: Array
    margins: Array
    feasible: bool
    worst_margin: float
    on_front: bool = False


@dataclass(frozen=True)
class Curve:
    """A curve of every design: ``values[design, point]`` over ``scale[point]``, both SI with spec-side units.

    Attributes:
        scale_name: Name of the abscissa ("gap").
        scale: Abscissa [SI], shape (point,).
        scale_unit: Its unit in reports ("mm").
        values: Ordinates [SI], shape (design, point).
        unit: Their unit in reports ("N").
    """

    scale_name: str
    scale: Array
    scale_unit: str
    values: Array
    unit: str


@dataclass(frozen=True)
class Run:
    """Everything about one execution of one spec, as stored in an archive.

    Attributes:
        title: The spec's title.
        kind: "design" or "front".
        spec_toml: The spec as given.
        spec_json: The resolved spec as JSON; reading it back gives an equal spec.
        seed: Seed of the search.
        stop_reason: Why the run ended, a sentence.
        complete: Did the run end by itself?
        evaluations: Pattern pairs evaluated, over all resumes.
        base: Geometry of the base.
        mover: Geometry of the mover.
        columns: The judged numbers, requires first, in spec order.
        designs: Best first.
        curves: By name, at least "force_gap".
        history: Rows (evaluations, best score) in the order of the run, shape (row, 2).
        warnings: Sentences a user must read.
        state: Arrays that a resume needs, by name.
        provenance: created_utc, versions_json, platform, durations_json: the only part that differs between equal runs.
        verification: What ``verify`` found (JSON-able), or None.
    """

    title: str
    kind: Literal["design", "front"]
    spec_toml: str
    spec_json: str
    seed: int
    stop_reason: str
    complete: bool
    evaluations: int
    base: Part
    mover: Part
    columns: tuple[Column, ...]
    designs: tuple[Design, ...]
    curves: dict[str, Curve]
    history: Array
    warnings: tuple[str, ...] = ()
    state: dict[str, NDArray[Any]] = field(default_factory=dict)
    provenance: dict[str, str] = field(default_factory=dict)
    verification: dict[str, Any] | None = None

    @property
    def spec_sha256(self) -> str:
        """SHA-256 of the spec as given (UTF-8), in hexadecimal: what ``sha256sum spec.toml`` prints."""
        return hashlib.sha256(self.spec_toml.encode()).hexdigest()
