"""How a pattern would be made, on patterns drawn by hand."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.typing import NDArray
from polewright.models.blank import Disc
from polewright.models.part import Part
from polewright.models.patterns import uniform

from ..models.parts import plate
from ..models.references import MM
from .examples import value

Pattern = NDArray[np.int8]
CELL_MM = 0.5
SIGNS = {"+": 1, "-": -1, ".": 0}


def drawn(*rows: str) -> Pattern:
    """A pattern as it is seen from +z: the last line is the lowest y."""
    return np.array([[SIGNS[sign] for sign in row] for row in reversed(rows)], dtype=np.int8)


# pattern, poles, edges between N and S [cells], narrowest pole [cells]
DRAWN = {
    "one pole": (drawn("++++++", "++++++", "++++++", "++++++"), 1, 0, 4),
    "halves": (drawn("+++---", "+++---", "+++---", "+++---"), 2, 4, 3),
    "stripes": (drawn("++--++", "++--++", "++--++", "++--++"), 3, 8, 2),
    "island": (drawn("++++++", "++--++", "++--++", "++++++"), 2, 8, 1),
    "touching at a corner": (drawn("+++---", "+++---", "---+++", "---+++"), 4, 10, 2),
    "unmagnetized band": (drawn("++..--", "++..--", "++..--", "++..--"), 2, 0, 2),
    "a thread joins two poles": (drawn("++--++", "++++++", "++--++", "++--++"), 3, 10, 1),
    "nothing": (drawn("......", "......", "......", "......"), 0, 0, 0),
}


def both(name: str, a: Pattern, b: Pattern, of: str = "both") -> float:
    part = plate(6, 4, CELL_MM)
    return value(name, part, part, a, b, of=of)


@pytest.mark.parametrize("case", DRAWN)
def test_drawn_patterns(case: str) -> None:
    pattern, poles, edges, width = DRAWN[case]
    quiet = uniform(np.ones((4, 6), dtype=bool))
    for a, b, of in ((pattern, quiet, "base"), (quiet, pattern, "mover"), (-pattern, quiet, "base")):
        assert both("pole_count", a, b, of) == poles
        assert both("pole_edge_length", a, b, of) == pytest.approx(edges * CELL_MM * MM)
        assert both("narrowest_pole", a, b, of) == pytest.approx(width * CELL_MM * MM)


def test_of_both_the_worse_one_counts() -> None:
    coarse, fine = DRAWN["halves"][0], DRAWN["stripes"][0]
    for a, b in ((coarse, fine), (fine, coarse)):
        assert both("pole_count", a, b) == 3
        assert both("pole_edge_length", a, b) == pytest.approx(8 * CELL_MM * MM)
        assert both("narrowest_pole", a, b) == pytest.approx(2 * CELL_MM * MM)


def test_an_outline_is_no_edge() -> None:
    part = Part(Disc(8.0 * MM), 1.0 * MM, 2.0 * MM, 1.2)
    a = uniform(part.mask)
    assert value("pole_count", part, part, a, a) == 1
    assert value("pole_edge_length", part, part, a, a) == 0.0
    half = np.where(part.x > 0, a, -a).astype(np.int8)
    assert value("pole_edge_length", part, part, half, a, of="base") == pytest.approx(8.0 * MM)
