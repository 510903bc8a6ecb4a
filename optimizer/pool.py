"""The designs a run keeps: exactly judged, best first, distinct from each other."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ..models.symmetry import IMAGES
from ..objectives.problem import Evaluation, Problem
from .layout import Layout
from .width import keeps_width

Array = NDArray[np.float64]

_LARGEST = 48
"""Designs kept of each island."""
_DISTINCT = 0.01
"""Designs count as distinct when more than this fraction of the free cells differs."""


@dataclass(frozen=True, eq=False)
class Candidate:
    """One rounded design.

    Attributes:
        z: Variables, -1 and +1, shape (n,).
        origin: Which kind of search found it.
        island: Number of the population that it belongs to; walks cross designs of one island only.
        evaluation: Its exact judgement.
    """

    z: Array
    origin: str
    island: int
    evaluation: Evaluation

    @property
    def rank(self) -> tuple[bool, float]:
        """Larger is better: feasible designs by their score, others by their worst margin."""
        feasible = self.evaluation.feasible
        return feasible, self.evaluation.score if feasible else self.evaluation.worst_margin


class Pool:
    """Designs of a run, best first.

    Attributes:
        problem: What is asked.
        layout: What is free.
        candidates: The best designs so far.
    """

    def __init__(self, problem: Problem, layout: Layout) -> None:
        self.problem = problem
        self.layout = layout
        self.candidates: list[Candidate] = []
        self._seen: set[bytes] = set()

    @property
    def best(self) -> Candidate | None:
        """The best design so far."""
        return self.candidates[0] if self.candidates else None

    def best_on(self, island: int) -> Candidate | None:
        """The best design of one island."""
        return next((candidate for candidate in self.candidates if candidate.island == island), None)

    def best_of(self, origin: str) -> Candidate | None:
        """The best design that one kind of search found."""
        return next((candidate for candidate in self.candidates if candidate.origin == origin), None)

    def add(self, z: Array, origin: str, island: int = 0) -> None:
        """Judge rounded variables exactly and keep them if they are among the best; repeats are ignored."""
        key = np.packbits(z > 0.0).tobytes()
        if key in self._seen or not keeps_width(self.layout, z[None])[0]:
            return
        self._seen.add(key)
        a, b = self.layout.patterns(z)
        self.candidates.append(Candidate(z.copy(), origin, island, self.problem.exact(a, b)))
        self.candidates.sort(key=lambda candidate: candidate.rank, reverse=True)
        mine = [n for n, candidate in enumerate(self.candidates) if candidate.island == island]
        if len(mine) > _LARGEST:
            del self.candidates[mine[-1]]

    def distinct(self, count: int, island: int | None = None) -> list[Candidate]:
        """Up to ``count`` of the best designs, of one island or of all, each apart from all better ones."""
        apart = max(_DISTINCT * self.layout.count, 1.0)
        found: list[Candidate] = []
        for candidate in self.candidates:
            if island is not None and candidate.island != island:
                continue
            if all(self._differ(candidate, other, apart) for other in found):
                found.append(candidate)
            if len(found) == count:
                break
        return found

    def _differ(self, one: Candidate, other: Candidate, apart: float) -> bool:
        """Are they more than ``apart`` from each other, and not each other's mirror image with equal numbers?"""
        if self._distance(one.z, other.z) <= apart:
            return False
        if not np.allclose(one.evaluation.values, other.evaluation.values, rtol=1e-6, atol=0.0, equal_nan=True):
            return True
        mine, yours = self.layout.patterns(one.z), self.layout.patterns(other.z)
        signs = (1.0, -1.0) if self.problem.reverses else (1.0,)
        images = [image for name in ("half-turn", "quarter-turn", "even-x", "even-y") for image, _ in IMAGES[name]]
        return not any(
            all(np.array_equal(sign * image(a), b) for a, b in zip(mine, yours, strict=True))
            for image in images
            for sign in signs
        )

    def _distance(self, one: Array, other: Array) -> float:
        """Variables that differ; both parts reversed together are the same design where nothing tells them apart."""
        differ = float((one != other).sum())
        given = self.layout.base.constant.any() or self.layout.mover.constant.any()
        return min(differ, one.size - differ) if self.problem.reverses and not given else differ
