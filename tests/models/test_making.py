"""Measures of making: hand-drawn patterns, a morphology library as oracle, and the definition spelled out in loops."""

from __future__ import annotations

from itertools import groupby

import hypothesis.strategies as st
import numpy as np
import pytest
from hypothesis import given
from hypothesis.extra.numpy import arrays
from numpy.typing import NDArray
from polewright.models.making import brush_ok, narrowest_pole, pole_count, pole_edge_length, poles, unpainted
from polewright.models.patterns import checker, stripes, uniform
from scipy import ndimage

Pattern = NDArray[np.int8]
Mask = NDArray[np.bool_]

SIGNS = {"+": 1, "-": -1, ".": 0, " ": 0}


def drawn(*rows: str) -> tuple[Pattern, Mask]:
    """Pattern and mask from a drawing: + and - poles, . unmagnetized on the blank, blank space off it."""
    pattern = np.array([[SIGNS[sign] for sign in row] for row in rows], dtype=np.int8)
    return pattern, np.array([[sign != " " for sign in row] for row in rows])


def full(pattern: Pattern) -> Mask:
    return np.ones(pattern.shape, dtype=bool)


def disc(n: int) -> Mask:
    y, x = np.mgrid[:n, :n] - (n - 1) / 2
    return np.asarray(x * x + y * y <= n * n / 4)


two_levels = arrays(np.int8, st.tuples(st.integers(1, 7), st.integers(1, 7)), elements=st.sampled_from([-1, 1]))
three_levels = arrays(np.int8, st.tuples(st.integers(1, 7), st.integers(1, 7)), elements=st.sampled_from([-1, 0, 1]))


def test_poles_touch_along_edges_only() -> None:
    pattern, _ = drawn(
        "++--",
        "--++",
        "..+-",
    )
    expected = [[1, 1, 3, 3], [4, 4, 2, 2], [0, 0, 2, 5]]
    np.testing.assert_array_equal(poles(pattern), expected)
    assert pole_count(pattern) == 5


def test_no_pole_at_all() -> None:
    pattern = np.zeros((3, 4), dtype=np.int8)
    assert pole_count(pattern) == 0
    assert pole_edge_length(pattern, 1e-3) == 0.0
    assert narrowest_pole(pattern, full(pattern), 1e-3) == 0.0


@given(three_levels)
def test_poles_are_connected_and_of_one_polarity(pattern: Pattern) -> None:
    labels = poles(pattern)
    assert set(np.unique(labels)) - {0} == set(range(1, pole_count(pattern) + 1))
    assert ((labels == 0) == (pattern == 0)).all()
    for number in range(1, pole_count(pattern) + 1):
        assert np.unique(pattern[labels == number]).size == 1
        assert ndimage.label(labels == number)[1] == 1
    # neighbours of one polarity share their label: poles are as large as they can be
    same_x = (pattern[:, 1:] == pattern[:, :-1]) == (labels[:, 1:] == labels[:, :-1])
    same_y = (pattern[1:] == pattern[:-1]) == (labels[1:] == labels[:-1])
    assert same_x.all()
    assert same_y.all()


def test_edges_between_north_and_south_count() -> None:
    pattern, _ = drawn(
        "++-.",
        "+--.",
        ".-++",
    )
    # along x one edge in each of three rows; along y one between rows 0 and 1, one between rows 1 and 2
    assert pole_edge_length(pattern, 2e-3) == pytest.approx(5 * 2e-3)


def test_edges_of_a_checker() -> None:
    assert pole_edge_length(checker(np.ones((6, 8), dtype=bool), 2), 1.0) == 3 * 6 + 2 * 8


@pytest.mark.parametrize(("shape", "cells"), [((5, 8), 5), ((8, 5), 5), ((1, 9), 1), ((32, 32), 32)])
def test_uniform_rectangle_is_as_wide_as_its_shorter_side(shape: tuple[int, int], cells: int) -> None:
    pattern = np.ones(shape, dtype=np.int8)
    assert narrowest_pole(pattern, full(pattern), 0.5e-3) == pytest.approx(cells * 0.5e-3)


def test_hand_drawn_widths() -> None:
    for k, rows in (
        (2, ("++--", "++--", "--++", "--++")),
        (1, ("++--", "+---", "---+", "--++")),
        (1, ("+++++", "+++++", "++-++", "+++++", "+++++")),  # an island of one cell
        (2, ("++----", "++----", "++++++", "++++++")),
        (1, ("++--", "++--", "+---", "+---")),  # the N pole's foot is one cell wide
        (1, ("++---", "-++--", "--++-", "---++")),  # a diagonal band: runs of two, yet no block of 2 x 2
        (3, ("+++---", "+++---", "+++---", "------", "------", "------")),
    ):
        pattern, mask = drawn(*rows)
        assert narrowest_pole(pattern, mask, 1.0) == k, rows


def test_unmagnetized_cells_block_the_brush() -> None:
    pattern, mask = drawn(
        "++++",
        "++++",
        "+.++",
        "++++",
    )
    np.testing.assert_array_equal(np.argwhere(unpainted(pattern, mask, 2)), [[2, 0], [3, 0], [3, 1]])
    assert narrowest_pole(pattern, mask, 1.0) == 1


