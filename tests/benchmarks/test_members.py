"""Which member of the portfolio wins on which kind of spec: each alone against all together, equal seconds, one run.

The table that it prints stands in DEVELOPERS.md. Scores are the worst margin, or the improved force in N where the
spec has one; every number is the best design's exact judgement.
"""

from __future__ import annotations

import time
from collections.abc import Callable
from typing import Literal

import numpy as np
import pytest
from polewright.models.blank import Rectangle
from polewright.models.part import Part
from polewright.objectives.goals import Improve, Require
from polewright.objectives.problem import Problem
from polewright.objectives.quantity import Bound
from polewright.optimizer.layout import Face, Layout, layout
from polewright.optimizer.pool import Pool
from polewright.optimizer.portfolio import search
from polewright.optimizer.seeds import generator
from polewright.optimizer.stages import Stages
from polewright.optimizer.stopping import Budget
from polewright.optimizer.tabu import STARTS

SECONDS = 6.0
PLENTY = 10**9
SHORTFALL = 0.02
"""The portfolio may end this fraction below a member: walks are random, and the machine is shared."""


def bound(kind: Literal["at_least", "at_most", "equal_to"], *values: float, within: float = 0.0) -> Bound:
    """A bound in SI on each of some values."""
    return Bound(kind, np.array(values), np.full(len(values), within))


def plate(cells: int, pitch: float, remanence: float = 1.3) -> Part:
    """A square plate 3 mm thick."""
    return Part(Rectangle(cells * pitch, cells * pitch), pitch, 3e-3, remanence)


def face(part: Part, given: float = np.nan) -> Face:
    """A face that is free, or of one polarity."""
    return Face(part.mask, np.full(part.shape, given))


def near_far() -> tuple[Problem, Layout]:
    """Holds near, repels far, both parts free."""
    part = plate(24, 0.8e-3)
    asked = [
        Require("holding_force", {"gap": 0.3e-3}, bound("at_least", 58.0)),
        Require("axial_force", {"gap": 4e-3}, bound("at_least", 5.8)),
    ]
    return Problem(part, part, asked, []), layout(face(part), face(part))


def fixed_partner() -> tuple[Problem, Layout]:
    """The most repulsion at 4 mm against a uniform partner that still holds near: a linear program."""
    part = plate(24, 1e-3)
    asked = [Require("holding_force", {"gap": 0.3e-3}, bound("at_least", 20.0))]
    far = Improve("axial_force", {"gap": 4e-3}, "maximize")
    return Problem(part, part, asked, [far]), layout(face(part), face(part, 1.0))


def matched() -> tuple[Problem, Layout]:
    """The most hold at 1 mm of a matched pair: quadratic in one pattern."""
    part = plate(24, 1e-3)
    hold = Improve("holding_force", {"gap": 1e-3}, "maximize")
    return Problem(part, part, [], [hold]), layout(face(part), face(part), "matched")


def profile() -> tuple[Problem, Layout]:
    """A whole force-gap curve within a band."""
    part = plate(16, 1e-3, 1.2)
    gaps = (0.5e-3, 1e-3, 2e-3, 4e-3, 6e-3)
    curve = bound("equal_to", -15.0, -6.0, 0.0, 2.0, 1.5, within=0.3)
    return Problem(part, part, [Require("axial_force", {"gap": gaps}, curve)], []), layout(face(part), face(part))


def leaking() -> tuple[Problem, Layout]:
    """The most hold under a tight cap on the stray field: not linear."""
    part = plate(16, 1e-3)
    field = {"of": "base", "side": "back", "distance": 10e-3}
    asked = [Require("stray_field", field, bound("at_most", 1e-3))]
    hold = Improve("holding_force", {"gap": 0.3e-3}, "maximize")
    return Problem(part, part, asked, [hold]), layout(face(part), face(part))


KINDS: dict[str, Callable[[], tuple[Problem, Layout]]] = {
    "near-far": near_far, "fixed partner": fixed_partner, "matched": matched, "profile": profile, "leaking": leaking,
}  # fmt: skip


def alone(problem: Problem, found: Layout, member: str) -> float | None:
    """Best score that one member reaches within the seconds, None where it does not apply."""
    pool, budget = Pool(problem, found), Budget(PLENTY, SECONDS)
    stages = Stages(problem, found, budget, pool, 32)
    tabu = stages.tabu
    if (member == "programs" and stages.programs is None) or (member == "walks" and tabu is None):
        return None
    stages.obvious()
    for number in range(PLENTY):
        if budget.reason() is not None:
            break
        random = generator(0, member, number)
        if member == "walks" and tabu is not None:
            stages.walks(tabu, random, fresh=STARTS if number % 8 == 0 else 0)
        elif member == "polish":
            stages.polish(random)
        else:
            stages.relaxed(random, programs=member == "programs")
    return worth(pool)


def worth(pool: Pool) -> float:
    """Score of the best design; its worst margin where it misses a require."""
    assert pool.best is not None
    return pool.best.rank[1] if pool.best.rank[0] else min(pool.best.rank[1], 0.0)


@pytest.mark.parametrize("kind", sorted(KINDS))
def test_the_portfolio_is_not_below_its_members(kind: str, capsys: pytest.CaptureFixture[str]) -> None:
    problem, found = KINDS[kind]()
    tried = {member: alone(problem, found, member) for member in ("gradient", "programs", "walks", "polish")}
    reached = {member: score for member, score in tried.items() if score is not None}
    started = time.monotonic()
    together = worth(search(problem, found, Budget(PLENTY, SECONDS), 0, 32)[0])
    with capsys.disabled():
        row = ", ".join(f"{name} {value:.5g}" for name, value in (reached | {"portfolio": together}).items())
        print(f"\n{kind}: {row} ({time.monotonic() - started:.1f} s of at most {SECONDS:g})")  # noqa: T201
    best = max(reached.values())
    assert together >= best - SHORTFALL * max(abs(best), 1.0 if not problem.improves else 0.0)
