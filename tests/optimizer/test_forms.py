"""Condition forms against differences of their values: bilinear forms have exact ones."""

from __future__ import annotations

from typing import Literal

import numpy as np
import pytest
from polewright.objectives.problem import Problem
from polewright.optimizer.forms import ConditionForms
from polewright.optimizer.layout import Layout, layout

from ..models.parts import plate
from ..tolerances import CANCELLED, worst
from .problems import both_free, disc, free, given, near_far, profile, signs

Link = Literal["", "matched", "same"]


def cases() -> dict[str, tuple[Problem, Layout]]:
    part, wide, narrow, round_ = plate(4, 5), plate(6, 3), plate(4, 5), disc(5.0)
    known = np.full(part.shape, np.nan)
    known[1, 1:3] = [1.0, -1.0]
    partner = signs(np.random.default_rng(1), *narrow.shape)
    return {
        "free": (profile(part, part), both_free(part, part)),
        "unequal": (near_far(wide, narrow), both_free(wide, narrow)),
        "symmetric": (profile(part, round_), both_free(part, round_, "odd-x")),
        "matched": (profile(part, part), layout(free(part), free(part), "matched")),
        "same": (profile(part, part), layout(free(part, "even-x"), free(part), "same")),
        "partner": (profile(wide, narrow), layout(free(wide), given(narrow, partner))),
        "coarse": (near_far(part, part), both_free(part, part, brush=2).coarse()),
    }


CASES = cases()


@pytest.fixture(params=sorted(CASES))
def case(request: pytest.FixtureRequest) -> tuple[Problem, Layout, ConditionForms]:
    problem, found = CASES[request.param]
    return problem, found, ConditionForms(problem, found)


def test_values_are_the_problem_s_conditions_and_worth(case: tuple[Problem, Layout, ConditionForms]) -> None:
    problem, found, forms = case
    for z in np.random.default_rng(2).uniform(-1.0, 1.0, (3, found.count)):
        response = problem.rows(*found.patterns(z))
        wanted = problem.conditions(response)
        if problem.improves:
            wanted = np.append(wanted, problem.improvement(response))
        assert worst(forms.values(z), wanted) < CANCELLED


def test_slopes_and_curvature_are_differences(case: tuple[Problem, Layout, ConditionForms]) -> None:
    _, found, forms = case
    z = np.random.default_rng(3).uniform(-1.0, 1.0, found.count)
    here = forms.values(z)
    up, down = (
        np.stack([forms.values(z + step * unit) for unit in np.eye(found.count)], axis=1) for step in (1.0, -1.0)
    )
    assert worst(forms.slopes(z), (up - down) / 2.0) < CANCELLED
    size = np.abs(up - down).max()
    assert np.abs(forms.curvature - ((up + down) / 2.0 - here[:, None])).max() < CANCELLED * size
    assert found.linked or not forms.curvature.any()


def test_slope_change_is_the_difference_of_slopes(case: tuple[Problem, Layout, ConditionForms]) -> None:
    _, found, forms = case
    z = signs(np.random.default_rng(4), found.count)
    for variable in range(found.count):
        moved = z.copy()
        moved[variable] *= -1.0
        wanted = (forms.slopes(moved) - forms.slopes(z)) / (-2.0 * z[variable])
        size = np.abs(forms.slopes(z)).max()
        assert np.abs(forms.slope_change(variable) - wanted).max() < CANCELLED * size


def test_slopes_split_by_part(case: tuple[Problem, Layout, ConditionForms]) -> None:
    _, found, forms = case
    a, b = found.patterns(np.random.default_rng(5).uniform(-1.0, 1.0, found.count))
    through_base, through_mover = forms.slopes_base(b), forms.slopes_mover(a)
    if not found.linked:
        assert not through_base[:, found.owner == 1].any()
        assert not through_mover[:, found.owner == 0].any()