def test_an_outline_does_not_make_a_pole_narrow() -> None:
    """Cells off the blank belong to every pole, but half of the brush must be on the blank."""
    pattern, mask = drawn(
        "  +  ",
        " +++ ",
        "+++++",
        " +++ ",
        "  +  ",
    )
    assert brush_ok(pattern, mask, 2)  # at each tip a block of 2 x 2 has three cells on the blank
    assert brush_ok(pattern, mask, 5)  # 13 of 25 cells are on the blank
    pattern, mask = drawn(
        "+    ",
        "     ",
        "   ++",
        "   ++",
    )
    assert unpainted(pattern, mask, 2)[0, 0]  # the lone cell is a quarter of its block
    assert not unpainted(pattern, mask, 2)[2:, 3:].any()


@pytest.mark.parametrize("n", [8, 15, 32])
def test_uniform_disc_is_as_wide_as_its_diameter(n: int) -> None:
    assert narrowest_pole(uniform(disc(n)), disc(n), 1.0) == n


@given(three_levels, st.integers(1, 5))
def test_painting_is_morphological_opening_on_a_rectangle(pattern: Pattern, k: int) -> None:
    """SciPy's binary opening by a square (the standard definition) of each polarity."""
    lost = np.zeros(pattern.shape, dtype=bool)
    for polarity in (-1, 1):
        pole = pattern == polarity
        lost |= pole & ~ndimage.binary_opening(np.pad(pole, k), np.ones((k, k)))[k:-k, k:-k]
    np.testing.assert_array_equal(unpainted(pattern, full(pattern), k), lost)


@given(three_levels, st.data(), st.integers(1, 6))
def test_painting_follows_its_definition_on_any_outline(pattern: Pattern, data: st.DataObject, k: int) -> None:
    mask = data.draw(arrays(np.bool_, pattern.shape))
    on = np.where(mask, pattern, 0)
    painted = np.zeros(pattern.shape, dtype=bool)
    for row in range(pattern.shape[0] - k + 1):
        for column in range(pattern.shape[1] - k + 1):
            block = (slice(row, row + k), slice(column, column + k))
            inside = on[block][mask[block]]
            if 2 * inside.size >= k * k and np.unique(inside).size == 1 and inside[0] != 0:
                painted[block] = True
    np.testing.assert_array_equal(unpainted(pattern, mask, k), (on != 0) & ~painted)


@given(two_levels)
def test_runs_are_as_long_as_the_brush(pattern: Pattern) -> None:
    """When a brush of k cells paints a rectangle, every run along a row or a column has at least k cells."""
    k = round(narrowest_pole(pattern, full(pattern), 1.0))
    lines = [*pattern, *pattern.T]
    shortest = min(len(list(run)) for line in lines for _, run in groupby(line))
    assert shortest >= k


@given(three_levels)
def test_narrower_brushes_fit_as_well_on_a_rectangle(pattern: Pattern) -> None:
    fits = [brush_ok(pattern, full(pattern), k) for k in range(1, min(pattern.shape) + 1)]
    assert fits == sorted(fits, reverse=True)


@given(two_levels)
def test_width_does_not_depend_on_polarity_or_orientation(pattern: Pattern) -> None:
    width = narrowest_pole(pattern, full(pattern), 1.0)
    for other in (-pattern, pattern[::-1], pattern.T, np.rot90(pattern)):
        assert narrowest_pole(other, full(other), 1.0) == width


def test_many_patterns_at_once() -> None:
    rng = np.random.default_rng(1)
    patterns = rng.choice([-1, 1], (5, 6, 9)).astype(np.int8)
    mask = rng.random((6, 9)) < 0.8
    together = unpainted(patterns, mask, 2)
    for one, expected in zip(together, patterns, strict=True):
        np.testing.assert_array_equal(one, unpainted(expected, mask, 2))


@pytest.mark.parametrize("width", [1, 2, 3, 5])
@pytest.mark.parametrize("shape", [(12, 12), (10, 17), (5, 11)])
def test_obvious_patterns_keep_the_pole_width_on_a_rectangle(shape: tuple[int, int], width: int) -> None:
    mask = np.ones(shape, dtype=bool)
    for pattern in (stripes(mask, width, axis=1), stripes(mask, width, axis=0), checker(mask, width)):
        assert narrowest_pole(pattern, mask, 1.0) >= width
        assert set(np.unique(pattern)) <= {-1, 1}


@pytest.mark.parametrize("width", [2, 3, 4, 5])
def test_obvious_patterns_keep_the_pole_width_on_a_disc(width: int) -> None:
    mask = disc(32)
    for pattern in (stripes(mask, width), stripes(mask, width, axis=0), checker(mask, width)):
        assert narrowest_pole(pattern, mask, 1.0) >= width
        assert ((pattern != 0) == mask).all()


def test_stripes_share_what_is_left_over() -> None:
    mask = np.ones((2, 11), dtype=bool)
    assert "".join("+" if sign > 0 else "-" for sign in stripes(mask, 3)[0]) == "++++---++++"
    assert (stripes(mask, 3, axis=0) == 1).all()  # two cells are less than one stripe
    assert (stripes(mask.T, 3, axis=0) == stripes(mask, 3).T).all()
