"""The problem as differentiable functions of the variables, compiled once for a problem and layout."""

from __future__ import annotations

from collections.abc import Callable
from functools import cached_property
from typing import Any, NamedTuple

import jax
import jax.numpy as jnp
import numpy as np
from numpy.typing import NDArray

from ..models.pair_fourier import FourierForms, fourier_forms, transform_sizes, values
from ..objectives.plan import Response
from ..objectives.problem import Problem
from .layout import Layout

Array = NDArray[np.float64]

BATCH = 64
"""Designs evaluated together; always padded to this many, so that nothing recompiles and bits do not change."""


class Tables(NamedTuple):
    """Arrays that compiled functions take as arguments (as constants they would be compiled in).

    Attributes:
        forms: The pair's forms.
        linear_base: Linear rows on the base's cells.
        linear_mover: Linear rows on the mover's cells.
        offsets: What the surrogate of each condition overstates, shape (condition,).
    """

    forms: FourierForms
    linear_base: jax.Array
    linear_mover: jax.Array
    offsets: jax.Array


class Relaxed:
    """Response and conditions of variables.

    Attributes:
        problem: What is asked.
        layout: What is free.
        tables: Arrays for the compiled functions.
    """

    def __init__(self, problem: Problem, layout: Layout) -> None:
        self.problem = problem
        self.layout = layout
        self._sizes = transform_sizes(problem.forms)
        self.tables = Tables(
            fourier_forms(problem.forms),
            jnp.asarray(problem.linear_base),
            jnp.asarray(problem.linear_mover),
            jnp.zeros(problem.counts.size),
        )

    def response(self, tables: Tables, a: jax.Array, b: jax.Array) -> Response:
        """The plan's numbers for one pattern pair."""
        pair = values(tables.forms, self._sizes, a, b)
        linear = tables.linear_base @ a.reshape(-1) + tables.linear_mover @ b.reshape(-1)
        return Response(jnp, pair, linear, a, b)

    def judge(self, tables: Tables, z: jax.Array) -> tuple[jax.Array, jax.Array]:
        """Conditions (condition,) and worth of the improve (0 without one) for variables z (n,)."""
        response = self.response(tables, *self.layout.patterns(z, jnp))
        conditions = self.problem.conditions(response) - tables.offsets
        worth = self.problem.improvement(response) if self.problem.improves else jnp.zeros(())
        return conditions, worth

    @cached_property
    def _batched(self) -> Callable[..., Any]:
        return jax.jit(jax.vmap(self.judge, in_axes=(None, 0)))

    def judge_many(self, z: Array) -> tuple[Array, Array]:
        """Conditions (m, condition) and worth (m,) of many sets of variables (m, n), in batches of one size."""
        conditions, worth = np.zeros((len(z), self.problem.counts.size)), np.zeros(len(z))
        for first in range(0, len(z), BATCH):
            part = z[first : first + BATCH]
            padded = np.concatenate([part, np.zeros((BATCH - len(part), z.shape[1]))])
            found = self._batched(self.tables, jnp.asarray(padded))
            conditions[first : first + BATCH] = np.asarray(found[0])[: len(part)]
            worth[first : first + BATCH] = np.asarray(found[1])[: len(part)]
        return conditions, worth

    def calibrated(self, offsets: Array) -> None:
        """Take from now on ``offsets`` from the conditions: what their surrogates overstate at the best design."""
        self.tables = self.tables._replace(offsets=jnp.asarray(offsets))
