"""Seeds, stopping, the pool, and tiny budgets: they end with a design, the right reason and at most a batch over."""

from __future__ import annotations

import time

import numpy as np
import pytest
from polewright.objectives.problem import Problem
from polewright.optimizer.layout import layout
from polewright.optimizer.pool import Pool
from polewright.optimizer.portfolio import search
from polewright.optimizer.seeds import generator
from polewright.optimizer.stopping import Budget, StopReason

from ..models.parts import plate
from .problems import Array, both_free, free, given, near_far, require, signs

STARTS = 4


def test_a_stream_depends_on_its_name_alone() -> None:
    first = generator(3, "stage", 2).random(4)
    generator(3, "stage", 1).random(100)
    np.random.default_rng().random(5)
    assert np.array_equal(first, generator(3, "stage", 2).random(4))
    others = [generator(3, "stage", 1), generator(4, "stage", 2), generator(3, "stage"), generator(3, "obvious", 2)]
    assert not any(np.array_equal(first, other.random(4)) for other in others)


def test_budget_gives_its_reasons_in_order() -> None:
    flag = [False]
    budget = Budget(10, None, lambda: flag[0])
    assert budget.reason() is None
    budget.spend(9)
    assert (budget.left, budget.reason()) == (1, None)
    budget.spend(3)
    assert (budget.left, budget.used, budget.reason()) == (0, 12, StopReason.EVALUATIONS)
    flag[0] = True
    assert budget.reason() is StopReason.INTERRUPTED


def test_budgets_accumulate_over_resumes() -> None:
    assert Budget(10, None, used=10).reason() is StopReason.EVALUATIONS
    resumed = Budget(10, 5.0, used=3, elapsed_before=4.0)
    assert resumed.left == 7
    assert resumed.elapsed >= 4.0
    assert resumed.reason() is None
    assert Budget(10, 5.0, elapsed_before=5.0).reason() is StopReason.SECONDS


@pytest.mark.parametrize("evaluations", [1, 5, 50, 1000])
def test_tiny_budgets_end_with_a_design(evaluations: int) -> None:
    part = plate(5, 4)
    problem, found = near_far(part, part), both_free(part, part)
    budget = Budget(evaluations)
    pool, progress, reason = search(problem, found, budget, seed=1, starts=STARTS)
    assert reason is StopReason.EVALUATIONS
    assert 0 < budget.used <= evaluations
    assert pool.best is not None
    again = problem.exact(*found.patterns(pool.best.z))
    assert again.worst_margin == pool.best.evaluation.worst_margin
    assert progress.stage <= 1


@pytest.mark.parametrize("evaluations", [1, 50])
def test_tiny_budgets_of_problems_that_are_not_linear(evaluations: int) -> None:
    part = plate(5, 4)
    stiff = require("lateral_stiffness", "at_least", 10.0, gap=0.5e-3)
    budget = Budget(evaluations)
    pool, _, reason = search(Problem(part, part, [stiff], []), both_free(part, part), budget, seed=1, starts=STARTS)
    assert reason is StopReason.EVALUATIONS
    assert 0 < budget.used <= evaluations
    assert pool.best is not None


def test_a_pole_width_alone_may_be_asked_for() -> None:
    # it is met by construction, so that the search has no condition at all
    part = plate(6, 6)
    problem = Problem(part, part, [require("narrowest_pole", "at_least", 2e-3, of="both")], [])
    found = both_free(part, part, brush=2)
    pool, _, _ = search(problem, found, Budget(3000), seed=1, starts=STARTS)
    assert pool.best is not None
    assert pool.best.evaluation.feasible


def test_a_cap_in_seconds_ends_a_run() -> None:
    part = plate(8, 8)
    budget = Budget(10**9, 1.0)
    began = time.monotonic()
    pool, _, reason = search(near_far(part, part), both_free(part, part), budget, seed=1, starts=STARTS)
    assert reason is StopReason.SECONDS
    assert pool.best is not None
    # generous: what is being compiled or walked is finished first
    assert 1.0 <= time.monotonic() - began < 60.0


def test_an_interrupt_before_anything_still_gives_a_design() -> None:
    part = plate(5, 4)
    budget = Budget(10**6, None, lambda: True)
    pool, progress, reason = search(near_far(part, part), both_free(part, part), budget, seed=1, starts=STARTS)
    assert reason is StopReason.INTERRUPTED
    assert pool.best is not None
    assert progress.stage == 0


def test_given_patterns_are_evaluated_once() -> None:
    part = plate(5, 4)
    a = signs(np.random.default_rng(2), *part.shape)
    problem = near_far(part, part)
    pool, _, reason = search(problem, layout(given(part, a), given(part, -a)), Budget(100), seed=0, starts=STARTS)
    assert reason is StopReason.GIVEN
    assert len(pool.candidates) == 1
    assert pool.best is not None
    assert pool.best.evaluation.worst_margin == problem.exact(a, -a).worst_margin


def test_a_start_that_is_best_is_kept() -> None:
    # 1 evaluation: nothing can be found, so the best is the given one or an obvious one
    part = plate(5, 4)
    problem, found = near_far(part, part), both_free(part, part)
    better, _, _ = search(problem, found, Budget(900), seed=1, starts=STARTS)
    assert better.best is not None
    begun = Pool(problem, found)
    begun.add(better.best.z, "given")
    pool, _, _ = search(problem, found, Budget(1), seed=9, starts=STARTS, pool=begun)
    assert pool.best is not None
    assert pool.best.rank >= better.best.rank


def pooled(rows: Array) -> Pool:
    part = plate(5, 4)
    pool = Pool(near_far(part, part), both_free(part, part))
    for z in rows:
        pool.add(z, "polish")
    return pool


def test_pool_ranks_exactly_and_ignores_repeats() -> None:
    rows = signs(np.random.default_rng(3), 12, 40)
    pool = pooled(np.concatenate([rows, rows]))
    assert len(pool.candidates) == 12
    ranks = [candidate.rank for candidate in pool.candidates]
    assert ranks == sorted(ranks, reverse=True)
    wanted = max(pool.problem.exact(*pool.layout.patterns(z)).worst_margin for z in rows)
    assert pool.best is not None
    assert pool.best.evaluation.worst_margin == wanted


def test_a_feasible_design_stands_before_all_others() -> None:
    part = plate(5, 4)
    problem = Problem(part, part, [require("net_moment", "at_most", 1e-9, of="base", scale=1.0)], [])
    pool = Pool(problem, both_free(part, part))
    checker = np.where(np.indices(part.shape).sum(0) % 2 == 0, 1.0, -1.0)
    for a in (np.ones(part.shape), checker, -np.ones(part.shape)):
        pool.add(pool.layout.variables(a, a), "given")
    assert [c.evaluation.feasible for c in pool.candidates] == [True, False, False]


def test_distinct_designs_differ_in_more_than_a_joint_reversal() -> None:
    z = signs(np.random.default_rng(4), 40)
    near = z.copy()
    near[0] *= -1.0
    far = z.copy()
    far[:10] *= -1.0
    pool = pooled(np.stack([z, -z, near, far]))
    found = pool.distinct(8)
    assert len(found) == 2
    assert found[0] is pool.best
    assert len(pool.distinct(1)) == 1


def test_pool_refuses_what_breaks_the_pole_width() -> None:
    part = plate(6, 6)
    found = layout(free(part, brush=2), free(part, brush=2))
    pool = Pool(near_far(part, part), found)
    z = np.ones(found.count)
    z[7] = -1.0
    pool.add(z, "polish")
    assert pool.best is None
    pool.add(np.ones(found.count), "polish")
    assert pool.best is not None
