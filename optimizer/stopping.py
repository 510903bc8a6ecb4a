"""When a search ends: budget of evaluations, cap in seconds, a plateau, or somebody's interrupt."""

from __future__ import annotations

import time
from collections.abc import Callable
from enum import Enum


class StopReason(Enum):
    """Why a run ended, in words for people."""

    PROVEN = "every pattern pair was looked at: the best one is proven"
    GIVEN = "all patterns are given: they were evaluated"
    PLATEAU = "the best design no longer improved"
    EVALUATIONS = "the budget of evaluations is used up"
    SECONDS = "the cap in seconds was reached: another run may end elsewhere"
    INTERRUPTED = "interrupted: the best design so far is kept"


class Budget:
    """Counts evaluations (one pattern pair through all its poses) and watches the clock and the interrupt flag.

    What costs a fraction of an evaluation (moves of a walk) is booked as that fraction.

    Attributes:
        evaluations: Evaluations allowed, over all resumes.
        used: Evaluations so far.
        seconds: Cap in seconds over all resumes, or None.
        elapsed_before: Seconds that earlier parts of the run took.
    """

    def __init__(
        self,
        evaluations: int,
        seconds: float | None = None,
        interrupted: Callable[[], bool] = lambda: False,
        used: int = 0,
        elapsed_before: float = 0.0,
    ) -> None:
        self.evaluations = evaluations
        self.seconds = seconds
        self.used = used
        self.elapsed_before = elapsed_before
        self._interrupted = interrupted
        self._started = time.monotonic()
        self._short = False

    @property
    def elapsed(self) -> float:
        """Seconds the run has taken, earlier parts included."""
        return self.elapsed_before + time.monotonic() - self._started

    @property
    def left(self) -> int:
        """Evaluations still allowed."""
        return max(self.evaluations - self.used, 0)

    def spend(self, count: int) -> None:
        """Book evaluations."""
        self.used += count

    def affords(self, count: int) -> bool:
        """Is there budget for ``count`` more evaluations? If not, the budget counts as used up from now on."""
        self._short = self._short or self.left < count
        return not self._short

    def reason(self) -> StopReason | None:
        """Why the run must end now, or None."""
        if self._interrupted():
            return StopReason.INTERRUPTED
        if self._short or self.used >= self.evaluations:
            return StopReason.EVALUATIONS
        if self.seconds is not None and self.elapsed >= self.seconds:
            return StopReason.SECONDS
        return None
