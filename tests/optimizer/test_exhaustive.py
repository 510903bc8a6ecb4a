"""Every pattern pair: the proven optimum against a brute force with the published cuboid force."""

from __future__ import annotations

import numpy as np
import pytest
from polewright.models.part import Part
from polewright.objectives.goals import Improve
from polewright.objectives.problem import Problem
from polewright.optimizer import exhaustive
from polewright.optimizer.layout import Face, layout
from polewright.optimizer.portfolio import search
from polewright.optimizer.stopping import Budget, StopReason

from ..models import references as ref
from ..models.parts import plate
from .cuboids import all_patterns, axial_matrix
from .problems import MM, axial, both_free, free, most_held, near_far, require

CELLS_2MM = plate(3, 3, cell_mm=2.0)


def test_the_pair_of_nine_cells_is_solved_to_the_last_digit() -> None:
    part = CELLS_2MM
    problem = Problem(part, part, [axial("at_most", 0.3, -4.0), axial("at_least", 4.0, 0.1)], [])
    found = both_free(part, part)
    pool, _, reason = search(problem, found, Budget(200_000), seed=0, starts=4)
    assert reason is StopReason.PROVEN
    # all 2^18 pairs
    every = all_patterns(9)
    near, far = (every @ axial_matrix(3, 2e-3, 3e-3, 1.3, gap * MM) @ every.T for gap in (0.3, 4.0))
    margins = np.minimum((-4.0 - near) / 4.0, (far - 0.1) / 0.1)
    assert pool.best is not None
    best = pool.best.evaluation
    assert best.worst_margin == pytest.approx(margins.max(), rel=1e-9)
    # the pattern itself is an optimum of the brute force, not only its value
    a, b = found.patterns(pool.best.z)
    row = int(np.flatnonzero((every == a.ravel()).all(axis=1))[0])
    column = int(np.flatnonzero((every == b.ravel()).all(axis=1))[0])
    assert margins[row, column] == pytest.approx(margins.max(), rel=1e-9)
    assert pool.best.origin in ("enumerated", "given")


def test_a_joint_reversal_halves_the_pairs() -> None:
    part = CELLS_2MM
    problem, found = near_far(part, part), both_free(part, part)
    assert exhaustive.pairs(problem, found) == 2**17
    assert exhaustive.fits(problem, found, Budget(2**17))
    assert not exhaustive.fits(problem, found, Budget(2**17 - 1))


def test_given_cells_keep_all_pairs() -> None:
    part = CELLS_2MM
    known = np.full(part.shape, np.nan)
    known[0, 0] = 1.0
    found = layout(Face(part.mask, known), free(part))
    assert exhaustive.pairs(near_far(part, part), found) == 2**17


@pytest.mark.parametrize(("gap", "largest", "pattern", "least"), ref.ENUMERATED_3X3)
def test_matched_pairs_of_nine_cells(gap: float, largest: float, pattern: str, least: float | None) -> None:
    part = CELLS_2MM
    found = layout(free(part), free(part), "matched")
    improve = most_held(gap)
    for sense, wanted in (("maximize", largest), ("minimize", least)):
        if wanted is None:
            continue
        problem = Problem(part, part, [], [Improve(improve.quantity, improve.params, sense)])  # type: ignore[arg-type]
        pool, _, reason = search(problem, found, Budget(1000), seed=0, starts=4)
        assert reason is StopReason.PROVEN
        assert pool.best is not None
        assert pool.best.evaluation.values[0] == pytest.approx(wanted, abs=6e-7)  # printed to 1e-6 N
        if sense == "maximize":
            told = ref.pattern(pattern)
            assert problem.exact(told, told).values[0] == pytest.approx(pool.best.evaluation.values[0], rel=1e-12)


@pytest.mark.parametrize(("gap", "largest", "pattern"), ref.ENUMERATED_4X4[:3])
def test_matched_pairs_of_sixteen_cells(gap: float, largest: float, pattern: str) -> None:
    part = plate(4, 4, cell_mm=2.0)
    problem = Problem(part, part, [], [most_held(gap)])
    found = layout(free(part), free(part), "matched")
    z, complete = exhaustive.best(problem, found, Budget(65_536))
    assert complete
    reached = problem.exact(*found.patterns(z[0])).values[0]
    assert reached == pytest.approx(largest, abs=6e-7)
    told = ref.pattern(pattern)
    assert problem.exact(told, told).values[0] == pytest.approx(reached, rel=1e-12)


@pytest.mark.parametrize("sense", ["maximize", "minimize"])
def test_a_field_component_tells_the_two_signs_apart(sense: str) -> None:
    # reversing both parts reverses the field: half of the pairs would hold only one of the two extremes
    part = CELLS_2MM
    point = (1.0 * MM, 0.5 * MM, -6.0 * MM)
    params = {"of": "pair", "gap": 1.0 * MM, "point": point, "component": "z"}
    problem = Problem(part, part, [], [Improve("field_at", params, sense)])  # type: ignore[arg-type]
    found = layout(free(part), free(part), "matched")
    assert exhaustive.pairs(problem, found) == 2**9
    z, complete = exhaustive.best(problem, found, Budget(2**9))
    assert complete
    both = problem.linear_base + problem.linear_mover
    along_z = max(both, key=lambda row: abs(row.sum()))  # the z row is the one that a uniform part excites most
    every = all_patterns(9) @ along_z
    wanted = every.max() if sense == "maximize" else every.min()
    assert problem.exact(*found.patterns(z[0])).values[0] == pytest.approx(wanted, rel=1e-12)


def test_quantities_that_cost_more_than_rows_are_enumerated_one_by_one() -> None:
    part = plate(2, 2, cell_mm=2.0)
    stray = require("stray_field", "at_most", 30e-3, of="base", side="back", distance=5.0 * MM, gap=0.0)
    problem = Problem(part, part, [stray, axial("at_most", 0.5, -0.5)], [])
    assert not problem.judged_by_rows
    found = both_free(part, part)
    z, complete = exhaustive.best(problem, found, Budget(1000))
    assert complete
    every = [problem.exact(*found.patterns(row)) for row in all_patterns(8)]
    best = max((e.feasible, e.score if e.feasible else e.worst_margin) for e in every)
    reached = problem.exact(*found.patterns(z[0]))
    assert (reached.feasible, reached.score) == pytest.approx(best, rel=1e-9)


def test_pole_width_holds_in_an_enumeration() -> None:
    part = plate(4, 2)
    problem = Problem(part, part, [], [most_held(0.2)])
    found = layout(free(part, brush=2), free(part, brush=2), "matched")
    z, complete = exhaustive.best(problem, found, Budget(1000))
    assert complete
    wide = {tuple(found.patterns(row)[0].ravel()) for row in z}
    # of the 2^8 patterns, a brush of 2 x 2 paints: uniform, and split in the middle; each up to its reversal
    assert len(wide) == 2


def test_an_interrupt_says_that_pairs_were_left_out() -> None:
    part: Part = CELLS_2MM
    asked = iter([False, True, True, True])
    z, complete = exhaustive.best(near_far(part, part), both_free(part, part), Budget(10**6, None, lambda: next(asked)))
    assert not complete
    assert 0 < len(z) <= exhaustive.KEEP
