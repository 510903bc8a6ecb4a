"""Pole width: mended patterns keep it on every outline and symmetry, and moves set what they say."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray
from polewright.models.part import Part
from polewright.optimizer.layout import Face, Layout, layout
from polewright.optimizer.width import keeps_width, mended, moves, rounded

from ..models.parts import plate
from .problems import RULES, Array, both_free, disc, free, ring, signs

BLANKS = {"rectangle": plate(12, 12), "long": plate(14, 9), "disc": disc(14.0), "ring": ring(18.0, 6.0)}


def paintable(pattern: Array, mask: NDArray[np.bool_], k: int) -> bool:
    """The rule of ``models.making`` once more, block by block: can a brush of k cells paint every pole without loss?"""
    painted = np.zeros(mask.shape, dtype=bool)
    for y in range(mask.shape[0] - k + 1):
        for x in range(mask.shape[1] - k + 1):
            window = (slice(y, y + k), slice(x, x + k))
            cells = pattern[window][mask[window]]
            if 2 * cells.size >= k * k and (abs(cells.sum()) == cells.size):
                painted[window] = True
    return bool((painted | ~mask | (pattern == 0.0)).all())


def relaxed(found: Layout, seed: int, softness: float) -> Array:
    """Random variables, from noise to smooth waves over the face."""
    random = np.random.default_rng(seed)
    rough = random.uniform(-1.0, 1.0, found.count)
    waves = []
    for mask in found.masks:
        y, x = np.indices(mask.shape)
        waves.append(np.sin(random.uniform(0.2, 2.0) * x + random.uniform(0.2, 2.0) * y + random.uniform(0, 6)))
    return (1.0 - softness) * rough + softness * found.variables(waves[0], waves[1])


@settings(max_examples=120)
@given(
    blank=st.sampled_from(sorted(BLANKS)),
    rule=st.sampled_from(sorted(RULES)),
    brush=st.integers(1, 4),
    seed=st.integers(0, 2**20),
    softness=st.floats(0.0, 1.0),
)
def test_mended_patterns_keep_width_and_symmetry(blank: str, rule: str, brush: int, seed: int, softness: float) -> None:
    part = BLANKS[blank]
    assume(rule != "quarter-turn" or part.shape[0] == part.shape[1])
    found = layout(free(part, rule, brush), free(part, rule, brush), "matched")
    z = mended(found, relaxed(found, seed, softness))
    assert (np.abs(z) == 1.0).all()
    assert keeps_width(found, z[None])[0]
    pattern, _ = found.patterns(z)
    assert paintable(pattern, part.mask, brush)
    for y, x in np.argwhere(part.mask):
        for move, sign in RULES[rule]:
            assert pattern[move(int(y), int(x), pattern.shape)] == sign * pattern[y, x]


def test_what_keeps_the_width_is_not_changed() -> None:
    part = BLANKS["rectangle"]
    found = both_free(part, part, brush=3)
    z = both_free(part, part, brush=3).coarse()
    fine = rounded(found.variables(*z.patterns(signs(np.random.default_rng(1), z.count))))
    assert np.array_equal(mended(found, 0.3 * fine), fine)


@pytest.mark.parametrize("name", sorted(BLANKS))
@pytest.mark.parametrize("brush", [2, 3])
def test_keeps_width_judges_each_design_and_each_part(name: str, brush: int) -> None:
    part = BLANKS[name]
    found = both_free(part, part, brush=brush)
    random = np.random.default_rng(2)
    good = mended(found, relaxed(found, 3, 0.9))
    trials = np.stack([good, *(np.where(random.random(found.count) < 0.01, -good, good) for _ in range(20))])
    wanted = [all(paintable(p, part.mask, brush) for p in found.patterns(z)) for z in trials]
    assert keeps_width(found, trials).tolist() == wanted
    assert wanted[0]
    assert not all(wanted)


def test_given_cells_are_as_wide_as_they_are_given() -> None:
    part = plate(8, 8)
    known = np.full(part.shape, np.nan)
    known[3, 3] = -1.0  # one cell of the other pole in the middle of a free face
    found = layout(Face(part.mask, known, "none", 2), free(part, brush=2))
    z = mended(found, np.ones(found.count))
    a, _ = found.patterns(z)
    assert a[3, 3] == -1.0
    assert keeps_width(found, z[None])[0]


@pytest.mark.parametrize("part", [plate(6, 5), disc(7.0)])
@pytest.mark.parametrize("brush", [1, 2, 3])
@pytest.mark.parametrize("rule", ["none", "half-turn", "odd-x"])
def test_moves_set_whole_windows(part: Part, brush: int, rule: str) -> None:
    found = both_free(part, part, rule, brush)
    variables, values = moves(found)
    windows = {(1, brush), (brush, 1), (brush, brush)}
    images = 0
    z = signs(np.random.default_rng(4), found.count)
    before = found.patterns(z)
    for chosen, value in zip(variables, values, strict=True):
        after_z = z.copy()
        on = chosen >= 0
        after_z[chosen[on]] = value[on]
        after = found.patterns(after_z)
        # some window of one part has one polarity now, and nothing changed but cells tied to it
        fits = 0
        for number, pattern in enumerate(after):
            touched = np.isin((found.base, found.mover)[number].index, chosen[on])
            assert np.array_equal(pattern[~touched], before[number][~touched])
            for height, width in windows:
                for y in range(pattern.shape[0] - height + 1):
                    for x in range(pattern.shape[1] - width + 1):
                        at = (slice(y, y + height), slice(x, x + width))
                        free_cells = (found.base, found.mover)[number].index[at] >= 0
                        inside = pattern[at][free_cells]
                        same = inside.size > 0 and abs(inside.sum()) == inside.size
                        fits += same and set(chosen[on]) == set(
                            (found.base, found.mover)[number].index[at][free_cells].tolist()
                        )
        images += fits > 0
    # with an odd symmetry a window over the axis holds a cell and its opposite: that one cannot be of one polarity
    assert images == len(variables) or rule == "odd-x"
    if brush == 1 and rule == "none":
        assert len(variables) == 2 * found.count
