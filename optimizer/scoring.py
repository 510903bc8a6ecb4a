"""One number for conditions and worth of rounded designs, the same in every discrete search."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

VIOLATION = 20.0
"""What a violated condition costs against worth, which is in units of what obvious patterns reach."""
_HUGE = 1e3


def score(
    xp: Any,
    counts: NDArray[np.bool_],
    conditions: Any,
    worth: Any = None,
    violation: Any = VIOLATION,
    softness: Any = None,
) -> Any:
    """Judge designs by one number, larger is better.

    Without an improve: the least condition that counts, minus what equalities are violated by. With one: the worth,
    minus ``violation`` times what the conditions are violated by.

    Args:
        xp: ``numpy`` or ``jax.numpy``.
        counts: Which conditions enter the worst margin, shape (condition,).
        conditions: Conditions, met where >= 0, shape (..., condition).
        worth: Worth of the improve, shape (...), or None without one.
        violation: Price of a violation.
        softness: Width of a soft minimum in units of the conditions, or None for the true minimum.

    Returns:
        Shape (...).
    """
    conditions = xp.nan_to_num(conditions, nan=-_HUGE, posinf=_HUGE, neginf=-_HUGE)
    if worth is not None:
        return xp.nan_to_num(worth, nan=-_HUGE) + violation * xp.minimum(conditions, 0.0).sum(-1)
    counting, equal = conditions[..., counts], conditions[..., ~counts]
    if not counting.shape[-1] and not equal.shape[-1]:
        return xp.zeros(conditions.shape[:-1])
    missed = violation * xp.minimum(equal, 0.0).sum(-1)
    if not counting.shape[-1]:
        return missed + xp.minimum(equal.min(-1), 0.5)
    least = counting.min(-1)
    if softness is not None:
        least = least - softness * xp.log(xp.exp((least[..., None] - counting) / softness).sum(-1))
    return least + missed
