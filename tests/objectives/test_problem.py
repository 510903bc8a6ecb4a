"""Judgement of a design, and the conditions that a search sees instead."""

from __future__ import annotations

from typing import Any, Literal

import jax.numpy as jnp
import numpy as np
import pytest
from numpy.typing import NDArray
from polewright.models.patterns import stripes, uniform
from polewright.objectives.goals import Improve, Require
from polewright.objectives.plan import Response
from polewright.objectives.problem import Problem
from polewright.objectives.quantity import Bound

from ..models.references import MM
from .examples import BASE, MOVER, example, rounded

CENTRED: dict[str, Any] = {"offset_mm": (0.0, 0.0)}
A, B = uniform(BASE.mask), uniform(MOVER.mask)


def require(
    name: str, kind: Literal["at_least", "at_most", "equal_to"], *values: float, within: float = 0.0, **changes: Any
) -> Require:
    bound = Bound(kind, np.array(values), np.full(len(values), within))
    return Require(name, example(name, **changes), bound)


def hold(gap_mm: float = 0.7) -> float:
    """Holding force of two uniform faces [N]."""
    asked = Problem(BASE, MOVER, [require("holding_force", "at_least", 0.0, gap_mm=gap_mm, **CENTRED)], [])
    return float(asked.exact(A, B).values[0])


def test_values_stand_in_spec_order_requires_first() -> None:
    asked = Problem(
        BASE,
        MOVER,
        [
            require("axial_force", "at_most", 0.0, 0.0, gap_mm=(0.7, 2.0), **CENTRED),
            require("pole_count", "at_most", 3.0),
        ],
        [Improve("holding_force", example("holding_force", gap_mm=2.0, **CENTRED), "maximize")],
    )
    found = asked.exact(A, B)
    assert found.values == pytest.approx([-hold(0.7), -hold(2.0), 1.0, hold(2.0)])
    assert found.margins.shape == (2,)
    assert found.score == pytest.approx(hold(2.0))


def test_a_require_is_as_good_as_its_worst_element() -> None:
    near, far = hold(0.7), hold(2.0)
    asked = Problem(
        BASE, MOVER, [require("holding_force", "at_least", 0.5 * near, 1.1 * far, gap_mm=(0.7, 2.0), **CENTRED)], []
    )
    found = asked.exact(A, B)
    assert found.margins == pytest.approx([-0.1 / 1.1])
    assert not found.feasible


def test_an_equality_that_is_met_does_not_enter_the_worst_margin() -> None:
    near = hold()
    loose = require("holding_force", "at_least", 0.5 * near, **CENTRED)
    tight = require("holding_force", "equal_to", near, within=0.01 * near, **CENTRED)
    found = Problem(BASE, MOVER, [loose, tight], []).exact(A, B)
    assert found.feasible
    assert found.margins == pytest.approx([1.0, 0.01])
    assert found.worst_margin == pytest.approx(1.0)
    assert found.score == found.worst_margin


def test_an_equality_that_is_missed_does() -> None:
    near = hold()
    loose = require("holding_force", "at_least", 0.5 * near, **CENTRED)
    missed = require("holding_force", "equal_to", 2.0 * near, within=0.02 * near, **CENTRED)
    found = Problem(BASE, MOVER, [loose, missed], []).exact(A, B)
    assert not found.feasible
    assert found.worst_margin == pytest.approx(-0.49)


def test_equalities_alone_that_are_met_give_their_own_margin() -> None:
    near = hold()
    found = Problem(BASE, MOVER, [require("holding_force", "equal_to", near, within=0.01 * near, **CENTRED)], []).exact(
        A, B
    )
    assert found.worst_margin == pytest.approx(0.01)


def test_a_value_that_does_not_exist_misses() -> None:
    asked = Problem(BASE, MOVER, [require("stand_off", "at_least", 1.0 * MM)], [])
    found = asked.exact(A, B)
    assert np.isnan(found.values).all()
    assert found.margins == pytest.approx([-np.inf])
    assert not found.feasible
    assert found.worst_margin == -np.inf


def test_improve_senses_rank_designs() -> None:
    def score(sense: Any, b: NDArray[np.int8], target: float | None = None) -> float:
        aim = None if target is None else np.array([target])
        improve = Improve("holding_force", example("holding_force", **CENTRED), sense, aim)
        return Problem(BASE, MOVER, [], [improve]).exact(A, b).score

    striped = stripes(MOVER.mask, 2)  # holds less than a uniform face
    assert score("maximize", B) > score("maximize", striped)
    assert score("minimize", B) < score("minimize", striped)
    assert score("toward", B, hold()) > score("toward", striped, hold())
    assert score("toward", B, hold()) == pytest.approx(0.0, abs=1e-9)


