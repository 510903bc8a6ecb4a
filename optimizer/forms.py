"""Linear conditions of a problem as bilinear forms in the variables: what LPs and flips work on.

Each condition is one form (its combination of pair rows, scaled), the improve's worth one more. With one part fixed
every form is linear in the other part's variables; its slopes come from one product for all forms.
"""

from __future__ import annotations

from functools import cached_property

import numpy as np
from numpy.typing import NDArray
from scipy import sparse

from ..objectives.problem import Problem
from .layout import Layout

Array = NDArray[np.float64]


class ConditionForms:
    """Forms of the conditions, and of the improve, that are linear in the pair rows.

    Attributes:
        layout: Variables.
        counts: Which conditions enter the worst margin, shape (condition,).
        constant: Constants of the forms, shape (form,); with an improve the last form is its worth.
        improves: Is there a worth?
    """

    def __init__(self, problem: Problem, layout: Layout) -> None:
        self.layout = layout
        self.counts = problem.counts[: problem.constant.size]
        self.improves = bool(problem.improves)
        factors, self.constant = problem.linear_forms()
        self._forms = problem.forms.combined(factors)
        self._to_base = layout.base.matrix(layout.count)
        self._to_mover = layout.mover.matrix(layout.count)
        self._base_columns, self._mover_columns = self._to_base.tocsc(), self._to_mover.tocsc()

    def values(self, z: Array) -> Array:
        """Value of every form at variables z (n,), shape (form,)."""
        a, b = self.layout.patterns(z)
        return self._forms.values(a, b) + self.constant

    def slopes(self, z: Array) -> Array:
        """Derivative of every form with respect to every variable at z, shape (form, n)."""
        a, b = self.layout.patterns(z)
        return self.slopes_base(b) + self.slopes_mover(a)

    def slopes_base(self, b: Array) -> Array:
        """Derivative through the base's cells for a mover pattern, shape (form, n)."""
        products = self._forms.base_products(b).reshape(self._forms.count, self._to_base.shape[0])
        return np.asarray(products @ self._to_base)

    def slopes_mover(self, a: Array) -> Array:
        """Derivative through the mover's cells for a base pattern, shape (form, n)."""
        products = self._forms.mover_products(a).reshape(self._forms.count, self._to_mover.shape[0])
        return np.asarray(products @ self._to_mover)

    def slope_change(self, variable: int) -> Array:
        """What one unit of a variable adds to the slopes of all, shape (form, n)."""
        total = np.zeros((self._forms.count, self.layout.count))
        for cell, sign in _column(self._base_columns, variable):
            spread = self._forms.mover_column(divmod(cell, self.layout.base.index.shape[1]))
            total += sign * (spread.reshape(len(spread), self._to_mover.shape[0]) @ self._to_mover)
        for cell, sign in _column(self._mover_columns, variable):
            spread = self._forms.base_column(divmod(cell, self.layout.mover.index.shape[1]))
            total += sign * (spread.reshape(len(spread), self._to_base.shape[0]) @ self._to_base)
        return total

    @cached_property
    def curvature(self) -> Array:
        """Value of every form of a variable with itself, shape (form, n): nonzero only where the parts are linked."""
        if not self.layout.linked:
            return np.zeros((self._forms.count, self.layout.count))
        return np.stack([0.5 * self.slope_change(n)[:, n] for n in range(self.layout.count)], axis=1)


def _column(columns: sparse.csc_array, number: int) -> list[tuple[int, float]]:
    """Row numbers and entries of one column."""
    first, last = columns.indptr[number], columns.indptr[number + 1]
    return list(zip(columns.indices[first:last].tolist(), columns.data[first:last].tolist(), strict=True))
