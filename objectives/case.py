"""One rounded design under exact evaluation: the numbers that are reported come from here."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from functools import lru_cache
from typing import final

import numpy as np
from numpy.typing import NDArray

from ..models.pair import PairForms, Row, pair_forms, pair_values
from ..models.part import Part
from ..models.stray import Placed
from .plan import Response
from .sites import Source, seats

Array = NDArray[np.float64]
Measure = Callable[[Sequence[Row]], Array]
"""Values of pair rows [SI], shape (row,)."""


_CURVE = 8
"""From this many rows on, the tables are kept: the next design will be asked for the same curve."""
_KEPT = 4_000_000
"""Largest number of entries of tables that are kept."""


@lru_cache(maxsize=8)
def _curve_forms(base: Part, mover: Part, rows: tuple[Row, ...]) -> PairForms:
    return pair_forms(base, mover, rows)


@final
class Case:
    """A pattern pair with exact physics at any pose.

    Attributes:
        base: The part below.
        mover: The part above.
        response: The plan's numbers for this design, float64 NumPy.
        measure: Where pair physics comes from, if not from the nominal parts: another path, a pair with errors.
    """

    def __init__(self, base: Part, mover: Part, response: Response, measure: Measure | None = None) -> None:
        self.base = base
        self.mover = mover
        self.response = response
        self.measure = measure

    def pair(self, rows: Sequence[Row]) -> Array:
        """Exact values of pair rows at any poses [SI], shape (row,)."""
        if self.measure is not None:
            return self.measure(rows)
        a, b = self.response.base, self.response.mover
        if len(rows) < _CURVE or len(rows) * 4 * max(a.size, b.size) > _KEPT:
            return pair_values(self.base, self.mover, a, b, rows)
        return _curve_forms(self.base, self.mover, tuple(rows)).values(a, b)

    def axial_force(self, gaps: Array) -> Array:
        """F_z on the mover [N] at centred poses, shape of ``gaps`` [m]."""
        return self.pair([Row("fz", float(gap)) for gap in gaps])

    def sources(self, of: Source, gap: float = 0.0) -> list[Placed]:
        """The magnets whose field is asked for, at their places."""
        patterns = (self.response.base, self.response.mover)
        found = seats(self.base, self.mover, of, gap)
        return [Placed(s.part, pattern, s.origin) for s, pattern in zip(found, patterns, strict=True) if s is not None]
