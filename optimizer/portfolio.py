"""The portfolio: runs what measured best on each kind of problem and keeps the best rounded designs.

A run is a list of stages; each is a deterministic function of the seed, the stage's number and the designs kept so
far. So a run that was stopped continues at the last finished stage and ends as the uninterrupted one would.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from ..objectives.problem import Problem
from . import exhaustive
from .layout import Layout
from .pool import Pool
from .seeds import generator
from .stages import Stages
from .stopping import Budget, StopReason

Array = NDArray[np.float64]

_ROUNDS = 1000
"""More stages than any budget pays for; it only bounds a run whose stages book nothing."""
_LINEAR, _CORE, _CURVED = (6, 20), (8, 20), (3, 6)
"""Rounds without a gain that end a run whose best design meets every require, or does not: where all is linear, where
walks can search a linear core, elsewhere. Rounds of walks are cheap."""
_ISLAND_PATIENCE = 3
"""Rounds without a gain that end an island: a new population finds other basins sooner than an old one leaves its."""
_GAIN = 1e-3
"""Smallest relative gain of the score that counts."""


@dataclass
class Progress:
    """Where a run stands; all that a resume needs besides the designs.

    Attributes:
        stage: Stages finished.
        stale: Rounds since the last gain.
        mark: Rank that the next gain is measured from.
        island: Number of the population that is being bred.
        age: Rounds that it has been bred for.
        island_stale: Rounds since its last gain.
        island_mark: Rank that its next gain is measured from.
        history: Rows (evaluations, worst margin, score) after each stage.
    """

    stage: int = 0
    stale: int = 0
    mark: tuple[bool, float] = (False, -np.inf)
    island: int = 0
    age: int = 0
    island_stale: int = 0
    island_mark: tuple[bool, float] = (False, -np.inf)
    history: list[tuple[float, float, float]] = field(default_factory=list)


def search(
    problem: Problem,
    layout: Layout,
    budget: Budget,
    seed: int,
    starts: int,
    pool: Pool | None = None,
    progress: Progress | None = None,
    on_stage: Callable[[Pool, Progress], None] | None = None,
) -> tuple[Pool, Progress, StopReason]:
    """Find rounded designs.

    Args:
        problem: What is asked.
        layout: What is free.
        budget: Evaluations, seconds and interrupt.
        seed: Seed of everything random.
        starts: Starts of the gradient search.
        pool: Designs to begin from: given ones, or those of an earlier part of the run.
        progress: Where that part stood.
        on_stage: Called after each finished stage, to keep what there is.

    Returns:
        The designs, where the run stands and why it ended; the pool holds at least one design.
    """
    pool, progress = pool or Pool(problem, layout), progress or Progress()
    stages = Stages(problem, layout, budget, pool, starts)
    if layout.count and exhaustive.fits(problem, layout, budget):
        found, complete = exhaustive.best(problem, layout, budget)
        for z in found:
            pool.add(z, "enumerated")
        _note(pool, progress, budget)
        if pool.best is not None:
            return pool, progress, StopReason.PROVEN if complete else budget.reason() or StopReason.EVALUATIONS
    if progress.stage == 0:
        stages.obvious()
    if layout.count == 0:
        return pool, progress, StopReason.GIVEN
    patience = _LINEAR if problem.is_linear else _CORE if problem.has_linear_core else _CURVED
    while progress.stage < _ROUNDS:
        number = progress.stage
        stages.run(number, generator(seed, "stage", number), progress.island, progress.age)
        reason = budget.reason()
        _note(pool, progress, budget)
        if reason is not None:
            return pool, progress, reason
        progress.stage += 1
        if on_stage is not None:
            on_stage(pool, progress)
        met = pool.best is not None and pool.best.evaluation.feasible
        if progress.stale >= patience[0 if met else 1]:
            break
    return pool, progress, StopReason.PLATEAU


def _note(pool: Pool, progress: Progress, budget: Budget) -> None:
    """Write the stage's outcome down and count rounds without a gain."""
    if pool.best is None:
        return
    evaluation, rank = pool.best.evaluation, pool.best.rank
    progress.history.append((float(budget.used), evaluation.worst_margin, evaluation.score))
    gained = _gains(rank, progress.mark)
    progress.stale, progress.mark = (0, rank) if gained else (progress.stale + 1, progress.mark)
    here = pool.best_on(progress.island)
    gained = here is not None and _gains(here.rank, progress.island_mark)
    progress.age += 1
    if gained and here is not None:
        progress.island_stale, progress.island_mark = 0, here.rank
        return
    progress.island_stale += 1
    if progress.island_stale >= _ISLAND_PATIENCE:
        progress.island, progress.age, progress.island_stale = progress.island + 1, 0, 0
        progress.island_mark = (False, -np.inf)


def _gains(rank: tuple[bool, float], mark: tuple[bool, float]) -> bool:
    """Is a rank better than a mark by more than the smallest gain that counts?"""
    if not np.isfinite(mark[1]):
        return True
    return rank[0] > mark[0] or (rank[0] == mark[0] and rank[1] > mark[1] + _GAIN * abs(mark[1]))
