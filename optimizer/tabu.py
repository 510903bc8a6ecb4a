"""Tabu search on linear problems: many rounded starts walk at once, one flip or one facing pair of flips at a step.

All forms are bilinear, so one table of slope changes (how a unit of each variable moves the slopes of all forms) makes
every step exact and cheap: the effects of all flips are read from the slopes, and after the best allowed move values
and slopes are updated, never recomputed. A facing pair reverses a cell of the base and the cell above it together:
where both faces hold one texture, that is the move that changes it.
"""

from __future__ import annotations

from collections.abc import Callable
from functools import cached_property, reduce
from typing import Any, NamedTuple

import jax
import jax.numpy as jnp
import numpy as np
from numpy.typing import NDArray

from .forms import ConditionForms
from .stopping import Budget

Array = NDArray[np.float64]

STARTS = 16
"""Starts that walk together; always as many, so that nothing recompiles."""
CHUNK = 250
"""Steps between two looks at the budget."""
MOVES_PER_EVALUATION = 4
"""A move updates values and slopes by a difference and costs a fraction of an evaluation: as many are booked as one."""
_ROUNDING = 2e-6
LARGEST = 30_000_000
"""Largest number of entries of the table of slope changes."""


def affordable(forms: ConditionForms) -> bool:
    """Does the table of slope changes fit?"""
    return forms.constant.size * forms.layout.count**2 <= LARGEST


class _Tables(NamedTuple):
    """Arrays of the walk: slope changes (n, form, n), curvature (form, n), pairs (p, 2), coupling (form, p)."""

    changes: jax.Array
    curvature: jax.Array
    pairs: jax.Array
    coupling: jax.Array


class _Walk(NamedTuple):
    """State of one start.

    Variables, values of the forms, their slopes, when each variable is free again; the best soft score met, which bars
    are lifted for; the best true score met and its variables.
    """

    z: jax.Array
    values: jax.Array
    slopes: jax.Array
    free: jax.Array
    best: jax.Array
    top: jax.Array
    top_z: jax.Array


