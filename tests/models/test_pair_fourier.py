"""The differentiable evaluation against the plain one (``PairForms.values``), and its derivatives against Taylor."""

from __future__ import annotations

from collections.abc import Callable
from functools import cache

import jax
import jax.numpy as jnp
import numpy as np
import pytest
from numpy.typing import NDArray
from polewright.models.blank import Disc, Rectangle, Ring
from polewright.models.pair import Component, PairForms, Row, pair_forms
from polewright.models.pair_fourier import FourierForms, fourier_forms, transform_sizes, values
from polewright.models.part import Part
from polewright.models.patterns import checker, stripes, uniform

from ..tolerances import CANCELLED, EXACT, worst
from .parts import noise, plate
from .references import MM

Array = NDArray[np.float64]
Evaluate = Callable[[FourierForms, jax.Array, jax.Array], jax.Array]

COMPONENTS: tuple[Component, ...] = ("energy", "fx", "fy", "fz", "kxx", "kyy", "kxy", "kzz", "mx", "my", "mz")
POSES_MM = [(0.3, 0.0, 0.0), (1.0, 2.0, 0.0), (0.0, 0.0, -3.0), (4.0, -7.2, 0.5)]
PAIRS = {
    "equal, even": (plate(8, 8), plate(8, 8)),
    "odd, not square": (plate(9, 5), plate(9, 5)),
    "odd on even": (plate(8, 6), plate(5, 9)),
    "other thickness, remanence, coating": (
        Part(Rectangle(6.4 * MM, 4.0 * MM), 0.8 * MM, 3.0 * MM, 1.3, coating=0.02 * MM),
        Part(Rectangle(4.0 * MM, 7.2 * MM), 0.8 * MM, 1.5 * MM, 0.4, coating=0.03 * MM),
    ),
    "disc on ring": (
        Part(Disc(9.0 * MM), 1.0 * MM, 2.0 * MM, 1.2),
        Part(Ring(11.0 * MM, 4.0 * MM), 1.0 * MM, 2.0 * MM, 1.2),
    ),
    "one cell": (plate(1, 1), plate(1, 1)),
    "one row on one column": (plate(7, 1), plate(1, 6)),
}
every_pair = pytest.mark.parametrize("name", PAIRS)


@cache
def setup(name: str) -> tuple[PairForms, FourierForms, Evaluate]:
    """Forms of a pair, their transformed tables, and the function under test."""
    rows = [Row(component, *(np.array(pose) * MM)) for pose in POSES_MM for component in COMPONENTS]
    forms = pair_forms(*PAIRS[name], rows)
    sizes = transform_sizes(forms)
    return forms, fourier_forms(forms), lambda tables, a, b: values(tables, sizes, a, b)


@cache
def compiled(name: str) -> tuple[Evaluate, Callable[..., tuple[jax.Array, tuple[jax.Array, jax.Array]]]]:
    """The function compiled, and that of a weighted sum of its rows with both gradients."""
    evaluate = setup(name)[2]

    def weighted(tables: FourierForms, a: jax.Array, b: jax.Array, weights: jax.Array) -> jax.Array:
        return evaluate(tables, a, b) @ weights

    return jax.jit(evaluate), jax.jit(jax.value_and_grad(weighted, argnums=(1, 2)))


def relaxed(part: Part, seed: int) -> jax.Array:
    """Values in (-1, 1) on the part's cells, as a search carries them."""
    return jnp.asarray(np.where(part.mask, np.random.default_rng(seed).uniform(-1.0, 1.0, part.shape), 0.0))


def assert_equal_by_component(received: jax.Array, expected: Array, tier: float) -> None:
    """Each component on the scale of its own largest entry: they have different units."""
    by_component = np.asarray(received).reshape(len(POSES_MM), len(COMPONENTS)).T
    for name, got, want in zip(COMPONENTS, by_component, expected.reshape(by_component.T.shape).T, strict=True):
        size = np.abs(want).max()
        assert np.abs(got - want).max() <= tier * max(size, 1e-9), name


def test_float64_and_strict_ranks() -> None:
    assert jnp.zeros(1).dtype == jnp.float64
    with pytest.raises(ValueError, match="rank"):
        jnp.zeros(3) + jnp.zeros((2, 3))


@every_pair
def test_values_equal_the_plain_evaluation(name: str) -> None:
    forms, tables, _ = setup(name)
    for seed in (0, 1):
        a, b = relaxed(forms.base, seed), relaxed(forms.mover, 10 + seed)
        expected = forms.values(np.asarray(a), np.asarray(b))
        assert_equal_by_component(compiled(name)[0](tables, a, b), expected, CANCELLED)


@every_pair
def test_compiled_equals_interpreted(name: str) -> None:
    forms, tables, evaluate = setup(name)
    a, b = relaxed(forms.base, 2), relaxed(forms.mover, 3)
    assert_equal_by_component(compiled(name)[0](tables, a, b), np.asarray(evaluate(tables, a, b)), CANCELLED)


