"""The magnetized pair: energy, force, stiffness and moment on the mover as bilinear forms of the two patterns.

A row names one component at one pose. Its value is ``sum_ij a_i K(j - i) b_j`` over base cells i and mover cells j of
one pitch, so a row is a table of K over whole-cell displacements, built once in float64. Rigid axial magnetization
(recoil permeability 1): surface charges +-Br on the faces of each part.

Signs: base below, mover above, polarity +1 along +z, forces and moments act on the mover, F_z > 0 pushes apart.
Moments are taken about the centre of the mover's mating face (the magnet's lower face).
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Literal, NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy import fft

from .kernels.square import PARITY, sheet_kernels
from .part import Part
from .units import MU0

Array = NDArray[np.float64]

Component = Literal["energy", "fx", "fy", "fz", "kxx", "kyy", "kxy", "kzz", "mx", "my", "mz"]
"""Energy [J], force [N], derivative of the force [N/m] (kzz = dF_z/dgap, kxy = dF_x/dy), moment [N m]."""
Weight = Literal["1", "x", "y"]

_PLAIN: dict[str, str] = {
    "energy": "e", "fx": "x", "fy": "y", "fz": "z", "kxx": "xx", "kyy": "yy", "kxy": "xy", "kzz": "zz",
}  # fmt: skip


class Row(NamedTuple):
    """One component at one pose: surface gap and lateral offset of the mover [m]."""

    component: Component
    gap: float
    dx: float = 0.0
    dy: float = 0.0


@dataclass(frozen=True, eq=False)
class Term:
    """Tables of the rows that share how cells are weighted.

    Attributes:
        weight_base: "1", or the coordinate that base cells are multiplied by.
        weight_mover: The same for mover cells.
        rows: Row numbers, shape (k,).
        tables: K over displacements j - i, shape (k, my + ny - 1, mx + nx - 1); entry [., iy + ny - 1, ix + nx - 1]
            belongs to the displacement (iy, ix).
    """

    weight_base: Weight
    weight_mover: Weight
    rows: NDArray[np.intp]
    tables: Array


@dataclass(frozen=True, eq=False)
class PairForms:
    """Bilinear forms of one pair, ``value_r(a, b) = sum a K_r b``.

    Attributes:
        base: The part below.
        mover: The part above, of the same cell pitch.
        count: How many forms there are.
        terms: The tables; a form's value is the sum over the terms that hold it.
    """

    base: Part
    mover: Part
    count: int
    terms: tuple[Term, ...]

    def values(self, a: Array, b: Array) -> Array:
        """Value of every row in SI units, shape (row,), for patterns a (ny, nx) and b (my, mx)."""
        out = np.zeros(self.count)
        correlations: dict[tuple[str, str], Array] = {}
        for term in self.terms:
            key = (term.weight_base, term.weight_mover)
            if key not in correlations:
                correlations[key] = _correlate(self.weighted_base(a, key[0]), self.weighted_mover(b, key[1]))
            out[term.rows] += np.tensordot(term.tables, correlations[key], axes=2)
        return out

    def base_products(self, b: Array) -> Array:
        """K b of every row, shape (row, ny, nx): the derivative of each value with respect to the base's cells."""
        out = np.zeros((self.count, *self.base.shape))
        for term in self.terms:
            product = _apply(term.tables, self.weighted_mover(b, term.weight_mover), self.base.shape, transpose=False)
            out[term.rows] += self.weighted_base(product, term.weight_base)
        return out

    def mover_products(self, a: Array) -> Array:
        """K' a of every row, shape (row, my, mx): the derivative of each value with respect to the mover's cells."""
        out = np.zeros((self.count, *self.mover.shape))
        for term in self.terms:
            product = _apply(term.tables, self.weighted_base(a, term.weight_base), self.mover.shape, transpose=True)
            out[term.rows] += self.weighted_mover(product, term.weight_mover)
        return out

    def base_column(self, j: tuple[int, int]) -> Array:
        """K e_j of every row for one mover cell j = (iy, ix), shape (row, ny, nx)."""
        (ny, nx), out = self.base.shape, np.zeros((self.count, *self.base.shape))
        for term in self.terms:
            part = term.tables[:, j[0] : j[0] + ny, j[1] : j[1] + nx][:, ::-1, ::-1]
            part = part * _coordinate(self.mover, term.weight_mover)[j]
            out[term.rows] += self.weighted_base(part, term.weight_base)
        return out

    def mover_column(self, i: tuple[int, int]) -> Array:
        """K' e_i of every row for one base cell i = (iy, ix), shape (row, my, mx)."""
        (ny, nx), (my, mx) = self.base.shape, self.mover.shape
        out = np.zeros((self.count, my, mx))
        for term in self.terms:
            part = term.tables[:, ny - 1 - i[0] : ny - 1 - i[0] + my, nx - 1 - i[1] : nx - 1 - i[1] + mx]
            part = part * _coordinate(self.base, term.weight_base)[i]
            out[term.rows] += self.weighted_mover(part, term.weight_mover)
        return out

    def combined(self, factors: Array) -> PairForms:
        """Forms that are linear combinations of these: ``factors`` (new form, form)."""
        every = np.arange(len(factors))
        terms = [
            Term(t.weight_base, t.weight_mover, every, np.tensordot(factors[:, t.rows], t.tables, axes=1))
            for t in self.terms
        ]
        return PairForms(self.base, self.mover, len(factors), tuple(terms))

    def weighted_base(self, a: Array, weight: str) -> Array:
        """The base's pattern times a cell coordinate; last two axes (ny, nx)."""
        return a if weight == "1" else a * _coordinate(self.base, weight)

    def weighted_mover(self, b: Array, weight: str) -> Array:
        """The mover's pattern times a cell coordinate; last two axes (my, mx)."""
        return b if weight == "1" else b * _coordinate(self.mover, weight)


