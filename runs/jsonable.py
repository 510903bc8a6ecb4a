"""Plain JSON values of records: no NumPy types, no NaN or infinity (null instead)."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

import numpy as np


def jsonable(value: Any) -> Any:
    """Return ``value`` with mappings, sequences, arrays and NumPy scalars as JSON's own types; NaN becomes None."""
    if isinstance(value, Mapping):
        return {str(key): jsonable(item) for key, item in value.items()}
    if isinstance(value, list | tuple):
        return [jsonable(item) for item in value]
    if isinstance(value, np.ndarray | np.generic):
        return jsonable(value.tolist())
    if isinstance(value, float) and not math.isfinite(value):
        return None
    return value
