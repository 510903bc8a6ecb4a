"""One rounded design under exact evaluation: the numbers that are reported come from here."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import final

import numpy as np
from numpy.typing import NDArray

from ..models.pair import Row, pair_values
from ..models.part import Part
from ..models.stray import Placed
from .plan import Response
from .sites import Source, seats

Array = NDArray[np.float64]
Measure = Callable[[Sequence[Row]], Array]
"""Values of pair rows [SI], shape (row,)."""


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
        return pair_values(self.base, self.mover, self.response.base, self.response.mover, rows)

    def axial_force(self, gaps: Array) -> Array:
        """F_z on the mover [N] at centred poses, shape of ``gaps`` [m]."""
        return self.pair([Row("fz", float(gap)) for gap in gaps])

    def sources(self, of: Source, gap: float = 0.0) -> list[Placed]:
        """The magnets whose field is asked for, at their places."""
        patterns = (self.response.base, self.response.mover)
        found = seats(self.base, self.mover, of, gap)
        return [Placed(s.part, pattern, s.origin) for s, pattern in zip(found, patterns, strict=True) if s is not None]