def pair_forms(base: Part, mover: Part, rows: Sequence[Row]) -> PairForms:
    """Build the forms of a list of rows, in their order."""
    if abs(base.cell - mover.cell) > 1e-9 * base.cell:
        message = f"base and mover must have one cell pitch, received {base.cell} m and {mover.cell} m"
        raise ValueError(message)
    return PairForms(base, mover, len(rows), tuple(_terms(base, mover, rows)))


def pair_values(base: Part, mover: Part, a: Array, b: Array, rows: Sequence[Row], chunk: int = 32) -> Array:
    """Values at any poses for one pattern pair, tables built and dropped in chunks; shape (row,), SI units."""
    parts = [pair_forms(base, mover, rows[k : k + chunk]).values(a, b) for k in range(0, len(rows), chunk)]
    return np.concatenate(parts) if parts else np.zeros(0)


def _coordinate(part: Part, weight: str) -> Array:
    """Cell coordinate of a weight on the part's lattice [m], or ones; shape (ny, nx)."""
    ones = np.ones(part.shape)
    return ones if weight == "1" else ones * (part.x[None, :] if weight == "x" else part.y[:, None])


def _correlate(a: Array, b: Array) -> Array:
    """sum_i a_i b_(i + m) over displacements m, shape (my + ny - 1, mx + nx - 1)."""
    shape = (a.shape[0] + b.shape[0] - 1, a.shape[1] + b.shape[1] - 1)
    full = (fft.next_fast_len(shape[0], real=True), fft.next_fast_len(shape[1], real=True))
    spectrum = fft.rfft2(a[::-1, ::-1], full) * fft.rfft2(b, full)
    return np.asarray(fft.irfft2(spectrum, full)[: shape[0], : shape[1]])


def _apply(tables: Array, pattern: Array, shape: tuple[int, int], *, transpose: bool) -> Array:
    """Toeplitz products: sum_j K(j - i) b_j over i, or with ``transpose`` sum_i K(j - i) a_i over j."""
    flipped = pattern if transpose else pattern[::-1, ::-1]
    size = (tables.shape[1] + pattern.shape[0] - 1, tables.shape[2] + pattern.shape[1] - 1)
    full = (fft.next_fast_len(size[0], real=True), fft.next_fast_len(size[1], real=True))
    product = fft.irfft2(fft.rfft2(tables, full) * fft.rfft2(flipped, full), full)
    top, left = pattern.shape[0] - 1, pattern.shape[1] - 1
    out = product[:, top : top + shape[0], left : left + shape[1]]
    return np.asarray(out if transpose else out[:, ::-1, ::-1])


def _terms(base: Part, mover: Part, rows: Sequence[Row]) -> Iterable[Term]:
    """Collect the tables of all rows, one term for each pair of weights; rows of one offset are built together."""
    pieces: dict[tuple[Weight, Weight], list[tuple[int, Array]]] = {}
    offsets = dict.fromkeys((row.dx, row.dy) for row in rows)
    for dx, dy in offsets:
        numbers = [n for n, row in enumerate(rows) if (row.dx, row.dy) == (dx, dy)]
        tables = _SheetTables(base, mover, dx, dy, sorted({rows[n].gap for n in numbers}))
        for n in numbers:
            for weights, table in _row_tables(tables, rows[n]):
                pieces.setdefault(weights, []).append((n, table))
    for (weight_base, weight_mover), found in pieces.items():
        numbers_of = np.array([n for n, _ in found], dtype=np.intp)
        yield Term(weight_base, weight_mover, numbers_of, np.stack([table for _, table in found]))


