"""What an evaluation costs, as ratios in one run; times are printed and never asserted.

The pair is that of the notes: 32 x 32 cells each, the axial force at 24 gaps.
"""

from __future__ import annotations

import os
import subprocess
import sys
from collections.abc import Callable
from functools import cache
from pathlib import Path
from typing import NamedTuple

import jax
import jax.numpy as jnp
import numpy as np
import pytest
from polewright.models.pair import Row, pair_forms
from polewright.models.pair_fourier import FourierForms, fourier_forms, transform_sizes, values

from ..models.library import library_force
from ..models.parts import noise, plate
from ..models.references import MM
from .timing import least, settle, show

ROOT = Path(__file__).resolve().parents[2]
CELLS = 32
GAPS_MM = np.linspace(0.1, 10.0, 24)
BATCH = 256
Capture = pytest.CaptureFixture[str]


class Case(NamedTuple):
    """Compiled functions of the tables and patterns, and arguments for them."""

    tables: FourierForms
    value: Callable[..., jax.Array]
    gradient: Callable[..., tuple[jax.Array, tuple[jax.Array, jax.Array]]]
    batch: Callable[..., jax.Array]
    bare: Callable[..., tuple[jax.Array, jax.Array]]
    one: tuple[jax.Array, jax.Array]
    many: tuple[jax.Array, jax.Array]
    filled: tuple[jax.Array, jax.Array]


@cache
def case() -> Case:
    part = plate(CELLS, CELLS)
    forms = pair_forms(part, part, [Row("fz", gap * MM) for gap in GAPS_MM])
    sizes = transform_sizes(forms)
    weights = jnp.asarray(np.random.default_rng(0).normal(size=forms.count))

    def value(tables: FourierForms, a: jax.Array, b: jax.Array) -> jax.Array:
        return values(tables, sizes, a, b)

    def weighted(tables: FourierForms, a: jax.Array, b: jax.Array) -> jax.Array:
        return value(tables, a, b) @ weights

    many = [
        jnp.asarray(np.stack([noise(part, seed + n) for n in range(BATCH)]).astype(np.float64)) for seed in (0, BATCH)
    ]
    filled = [jnp.asarray(np.pad(np.asarray(p[0]), [(0, s - CELLS) for s in sizes])) for p in many]
    return Case(
        fourier_forms(forms),
        jax.jit(value),
        jax.jit(jax.value_and_grad(weighted, argnums=(1, 2))),
        jax.jit(jax.vmap(value, in_axes=(None, 0, 0))),
        jax.jit(lambda a, b: (jnp.fft.rfft2(a), jnp.fft.rfft2(b))),
        (many[0][0], many[1][0]),
        (many[0], many[1]),
        (filled[0], filled[1]),
    )


def test_forces_at_24_gaps_against_their_two_transforms(capsys: Capture) -> None:
    c = case()

    def ratio() -> float:
        bare, value = least([lambda: c.bare(*c.filled), lambda: c.value(c.tables, *c.one)], rounds=10, repeats=40)
        show(
            capsys,
            f"24 gaps x (32 x 32)^2: {value * 1e6:.0f} us, two bare FFTs {bare * 1e6:.0f} us: {value / bare:.2f}",
        )
        return float(value / bare)

    assert settle(ratio, 1.5) <= 1.5


def test_value_and_gradient_against_the_value(capsys: Capture) -> None:
    c = case()

    def ratio() -> float:
        calls = [lambda: c.value(c.tables, *c.one), lambda: c.gradient(c.tables, *c.one)]
        value, gradient = least(calls, rounds=10, repeats=40)
        show(
            capsys,
            f"value and both gradients: {gradient * 1e6:.0f} us, value {value * 1e6:.0f} us: {gradient / value:.2f}",
        )
        return float(gradient / value)

    assert settle(ratio, 2.0) <= 2.0


def test_a_batch_against_single_values(capsys: Capture) -> None:
    c = case()

    def ratio() -> float:
        calls = [lambda: c.value(c.tables, *c.one), lambda: c.batch(c.tables, *c.many)]
        single, together = least(calls, rounds=10, repeats=4)
        each = together / BATCH
        show(capsys, f"batch of 256: {each * 1e6:.1f} us each, single {single * 1e6:.0f} us: {each / single:.2f}")
        return float(each / single)

    assert settle(ratio, 0.7) <= 0.7


def test_against_the_force_of_the_field_library(capsys: Capture) -> None:
    """One force of two 4 x 4 patterns; the library meshes the target to about 1e-3, we are exact."""
    part = plate(4, 4)
    a, b = noise(part, 1), noise(part, 2)
    forms = pair_forms(part, part, [Row("fz", 1.0 * MM)])
    sizes, tables = transform_sizes(forms), fourier_forms(forms)
    compiled = jax.jit(lambda tables, a, b: values(tables, sizes, a, b))
    x, y = (jnp.asarray(pattern.astype(np.float64)) for pattern in (a, b))

    def built() -> jax.Array:
        return values(fourier_forms(pair_forms(part, part, [Row("fz", 1.0 * MM)])), sizes, x, y)

    ours, whole = least([lambda: compiled(tables, x, y), built], rounds=3, repeats=5)
    (theirs,) = least([lambda: library_force(part, part, a, b, 1.0 * MM, 0.0, 0.0, 1000)], rounds=1, repeats=1)
    show(capsys, f"one force of (4 x 4)^2: library {theirs * 1e3:.0f} ms, {theirs / ours:.0f} times an evaluation")
    show(capsys, f"and {theirs / whole:.0f} times the same with its tables built anew")
    assert ours < theirs


def test_help_against_an_empty_python(capsys: Capture) -> None:
    path = os.pathsep.join([str(ROOT / ".ci" / "path"), os.environ.get("PYTHONPATH", "")])
    environment = {**os.environ, "PYTHONPATH": path}

    def run(*arguments: str) -> int:
        command = [sys.executable, *arguments]
        return subprocess.run(command, env=environment, cwd=ROOT.parent, check=True, capture_output=True).returncode

    def ratio() -> float:
        empty, asked = least([lambda: run("-c", "pass"), lambda: run("-m", "polewright.runs", "--help")], 6, 1)
        show(
            capsys, f"polewright --help: {asked * 1e3:.0f} ms, python -c pass {empty * 1e3:.0f} ms: {asked / empty:.2f}"
        )
        return float(asked / empty)

    assert settle(ratio, 6.0) <= 6.0
