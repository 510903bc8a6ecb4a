"""From variables to patterns: what of both parts is free, what moves together, what is given.

One variable in [-1, 1] stands for an orbit of cells; a part's pattern is ``constant + sign * z[index]``. A mover
that is the matched or the same part has no variables of its own but reads the base's.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray
from scipy import sparse

from .symmetry import orbits

Array = NDArray[np.float64]
Index = NDArray[np.intp]


@dataclass(frozen=True, eq=False)
class Face:
    """What is known of one part's pattern before the search.

    Attributes:
        mask: Cells on the part, shape (ny, nx).
        given: Polarity of the cells that are given, NaN where free, shape (ny, nx).
        symmetry: Name of the symmetry of the free cells.
        brush: Least pole width [cells].
    """

    mask: NDArray[np.bool_]
    given: Array
    symmetry: str = "none"
    brush: int = 1


@dataclass(frozen=True, eq=False)
class FaceMap:
    """A part's pattern as a function of the variables; arrays (ny, nx).

    Attributes:
        index: Number of the variable, -1 for cells that have none.
        sign: Factor of the variable.
        constant: Polarity of the given cells, 0 elsewhere.
    """

    index: Index
    sign: Array
    constant: Array

    @cached_property
    def is_identity(self) -> bool:
        """Are the part's cells, in order, a run of variables?"""
        flat = self.index.ravel()
        run = flat.size > 0 and flat[0] >= 0 and bool((np.diff(flat) == 1).all())
        return run and bool((self.sign == 1.0).all())

    def pattern(self, z: Any, xp: Any) -> Any:
        """Pattern (..., ny, nx) of variables z (..., n)."""
        if self.is_identity:
            first = int(self.index.flat[0])
            return z[..., first : first + self.index.size].reshape((*z.shape[:-1], *self.index.shape))
        if (self.index < 0).all():
            return xp.broadcast_to(xp.asarray(self.constant), (*z.shape[:-1], *self.index.shape))
        return self.constant + self.sign * z[..., np.maximum(self.index, 0)]

    def matrix(self, count: int) -> sparse.csr_array:
        """The map's linear part as a sparse matrix (ny * nx, n)."""
        cells = np.nonzero(self.index.ravel() >= 0)[0]
        entries = (self.sign.ravel()[cells], (cells, self.index.ravel()[cells]))
        return sparse.csr_array(entries, shape=(self.index.size, count))


@dataclass(frozen=True, eq=False)
class Layout:
    """Variables of both parts.

    Attributes:
        count: Number of variables.
        base: The base's map.
        mover: The mover's map.
        masks: Cells on (base, mover).
        brushes: Least pole width of (base, mover) [cells].
        linked: Does the mover read the base's variables?
    """

    count: int
    base: FaceMap
    mover: FaceMap
    masks: tuple[NDArray[np.bool_], NDArray[np.bool_]]
    brushes: tuple[int, int]
    linked: bool

    def patterns(self, z: Any, xp: Any = np) -> tuple[Any, Any]:
        """Patterns of base (..., ny, nx) and mover (..., my, mx) for variables z (..., n)."""
        return self.base.pattern(z, xp), self.mover.pattern(z, xp)

    def variables(self, a: Array, b: Array) -> Array:
        """Variables whose patterns are closest to a and b: the mean over each orbit, shape (n,)."""
        total, weight = np.zeros(self.count), np.zeros(self.count)
        for face, pattern in ((self.base, a), (self.mover, b)):
            on = (face.index >= 0) & (face.sign != 0.0)
            np.add.at(total, face.index[on], (face.sign * pattern)[on])
            np.add.at(weight, face.index[on], 1.0)
        return total / np.maximum(weight, 1.0)

    @cached_property
    def owner(self) -> Index:
        """0 where a variable belongs to the base, 1 where to the mover, shape (n,)."""
        owner = np.ones(self.count, dtype=np.intp)
        owner[np.unique(self.base.index[self.base.index >= 0])] = 0
        return owner

    def facing(self) -> Index:
        """Pairs (base variable, mover variable) that meet when the parts are centred, shape (p, 2); none if linked."""
        if self.linked:
            return np.zeros((0, 2), dtype=np.intp)
        (ny, nx), (my, mx) = self.base.index.shape, self.mover.index.shape
        y, x = np.arange(ny) + (my - ny) // 2, np.arange(nx) + (mx - nx) // 2
        over_y, over_x = (y >= 0) & (y < my), (x >= 0) & (x < mx)
        above = np.full((ny, nx), -1, dtype=np.intp)
        above[np.ix_(over_y, over_x)] = self.mover.index[np.ix_(y[over_y], x[over_x])]
        met = (self.base.index >= 0) & (above >= 0)
        return np.unique(np.stack([self.base.index[met], above[met]], axis=1), axis=0)

    def coarse(self) -> Layout:
        """The same with cells tied together in blocks as wide as the pole width; itself where that changes nothing."""
        if max(self.brushes) == 1 or self.count == 0:
            return self
        faces = (self.base, self.mover)
        labels = np.arange(self.count)
        for face, brush in zip(faces, self.brushes, strict=True):
            labels = _tie(labels, face, _blocks(face.index.shape, brush))
        _, numbers = np.unique(labels, return_inverse=True)
        maps = [
            FaceMap(np.where(face.index >= 0, numbers[np.maximum(face.index, 0)], -1), face.sign, face.constant)
            for face in faces
        ]
        return Layout(int(numbers.max(initial=-1)) + 1, maps[0], maps[1], self.masks, self.brushes, self.linked)


