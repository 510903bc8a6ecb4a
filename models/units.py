"""Units: SI inside the code, the engineer's units at its edges; this module alone converts.

A unit is written as in spec files and reports (``"mm"``, ``"N mm"``, ``"mT"``). ``FACTORS`` holds how many SI
units one of them is; ``SI_NAMES`` what the SI unit is called in an archive.
"""

from __future__ import annotations

from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

Number = TypeVar("Number", float, NDArray[np.float64])

MU0 = 4e-7 * float(np.pi)
"""Vacuum permeability [T m/A]: its value before 2019, which every reference here uses."""

FACTORS: dict[str, float] = {
    "1": 1.0,
    "m": 1.0,
    "mm": 1e-3,
    "um": 1e-6,
    "N": 1.0,
    "N mm": 1e-3,
    "N/mm": 1e3,
    "mJ": 1e-3,
    "T": 1.0,
    "mT": 1e-3,
    "kA/m": 1e3,
    "A m2": 1.0,
    "deg": float(np.pi / 180.0),
    "%": 0.01,
    "%/mm": 10.0,
    "C": 1.0,
    "s": 1.0,
}

SI_NAMES: dict[str, str] = {
    "1": "1",
    "m": "m",
    "mm": "m",
    "um": "m",
    "N": "N",
    "N mm": "N m",
    "N/mm": "N/m",
    "mJ": "J",
    "T": "T",
    "mT": "T",
    "kA/m": "A/m",
    "A m2": "A m2",
    "deg": "rad",
    "%": "1",
    "%/mm": "1/m",
    "C": "degC",
    "s": "s",
}


def to_si(value: Number, unit: str) -> Number:
    """Return ``value``, given in ``unit``, in SI units."""
    return value * FACTORS[unit]


def from_si(value: Number, unit: str) -> Number:
    """Return ``value``, given in SI units, in ``unit``."""
    return value / FACTORS[unit]
