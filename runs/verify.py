"""``verify``: a second physics path, scatter and wrong assembly for one design of a run."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import numpy as np

from .archive import read_run, write_run
from .judged import find_design
from .records import Run
from .resolve import parts
from .result import Status
from .spec import spec_from_json
from .verification.asked import asked_of
from .verification.assembly import assembly
from .verification.scatter import scatter
from .verification.second import second_path
from .verification.state import State

Watcher = Callable[[str, float], None]


def verify(run: Run | str | Path, design_id: str | None = None, watch: Watcher | None = None) -> Run:
    """Verify one design of a run, and store the result where the run is an archive.

    Args:
        run: A run, or the archive that holds it. An archive is written anew, whole, at the very end: interrupted, it
            stays as it was.
        design_id: Which design; the best one by default.
        watch: Called with what is being done and the share of all that is done, 0 to 1.

    Returns:
        The run with its ``verification``: ``design`` (id), ``second_path``, ``scatter`` and ``assembly``; values in SI.
        See ``verification.second``, ``scatter`` and ``assembly`` for what each holds.

    Raises:
        InputError: There is no such archive or design, or the archive cannot be written.
    """
    found = run if isinstance(run, Run) else read_run(Path(run))
    design = find_design(found, design_id)
    spec = spec_from_json(found.spec_json, found.spec_toml)
    base, mover = parts(spec)
    asked = asked_of(spec, base, mover)
    state = State(base, mover, design.base.astype(np.float64), design.mover.astype(np.float64))
    tell = watch if watch is not None else _silent
    second = second_path(found, design, asked, state, lambda share: tell("second physics path", 0.4 * share))
    spread = scatter(found, spec, asked, state, lambda share: tell("tolerances", 0.4 + 0.45 * share))
    wrong = assembly(spec, asked, state, lambda share: tell("wrong assembly", 0.85 + 0.15 * share))
    verification = {"design": design.id, "second_path": second, "scatter": spread, "assembly": wrong}
    verified = replace(found, verification=verification)
    if not isinstance(run, Run):
        write_run(verified, Path(run))
    return verified


def verified_status(run: Run) -> Status:
    """Return "missed" when the verified design misses a requirement, by its own numbers or by the second path's."""
    found = run.verification or {}
    design = find_design(run, found.get("design"))
    return "met" if design.feasible and not found.get("second_path", {}).get("missed") else "missed"


def _silent(what: str, share: float) -> None:
    """Tell nobody."""
    del what, share
