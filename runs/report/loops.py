"""Outlines of sets of cells: closed loops along cell edges, so that a pole is drawn as one shape without seams."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Corner = tuple[int, int]

_LEFT = {(1, 0): (0, 1), (0, 1): (-1, 0), (-1, 0): (0, -1), (0, -1): (1, 0)}


def cell_loops(cells: NDArray[np.bool_]) -> list[list[Corner]]:
    """Return the closed outlines of the cells that are set.

    Args:
        cells: Which cells are set, shape (ny, nx).

    Returns:
        Loops of corners (ix, iy), 0 <= ix <= nx and 0 <= iy <= ny, with the cells on their left; only where they
        turn. Cells that touch at a corner alone get separate loops.
    """
    steps = _edges(cells)
    loops = []
    while steps:
        start = next(iter(steps))
        loops.append(_walk(steps, start))
    return loops


def _edges(cells: NDArray[np.bool_]) -> dict[Corner, list[Corner]]:
    """Directed unit edges by the corner they leave from."""
    framed = np.pad(cells, 1)
    inside = framed[1:-1, 1:-1]
    sides = (
        (inside & ~framed[:-2, 1:-1], (0, 0), (1, 0)),  # lower edge, to the right
        (inside & ~framed[1:-1, 2:], (1, 0), (0, 1)),  # right edge, up
        (inside & ~framed[2:, 1:-1], (1, 1), (-1, 0)),  # upper edge, to the left
        (inside & ~framed[1:-1, :-2], (0, 1), (0, -1)),  # left edge, down
    )
    steps: dict[Corner, list[Corner]] = {}
    for present, (dx, dy), step in sides:
        for iy, ix in np.argwhere(present).tolist():
            steps.setdefault((ix + dx, iy + dy), []).append(step)
    return steps


def _walk(steps: dict[Corner, list[Corner]], start: Corner) -> list[Corner]:
    corner, step = start, _take(steps, start, None)
    first_step, loop = step, [start]
    while True:
        corner = (corner[0] + step[0], corner[1] + step[1])
        if corner == start:
            break
        following = _take(steps, corner, step)
        if following != step:
            loop.append(corner)
        step = following
    return loop[1:] if step == first_step else loop


def _take(steps: dict[Corner, list[Corner]], corner: Corner, arriving: Corner | None) -> Corner:
    leaving = steps[corner]
    # turning left where two edges leave keeps cells that touch at a corner apart
    chosen = _LEFT[arriving] if arriving is not None and _LEFT[arriving] in leaving else leaving[0]
    leaving.remove(chosen)
    if not leaving:
        del steps[corner]
    return chosen
