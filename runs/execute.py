"""One spec in, one run out: what the command line, Python users and pipelines all call."""

from __future__ import annotations

import json
import platform
import time
from collections.abc import Callable
from datetime import UTC, datetime
from importlib.metadata import PackageNotFoundError, version
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from .. import __version__
from ..models.errors import InputError, Issue
from ..models.making import unpainted
from ..models.units import from_si
from ..objectives.problem import Problem
from ..optimizer.layout import Layout
from ..optimizer.pool import Candidate, Pool
from ..optimizer.portfolio import Progress, search
from ..optimizer.stopping import Budget, StopReason
from ..optimizer.width import mended
from . import checkpoint
from .archive import read_run, write_run
from .curves import curves_of
from .interrupts import watched
from .output import output_path
from .records import Design, Run
from .resolve import columns_of, layout_of, problem_of
from .spec import CellFile, Spec, load_spec
from .warnings import warnings_of

Array = NDArray[np.float64]
Watcher = Callable[[Run], None]

_KEPT = 8
"""Distinct designs that a run keeps."""
_FINAL = (StopReason.PROVEN.value, StopReason.GIVEN.value)
"""Ends that no larger budget changes."""


def design(
    spec: Spec | str | Path,
    *,
    output: str | Path | None = None,
    replace: bool = False,
    resume: bool = False,
    start_from: str | Path | None = None,
    watch: Watcher | None = None,
) -> Run:
    """Find pole patterns that meet a spec with at most one improve, and store the run.

    Args:
        spec: A spec, or the file that holds it.
        output: Archive to write; by default the spec file's stem with .h5 in the current folder.
        replace: May an existing archive be overwritten?
        resume: Continue an interrupted run in the archive (without one, start it).
        start_from: An archive whose designs are evaluated under this spec and searched from.
        watch: Called with the run so far after each stage.

    Returns:
        The run, best design first; ``run.complete`` is False when it was interrupted.

    Raises:
        InputError: Bad input or usage; nothing was written.
    """
    source = "" if isinstance(spec, Spec) else str(spec)
    name = "design.h5" if isinstance(spec, Spec) else Path(spec).stem + ".h5"
    found = spec if isinstance(spec, Spec) else load_spec(spec)
    if len(found.improve) > 1:
        message = f"at most one improve for design, received {len(found.improve)}; keep one"
        raise InputError(Issue(message, "improve"), source)
    inputs = tuple(Path(p) for p in (source, start_from) if p)
    path = output_path(Path(output) if output else None, name, replace=replace, resume=resume, inputs=inputs)
    earlier = read_run(path) if resume and path.exists() else None
    if earlier is not None:
        _check_same(earlier, found, path)
        if earlier.complete and (earlier.stop_reason in _FINAL or _budgets(earlier) == _budgets_of(found)):
            return earlier
    starts = _stored(read_run(Path(start_from)), found) if start_from else []

    def keep(run: Run) -> None:
        write_run(run, path)
        if watch is not None:
            watch(run)

    run = execute(found, earlier=earlier, starts=starts, keep=keep)
    write_run(run, path)
    return run


def execute(
    spec: Spec,
    *,
    earlier: Run | None = None,
    starts: list[tuple[Array, Array]] | None = None,
    keep: Watcher | None = None,
) -> Run:
    """Search under a spec and return the run; ``keep`` gets the state after each stage.

    Args:
        spec: What is asked.
        earlier: An unfinished run of the same spec to continue.
        starts: Pattern pairs to begin from as well.
        keep: Called with the unfinished run after each stage.
    """
    began = time.monotonic()
    problem = problem_of(spec)
    layout = layout_of(spec, problem)
    _check_width(layout, problem)
    pool, progress = (
        checkpoint.restore(earlier.state, problem, layout) if earlier else (Pool(problem, layout), Progress())
    )
    before = float(json.loads(earlier.provenance["durations_json"])["search_s"]) if earlier else 0.0
    given = [*(starts or []), *_start(spec, problem)]
    used = int(earlier.state["evaluations"][0]) if earlier else 0
    if layout.count and earlier is None:
        for a, b in given:
            pool.add(mended(layout, layout.variables(a, b)), "given")
    # a resume begins at the last finished stage; before the first one that is the beginning, with what is given
    last = checkpoint.take(pool, progress, used)

    with watched() as interrupted:
        budget = Budget(spec.search.evaluations, spec.search.budget_s, interrupted, used, before)

        def on_stage(pool: Pool, progress: Progress) -> None:
            nonlocal last
            last = checkpoint.take(pool, progress, budget.used)
            if keep is not None:
                keep(_run(spec, problem, pool, progress, budget, last, StopReason.INTERRUPTED, began))

        pool, progress, reason = search(
            problem, layout, budget, spec.search.seed, spec.search.starts, pool, progress, on_stage
        )
    return _run(spec, problem, pool, progress, budget, last, reason, began)


