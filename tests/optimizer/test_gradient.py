"""The relaxed problem and its loss: equal to the exact judgement, and with a gradient that passes a Taylor test."""

from __future__ import annotations

import jax
import jax.numpy as jnp
import numpy as np
import pytest
from polewright.objectives.problem import Problem
from polewright.optimizer.gradient import CHUNK, GradientDesign
from polewright.optimizer.layout import Layout, layout
from polewright.optimizer.relaxed import BATCH, Relaxed
from polewright.optimizer.stopping import Budget

from ..models.parts import plate
from ..tolerances import CANCELLED, worst
from .problems import MM, axial, both_free, curved, disc, free, near_far, profile, require


def cases() -> dict[str, tuple[Problem, Layout]]:
    part, round_ = plate(5, 4), disc(5.0)
    bands = [axial("equal_to", 0.5, -1.0, 0.2), axial("equal_to", 2.0, -0.1, 0.05)]
    return {
        "bounds": (near_far(part, part), both_free(part, part, brush=2)),
        "improve": (profile(part, round_), both_free(part, round_, "half-turn")),
        "bands": (Problem(part, part, bands, []), layout(free(part), free(part), "same")),
        "curved": (curved(round_, part), both_free(round_, part)),
    }


CASES = cases()


@pytest.mark.parametrize("name", sorted(CASES))
def test_many_are_judged_as_each_is_exactly(name: str) -> None:
    problem, found = CASES[name]
    relaxed = Relaxed(problem, found)
    z = np.random.default_rng(1).choice([-1.0, 1.0], (BATCH + 7, found.count))
    conditions, worth = relaxed.judge_many(z)
    for row, one, gain in zip(z, conditions, worth, strict=True):
        response = problem.rows(*found.patterns(row))
        assert worst(one, problem.conditions(response)) < CANCELLED
        if problem.improves:
            assert gain == pytest.approx(problem.improvement(response), rel=1e-9, abs=1e-12)
    # one design alone gives the very bits it gives among others
    alone, _ = relaxed.judge_many(z[5:6])
    assert np.array_equal(alone[0], conditions[5])


def test_a_calibrated_problem_takes_off_what_surrogates_overstate() -> None:
    problem, found = CASES["curved"]
    relaxed = Relaxed(problem, found)
    z = np.random.default_rng(2).choice([-1.0, 1.0], (2, found.count))
    before, _ = relaxed.judge_many(z)
    offsets = np.linspace(0.1, 0.3, problem.counts.size)
    relaxed.calibrated(offsets)
    after, _ = relaxed.judge_many(z)
    np.testing.assert_allclose(before - after, np.tile(offsets, (2, 1)), atol=1e-12)


def one_bound() -> tuple[Problem, Layout]:
    part = plate(5, 4)
    require_tilt = require("lateral_stiffness", "at_least", 100.0, gap=0.5 * MM)
    return Problem(part, part, [require_tilt, axial("equal_to", 0.5, -1.0, 0.2)], []), both_free(part, part, brush=2)


@pytest.mark.parametrize("name", ["improve", "bands", "one bound"])
def test_loss_passes_the_taylor_test(name: str) -> None:
    # f(x + h d) - f(x) - h g.d falls with h^2: by 4 at each halving. (With several bounds the loss holds their spread
    # constant on purpose, so only one bound beside bands is differentiated in full.)
    problem, found = one_bound() if name == "one bound" else CASES[name]
    design = GradientDesign(Relaxed(problem, found))
    random = np.random.default_rng(3)
    x, d = jnp.asarray(random.normal(size=found.count) * 0.3), jnp.asarray(random.normal(size=found.count))
    tables, progress = design.relaxed.tables, jnp.asarray(0.3)
    dual = jnp.asarray(random.uniform(0.5, 1.0, problem.counts.size))

    @jax.jit
    def loss(latent: jax.Array) -> jax.Array:
        return jnp.asarray(design.loss(tables, latent, dual, progress)[0])

    value, slope = jax.value_and_grad(loss)(x)
    steps = 1e-3 * 0.5 ** np.arange(4)
    rests = np.array([float(loss(x + h * d) - value - h * (slope @ d)) for h in steps])
    assert rests[:-1] / rests[1:] == pytest.approx(np.full(3, 4.0), rel=0.1)


@pytest.mark.parametrize("name", ["improve", "bands", "bounds"])
def test_projection_gives_patterns_between_the_poles(name: str) -> None:
    problem, found = CASES[name]
    design = GradientDesign(Relaxed(problem, found))
    latent = jnp.asarray(np.random.default_rng(4).normal(size=found.count) * 3.0)
    z = np.asarray(design.project(latent, 4.0))
    assert (np.abs(z) <= 1.0).all()
    flat = np.asarray(design.project(jnp.ones(found.count), 4.0))
    # a filter keeps what is uniform: each part's variables stay equal
    np.testing.assert_allclose(flat, np.tanh(4.0), rtol=1e-12)


def test_design_improves_every_start_and_books_its_steps() -> None:
    problem, found = CASES["improve"]
    relaxed = Relaxed(problem, found)
    design = GradientDesign(relaxed, steps=2 * CHUNK)
    starts = np.random.default_rng(5).normal(size=(4, found.count)) * 0.1
    budget = Budget(10**6)
    reached = design.run(starts, budget)
    assert budget.used == 4 * 2 * CHUNK
    before, _ = relaxed.judge_many(np.tanh(starts))
    after, _ = relaxed.judge_many(reached)
    assert (np.minimum(after, 0.0).sum(1) > np.minimum(before, 0.0).sum(1)).all()
    unmoved = design.run(starts, Budget(3))
    np.testing.assert_allclose(unmoved, np.asarray(jax.vmap(lambda x: design.project(x, 4.0))(jnp.asarray(starts))))
