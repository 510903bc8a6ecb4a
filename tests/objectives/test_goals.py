"""Relative margins and improvements, after the fine print of the spec."""

from __future__ import annotations

from typing import Any, Literal

import numpy as np
import pytest
from polewright.objectives.goals import Improve, improvement, relative_margins
from polewright.objectives.quantity import Bound

Kind = Literal["at_least", "at_most", "equal_to"]


def bound(kind: Kind, values: list[float], within: list[float] | None = None, scale: float | None = None) -> Bound:
    return Bound(kind, np.array(values), np.array(within or [0.0] * len(values)), scale)


def margins(asked: Bound, values: list[float], unit: str = "N") -> Any:
    return list(relative_margins(asked, np.array(values), unit))


def test_floor_and_ceiling_mirror_each_other() -> None:
    assert margins(bound("at_least", [20.0]), [25.0]) == [0.25]
    assert margins(bound("at_least", [20.0]), [15.0]) == [-0.25]
    assert margins(bound("at_most", [20.0]), [25.0]) == [-0.25]
    assert margins(bound("at_least", [-20.0]), [-25.0]) == [-0.25]
    assert margins(bound("at_most", [-20.0]), [-25.0]) == [0.25]
    assert margins(bound("at_least", [20.0]), [20.0]) == [0.0]


def test_a_target_has_a_band() -> None:
    asked = bound("equal_to", [10.0], [1.0])
    assert margins(asked, [10.0]) == [0.1]
    assert margins(asked, [11.0]) == [0.0]
    assert margins(asked, [8.0]) == pytest.approx([-0.1])


def test_scale_stands_in_where_the_bound_is_small() -> None:
    assert margins(bound("at_least", [0.0], scale=5.0), [1.0]) == [0.2]
    assert margins(bound("at_least", [2.0], scale=5.0), [3.0]) == [0.2]
    assert margins(bound("at_least", [10.0], scale=5.0), [11.0]) == [0.1]
    assert margins(bound("equal_to", [0.0], [1.0], scale=5.0), [0.0]) == [0.2]


def test_a_bound_of_zero_takes_the_largest_size_seen_on_the_list() -> None:
    assert margins(bound("at_least", [0.0, 0.0]), [1.0, -4.0]) == [0.25, -1.0]
    assert margins(bound("at_least", [0.0, 2.0]), [1.0, 4.0]) == [0.25, 1.0]
    assert margins(bound("at_most", [0.0]), [0.0]) == [0.0]


def test_without_any_size_the_unit_is_the_scale() -> None:
    """1 in the quantity's unit: 1 mm, not 1 m."""
    assert margins(bound("equal_to", [0.0], [0.5e-3]), [0.0], "mm") == pytest.approx([0.5])


def test_what_does_not_exist_is_missed() -> None:
    assert margins(bound("at_most", [2.0, 2.0]), [np.nan, 1.0]) == [-np.inf, 0.5]
    assert margins(bound("at_least", [0.0]), [np.nan]) == [-np.inf]
    assert margins(bound("equal_to", [0.0], [1.0]), [np.nan]) == [-np.inf]


def test_many_designs_at_once() -> None:
    asked = bound("at_least", [0.0, 2.0])
    values = np.array([[1.0, 4.0], [-3.0, 1.0]])
    assert relative_margins(asked, values, "N") == pytest.approx(np.array([margins(asked, list(v)) for v in values]))


def test_improvements_count_the_worst_of_a_list() -> None:
    values = np.array([[1.0, 3.0], [2.0, 2.5]])
    assert list(improvement(Improve("axial_force", {}, "maximize"), values, np)) == [1.0, 2.0]
    assert list(improvement(Improve("axial_force", {}, "minimize"), values, np)) == [-3.0, -2.5]


def test_towards_a_target_counts_the_rms_deviation() -> None:
    improve = Improve("axial_force", {}, "toward", np.array([1.0, 2.0]))
    assert improvement(improve, np.array([4.0, 6.0]), np) == pytest.approx(-np.sqrt(12.5))
    assert improvement(improve, np.array([1.0, 2.0]), np) == pytest.approx(0.0, abs=1e-100)


def test_decades_count_by_their_logarithm() -> None:
    improve = Improve("stray_field", {}, "minimize", log=True)
    better, worse = improvement(improve, np.array([[1e-6], [1e-3]]), np)
    assert better - worse == pytest.approx(np.log(1e3))
