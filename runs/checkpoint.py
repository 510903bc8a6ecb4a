"""What a stopped run needs to continue: its finished stage's designs and counters, as arrays."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..models.errors import InputError
from ..objectives.problem import Problem
from ..optimizer.layout import Layout
from ..optimizer.pool import Pool
from ..optimizer.portfolio import Progress

ORIGINS = ("given", "gradient", "linear", "polish", "search", "enumerated")


@dataclass(frozen=True)
class Checkpoint:
    """State after a finished stage.

    Attributes:
        arrays: By name, as stored under /state.
    """

    arrays: dict[str, NDArray[Any]]

    @property
    def evaluations(self) -> int:
        """Evaluations used up to then."""
        return int(self.arrays["evaluations"][0])


def take(pool: Pool, progress: Progress, evaluations: int) -> Checkpoint:
    """Write a finished stage down."""
    z = [candidate.z for candidate in pool.candidates]
    return Checkpoint(
        {
            "variables": np.array(z, dtype=np.int8).reshape(len(z), pool.layout.count),
            "origins": np.array([ORIGINS.index(c.origin) for c in pool.candidates], dtype=np.int8),
            "stage": np.array([progress.stage, progress.stale, int(progress.mark[0])], dtype=np.int64),
            "mark": np.array([progress.mark[1]], dtype=np.float64),
            "rounds": np.array(progress.history, dtype=np.float64).reshape(-1, 3),
            "evaluations": np.array([evaluations], dtype=np.int64),
        }
    )


def restore(arrays: dict[str, NDArray[Any]], problem: Problem, layout: Layout) -> tuple[Pool, Progress]:
    """Read a finished stage back; designs are judged anew, exactly.

    Raises:
        InputError: The arrays do not belong to this spec.
    """
    pool = Pool(problem, layout)
    try:
        variables, origins = arrays["variables"], arrays["origins"]
        if variables.shape[1:] != (layout.count,):
            message = "the archive's state does not fit its spec; start the run anew with --replace"
            raise InputError(message)
        for z, origin in zip(variables, origins, strict=True):
            pool.add(z.astype(np.float64), ORIGINS[int(origin)])
        stage, stale, met = (int(value) for value in arrays["stage"])
        history = [(float(a), float(b), float(c)) for a, b, c in arrays["rounds"]]
        return pool, Progress(stage, stale, (bool(met), float(arrays["mark"][0])), history)
    except (KeyError, IndexError) as error:
        message = f"the archive holds no complete state ({error}); start the run anew with --replace"
        raise InputError(message) from None
