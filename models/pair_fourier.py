"""The pair's bilinear forms in the Fourier domain: differentiable, batched, one transform of each pattern for all rows.

By Parseval the value of a row is a dot product of the cross spectrum conj(A) B with the row's own table, so the
physics of all gaps and components costs one forward transform of each pattern and one matrix product. Forms whose
table is even in the displacement have a real spectrum and need only the real part; forms whose table is even along y
(all of an aligned pair but F_y, K_xy and moments about x and z) need only half of the frequencies along y.

Zero-filling is done by concatenation: padding an array that has just been computed makes XLA's CPU code read outside
the operand. The derivative of a slice is such a padding, and that of a real transform holds one, so both have
derivatives of their own here.
"""

from __future__ import annotations

from collections.abc import Iterator
from functools import partial
from typing import NamedTuple

import jax
import jax.numpy as jnp
import numpy as np
from numpy.typing import NDArray
from scipy import fft

from .pair import PairForms, Term

jax.config.update("jax_enable_x64", True)  # type: ignore[no-untyped-call]  # pair kernels are unusable in float32 (REFERENCES: cancellation)

Array = NDArray[np.float64]

_ROUNDING = 1e-13
"""What is this much smaller than a table's largest entry is rounding."""


class Spectrum(NamedTuple):
    """Row tables of one pair of cell weights.

    Attributes:
        weight_base: Factors of the base's cells (ny, nx), or None for ones.
        weight_mover: Factors of the mover's cells (my, mx), or None for ones.
        scatter: Which rows of all the table's rows are, (row, k) of zeros and ones, or None when it is all of them.
        real: Factors of Re(conj(A) B), shape (k, frequency x, frequency y); only frequencies >= 0 along y when folded.
        imag: Factors of Im(conj(A) B), of the same shape, or None when all vanish.
    """

    weight_base: jax.Array | None
    weight_mover: jax.Array | None
    scatter: jax.Array | None
    real: jax.Array
    imag: jax.Array | None


class FourierForms(NamedTuple):
    """Everything ``values`` needs, as arrays; a pytree."""

    spectra: tuple[Spectrum, ...]


def fourier_forms(forms: PairForms) -> FourierForms:
    """Transform the tables of ``forms``; done once for a problem."""
    return FourierForms(tuple(spectrum for term in forms.terms for spectrum in _spectra(forms, term)))


def values(forms: FourierForms, sizes: tuple[int, int], a: jax.Array, b: jax.Array) -> jax.Array:
    """Value of every row in SI units.

    Args:
        forms: From ``fourier_forms``.
        sizes: From ``transform_sizes``.
        a: Base pattern (ny, nx), float64.
        b: Mover pattern (my, mx), float64.

    Returns:
        Shape (row,).
    """
    plain_a, plain_b = _transform(a, sizes), _transform(b, sizes)
    total: jax.Array | None = None
    for spectrum in forms.spectra:
        left = plain_a if spectrum.weight_base is None else _transform(a * spectrum.weight_base, sizes)
        right = plain_b if spectrum.weight_mover is None else _transform(b * spectrum.weight_mover, sizes)
        out = _weigh(spectrum.real, left.real * right.real + left.imag * right.imag)
        if spectrum.imag is not None:
            out = out + _weigh(spectrum.imag, left.real * right.imag - left.imag * right.real)
        if spectrum.scatter is not None:
            out = spectrum.scatter @ out
        total = out if total is None else total + out
    return jnp.zeros(0) if total is None else total


def transform_sizes(forms: PairForms) -> tuple[int, int]:
    """Size (Ny, Nx) of the zero-filled transforms."""
    (ny, nx), (my, mx) = forms.base.shape, forms.mover.shape
    return fft.next_fast_len(ny + my - 1, real=True), fft.next_fast_len(nx + mx - 1, real=True)


def _transform(pattern: jax.Array, sizes: tuple[int, int]) -> jax.Array:
    """Zero-filled real transform, shape (frequency x, frequency y)."""
    return _padded_transform((pattern.shape[0], pattern.shape[1]), sizes, pattern)


@partial(jax.custom_vjp, nondiff_argnums=(0, 1))
def _padded_transform(shape: tuple[int, int], sizes: tuple[int, int], pattern: jax.Array) -> jax.Array:
    """``_transform`` of a pattern of ``shape``, one axis at a time."""
    wide = jnp.concatenate([pattern, jnp.zeros((shape[0], sizes[1] - shape[1]))], axis=1)
    half = jnp.fft.rfft(wide, axis=1).T
    high = jnp.concatenate([half, jnp.zeros((half.shape[0], sizes[0] - shape[0]), half.dtype)], axis=1)
    return jnp.fft.fft(high, axis=1)


