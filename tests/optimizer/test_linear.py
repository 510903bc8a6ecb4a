"""Linear programs: with one part given the optimum of a sum is known, and other solvers agree on the rest."""

from __future__ import annotations

import numpy as np
import pytest
from polewright.models.pair import Row, pair_forms
from polewright.objectives.problem import Problem
from polewright.optimizer.forms import ConditionForms
from polewright.optimizer.layout import layout
from polewright.optimizer.linear import alternate, best_part
from polewright.optimizer.stopping import Budget
from scipy.optimize import linprog

from ..models import references as ref
from ..models.parts import plate
from .problems import MM, axial, both_free, free, given, most_held, near_far, profile, signs


def test_enumerated_partner_of_4_by_4() -> None:
    # all 65,536 patterns against a given partner, enumerated with the closed form (see references)
    part = plate(4, 4)
    problem = Problem(part, part, [], [most_held(1.0)])
    found = layout(free(part), given(part, ref.pattern(ref.LINEAR_PARTNER)))
    z = best_part(ConditionForms(problem, found), np.zeros(found.count), "base")
    a, b = found.patterns(z)
    assert np.array_equal(a, ref.pattern(ref.LINEAR_BEST))
    assert problem.exact(a, b).values[0] == pytest.approx(ref.LINEAR_BEST_N, abs=1e-8)


@pytest.mark.parametrize("side", ["base", "mover"])
def test_without_requires_a_part_reaches_the_sum_of_sizes(side: str) -> None:
    # a bilinear form is linear in one part: its largest value over |a| <= 1 is sum|K b|
    base, mover = plate(14, 11), plate(9, 12)
    problem = Problem(base, mover, [], [most_held(0.4)])
    pattern = signs(np.random.default_rng(1), *(mover if side == "base" else base).shape)
    forms = pair_forms(base, mover, [Row("fz", 0.4 * MM)])
    if side == "base":
        found = layout(free(base), given(mover, pattern))
        largest = np.abs(forms.base_products(pattern)).sum()
        z = best_part(ConditionForms(problem, found), np.zeros(found.count), "base")
    else:
        found = layout(given(base, pattern), free(mover))
        largest = np.abs(forms.mover_products(pattern)).sum()
        z = best_part(ConditionForms(problem, found), np.zeros(found.count), "mover")
    assert problem.exact(*found.patterns(z)).values[0] == pytest.approx(largest, rel=1e-10)


def test_worst_margin_agrees_with_an_interior_point_solver() -> None:
    # the same program written down once more from dense kernels, solved by another method
    base, mover = plate(6, 5), plate(5, 6)
    problem = near_far(base, mover)
    b = signs(np.random.default_rng(2), *mover.shape)
    found = layout(free(base), given(mover, b))
    forms = ConditionForms(problem, found)
    z = best_part(forms, np.zeros(found.count), "base")
    near, far = pair_forms(base, mover, [Row("fz", 0.3 * MM), Row("fz", 4.0 * MM)]).base_products(b).reshape(2, -1)
    # relative margins: -F(0.3)/2 - 1 and F(4)/0.05 - 1, both at least t
    rows = np.array([np.append(near / 2.0, 1.0), np.append(-far / 0.05, 1.0)])
    bounds = [(-1.0, 1.0)] * near.size + [(None, None)]
    other = linprog(np.append(np.zeros(near.size), -1.0), rows, [-1.0, -1.0], bounds=bounds, method="highs-ipm")
    assert forms.values(z).min() == pytest.approx(-other.fun, rel=1e-7)
    assert (np.abs(np.abs(z) - 1.0) > 1e-6).sum() <= 2  # at a vertex: no more fractions than active conditions


def test_improve_under_bounds_agrees_with_an_interior_point_solver() -> None:
    base, mover = plate(6, 6), plate(6, 6)
    problem = profile(base, mover)
    a = np.where(np.indices(base.shape)[1] < 3, 1.0, -1.0)
    found = layout(given(base, a), free(mover))
    forms = ConditionForms(problem, found)
    z = best_part(forms, np.zeros(found.count), "mover")
    rows = [Row("fz", gap * MM) for gap in (0.3, 3.0, 1.5, 0.5)]
    near, far, band, best = pair_forms(base, mover, rows).mover_products(a).reshape(4, -1)
    other = linprog(
        best, np.stack([near, -far, band, -band]), [-1.0, -0.02, -0.1, 0.5], bounds=[(-1.0, 1.0)] * 36,
        method="highs-ipm",
    )  # fmt: skip
    assert other.status == 0
    assert -(best @ z) == pytest.approx(-other.fun, rel=1e-6)
    assert forms.values(z)[:-1].min() > -1e-7


def test_bounds_that_nothing_meets_are_missed_by_as_little_as_possible() -> None:
    part = plate(5, 5)
    problem = Problem(part, part, [axial("at_most", 0.3, -1e3)], [most_held(0.5)])
    found = layout(free(part), given(part, np.ones(part.shape)))
    z = best_part(ConditionForms(problem, found), np.zeros(found.count), "base")
    assert (z == 1.0).all()  # facing uniform poles pull most


def test_taking_turns_never_loses() -> None:
    part = plate(6, 6)
    problem = near_far(part, part)
    found = both_free(part, part)
    forms = ConditionForms(problem, found)
    for z in np.random.default_rng(3).uniform(-1.0, 1.0, (3, found.count)):
        budget = Budget(1000)
        out = alternate(forms, z, budget)
        assert (np.abs(out) <= 1.0 + 1e-12).all()
        assert forms.values(out).min() >= forms.values(z).min()
        assert budget.used > 0
    assert np.array_equal(alternate(forms, z, Budget(0)), z)
