"""No read outside an operand: the evaluation on inputs that were just computed, between forbidden pages."""

from __future__ import annotations

import signal
import sys

import jax
import jax.numpy as jnp
import numpy as np
import pytest
from polewright.models.pair import Component, Row, pair_forms
from polewright.models.pair_fourier import FourierForms, fourier_forms, transform_sizes, values

from ..guard_pages import count_for, guarded, run_apart
from .parts import plate
from .references import MM

pytestmark = pytest.mark.skipif(not sys.platform.startswith("linux"), reason="forbidden pages are made for Linux here")

SIZES = (8, 16, 32, 64)
REPEATS = 10
COMPONENTS: tuple[Component, ...] = ("fz", "fx", "fy", "my")


def batch(n: int) -> jax.Array:
    """Numbers in [0, 1), shape (design, n, n), with nothing readable beside them."""
    return guarded(np.random.default_rng(n).uniform(size=(count_for(n * n), n, n)))


def guarded_evaluation() -> None:
    """Runs in a process of its own."""
    for n in SIZES:
        part = plate(n, n)
        # whole, odd and fractional offsets: folded, imaginary and full spectra
        rows = [Row(c, 0.5 * MM, dx * MM) for c in COMPONENTS for dx in (0.0, 0.3)]
        forms = pair_forms(part, part, rows)
        sizes = transform_sizes(forms)

        def loss(tables: FourierForms, z: jax.Array, sizes: tuple[int, int] = sizes) -> jax.Array:
            return values(tables, sizes, 2.0 * z - 1.0, 1.0 - 2.0 * z).sum()

        tables, z = fourier_forms(forms), batch(n)
        for function in (loss, jax.value_and_grad(loss, argnums=1)):
            many = jax.jit(jax.vmap(function, in_axes=(None, 0)))
            for _ in range(REPEATS):
                jax.block_until_ready(many(tables, z))  # type: ignore[no-untyped-call]


def guarded_padding() -> None:
    """The obvious way, which reads outside; runs in a process of its own."""
    for n in SIZES:
        z, border = batch(n), ((0, n), (0, n))
        many = jax.jit(jax.vmap(lambda x, border=border: jnp.fft.fft2(jnp.pad(2.0 * x - 1.0, border))))
        for _ in range(REPEATS):
            jax.block_until_ready(many(z))  # type: ignore[no-untyped-call]


def test_evaluation_and_gradient_read_nothing_outside() -> None:
    assert run_apart(__file__, "guarded_evaluation") == 0


def test_the_guard_catches_a_fused_padding() -> None:
    """What the test above is worth: the obvious padding is caught as long as XLA has that flaw."""
    code = run_apart(__file__, "guarded_padding")
    if code == 0:
        pytest.skip("this XLA pads computed arrays without reading outside")
    assert code == -signal.SIGSEGV