def test_conditions_are_met_where_margins_are() -> None:
    """On rounded designs, for requires whose surrogate is exact: signs agree, in NumPy and in JAX."""
    requires = [
        require("axial_force", "at_most", -1.0, 0.5, gap_mm=(0.7, 2.0), **CENTRED),
        require("tilt_moment", "at_most", 2e-3, **CENTRED),
        require("lateral_force", "at_least", 0.0),
        require("net_moment", "at_most", 0.02, of="base"),
        require("holding_force", "equal_to", 1.0, within=1.0, **CENTRED),
    ]
    asked = Problem(BASE, MOVER, requires, [])
    seen = set()
    for seed in range(40):
        a, b = rounded(BASE, seed), rounded(MOVER, 100 + seed)
        response = asked.rows(a, b)
        conditions = asked.conditions(response)
        assert conditions.shape == asked.counts.shape
        assert bool((conditions >= 0.0).all()) == asked.exact(a, b).feasible
        seen.add(asked.exact(a, b).feasible)
        traced = Response(
            jnp, jnp.asarray(response.pair), jnp.asarray(response.linear), jnp.asarray(a * 1.0), jnp.asarray(b * 1.0)
        )
        assert np.asarray(asked.conditions(traced)) == pytest.approx(conditions, rel=1e-9)
    assert asked.counts.sum() == 5  # the equality's two ends do not count
    assert False in seen


def test_many_designs_are_judged_like_one() -> None:
    near = hold()
    requires = [
        require("holding_force", "at_least", 0.1 * near, 0.0, gap_mm=(0.7, 2.0), **CENTRED),
        require("tilt_moment", "equal_to", 2e-3, within=2e-3, **CENTRED),
    ]
    improve = Improve("axial_stiffness", example("axial_stiffness", **CENTRED), "maximize")
    for improves in ([], [improve]):
        asked = Problem(BASE, MOVER, requires, improves)
        assert asked.judged_by_rows
        pairs = [(rounded(BASE, n), rounded(MOVER, 50 + n)) for n in range(6)] + [(A, B)]
        one = [asked.rows(a, b) for a, b in pairs]
        stacked = [
            np.stack([getattr(response, name) for response in one]) for name in ("pair", "linear", "base", "mover")
        ]
        feasible, worst, score = asked.judge_rows(Response(np, *stacked))
        for n, (a, b) in enumerate(pairs):
            alone = asked.exact(a, b)
            assert bool(feasible[n]) is alone.feasible
            assert worst[n] == pytest.approx(alone.worst_margin)
            assert score[n] == pytest.approx(alone.score)


def test_a_pose_is_computed_once() -> None:
    """Quantities that look at one pose share its row."""
    requires = [
        require("axial_force", "at_least", 1.0, **CENTRED),
        require("holding_force", "at_least", 1.0, **CENTRED),
        require("force_sensitivity", "at_most", 1.0, **CENTRED),
        require("axial_stiffness", "at_most", 1.0, **CENTRED),
        require("net_moment", "at_most", 1.0, of="base"),
        require("net_moment", "at_most", 1.0, of="both"),
    ]
    asked = Problem(BASE, MOVER, requires, [])
    assert asked.forms.count == 2  # fz and kzz
    assert asked.linear_base.shape[0] == 2


def test_linear_forms_are_the_conditions_and_the_worth() -> None:
    requires = [
        require("holding_force", "at_least", 1.0, **CENTRED),
        require("axial_force", "at_least", 0.5, gap_mm=3.0, **CENTRED),
    ]
    improve = Improve("holding_force", example("holding_force", gap_mm=0.2, **CENTRED), "maximize")
    asked = Problem(BASE, MOVER, requires, [improve])
    assert asked.is_linear
    factors, constant = asked.linear_forms()
    response = asked.rows(rounded(BASE, 1), rounded(MOVER, 2))
    expected = [*asked.conditions(response), asked.improvement(response)]
    assert factors @ response.pair + constant == pytest.approx(expected, rel=1e-9)


def test_a_pole_width_is_met_by_the_brush() -> None:
    requires = [
        require("narrowest_pole", "at_least", 2.0 * MM, of="both"),
        require("narrowest_pole", "at_least", 3.0 * MM, of="mover"),
    ]
    asked = Problem(BASE, MOVER, requires, [])
    assert asked.brush("base") == pytest.approx(2.0 * MM)
    assert asked.brush("mover") == pytest.approx(3.0 * MM)
    assert asked.counts.size == 0


def test_what_a_surrogate_overstates() -> None:
    """The offset turns the surrogate's condition into the exact one at that design."""
    asked = Problem(BASE, MOVER, [require("stray_field", "at_most", 5e-3, of="base", side="back")], [])
    a, b = rounded(BASE, 3), rounded(MOVER, 4)
    claimed = asked.conditions(asked.rows(a, b)) - asked.overstated(a, b)
    assert claimed == pytest.approx(asked.exact(a, b).margins, rel=1e-9)


@pytest.mark.parametrize(("component", "reverses"), [("z", False), ("size", True)])
def test_reversal_matters_to_a_component_alone(component: str, reverses: bool) -> None:
    asked = Problem(BASE, MOVER, [require("field_at", "at_most", 1.0, component=component)], [])
    assert asked.reverses is reverses
