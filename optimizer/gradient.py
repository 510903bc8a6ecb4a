"""Gradient design: many relaxed patterns at once, latent -> filter -> projection -> physics, by one compiled scan.

Without an improve the loss is a log-sum-exp of the conditions that count, on the scale of their own spread, so that the
worst ones are pushed and the others not forgotten; equalities are pulled inside their bands. With an improve, its worth
is pushed and the conditions are held by an augmented Lagrangian.
"""

from __future__ import annotations

from collections.abc import Callable
from functools import cached_property
from typing import Any, NamedTuple

import jax
import jax.numpy as jnp
import numpy as np
import optax  # type: ignore[import-untyped]
from numpy.typing import NDArray

from .layout import FaceMap
from .relaxed import Relaxed, Tables
from .stopping import Budget

Array = NDArray[np.float64]

CHUNK = 50
"""Steps between two looks at the budget."""
_RATE = 0.05
_SHARPNESS = (1.0, 8.0)
_STEEPNESS = (1.0, 4.0)
_MARGIN = 0.004
"""Conditions are aimed at this much above zero, so that rounding keeps them."""
_INSIDE = 0.2
"""Equalities are aimed at this fraction of their half band."""
_STIFFNESS = 4.0
_DUAL_RATE = 0.1


class _State(NamedTuple):
    """What one start carries: latents (n,), the optimizer's state, multipliers (condition,)."""

    latent: jax.Array
    adam: Any
    dual: jax.Array


class GradientDesign:
    """Relaxed design from random or given starts.

    Attributes:
        relaxed: The problem as functions of the variables.
        steps: Steps of each start.
    """

    def __init__(self, relaxed: Relaxed, steps: int = 300) -> None:
        self.relaxed = relaxed
        self.steps = steps
        self._counts = jnp.asarray(relaxed.problem.counts)
        self._adam = optax.adam(_RATE)
        self._filters = [_filter(brush) for brush in relaxed.layout.brushes]

    def run(self, starts: Array, budget: Budget) -> Array:
        """Design from latents (m, n); the number of starts is best kept the same, since it is compiled for.

        Returns:
            Relaxed variables in [-1, 1], shape (m, n); what was reached so far when the budget ends it early.
        """
        latent = jnp.asarray(starts)
        count = self.relaxed.problem.counts.size
        state = jax.vmap(lambda x: _State(x, self._adam.init(x), jnp.zeros(count)))(latent)
        for first in range(0, self.steps, CHUNK):
            last = min(first + CHUNK, self.steps)
            if budget.reason() is not None or not budget.affords(len(starts) * (last - first)):
                break
            state = self._advance(self.relaxed.tables, state, jnp.arange(first, last) / self.steps)
            budget.spend(len(starts) * (last - first))
        return np.asarray(self._project(state.latent))

    def project(self, latent: jax.Array, steepness: jax.Array | float) -> jax.Array:
        """Filter the latents over the pattern and project them towards -1 and +1, shape (n,)."""
        layout = self.relaxed.layout
        smooth = jnp.zeros(layout.count)
        for number, face in enumerate((layout.base, layout.mover)):
            if number == 1 and layout.linked:
                continue
            filtered = _filtered(face.pattern(latent, jnp), layout.masks[number], self._filters[number])
            smooth = smooth + _collect(face, filtered, layout.count)
        return jnp.tanh(steepness * smooth)

    def loss(self, tables: Tables, latent: jax.Array, dual: jax.Array, progress: jax.Array) -> Any:
        """Loss of one start, and its conditions."""
        steepness = _between(_STEEPNESS, progress)
        conditions, worth = self.relaxed.judge(tables, self.project(latent, steepness))
        if conditions.size == 0:
            return -worth, conditions
        if self.relaxed.problem.improves:
            short = jnp.maximum(dual - _STIFFNESS * (conditions - _aim(self._counts)), 0.0)
            return -worth + (short**2).sum() / (2.0 * _STIFFNESS), conditions
        counts = self.relaxed.problem.counts
        band = jnp.maximum(_INSIDE - conditions[~counts], 0.0)
        missed = _STIFFNESS * (band + 0.5 * band**2).sum()
        push = conditions[counts]
        if not counts.any():
            return missed, conditions
        spread = jax.lax.stop_gradient(push.max() - push.min()) + 0.02
        sharpness = _between(_SHARPNESS, progress) / spread
        return jax.nn.logsumexp(-sharpness * push) / sharpness + missed, conditions

    @cached_property
    def _advance(self) -> Callable[..., _State]:
        def step(tables: Tables, state: _State, progress: jax.Array) -> _State:
            slope, conditions = jax.grad(self.loss, argnums=1, has_aux=True)(tables, state.latent, state.dual, progress)
            # the loss has no natural size: a unit gradient lets one rate serve forces in N and fields in mT
            slope = slope / (jnp.sqrt((slope**2).mean()) + 1e-30)
            change, adam = self._adam.update(slope, state.adam)
            short = state.dual - _STIFFNESS * (conditions - _aim(self._counts))
            dual = state.dual + _DUAL_RATE * (jnp.maximum(short, 0.0) - state.dual)
            return _State(jnp.clip(state.latent + change, -2.0, 2.0), adam, dual)

        many = jax.vmap(step, in_axes=(None, 0, None))

        def advance(tables: Tables, state: _State, progress: jax.Array) -> _State:
            return jax.lax.scan(lambda carry, at: (many(tables, carry, at), None), state, progress)[0]

        return jax.jit(advance)

    @cached_property
    def _project(self) -> Callable[[jax.Array], jax.Array]:
        return jax.jit(jax.vmap(lambda latent: self.project(latent, _STEEPNESS[1])))


