"""Named tolerance tiers. A test names its tier; each looser one says here why it cannot be tighter.

All are relative. A force or moment curve is compared with the largest entry of that curve (``worst``): where a force
passes through zero a relative error says nothing.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

EXACT = 1e-12
"""Both sides are the same real number; float64 sums of some thousand terms differ by rounding alone."""

CANCELLED = 1e-10
"""Identities of pair values: equal in exact arithmetic, but the four sheets of far cells cancel some digits."""

TWO_PATHS = 1e-9
"""Pair kernels against the second path at gaps >= 0.1 cell. The contract is 1e-6; 1e-10 and better is measured, limited
by the quadrature of cells a few pitches apart. The tighter gate notices a loss of digits long before it matters."""

CONTACT = 1e-6
"""Second path at gap 0: graded panels stop 1e-5 cell before the edge, where fields have logarithmic peaks."""

KERNEL = 1e-7
"""A kernel table against the closed form in extended precision, of the table's largest entry: closed forms cancel."""

TABLE_8 = 1e-7
"""Against reference values printed with eight to nine digits."""

TABLE_10 = 1e-8
"""Against reference values printed with ten digits."""

TABLE_6 = 3e-6
"""Against reference values printed with six digits or given as a rounded ratio."""

SERIES = 1e-6
"""Cuboid strips against the infinite series: the end-effect trick and 120 source strips leave 2e-9 to 1e-7."""

SLOPE = 1e-6
"""Central differences with a step of 1e-3 of a gap: the fourth-order rest and the rounding over the step."""

TRACE = 1e-8
"""Sum of the three stiffnesses, of the largest: zero by Earnshaw's theorem, up to rounding of three kernels."""

LIBRARY_FIELD = 1e-9
"""Against magpylib's closed-form field of cuboids; both are closed forms, theirs loses digits beside edges."""

LIBRARY_FORCE = {1000: 1e-3, 4000: 3e-4, 20000: 1e-4}
"""Against magpylib's getFT, by its ``meshing``: the error of its own mesh, which does not fall steadily."""

LATTICE = 0.01
"""A round blank cut into square cells against the round closed form: the staircase outline."""


def worst(received: ArrayLike, expected: ArrayLike) -> float:
    """Return the largest difference over the largest expected size."""
    size = np.abs(np.asarray(expected, dtype=np.float64)).max()
    return float(np.abs(np.asarray(received, dtype=np.float64) - np.asarray(expected)).max() / size)
