"""Layouts: symmetries, linked movers, given cells and what searches read off them, against plain loops over cells."""

from __future__ import annotations

from typing import Literal

import numpy as np
import pytest
from numpy.typing import NDArray
from polewright.models.part import Part
from polewright.models.symmetry import IMAGES
from polewright.optimizer.layout import Face, layout

from ..models.parts import plate
from .problems import RULES, Array, both_free, disc, free, given, ring

PARTS = {
    "4 x 4": plate(4, 4),
    "5 x 5": plate(5, 5),
    "6 x 4": plate(6, 4),
    "5 x 4": plate(5, 4),
    "1 x 3": plate(1, 3),
    "disc": disc(9.0),
    "disc even": disc(8.0),
    "ring": ring(10.0, 4.0),
}


def possible(part: Part, symmetry: str) -> bool:
    return symmetry != "quarter-turn" or part.shape[0] == part.shape[1]


CASES = [(name, rule) for name, part in PARTS.items() for rule in RULES if possible(part, rule)]


def own_opposite(shape: tuple[int, int], rule: str) -> NDArray[np.bool_]:
    """Cells that a symmetry asks to be their own opposite, found by following images from every cell."""
    out = np.zeros(shape, dtype=bool)
    for start in np.ndindex(shape):
        reached, todo = {(*start, 1)}, [(*start, 1)]
        while todo:
            y, x, sign = todo.pop()
            for move, factor in RULES[rule]:
                found = (*move(y, x, shape), sign * factor)
                if found not in reached:
                    reached.add(found)
                    todo.append(found)
        out[start] = (*start, -1) in reached
    return out


def assert_obeys(pattern: Array, mask: NDArray[np.bool_], rule: str) -> None:
    for y, x in np.argwhere(mask):
        for move, sign in RULES[rule]:
            assert pattern[move(int(y), int(x), pattern.shape)] == sign * pattern[y, x]


def test_all_symmetries_of_the_contract_are_known() -> None:
    assert set(IMAGES) == set(RULES)


@pytest.mark.parametrize(("name", "rule"), CASES)
def test_patterns_obey_their_symmetry(name: str, rule: str) -> None:
    part = PARTS[name]
    found = both_free(part, part, rule)
    torn = own_opposite(part.shape, rule)
    for z in np.random.default_rng(1).uniform(0.1, 1.0, (3, found.count)):
        for pattern in found.patterns(z):
            assert_obeys(pattern, part.mask, rule)
            assert (pattern[~part.mask] == 0.0).all()
            # nothing else is blank: every other cell of the part is magnetized
            assert ((pattern == 0.0) == (torn | ~part.mask)).all()


@pytest.mark.parametrize(("name", "rule"), CASES)
def test_symmetry_leaves_all_that_it_may_free(name: str, rule: str) -> None:
    # a random pattern made symmetric by averaging its images is reproduced, so no freedom is lost
    part = PARTS[name]
    found = both_free(part, part, rule)
    pattern = np.random.default_rng(2).normal(size=part.shape)
    symmetric = pattern + sum(sign * move(pattern) for move, sign in IMAGES[rule])
    symmetric = np.where(part.mask, symmetric, 0.0)
    z = found.variables(symmetric, -symmetric)
    for pattern, wanted in zip(found.patterns(z), (symmetric, -symmetric), strict=True):
        np.testing.assert_allclose(pattern, wanted, atol=1e-12)


@pytest.mark.parametrize(("name", "rule"), CASES)
@pytest.mark.parametrize("link", ["", "matched", "same"])
def test_variables_make_the_round_trip(name: str, rule: str, link: Literal["", "matched", "same"]) -> None:
    part = PARTS[name]
    found = layout(free(part, rule), free(part, rule), link)
    z = np.random.default_rng(3).uniform(-1.0, 1.0, found.count)
    np.testing.assert_allclose(found.variables(*found.patterns(z)), z, atol=1e-14)


def test_batches_and_jax_give_the_same_patterns() -> None:
    import jax.numpy as jnp

    found = layout(free(PARTS["disc"], "odd-x"), free(PARTS["5 x 4"]))
    z = np.random.default_rng(4).uniform(-1.0, 1.0, (5, found.count))
    a, b = found.patterns(z)
    for n, row in enumerate(z):
        traced = found.patterns(jnp.asarray(row), jnp)
        assert np.array_equal(np.asarray(traced[0]), a[n])
        assert np.array_equal(np.asarray(traced[1]), b[n])
        assert np.array_equal(a[n], found.patterns(row)[0])
        assert np.array_equal(b[n], found.patterns(row)[1])


@pytest.mark.parametrize("name", ["5 x 4", "disc", "ring"])
def test_matched_is_the_base_itself(name: str) -> None:
    part = PARTS[name]
    found = layout(free(part), free(part), "matched")
    a, b = found.patterns(np.random.default_rng(5).uniform(-1.0, 1.0, found.count))
    assert np.array_equal(a, b)
    assert found.count == part.cells
    assert found.linked


@pytest.mark.parametrize("name", ["5 x 4", "4 x 4", "disc", "ring"])
def test_same_is_the_part_turned_over_about_x(name: str) -> None:
    # b(x, y) = -a(x, -y)
    part = PARTS[name]
    ny, nx = part.shape
    found = layout(free(part), free(part), "same")
    a, b = found.patterns(np.random.default_rng(6).uniform(-1.0, 1.0, found.count))
    for y in range(ny):
        for x in range(nx):
            assert b[y, x] == -a[ny - 1 - y, x]