class TabuSearch:
    """Multi-start tabu search.

    Attributes:
        forms: Conditions and worth as bilinear forms.
    """

    def __init__(self, forms: ConditionForms) -> None:
        self.forms = forms
        n = forms.layout.count
        changes = np.stack([forms.slope_change(k) for k in range(n)])
        curvature = 0.5 * np.einsum("kfk->fk", changes)
        pairs = forms.layout.facing()
        coupling = changes[pairs[:, 0], :, pairs[:, 1]].T.reshape(len(forms.constant), len(pairs))
        self._tables = _Tables(*(jnp.asarray(part) for part in (changes, curvature, pairs, coupling)))
        self._first, self._second = (_run_or_list(column) for column in pairs.T)
        self._tenure = (4, max(n // 12, 8) + 1)

    def run(
        self, starts: Array, random: np.random.Generator, budget: Budget, steps: int, softness: Array, violation: Array
    ) -> Array:
        """Walk from rounded variables (``STARTS``, n) and return the best that each start met, (``STARTS``, n).

        Args:
            starts: Variables of -1 and +1.
            random: Where the tenures come from.
            budget: Ends the walk early when it is used up.
            steps: Moves of each start.
            softness: Width of the soft minimum of each start, > 0, shape (``STARTS``,); see ``scoring.score``.
            violation: Price of a violation of each start, shape (``STARTS``,).
        """
        halves = (slice(0, STARTS // 2), slice(STARTS // 2, STARTS))
        walks = [self._begin(starts[half], softness[half], violation[half]) for half in halves]
        for first in range(0, steps, CHUNK):
            if budget.reason() is not None or not budget.affords(len(starts) * CHUNK // MOVES_PER_EVALUATION):
                break
            # two halves: each call returns at once, so both cores walk
            until = first + np.arange(CHUNK)[:, None, None] + random.integers(*self._tenure, size=(CHUNK, STARTS, 2))
            walks = [
                (self._advance(self._tables, walk, *price, (first + np.arange(CHUNK), until[:, half])), price)
                for (walk, price), half in zip(walks, halves, strict=True)
            ]
            jax.block_until_ready(walks)  # type: ignore[no-untyped-call]
            budget.spend(len(starts) * CHUNK // MOVES_PER_EVALUATION)
        return np.concatenate([np.asarray(walk.top_z) for walk, _ in walks])

    def _begin(self, starts: Array, softness: Array, violation: Array) -> tuple[_Walk, tuple[jax.Array, ...]]:
        """State of some starts, and their prices."""
        values = np.stack([self.forms.values(z) for z in starts])
        slopes = np.stack([self.forms.slopes(z) for z in starts])
        price = (jnp.asarray(softness), jnp.asarray(violation))
        best, top = self._scored(jnp.asarray(values), *price)
        free = jnp.zeros(starts.shape, dtype=jnp.int64)
        z = jnp.asarray(starts)
        return _Walk(z, jnp.asarray(values), jnp.asarray(slopes), free, best, top, z), price

    @cached_property
    def _scored(self) -> Callable[..., tuple[jax.Array, jax.Array]]:
        """Soft and true score of many starts, compiled."""

        def both(values: jax.Array, softness: jax.Array, violation: jax.Array) -> tuple[jax.Array, jax.Array]:
            return self._score(values, softness, violation), self._true_score(values, violation)

        return jax.jit(jax.vmap(both))

    def _true_score(self, values: jax.Array, violation: jax.Array) -> Any:
        """Score of forms (form,) with the true minimum."""
        return self._score(values, None, violation)

    def _score(self, values: jax.Array, softness: jax.Array | None, violation: jax.Array) -> Any:
        """Score of forms (form, ...), shape (...): ``scoring.score`` written out form by form, which XLA fuses."""
        forms = list(values)
        if self.forms.improves:
            *conditions, worth = forms
            return worth + violation * sum((jnp.minimum(c, 0.0) for c in conditions), jnp.zeros(()))
        counting = [c for c, counts in zip(forms, self.forms.counts, strict=True) if counts]
        equal = [c for c, counts in zip(forms, self.forms.counts, strict=True) if not counts]
        missed = violation * sum((jnp.minimum(c, 0.0) for c in equal), jnp.zeros(()))
        if not counting:
            return missed + jnp.minimum(reduce(jnp.minimum, equal), 0.5)
        least = reduce(jnp.minimum, counting)
        if softness is None:
            return least + missed
        tail = sum((_decay((c - least) / softness) for c in counting), jnp.zeros(()))
        return least - softness * _logarithm(tail) + missed

    @cached_property
    def _advance(self) -> Callable[..., _Walk]:
        n, first, second = self.forms.layout.count, self._first, self._second

        def flip(tables: _Tables, walk: _Walk, variable: jax.Array, amount: jax.Array) -> _Walk:
            """Move one variable by ``amount`` (-2 z to reverse it, 0 to leave it)."""
            values = walk.values + amount * walk.slopes[:, variable] + amount**2 * tables.curvature[:, variable]
            slopes = walk.slopes + amount * tables.changes[variable]
            z = walk.z + jnp.where(jnp.arange(n) == variable, amount, 0.0)
            return walk._replace(values=values, slopes=slopes, z=z)

        def step(
            tables: _Tables, walk: _Walk, softness: jax.Array, violation: jax.Array, now: jax.Array, until: jax.Array
        ) -> _Walk:
            # moves are only compared here: single precision is twice as fast; values and slopes stay in double
            z, slopes = walk.z.astype(jnp.float32), walk.slopes.astype(jnp.float32)
            single = -2.0 * z[None] * slopes + 4.0 * tables.curvature.astype(jnp.float32)
            facing = 4.0 * (z[first] * z[second])[None] * tables.coupling.astype(jnp.float32)
            both = single[:, first] + single[:, second] + facing
            after = walk.values.astype(jnp.float32)[:, None] + jnp.concatenate([single, both], axis=1)
            scores = self._score(after, softness.astype(jnp.float32), violation.astype(jnp.float32))
            barred = walk.free > now
            barred = jnp.concatenate([barred, barred[first] | barred[second]])
            # more than rounding above the best: else the way back to it would never be barred
            known = (walk.best + _ROUNDING * (1.0 + jnp.abs(walk.best))).astype(jnp.float32)
            scores = jnp.where(barred & (scores <= known), -jnp.inf, scores)
            move = jnp.argmax(scores)
            pair = tables.pairs[jnp.maximum(move - n, 0)] if len(self._tables.pairs) else jnp.zeros(2, dtype=jnp.int64)
            joint = move >= n
            i, j = jnp.where(joint, pair[0], move), pair[1]
            at = jnp.arange(n)
            free = jnp.where(at == i, until[0], walk.free)
            free = jnp.where((at == j) & joint, until[1], free)
            walk = flip(tables, walk, i, -2.0 * walk.z[i])
            walk = flip(tables, walk, j, jnp.where(joint, -2.0 * walk.z[j], 0.0))
            reached = self._score(walk.values, softness, violation)
            true = self._true_score(walk.values, violation)
            top_z = jnp.where(true > walk.top, walk.z, walk.top_z)
            best, top = jnp.maximum(reached, walk.best), jnp.maximum(true, walk.top)
            return walk._replace(free=free, best=best, top=top, top_z=top_z)

        many = jax.vmap(step, in_axes=(None, 0, 0, 0, None, 0))

        def advance(tables: _Tables, walk: _Walk, softness: jax.Array, violation: jax.Array, times: Any) -> _Walk:
            return jax.lax.scan(lambda w, at: (many(tables, w, softness, violation, *at), None), walk, times)[0]

        return jax.jit(advance)


def _decay(x: Any) -> Any:
    """exp(-x) for x >= 0 to a few percent by three squarings: XLA's exp and log took most of a step's time."""
    base = jnp.maximum(1.0 - x / 8.0, 0.0)
    for _ in range(3):
        base = base * base
    return base


def _logarithm(x: Any) -> Any:
    """log(x) for x >= 1 by its odd series in (x - 1) / (x + 1), rising and smooth; 1 % off at x = 6."""
    y = (x - 1.0) / (x + 1.0)
    square = y * y
    return 2.0 * y * (1.0 + square * (1.0 / 3.0 + square * (0.2 + square / 7.0)))


def _run_or_list(numbers: NDArray[np.intp]) -> slice | NDArray[np.intp]:
    """A slice where the numbers are a run (XLA copies it, but gathers a list element by element)."""
    if numbers.size and (np.diff(numbers) == 1).all():
        return slice(int(numbers[0]), int(numbers[-1]) + 1)
    return numbers