def _transform_forward(shape: tuple[int, int], sizes: tuple[int, int], pattern: jax.Array) -> tuple[jax.Array, None]:
    return _padded_transform(shape, sizes, pattern), None


def _transform_backward(shape: tuple[int, int], sizes: tuple[int, int], _: None, slope: jax.Array) -> tuple[jax.Array]:
    """Real part of the transposed transform: a sum over half of the frequencies is an inverse real transform."""
    half = jnp.fft.fft(slope, axis=1)[:, : shape[0]].T
    weights = sizes[1] / _multiplicity(sizes[1])
    wide = jax.lax.fft(jnp.conj(half) * weights[None, :], jax.lax.FftType.IRFFT, (sizes[1],))
    return (wide[:, : shape[1]],)


_padded_transform.defvjp(_transform_forward, _transform_backward)


def _weigh(table: jax.Array, cross: jax.Array) -> jax.Array:
    """Sum of a table (k, frequency x, frequency y) times one part of the cross spectrum, shape (k,)."""
    if table.shape[2] < cross.shape[1]:
        cross = _folded(cross.shape[1], cross)
    return table.reshape(table.shape[0], -1) @ cross.reshape(-1)


@partial(jax.custom_vjp, nondiff_argnums=(0,))
def _folded(size: int, cross: jax.Array) -> jax.Array:
    """Add what belongs to opposite frequencies along y, of ``size``; shape (frequency x, size // 2 + 1)."""
    pairs = (size - 1) // 2
    both = cross[:, 1 : pairs + 1] + cross[:, size - pairs :][:, ::-1]
    return jnp.concatenate([cross[:, :1], both, cross[:, pairs + 1 : size - pairs]], axis=1)


def _folded_forward(size: int, cross: jax.Array) -> tuple[jax.Array, None]:
    return _folded(size, cross), None


def _folded_backward(size: int, _: None, slope: jax.Array) -> tuple[jax.Array]:
    """Both of a pair take the slope of their sum."""
    return (jnp.concatenate([slope, slope[:, 1 : (size - 1) // 2 + 1][:, ::-1]], axis=1),)


_folded.defvjp(_folded_forward, _folded_backward)


def _multiplicity(size: int) -> Array:
    """How many frequencies of a full transform each one of a real transform stands for, shape (size // 2 + 1,)."""
    twice = np.full(size // 2 + 1, 2.0)
    twice[0] = 1.0
    if size % 2 == 0:
        twice[-1] = 1.0
    return twice


def _spectra(forms: PairForms, term: Term) -> Iterator[Spectrum]:
    """Transform one term's tables, displacement 0 at the origin of the period, Parseval weights included."""
    sizes = transform_sizes(forms)
    ny, nx = forms.base.shape
    padded = np.zeros((term.tables.shape[0], *sizes))
    padded[:, : term.tables.shape[1], : term.tables.shape[2]] = term.tables
    circular = np.roll(padded, (-(ny - 1), -(nx - 1)), axis=(1, 2))
    weighted = (fft.rfft2(circular) * _multiplicity(sizes[1]) / (sizes[0] * sizes[1])).swapaxes(1, 2)
    opposite = np.roll(weighted[:, :, ::-1], 1, axis=2)
    even = np.abs(weighted - opposite).max((1, 2)) <= _ROUNDING * np.abs(weighted).max((1, 2))
    for chosen, table in ((even, weighted[:, :, : sizes[0] // 2 + 1]), (~even, weighted)):
        if chosen.any():
            yield _spectrum(forms, term, chosen, table[chosen])


def _spectrum(forms: PairForms, term: Term, chosen: NDArray[np.bool_], table: NDArray[np.complex128]) -> Spectrum:
    """The rows ``chosen`` of a term with their transformed table."""
    rows = term.rows[chosen]
    everything = rows.size == forms.count and bool((rows == np.arange(forms.count)).all())
    real = np.abs(table.imag).max() <= _ROUNDING * np.abs(table.real).max()
    ones_base, ones_mover = np.ones(forms.base.shape), np.ones(forms.mover.shape)
    return Spectrum(
        None if term.weight_base == "1" else jnp.asarray(forms.weighted_base(ones_base, term.weight_base)),
        None if term.weight_mover == "1" else jnp.asarray(forms.weighted_mover(ones_mover, term.weight_mover)),
        None if everything else jnp.asarray(np.eye(forms.count)[:, rows]),
        jnp.asarray(table.real),
        None if real else jnp.asarray(table.imag),
    )
