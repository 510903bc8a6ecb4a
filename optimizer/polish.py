"""Polish of rounded patterns for any problem: moves ranked by the gradient, judged in batches by the physics itself."""

from __future__ import annotations

from functools import cached_property

import jax
import jax.numpy as jnp
import numpy as np
from numpy.typing import NDArray

from .relaxed import BATCH, Relaxed, Tables
from .scoring import score
from .stopping import Budget
from .width import keeps_width, moves

Array = NDArray[np.float64]

_SOFTNESS = 0.02
_FAILURES = 4
_GAIN = 1e-9


class Polish:
    """Best-improvement moves on any problem.

    Attributes:
        relaxed: The problem as functions of the variables.
    """

    def __init__(self, relaxed: Relaxed) -> None:
        self.relaxed = relaxed
        self._variables, self._targets = moves(relaxed.layout, facing=True)

    def run(self, z: Array, steps: int, budget: Budget) -> Array:
        """Improve rounded variables z (n,) by up to ``steps`` moves; z must keep the pole width."""
        best = float(self._scores(z[None])[0])
        for _ in range(steps):
            found = self._step(z, best, budget)
            if found is None:
                break
            z, best = found
        return z

    def _step(self, z: Array, best: float, budget: Budget) -> tuple[Array, float] | None:
        """The best improving move among those that the gradient promises most of, or None."""
        slope = np.asarray(self._slope(self.relaxed.tables, jnp.asarray(z)))
        flips = (self._targets * z[self._variables] < 0.0) & (self._variables >= 0)
        promise = (-2.0 * z * np.nan_to_num(slope))[self._variables] * flips
        order = np.argsort(-promise.sum(-1), kind="stable")
        order = order[flips[order].any(axis=1)]
        for first in range(0, min(_FAILURES * BATCH, order.size), BATCH):
            if budget.reason() is not None:
                return None
            trial = np.repeat(z[None], len(order[first : first + BATCH]), axis=0)
            for row, move in enumerate(order[first : first + BATCH]):
                trial[row, self._variables[move][flips[move]]] *= -1.0
            trial = trial[keeps_width(self.relaxed.layout, trial)]
            if not trial.size:
                continue
            if not budget.affords(len(trial)):
                return None
            budget.spend(len(trial))
            scores = self._scores(trial)
            top = int(np.argmax(scores))
            if scores[top] > best + _GAIN * max(abs(best), 1.0):
                return trial[top], float(scores[top])
        return None

    def _scores(self, z: Array) -> Array:
        """Scores of many sets of variables (m, n), shape (m,)."""
        conditions, worth = self.relaxed.judge_many(z)
        problem = self.relaxed.problem
        return np.asarray(score(np, problem.counts, conditions, worth if problem.improves else None))

    @cached_property
    def _slope(self) -> jax.stages.Wrapped:
        problem = self.relaxed.problem

        def soft(tables: Tables, z: jax.Array) -> jax.Array:
            conditions, worth = self.relaxed.judge(tables, z)
            found = score(jnp, problem.counts, conditions, worth if problem.improves else None, softness=_SOFTNESS)
            return jnp.asarray(found)

        return jax.jit(jax.grad(soft, argnums=1))