def test_same_of_a_part_with_given_cells_turns_them_too() -> None:
    part = PARTS["5 x 4"]
    known = np.full(part.shape, np.nan)
    known[0, 1] = 1.0
    found = layout(Face(part.mask, known), free(part), "same")
    _, b = found.patterns(np.zeros(found.count))
    assert b[3, 1] == -1.0
    assert np.count_nonzero(b) == 1


@pytest.mark.parametrize("rule", RULES)
def test_given_cells_stay_and_bring_their_images_along(rule: str) -> None:
    part = PARTS["4 x 4"]
    known = np.full(part.shape, np.nan)
    known[0, 1] = -1.0
    found = layout(Face(part.mask, known, rule), free(part))
    orbit = {(0, 1): -1.0}
    for _ in range(4):
        for (y, x), value in list(orbit.items()):
            for move, sign in RULES[rule]:
                orbit[move(y, x, (4, 4))] = sign * value
    for z in (np.ones(found.count), -np.ones(found.count)):
        a, _ = found.patterns(z)
        for cell, value in orbit.items():
            assert a[cell] == value
        others = [a[cell] for cell in np.ndindex(4, 4) if cell not in orbit]
        assert (np.abs(others) == 1.0).all()
    # the neighbours are free: both polarities occur on each of them
    a, b = found.patterns(np.ones(found.count))[0], found.patterns(-np.ones(found.count))[0]
    assert all(a[cell] == -b[cell] for cell in np.ndindex(4, 4) if cell not in orbit)


def test_fixed_cells_of_three_levels_stay() -> None:
    part = PARTS["disc"]
    known = np.full(part.shape, np.nan)
    known[4, 3:6] = [1.0, 0.0, -1.0]
    found = layout(Face(part.mask, known), given(part, part.mask))
    a, b = found.patterns(-np.ones(found.count))
    assert a[4, 3:6].tolist() == [1.0, 0.0, -1.0]
    assert found.count == part.cells - 3
    assert np.array_equal(b, part.mask.astype(float))


def test_two_given_patterns_leave_no_variable() -> None:
    part = PARTS["6 x 4"]
    pattern = np.random.default_rng(7).choice([-1, 1], part.shape)
    found = layout(given(part, pattern), given(part, -pattern))
    assert found.count == 0
    a, b = found.patterns(np.zeros(0))
    assert np.array_equal(a, pattern)
    assert np.array_equal(b, -pattern)


@pytest.mark.parametrize("mover", [plate(6, 4), plate(4, 4), plate(8, 6), plate(4, 8), disc(8.0)])
def test_facing_pairs_stand_above_each_other(mover: Part) -> None:
    base = PARTS["6 x 4"]
    found = both_free(base, mover)
    pairs = {
        (int(found.base.index[i]), int(found.mover.index[j]))
        for i in np.ndindex(base.shape)
        for j in np.ndindex(mover.shape)
        if base.mask[i] and mover.mask[j]
        and np.hypot(base.x[i[1]] - mover.x[j[1]], base.y[i[0]] - mover.y[j[0]]) < 1e-9
    }  # fmt: skip
    assert {(int(i), int(j)) for i, j in found.facing()} == pairs


def test_linked_parts_have_no_facing_pairs() -> None:
    part = PARTS["4 x 4"]
    assert layout(free(part), free(part), "matched").facing().shape == (0, 2)


def test_owner_tells_the_parts_apart() -> None:
    found = both_free(PARTS["6 x 4"], PARTS["5 x 4"])
    z = np.where(found.owner == 0, 1.0, -1.0)
    a, b = found.patterns(z)
    assert (a == 1.0).all()
    assert (b == -1.0).all()


@pytest.mark.parametrize("rule", [name for name, rules in RULES.items() if all(sign > 0 for _, sign in rules)])
@pytest.mark.parametrize("size", [4, 7, 9, 12, 13])
@pytest.mark.parametrize("brush", [1, 2, 3, 4])
def test_coarse_blocks_are_as_wide_as_the_pole(rule: str, size: int, brush: int) -> None:
    part = plate(size, size)
    fine = both_free(part, part, rule, brush)
    coarse = fine.coarse()
    assert coarse.count <= fine.count
    for z in np.random.default_rng(8).choice([-1.0, 1.0], (4, coarse.count)):
        a, _ = coarse.patterns(z)
        assert_obeys(a, part.mask, rule)
        for lines in (a, a.T):
            for line in lines:
                edges = np.flatnonzero(np.diff(line)) + 1
                assert (np.diff([0, *edges, size]) >= brush).all()


@pytest.mark.parametrize("rule", RULES)
def test_coarse_layouts_keep_the_symmetry_of_round_parts(rule: str) -> None:
    part = disc(11.0)
    coarse = both_free(part, part, rule, 3).coarse()
    a, b = coarse.patterns(np.random.default_rng(9).choice([-1.0, 1.0], coarse.count))
    assert_obeys(a, part.mask, rule)
    assert_obeys(b, part.mask, rule)


def test_a_pole_wider_than_the_part_makes_one_coarse_block() -> None:
    part = plate(10, 2)
    assert both_free(part, part, brush=3).coarse().count <= 2 * 3
