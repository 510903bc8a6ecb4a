"""Tabu, local search and polish: what they carry along is exact, what they return is the best that they met."""

from __future__ import annotations

from typing import Any, Literal

import jax.numpy as jnp
import numpy as np
import pytest
from polewright.objectives.problem import Problem
from polewright.optimizer.forms import ConditionForms
from polewright.optimizer.layout import Layout, layout
from polewright.optimizer.local import LocalSearch
from polewright.optimizer.polish import Polish
from polewright.optimizer.relaxed import Relaxed
from polewright.optimizer.scoring import score
from polewright.optimizer.stopping import Budget
from polewright.optimizer.tabu import CHUNK, MOVES_PER_EVALUATION, STARTS, TabuSearch
from polewright.optimizer.width import keeps_width, mended

from ..models.parts import plate
from ..tolerances import CANCELLED
from .problems import Array, both_free, curved, free, near_far, profile, signs

SOFTNESS = np.geomspace(0.02, 0.1, STARTS)
VIOLATION = np.geomspace(5.0, 50.0, STARTS)


def linear_cases() -> dict[str, tuple[Problem, Layout]]:
    part, wide, narrow = plate(5, 4), plate(6, 3), plate(4, 5)
    links: dict[str, Literal["matched", "same"]] = {"matched": "matched", "same": "same"}
    cases = {
        "free": (near_far(part, part), both_free(part, part)),
        "improve": (profile(wide, narrow), both_free(wide, narrow, "half-turn")),
    }
    return cases | {name: (profile(part, part), layout(free(part), free(part), link)) for name, link in links.items()}


CASES = linear_cases()


def spied(search: TabuSearch) -> list[tuple[Any, Array, Array]]:
    """Note the state after each chunk of steps with the prices (softness, violation) it was walked at."""
    seen: list[tuple[Any, Array, Array]] = []
    advance = search._advance

    def spy(*arguments: Any) -> Any:
        walk = advance(*arguments)
        seen.append((walk, np.asarray(arguments[2]), np.asarray(arguments[3])))
        return walk

    search.__dict__["_advance"] = spy
    return seen


@pytest.mark.parametrize("name", sorted(CASES))
def test_tabu_carries_exact_values_and_returns_its_best(name: str) -> None:
    problem, found = CASES[name]
    forms = ConditionForms(problem, found)
    search = TabuSearch(forms)
    starts = signs(np.random.default_rng(1), STARTS, found.count)
    seen = spied(search)
    returned = search.run(starts, np.random.default_rng(2), Budget(10**6), 3 * CHUNK, SOFTNESS, VIOLATION)
    last = seen[-2:]  # the two halves of the starts
    assert np.array_equal(np.concatenate([np.asarray(walk.top_z) for walk, _, _ in last]), returned)
    row = 0
    for walk, _, violation in last:
        for n in range(len(violation)):

            def judged(z: Array, price: Array = violation[n]) -> float:
                return float(search._true_score(jnp.asarray(forms.values(z)), jnp.asarray(price)))

            z, top_z = np.asarray(walk.z[n]), np.asarray(walk.top_z[n])
            assert (np.abs(z) == 1.0).all()
            values, slopes = forms.values(z), forms.slopes(z)
            assert np.abs(np.asarray(walk.values[n]) - values).max() < CANCELLED * np.abs(values).max()
            assert np.abs(np.asarray(walk.slopes[n]) - slopes).max() < CANCELLED * np.abs(slopes).max()
            top = judged(top_z)
            assert top == pytest.approx(float(walk.top[n]), rel=1e-9, abs=1e-9)
            assert top >= max(judged(starts[row]), judged(z)) - 1e-9
            row += 1


def test_tabu_books_what_it_walks_and_stops_at_the_budget() -> None:
    problem, found = CASES["free"]
    search = TabuSearch(ConditionForms(problem, found))
    starts = signs(np.random.default_rng(2), STARTS, found.count)

    def walked(budget: Budget) -> Array:
        return search.run(starts, np.random.default_rng(3), budget, 2 * CHUNK, SOFTNESS, VIOLATION)

    budget = Budget(10 * STARTS * CHUNK)
    found_z = walked(budget)
    assert budget.used == 2 * CHUNK * STARTS // MOVES_PER_EVALUATION
    assert np.array_equal(found_z, walked(Budget(10**9)))
    spent = Budget(STARTS - 1)
    assert np.array_equal(walked(spent), starts)
    assert spent.used == 0


def soft(search: LocalSearch, z: Array) -> float:
    """The local search's own score from values computed anew."""
    return float(search._score(search.forms.values(z)))


@pytest.mark.parametrize("name", sorted(CASES))
def test_local_search_returns_a_best_that_no_flip_beats(name: str) -> None:
    problem, found = CASES[name]
    search = LocalSearch(ConditionForms(problem, found))
    for z in signs(np.random.default_rng(3), 3, found.count):
        best = search.run(z, np.random.default_rng(4), 200, Budget(10**6))
        reached = soft(search, best)
        assert (np.abs(best) == 1.0).all()
        assert reached >= soft(search, z)
        flips = best * (1.0 - 2.0 * np.eye(found.count))
        assert max(soft(search, other) for other in flips) <= reached + 1e-9


@pytest.mark.parametrize("name", sorted(CASES))
def test_local_search_updates_are_exact(name: str) -> None:
    problem, found = CASES[name]
    search = LocalSearch(ConditionForms(problem, found))
    z = signs(np.random.default_rng(5), found.count)
    values, slopes = search.forms.values(z), search.forms.slopes(z)
    for variable in np.random.default_rng(6).integers(found.count, size=300):
        effects = search._effects(z, slopes, np.ones((found.count, 1), dtype=bool))
        wanted = values + effects[:, variable]
        values, slopes = search._flip(z, int(variable), values, slopes)
        np.testing.assert_allclose(values, wanted, atol=1e-10 * np.abs(values).max())
    np.testing.assert_allclose(values, search.forms.values(z), atol=CANCELLED * np.abs(values).max())
    np.testing.assert_allclose(slopes, search.forms.slopes(z), atol=CANCELLED * np.abs(slopes).max())


@pytest.mark.parametrize("rule", ["none", "odd-x"])
def test_local_search_keeps_the_pole_width(rule: str) -> None:
    part = plate(8, 8)
    found = both_free(part, part, rule, 2)
    search = LocalSearch(ConditionForms(near_far(part, part), found))
    z = mended(found, np.random.default_rng(7).normal(size=found.count))
    budget = Budget(10**6)
    best = search.run(z, np.random.default_rng(8), 150, budget)
    assert keeps_width(found, best[None])[0]
    assert soft(search, best) > soft(search, z)
    assert budget.used == 150
    assert np.array_equal(search.run(z, np.random.default_rng(8), 150, Budget(0)), z)


def test_polish_never_returns_worse() -> None:
    part = plate(6, 6)
    problem = curved(part, part)
    found = both_free(part, part, brush=2)
    polish = Polish(Relaxed(problem, found))

    def reached(z: Array) -> Any:
        conditions = problem.conditions(problem.rows(*found.patterns(z)))
        return score(np, problem.counts, conditions)

    for seed in range(2):
        z = mended(found, np.random.default_rng(seed).normal(size=found.count))
        budget = Budget(2000)
        out = polish.run(z, 10, budget)
        assert reached(out) > reached(z)
        assert keeps_width(found, out[None])[0]
        assert 0 < budget.used <= 2000 + 64
    assert np.array_equal(polish.run(z, 5, Budget(0)), z)
