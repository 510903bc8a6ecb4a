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
            "islands": np.array([candidate.island for candidate in pool.candidates], dtype=np.int64),
            "stage": np.array(
                [
                    progress.stage,
                    progress.stale,
                    progress.mark[0],
                    progress.island,
                    progress.age,
                    progress.island_stale,
                    progress.island_mark[0],
                ],
                dtype=np.int64,
            ),
            "marks": np.array([progress.mark[1], progress.island_mark[1]], dtype=np.float64),
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
    if arrays.get("variables", np.zeros((0, 0))).shape[1:] != (layout.count,):
        message = "the archive's state does not fit its spec; start the run anew with --replace"
        raise InputError(message)
    try:
        variables, origins, islands = arrays["variables"], arrays["origins"], arrays["islands"]
        for z, origin, island in zip(variables, origins, islands, strict=True):
            pool.add(z.astype(np.float64), ORIGINS[int(origin)], int(island))
        stage, stale, met, island, age, island_stale, island_met = (int(value) for value in arrays["stage"])
        mark, island_mark = (float(value) for value in arrays["marks"])
        history = [(float(a), float(b), float(c)) for a, b, c in arrays["rounds"]]
        marks = ((bool(met), mark), (bool(island_met), island_mark))
        return pool, Progress(stage, stale, marks[0], island, age, island_stale, marks[1], history)
    except (KeyError, IndexError, ValueError) as error:
        message = f"the archive holds no complete state ({error}); start the run anew with --replace"
        raise InputError(message) from None