def layout(base: Face, mover: Face, link: Literal["", "matched", "same"] = "") -> Layout:
    """Number the variables of both parts.

    Args:
        base: What is known of the base.
        mover: What is known of the mover; ignored but for its brush where ``link`` says that it reads the base's.
        link: "matched": b = a; "same": b(x, y) = -a(x, -y), the identical part turned over about the x axis.
    """
    first, count = _face_map(base, 0)
    if link == "matched":
        second = first
    elif link == "same":
        second = FaceMap(first.index[::-1], -first.sign[::-1], -first.constant[::-1])
    else:
        second, count = _face_map(mover, count)
    masks = (base.mask, base.mask[::-1] if link == "same" else base.mask if link else mover.mask)
    return Layout(count, first, second, masks, (base.brush, base.brush if link else mover.brush), bool(link))


def _face_map(face: Face, first: int) -> tuple[FaceMap, int]:
    """Map of one part; its variables are numbered from ``first`` in order of their first cells."""
    root, sign = orbits(face.mask.shape, face.symmetry)
    given = np.where(face.mask, face.given, 0.0)
    # an orbit is given as soon as one of its cells is
    known = np.full(face.mask.size, np.nan)
    on = ~np.isnan(given) & (sign != 0.0) & face.mask
    known[root[on]] = (given * sign)[on]
    value = np.where(np.isnan(given), known[root] * sign, given)
    free = face.mask & np.isnan(value) & (sign != 0.0)
    roots = np.unique(root[free])
    number = np.full(face.mask.size, -1, dtype=np.intp)
    number[roots] = first + np.arange(roots.size)
    index = np.where(free, number[root], -1)
    return FaceMap(index, np.where(free, sign, 0.0), np.nan_to_num(np.where(free, 0.0, value))), first + roots.size


def _blocks(shape: tuple[int, int], width: int) -> Index:
    """Numbers (ny, nx) of blocks at least ``width`` cells wide, symmetric about the middle where possible."""
    rows, columns = (_runs(n, width) for n in shape)
    return np.asarray(rows[:, None] * (columns.max() + 1) + columns[None, :])


def _runs(cells: int, width: int) -> Index:
    """Number of the run that each of ``cells`` belongs to: runs of at least ``width``, mirror-symmetric.

    A width beyond all cells gives one run.
    """
    width = min(width, cells)
    count = cells // width
    extra = cells - count * width
    if extra % 2 == 1 and count % 2 == 0:
        count, extra = count - 1, extra + width
    lengths = np.full(count, width)
    if extra % 2 == 1:
        lengths[count // 2] += 1
        extra -= 1
    pairs = max(count // 2, 1)
    for turn in range(extra // 2):
        lengths[turn % pairs] += 1
        lengths[count - 1 - turn % pairs] += 1
    return np.repeat(np.arange(count), lengths)


def _tie(labels: Index, face: FaceMap, blocks: Index) -> Index:
    """Give one label to all variables that meet in a block with equal signs, through their orbits."""
    labels = labels.copy()
    for block in np.unique(blocks):
        cells = (blocks == block) & (face.index >= 0)
        for sign in (1.0, -1.0):
            found = np.unique(labels[face.index[cells & (face.sign == sign)]])
            if found.size > 1:
                labels[np.isin(labels, found)] = found[0]
    return labels
