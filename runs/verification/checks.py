"""One comparison of the design path with the second path, and how it is judged."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, final

from ...models.units import from_si
from ..jsonable import jsonable

TOLERANCE = 1e-6
"""Allowed difference, relative to the scale that each check states."""

CONTACT_TOLERANCE = 1e-5
"""The same below ``NEAR`` cells between the magnets, where the quadrature of the second path is cut short."""

NEAR = 0.1
"""Distance of the magnets [cells] below which the looser tolerance holds."""


@final
@dataclass(frozen=True)
class Check:
    """One number by both paths.

    Attributes:
        what: What it is.
        unit: Unit in reports; all values are SI.
        gap: Gap of the pose [m], None where there is none.
        kernel: By the design path; NaN where it does not exist.
        second: By the second path; NaN where it does not exist.
        scale: What a difference is relative to [SI]; 0 asks for equality.
        relative_to: The scale in words.
        tolerance: Allowed relative difference.
        ceiling: Is the design path's value a bound that the second path's may stay below?
    """

    what: str
    unit: str
    gap: float | None
    kernel: float
    second: float
    scale: float
    relative_to: str
    tolerance: float = TOLERANCE
    ceiling: bool = False

    @property
    def difference(self) -> float:
        """Size of the difference [SI]; infinite when only one path finds a value."""
        if math.isnan(self.kernel) or math.isnan(self.second):
            return 0.0 if math.isnan(self.kernel) and math.isnan(self.second) else math.inf
        if self.ceiling:
            return max(self.second - self.kernel, 0.0)
        return abs(self.second - self.kernel)

    @property
    def relative(self) -> float:
        """The difference relative to the scale."""
        if self.difference == 0.0:
            return 0.0
        return self.difference / self.scale if self.scale > 0.0 else math.inf

    @property
    def ok(self) -> bool:
        """Do both paths agree?"""
        return self.relative <= self.tolerance

    def record(self) -> dict[str, Any]:
        """The check as it is stored."""
        return {
            "what": self.what, "unit": self.unit, "gap": self.gap, "kernel": self.kernel, "second": self.second,
            "difference": self.difference, "relative": self.relative, "relative_to": self.relative_to,
            "tolerance": self.tolerance, "ok": self.ok,
        }  # fmt: skip


def summary(checks: Sequence[Check], missed: Sequence[str], unchecked: Sequence[tuple[str, str]]) -> dict[str, Any]:
    """Return all checks as stored; ``largest`` is the worst difference in units where ``TOLERANCE`` is allowed."""
    largest = max((check.relative * (TOLERANCE / check.tolerance) for check in checks), default=0.0)
    failed = [check for check in checks if not check.ok]
    text = [
        f"{check.what}: the design path says {from_si(check.kernel, check.unit):.8g} {check.unit}, the second path "
        f"{from_si(check.second, check.unit):.8g} {check.unit}; they differ by {check.relative:.1e} of "
        f"{check.relative_to}, allowed is {check.tolerance:.0e}"
        for check in failed
    ]
    found: dict[str, Any] = jsonable(
        {
            "ok": not failed,
            "tolerance": TOLERANCE,
            # JSON has no infinity; a value that one path alone finds is as wrong as can be
            "largest": min(largest, 1e300),
            "checks": [check.record() for check in checks],
            "failed": text,
            "missed": list(missed),
            "unchecked": [{"what": what, "why": why} for what, why in unchecked],
        }
    )
    return found