def _run(
    spec: Spec,
    problem: Problem,
    pool: Pool,
    progress: Progress,
    budget: Budget,
    state: checkpoint.Checkpoint,
    reason: StopReason,
    began: float,
) -> Run:
    """Put everything together as it is stored."""
    kept = pool.distinct(_KEPT)
    designs = tuple(_design(pool.layout, candidate, f"d{n + 1}") for n, candidate in enumerate(kept))
    history = np.array(progress.history, dtype=np.float64).reshape(-1, 3)
    complete = reason is not StopReason.INTERRUPTED
    return Run(
        title=spec.title,
        kind="design",
        spec_toml=spec.toml,
        spec_json=spec.resolved_json(),
        seed=spec.search.seed,
        stop_reason=reason.value,
        complete=complete,
        evaluations=budget.used if complete else state.evaluations,
        base=problem.base,
        mover=problem.mover,
        columns=columns_of(spec),
        designs=designs,
        curves=curves_of(spec, problem, designs),
        history=history[:, :2],
        warnings=warnings_of(spec, problem, designs, reason),
        state=state.arrays,
        provenance=_provenance(began, budget),
    )


def _design(layout: Layout, candidate: Candidate, name: str) -> Design:
    a, b = layout.patterns(candidate.z)
    found = candidate.evaluation
    return Design(
        name, candidate.origin, a.astype(np.int8), b.astype(np.int8), found.values, found.margins, found.feasible,
        found.worst_margin,
    )  # fmt: skip


def _provenance(began: float, budget: Budget) -> dict[str, str]:
    versions = {"polewright": __version__, "python": platform.python_version()}
    for name in ("numpy", "scipy", "jax", "jaxlib", "optax", "h5py"):
        try:
            versions[name] = version(name)
        except PackageNotFoundError:
            versions[name] = "unknown"
    durations = {"search_s": round(budget.elapsed, 3), "total_s": round(time.monotonic() - began, 3)}
    return {
        "created_utc": datetime.now(UTC).isoformat(timespec="seconds"),
        "versions_json": json.dumps(versions),
        "platform": platform.platform(),
        "durations_json": json.dumps(durations),
    }


def _check_width(layout: Layout, problem: Problem) -> None:
    """Refuse a pole width that not even one single pole keeps where the pattern is free."""
    faces = ((layout.base, problem.base), (layout.mover, problem.mover))
    issues = []
    for number, (face, part) in enumerate(faces):
        brush, mask = layout.brushes[number], layout.masks[number]
        bare = unpainted(mask.astype(np.int8), mask, brush) & (face.index >= 0)
        if bare.any() and not (number == 1 and layout.linked):
            message = (
                f"must fit into the blank wherever the pattern is free, received {from_si(brush * part.cell, 'mm'):g} "
                f"in whole cells (narrowest_pole requires included): {bare.sum()} of {mask.sum()} cells lie where the "
                "blank is narrower; use a smaller width"
            )
            issues.append(Issue(message, f"{('base', 'mover')[number]}.pole_width_min_mm"))
    if issues:
        raise InputError(issues)


def _start(spec: Spec, problem: Problem) -> list[tuple[Array, Array]]:
    """The spec's own start pattern: on the base, the mover facing it matched or opposed where it fits."""
    if not isinstance(spec.search.start, CellFile):
        return []
    a = spec.search.start.values.astype(np.float64)
    if problem.mover.shape != a.shape:
        return [(a, problem.mover.mask.astype(np.float64))]
    b = np.where(problem.mover.mask, a, 0.0)
    return [(a, b), (a, -b)]


def _stored(run: Run, spec: Spec) -> list[tuple[Array, Array]]:
    """Patterns of a stored run, where they fit the spec's parts."""
    problem = problem_of(spec)
    shapes = (problem.base.shape, problem.mover.shape)
    if (run.base.shape, run.mover.shape) != shapes:
        sizes = " and ".join(f"{x} x {y}" for y, x in shapes)
        held = " and ".join(f"{p.shape[1]} x {p.shape[0]}" for p in (run.base, run.mover))
        message = f"--from needs a run whose parts have the spec's cells ({sizes}), received {held}"
        raise InputError(message)
    return [(d.base.astype(np.float64), d.mover.astype(np.float64)) for d in run.designs]


def _check_same(earlier: Run, spec: Spec, path: Path) -> None:
    """Only the budgets may differ on resume."""
    old, new = json.loads(earlier.spec_json), json.loads(spec.resolved_json())
    for document in (old, new):
        for key in ("evaluations", "budget_s"):
            document.get("search", {}).pop(key, None)
    if old != new:
        changed = sorted(key for key in {*old, *new} if old.get(key) != new.get(key))
        message = (
            f"--resume needs the spec that the run was started with (only search.evaluations and search.budget_s may "
            f"change), received one that differs in {', '.join(changed)}; use --replace or another output"
        )
        raise InputError(message, str(path))


def _budgets(run: Run) -> tuple[object, object]:
    settings = json.loads(run.spec_json).get("search", {})
    return settings.get("evaluations"), settings.get("budget_s")


def _budgets_of(spec: Spec) -> tuple[object, object]:
    settings = json.loads(spec.resolved_json()).get("search", {})
    return settings.get("evaluations"), settings.get("budget_s")