def _row_tables(tables: _SheetTables, row: Row) -> list[tuple[tuple[Weight, Weight], Array]]:
    """The terms of one row.

    For cells at X_i, X_j (from the moment's centre) the mean of the charge's position over both cells is
    (X_i + X_j) / 2 + u / 2, and u times the z-kernel is w times the x-kernel; likewise in y.
    """
    if row.component in _PLAIN:
        return [(("1", "1"), tables.plate(_PLAIN[row.component], row.gap))]
    if row.component == "mz":
        fx, fy = tables.plate("x", row.gap), tables.plate("y", row.gap)
        rest = 0.5 * (row.dy * fx - row.dx * fy)
        return [
            (("1", "1"), rest), (("x", "1"), 0.5 * fy), (("1", "x"), 0.5 * fy),
            (("y", "1"), -0.5 * fx), (("1", "y"), -0.5 * fx),
        ]  # fmt: skip
    fz = tables.plate("z", row.gap)
    if row.component == "my":
        arm = tables.plate("x", row.gap, arm=True)
        return [(("1", "1"), arm + 0.5 * row.dx * fz), (("x", "1"), -0.5 * fz), (("1", "x"), -0.5 * fz)]
    arm = tables.plate("y", row.gap, arm=True)
    return [(("1", "1"), -arm - 0.5 * row.dy * fz), (("y", "1"), 0.5 * fz), (("1", "y"), 0.5 * fz)]


class _SheetTables:
    """Sheet kernels of one offset at every axial distance that its gaps need, combined to plate pairs."""

    def __init__(self, base: Part, mover: Part, dx: float, dy: float, gaps: Sequence[float]) -> None:
        self._base, self._mover = base, mover
        coatings = base.coating + mover.coating
        self._faces = {gap: gap + coatings for gap in gaps}
        distances = {self._distance(gap, below, above) for gap in gaps for below in (0, 1) for above in (0, 1)}
        self._distances = {w: n for n, w in enumerate(sorted(distances))}
        self._u = _displacements(base.x, mover.x, dx, base.cell)
        self._v = _displacements(base.y, mover.y, dy, base.cell)
        self._cache: dict[str, Array] = {}

    def _distance(self, gap: float, below: int, above: int) -> float:
        return self._faces[gap] + below * self._base.thickness + above * self._mover.thickness

    def _sheets(self, name: str) -> Array:
        if name not in self._cache:
            w = np.array(list(self._distances))
            self._cache[name] = _folded(name, self._u, self._v, w, self._base.cell)
        return self._cache[name]

    def plate(self, name: str, gap: float, *, arm: bool = False) -> Array:
        """Plate-pair table of one kernel in SI; with ``arm`` each sheet pair is weighted by z - w / 2 (see above)."""
        sheets = self._sheets(name)
        total = np.zeros(sheets.shape[1:])
        for below in (0, 1):
            for above in (0, 1):
                w = self._distance(gap, below, above)
                sign = 1.0 if below != above else -1.0
                factor = above * self._mover.thickness - 0.5 * w if arm else 1.0
                total += sign * factor * sheets[self._distances[w]]
        return total * (self._base.remanence * self._mover.remanence / (4.0 * np.pi * MU0))


def _displacements(base: Array, mover: Array, offset: float, cell: float) -> Array:
    """Displacement of mover cell j from base cell i for j - i = -(n - 1) .. m - 1 [m]."""
    steps = np.arange(-(base.size - 1), mover.size)
    start = mover[0] - base[0] + offset
    # whole and half cells exactly, so that mirror images find each other below
    fraction = np.round(2.0 * start / cell)
    if abs(2.0 * start / cell - fraction) < 1e-9:
        return np.asarray((steps + 0.5 * fraction) * cell)
    return np.asarray(start + steps * cell)


def _folded(name: str, u: Array, v: Array, w: Array, cell: float) -> Array:
    """Sheet kernels on u x v, computed once for displacements that mirror each other."""
    fold_u, pick_u = _fold(u)
    fold_v, pick_v = _fold(v)
    table = sheet_kernels((name,), fold_u, fold_v, w, cell)[name]
    even_u, even_v = PARITY[name]
    out = table[:, pick_v[:, None], pick_u[None, :]]
    if even_u < 0 and fold_u.size < u.size:
        out = out * np.sign(u)[None, None, :]
    if even_v < 0 and fold_v.size < v.size:
        out = out * np.sign(v)[None, :, None]
    return np.asarray(out)


def _fold(u: Array) -> tuple[Array, NDArray[np.intp]]:
    """The evenly spaced set of |u| and where each u finds itself in it; u itself when no two mirror each other."""
    step = u[1] - u[0] if u.size > 1 else 1.0
    doubled = 2.0 * u / step
    if u.size == 1 or np.abs(doubled - np.round(doubled)).max() > 1e-9 or u[0] >= 0.0 or u[-1] <= 0.0:
        return u, np.arange(u.size)
    start = np.abs(u).min()
    index = np.round((np.abs(u) - start) / step).astype(np.intp)
    return start + np.arange(index.max() + 1) * step, index
