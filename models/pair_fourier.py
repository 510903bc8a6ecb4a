"""The pair's bilinear forms in the Fourier domain: differentiable, batched, one transform of each pattern for all rows.

By Parseval the value of a row is a dot product of the cross spectrum conj(A) B with the row's own table, so the
physics of all gaps and components costs one forward transform of each pattern and one matrix product. Forms whose
table is even in the displacement have a real spectrum and need only the real part.

Zero-filling is done by concatenation: padding an array that has just been computed makes XLA's CPU code read outside
the operand.
"""

from __future__ import annotations

from typing import NamedTuple

import jax
import jax.numpy as jnp
import numpy as np
from numpy.typing import NDArray
from scipy import fft

from .pair import PairForms

jax.config.update("jax_enable_x64", True)  # pair kernels are unusable in float32 (REFERENCES: cancellation)

Array = NDArray[np.float64]


class Spectrum(NamedTuple):
    """Row tables of one pair of cell weights.

    Attributes:
        weight_base: Factors of the base's cells (ny, nx), or None for ones.
        weight_mover: Factors of the mover's cells (my, mx), or None for ones.
        scatter: Which rows of all the table's rows are, (row, k) of zeros and ones, or None when it is all of them.
        real: Factors of Re(conj(A) B), shape (k, frequency).
        imag: Factors of Im(conj(A) B), shape (k, frequency), or None when all vanish.
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
    return FourierForms(tuple(_spectrum(forms, n) for n in range(len(forms.terms))))


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
        out = spectrum.real @ (left.real * right.real + left.imag * right.imag)
        if spectrum.imag is not None:
            out = out + spectrum.imag @ (left.real * right.imag - left.imag * right.real)
        if spectrum.scatter is not None:
            out = spectrum.scatter @ out
        total = out if total is None else total + out
    return jnp.zeros(0) if total is None else total


def transform_sizes(forms: PairForms) -> tuple[int, int]:
    """Size (Ny, Nx) of the zero-filled transforms."""
    (ny, nx), (my, mx) = forms.base.shape, forms.mover.shape
    return fft.next_fast_len(ny + my - 1, real=True), fft.next_fast_len(nx + mx - 1, real=True)


def _transform(pattern: jax.Array, sizes: tuple[int, int]) -> jax.Array:
    """Zero-filled real transform, one axis at a time, flattened to (frequency,)."""
    rows, columns = pattern.shape
    wide = jnp.concatenate([pattern, jnp.zeros((rows, sizes[1] - columns))], axis=1) if sizes[1] > columns else pattern
    half = jnp.fft.rfft(wide, axis=1)
    if sizes[0] > rows:
        half = jnp.concatenate([half, jnp.zeros((sizes[0] - rows, half.shape[1]), half.dtype)], axis=0)
    return jnp.fft.fft(half, axis=0).reshape(-1)


def _spectrum(forms: PairForms, number: int) -> Spectrum:
    """Transform one term's tables, displacement 0 at the origin of the period, Parseval weights included."""
    term = forms.terms[number]
    sizes = transform_sizes(forms)
    ny, nx = forms.base.shape
    padded = np.zeros((term.tables.shape[0], *sizes))
    padded[:, : term.tables.shape[1], : term.tables.shape[2]] = term.tables
    circular = np.roll(padded, (-(ny - 1), -(nx - 1)), axis=(1, 2))
    spectrum = fft.rfft2(circular)
    twice = np.full(spectrum.shape[2], 2.0)
    twice[0] = 1.0
    if sizes[1] % 2 == 0:
        twice[-1] = 1.0
    weighted = (spectrum * twice / (sizes[0] * sizes[1])).reshape(spectrum.shape[0], -1)
    even = np.abs(weighted.imag).max() <= 1e-13 * max(np.abs(weighted.real).max(), 1e-300)
    count = forms.count
    everything = term.rows.size == count and bool((term.rows == np.arange(count)).all())
    return Spectrum(
        None if term.weight_base == "1" else jnp.asarray(forms.weighted_base(np.ones(forms.base.shape), term.weight_base)),
        None
        if term.weight_mover == "1"
        else jnp.asarray(forms.weighted_mover(np.ones(forms.mover.shape), term.weight_mover)),
        None if everything else jnp.asarray(np.eye(count)[:, term.rows]),
        jnp.asarray(weighted.real),
        None if even else jnp.asarray(weighted.imag),
    )