@every_pair
def test_a_batch_equals_a_loop(name: str) -> None:
    """To a tolerance and not to the bit: sums are ordered by the batch's size (STACK: traps)."""
    forms, tables, evaluate = setup(name)
    a = jnp.stack([relaxed(forms.base, seed) for seed in range(5)])
    b = jnp.stack([relaxed(forms.mover, 10 + seed) for seed in range(5)])
    together = jax.jit(jax.vmap(evaluate, in_axes=(None, 0, 0)))(tables, a, b)
    for n in range(5):
        assert_equal_by_component(together[n], np.asarray(compiled(name)[0](tables, a[n], b[n])), CANCELLED)


def test_even_forms_are_folded() -> None:
    """An aligned pair's axial force needs a quarter of the numbers of a full complex spectrum."""
    forms = pair_forms(plate(8, 6), plate(8, 6), [Row("fz", gap * MM) for gap in (0.1, 1.0)])
    (spectrum,) = fourier_forms(forms).spectra
    sizes = transform_sizes(forms)
    assert spectrum.imag is None
    assert spectrum.scatter is None
    assert spectrum.real.shape == (2, sizes[1] // 2 + 1, sizes[0] // 2 + 1)


@every_pair
def test_gradients_equal_the_products_of_the_forms(name: str) -> None:
    """The derivative of a K b is K b with respect to a and K' a with respect to b, from another code path."""
    forms, tables, _ = setup(name)
    a, b = relaxed(forms.base, 4), relaxed(forms.mover, 5)
    on_base, on_mover = forms.base_products(np.asarray(b)), forms.mover_products(np.asarray(a))
    for row in range(forms.count):
        _, slopes = compiled(name)[1](tables, a, b, jnp.asarray(np.eye(forms.count)[row]))
        for got, want in zip(slopes, (on_base[row], on_mover[row]), strict=True):
            assert np.abs(np.asarray(got) - want).max() <= CANCELLED * max(np.abs(want).max(), 1e-9)


@every_pair
@pytest.mark.parametrize("moved", ["base", "mover", "both"])
def test_taylor(name: str, moved: str) -> None:
    """The rest after the linear term falls by four at each halving; it is zero where only one pattern moves."""
    forms, tables, evaluate = setup(name)
    a, b, da, db = (
        relaxed(part, seed)
        for seed, part in zip((6, 7, 8, 9), (forms.base, forms.mover, forms.base, forms.mover), strict=True)
    )
    da, db = da * (moved != "mover"), db * (moved != "base")
    # every row on the scale of the largest value of its kind, so that none is drowned
    evaluate, differentiate = compiled(name)
    size = np.abs(np.asarray(evaluate(tables, a, b)).reshape(len(POSES_MM), -1)).max(0)
    weights = jnp.asarray(np.tile(1.0 / np.maximum(size, 1e-9), len(POSES_MM)))
    weights = weights * jnp.asarray(np.random.default_rng(10).normal(size=forms.count))

    value, (slope_a, slope_b) = differentiate(tables, a, b, weights)
    linear = (slope_a * da).sum() + (slope_b * db).sum()
    steps = 0.5 ** np.arange(6)
    rests = np.array([float(evaluate(tables, a + h * da, b + h * db) @ weights - value - h * linear) for h in steps])
    if moved == "both":
        assert rests[1:] / rests[:-1] == pytest.approx(np.full(5, 0.25), rel=1e-5)
    else:
        assert np.abs(rests).max() < CANCELLED * forms.count


@pytest.mark.parametrize("make", [uniform, lambda mask: stripes(mask, 1), lambda mask: checker(mask, 1), np.zeros_like])
def test_degenerate_patterns_have_finite_values_and_gradients(
    make: Callable[[NDArray[np.bool_]], NDArray[np.int8]],
) -> None:
    forms, tables, _ = setup("equal, even")
    a = jnp.asarray(make(forms.base.mask).astype(np.float64))
    b = jnp.asarray(make(forms.mover.mask).astype(np.float64))
    value, slopes = compiled("equal, even")[1](tables, a, b, jnp.ones(forms.count))
    assert np.isfinite(value)
    assert all(np.isfinite(slope).all() for slope in slopes)


def test_reversing_both_patterns_changes_nothing() -> None:
    forms, tables, evaluate = setup("odd on even")
    a, b = (jnp.asarray(noise(part, 11).astype(np.float64)) for part in (forms.base, forms.mover))
    assert worst(evaluate(tables, -a, -b), evaluate(tables, a, b)) < EXACT


def test_compiled_once_for_all_patterns() -> None:
    """A search evaluates thousands of patterns: only their shape may cost a compilation."""
    forms, tables, evaluate = setup("equal, even")
    traced: list[None] = []

    def counted(*arguments: jax.Array) -> jax.Array:
        traced.append(None)
        return evaluate(tables, *arguments)

    once = jax.jit(counted)
    for seed in range(3):
        once(relaxed(forms.base, seed), relaxed(forms.mover, seed))
    assert len(traced) == 1


def test_no_forms_no_values() -> None:
    forms = pair_forms(plate(3, 3), plate(3, 3), [])
    a = relaxed(forms.base, 0)
    assert values(fourier_forms(forms), transform_sizes(forms), a, a).shape == (0,)
