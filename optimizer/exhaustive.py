"""Every pattern pair, where they fit the budget: the best one is then the proven optimum."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

from ..objectives.plan import Response
from ..objectives.problem import Problem
from .layout import Layout
from .stopping import Budget
from .width import keeps_width

Array = NDArray[np.float64]

_CHUNK = 4096
_SLOW = 2048
"""Pattern pairs that may be judged one by one where rows alone do not judge a design."""
_DENSE = 20_000_000
"""Largest number of entries of rows as full matrices; beyond it pairs are judged one by one."""
KEEP = 64
"""How many of the best pairs are returned."""


def pairs(problem: Problem, layout: Layout) -> int:
    """Pattern pairs to look at; a joint reversal of both parts that changes nothing halves them."""
    return 1 << (layout.count - int(_halved(problem, layout)))


def fits(problem: Problem, layout: Layout, budget: Budget) -> bool:
    """Can every pattern pair be looked at within the budget?"""
    if layout.count > 40:
        return False
    return pairs(problem, layout) <= (budget.left if _by_rows(problem) else min(budget.left, _SLOW))


def best(problem: Problem, layout: Layout, budget: Budget) -> tuple[Array, bool]:
    """The best variables of all (m, n), best first, and whether none was left out."""
    kept, keys = np.zeros((0, layout.count)), np.zeros((0, 2))
    dense = _dense(problem) if _by_rows(problem) else None
    for z in _all(layout.count, pairs(problem, layout)):
        if budget.reason() is not None:
            return kept, False
        budget.spend(len(z))
        z = z[keeps_width(layout, z)]
        if not len(z):
            continue
        found = _judge(problem, layout, z, dense)
        kept, keys = np.concatenate([kept, z]), np.concatenate([keys, found])
        order = np.lexsort((-keys[:, 1], -keys[:, 0]))[:KEEP]
        kept, keys = kept[order], keys[order]
    return kept, True


def _by_rows(problem: Problem) -> bool:
    """Can rows alone judge many pairs at once?"""
    entries = problem.base.mask.size * problem.mover.mask.size * problem.forms.count
    return problem.judged_by_rows and entries <= _DENSE


def _halved(problem: Problem, layout: Layout) -> bool:
    given = any(bool(face.constant.any()) for face in (layout.base, layout.mover))
    return problem.reverses and not given and layout.count > 0


def _all(count: int, total: int) -> Iterator[Array]:
    """Variables of every pair, in chunks; with half of them, the last variable stays +1."""
    for first in range(0, total, _CHUNK):
        numbers = np.arange(first, min(first + _CHUNK, total), dtype=np.int64)
        yield np.asarray(1.0 - 2.0 * ((numbers[:, None] >> np.arange(count)) & 1), dtype=np.float64)


def _dense(problem: Problem) -> Array:
    """All rows as full matrices, shape (ny * nx, row, my * mx)."""
    ny, nx = problem.base.shape
    columns = [problem.forms.mover_column((y, x)) for y in range(ny) for x in range(nx)]
    # sizes written out: a problem of fields alone has no rows
    return np.stack(columns).reshape(ny * nx, problem.forms.count, problem.mover.mask.size)


def _judge(problem: Problem, layout: Layout, z: Array, dense: Array | None) -> Array:
    """(feasible, score) of each, or (feasible, worst margin) where it is not; shape (m, 2)."""
    a, b = layout.patterns(z)
    if dense is None:
        found = [problem.exact(left, right) for left, right in zip(a, b, strict=True)]
        return np.array([(e.feasible, e.score if e.feasible else e.worst_margin) for e in found], dtype=np.float64)
    flat_a, flat_b = a.reshape(len(z), -1), b.reshape(len(z), -1)
    pair = (np.tensordot(flat_a, dense, axes=1) * flat_b[:, None, :]).sum(-1)
    linear = flat_a @ problem.linear_base.T + flat_b @ problem.linear_mover.T
    feasible, worst, score = problem.judge_rows(Response(np, pair, linear, a, b))
    return np.stack([feasible, np.where(feasible, score, worst)], axis=1)
