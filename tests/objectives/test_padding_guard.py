"""No read outside an operand: every surrogate and its gradient on inputs between forbidden pages."""

from __future__ import annotations

import sys

import jax
import jax.numpy as jnp
import numpy as np
import pytest
from polewright.objectives.catalogue import CATALOGUE

from ..guard_pages import count_for, guarded, run_apart
from ..models.parts import plate
from .examples import Compiled, Tables, problem

pytestmark = pytest.mark.skipif(not sys.platform.startswith("linux"), reason="forbidden pages are made for Linux here")

CELLS = 16
REPEATS = 5


def guarded_surrogates() -> None:
    """Runs in a process of its own."""
    part = plate(CELLS, CELLS)
    z = guarded(np.random.default_rng(0).uniform(size=(count_for(CELLS**2), CELLS, CELLS)))
    for name in CATALOGUE:
        asked = Compiled(problem(name, part, part))

        def loss(tables: Tables, z: jax.Array, asked: Compiled = asked) -> jax.Array:
            return asked.surrogate(tables, 2.0 * z - 1.0, 1.0 - 2.0 * z).sum()

        many = jax.jit(jax.vmap(jax.value_and_grad(loss, argnums=1), in_axes=(None, 0)))
        for _ in range(REPEATS):
            jax.block_until_ready(many(asked.tables, z))  # type: ignore[no-untyped-call]


def paddings(name: str) -> list[str]:
    """Operations of a surrogate and its gradient that pad an array."""
    part = plate(6, 5)
    asked = Compiled(problem(name, part, part))
    a = jnp.ones(part.shape)
    weights = jnp.ones(asked.quantity.elements)
    text = str(jax.make_jaxpr(asked.slope)(asked.tables, a, a, weights))
    return [
        line.strip() for line in text.splitlines() if any(word in line for word in (" pad[", "dynamic_update_slice"))
    ]


@pytest.mark.parametrize("name", CATALOGUE)
def test_nothing_is_padded(name: str) -> None:
    """Neither a pad nor what the derivative of a slice becomes: those crash now and then, too seldom to be noticed."""
    assert paddings(name) == []


def test_surrogates_and_gradients_read_nothing_outside() -> None:
    assert run_apart(__file__, "guarded_surrogates") == 0
