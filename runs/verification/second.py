"""The second path over a whole design: the curve, every pose and every quantity that has one."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ...models.pair import Row
from ..records import Design, Run
from .asked import LEAKS, Asked, poses_of
from .checks import CONTACT_TOLERANCE, NEAR, TOLERANCE, Check, summary
from .second_other import leak_checks, making_checks
from .second_pair import SecondPath, pair_checks
from .state import State

Array = NDArray[np.float64]
Tell = Callable[[float], None]

_CURVE_GAPS = 12


def second_path(run: Run, design: Design, asked: tuple[Asked, ...], state: State, tell: Tell) -> dict[str, Any]:
    """Check a design's stored numbers by the second path.

    Args:
        run: The run.
        design: One of its designs.
        asked: What its spec asks for.
        state: The design's pair, without errors.
        tell: Called with the share that is done.

    Returns:
        The record that reports and archives show: ``ok``, ``tolerance``, ``largest``, ``checks``, ``failed`` (in
        words), ``missed`` (requirements that the second path's value misses where it disagrees) and ``unchecked``.
    """
    second = SecondPath(state.base, state.mover, design.base, design.mover)
    checks = _forces(run, design, asked, state, second)
    largest = max(max(abs(check.kernel) for check in checks), 1e-12)
    tell(0.4)
    missed, unchecked = [], []
    for n, entry in enumerate(asked):
        reported = np.asarray(design.values[entry.columns], dtype=np.float64)
        why = ""
        if entry.name in LEAKS:
            found, values = leak_checks(entry, state, reported, run.seed)
        elif entry.quantity is not None and entry.quantity.of_pattern:
            found, values = making_checks(entry, state, reported)
        else:
            found, values, why = pair_checks(entry, state, second, reported, largest)
        if why:
            unchecked.append((entry.label, why))
        checks += found
        agreed = all(check.ok for check in found)
        if entry.bound is not None and not agreed and float(entry.margins(values)) < 0.0:
            missed.append(entry.label)
        tell(0.4 + 0.6 * (n + 1) / len(asked))
    return summary(checks, missed, unchecked)


def _forces(run: Run, design: Design, asked: tuple[Asked, ...], state: State, second: SecondPath) -> list[Check]:
    """The axial force along the stored curve and at every pose that the spec names."""
    cell, coatings = state.base.cell, state.base.coating + state.mover.coating
    named = poses_of(asked)
    poses: dict[tuple[float, float, float], float] = {}
    curve = run.curves.get("force_gap")
    position = [other.id for other in run.designs].index(design.id)
    if curve is not None:
        chosen = np.unique(np.linspace(0, curve.scale.size - 1, _CURVE_GAPS).round().astype(int))
        poses = {(float(curve.scale[n]), 0.0, 0.0): float(curve.values[position, n]) for n in chosen}
    if not poses and not named:
        named = [(share * cell, 0.0, 0.0) for share in (0.1, 0.5, 1.0, 3.0)]
    rest = [pose for pose in named if pose not in poses]
    poses |= dict(zip(rest, state.pair([Row("fz", *pose) for pose in rest]).tolist(), strict=True))
    largest = max(max(abs(force) for force in poses.values()), 1e-12)
    return [
        Check(
            "axial force" + (f" at offset [{pose[1] * 1e3:g}, {pose[2] * 1e3:g}] mm" if any(pose[1:]) else ""), "N",
            pose[0], force, float(second.force(*pose)[2]), largest, "the largest force on the curve",
            TOLERANCE if pose[0] + coatings >= NEAR * cell else CONTACT_TOLERANCE,
        )
        for pose, force in sorted(poses.items())
    ]  # fmt: skip