def _aim(counts: jax.Array) -> jax.Array:
    return jnp.where(counts, _MARGIN, _INSIDE)


def _between(ends: tuple[float, float], progress: jax.Array | float) -> Any:
    """Geometric path from the first end to the second."""
    return ends[0] * (ends[1] / ends[0]) ** progress


def _filter(brush: int) -> Array:
    """Binomial weights along one axis that suppress poles narrower than ``brush`` cells; [1] for one cell."""
    weights = np.ones(1)
    for _ in range(2 * (brush - 1)):
        weights = np.convolve(weights, [0.5, 0.5])
    return weights


def _filtered(pattern: jax.Array, mask: NDArray[np.bool_], weights: Array) -> jax.Array:
    """Weighted mean over the neighbours on the part."""
    if weights.size == 1:
        return pattern
    on = jnp.asarray(mask.astype(np.float64))
    return on * _smear(pattern * on, weights) / jnp.maximum(_smear(on, weights), 1e-9)


def _smear(values: jax.Array, weights: Array) -> jax.Array:
    """Separable convolution with zeros outside, as two banded matrix products (no padding of computed arrays)."""
    rows, columns = (_band(size, weights) for size in values.shape)
    return jnp.asarray(rows) @ values @ jnp.asarray(columns.T)


def _band(size: int, weights: Array) -> Array:
    half = weights.size // 2
    return np.asarray(sum(w * np.eye(size, k=k - half) for k, w in enumerate(weights)))


def _collect(face: FaceMap, pattern: jax.Array, count: int) -> jax.Array:
    """Read each variable of a part from the first of its cells, shape (n,); 0 for variables of the other part."""
    if (face.index < 0).all():
        return jnp.zeros(count)
    numbers, cells = np.unique(face.index[face.index >= 0], return_index=True)
    flat = np.nonzero(face.index.ravel() >= 0)[0][cells]
    read = pattern.reshape(-1)[flat] * face.sign.ravel()[flat] if not face.is_identity else pattern.reshape(-1)
    first, last = int(numbers[0]), int(numbers[-1]) + 1
    if last - first != numbers.size:  # variables of one part are consecutive by construction of the layout
        message = "variables of a part are not consecutive"
        raise ValueError(message)
    return jnp.concatenate([jnp.zeros(first), read, jnp.zeros(count - last)])
