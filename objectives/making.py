"""How a pattern would be made: its poles, their edges, the narrowest pole."""

from __future__ import annotations

from typing import Any, ClassVar, final

import numpy as np
from numpy.typing import NDArray

from ..models import making
from .case import Case
from .plan import Plan, Response
from .quantity import Params, Quantity
from .sites import part_names

Array = NDArray[np.float64]


def _patterns(source: Response, parts: tuple[str, ...]) -> list[Any]:
    return [getattr(source, part) for part in parts]


@final
class PoleCount(Quantity):
    """Connected poles on a part; of both, the larger number.

    The surrogate is the sum of the Euler numbers of both polarities (cells - adjacent pairs + blocks of four), which is
    the count wherever no pole encloses another.
    """

    of_pattern: ClassVar[bool] = True

    def __init__(self, params: Params, plan: Plan) -> None:  # noqa: ARG002 (it reads the patterns alone)
        self.elements = 1
        self._of = part_names(params["of"])

    def surrogate(self, response: Response) -> Any:
        """Euler number of the poles, shape (..., 1)."""
        xp = response.xp
        counts = [
            sum(_euler(xp.maximum(sign * pattern, 0.0)) for sign in (1.0, -1.0))
            for pattern in _patterns(response, self._of)
        ]
        return xp.stack(counts, axis=-1).max(-1)[..., None]

    def exact(self, case: Case) -> Array:
        """Count of connected poles, shape (1,)."""
        counts = [making.pole_count(pattern.astype(np.int8)) for pattern in _patterns(case.response, self._of)]
        return np.array([max(counts)], dtype=np.float64)


@final
class PoleEdgeLength(Quantity):
    """Boundary between N and S on a part; of both, the longer one [m]."""

    of_pattern: ClassVar[bool] = True

    def __init__(self, params: Params, plan: Plan) -> None:
        self.elements = 1
        self._of = part_names(params["of"])
        self._cell = plan.base.cell
        self._mask = {"base": plan.base.mask, "mover": plan.mover.mask}

    def surrogate(self, response: Response) -> Any:
        """Sum of (1 - s s') / 2 over neighbours, shape (..., 1); exact on a pattern of +1 and -1."""
        xp = response.xp
        lengths = []
        for part, pattern in zip(self._of, _patterns(response, self._of), strict=True):
            mask = self._mask[part]
            right, above = _neighbours(pattern)
            mask_right, mask_above = _neighbours(mask.astype(np.float64))
            across_x = ((1.0 - pattern * right) * (mask * mask_right)).sum((-2, -1))
            across_y = ((1.0 - pattern * above) * (mask * mask_above)).sum((-2, -1))
            lengths.append(0.5 * self._cell * (across_x + across_y))
        return xp.stack(lengths, axis=-1).max(-1)[..., None]

    def exact(self, case: Case) -> Array:
        """Length on the rounded pattern, shape (1,)."""
        lengths = [
            making.pole_edge_length(pattern.astype(np.int8), self._cell)
            for pattern in _patterns(case.response, self._of)
        ]
        return np.array([max(lengths)])


@final
class NarrowestPole(Quantity):
    """Smallest pole width on a part; of both, the smaller one [m].

    A search meets a floor on it by construction (every pattern it keeps passes the brush of that width); the surrogate
    serves as a measure of smoothness where it is to be improved: twice the area over the length of the edges.
    """

    of_pattern: ClassVar[bool] = True

    def __init__(self, params: Params, plan: Plan) -> None:
        self.elements = 1
        self._of = part_names(params["of"])
        self._cell = plan.base.cell
        self._mask = {"base": plan.base.mask, "mover": plan.mover.mask}
        self._edges = [PoleEdgeLength({"of": part}, plan) for part in self._of]

    def surrogate(self, response: Response) -> Any:
        """Mean width of the poles as area over half the edge length, shape (..., 1)."""
        xp = response.xp
        widths = []
        for part, edges in zip(self._of, self._edges, strict=True):
            area = self._mask[part].sum() * self._cell**2
            side = min(self._mask[part].shape) * self._cell
            widths.append(area / (edges.surrogate(response)[..., 0] + area / side))
        return xp.stack(widths, axis=-1).min(-1)[..., None]

    def exact(self, case: Case) -> Array:
        """Width on the rounded pattern, shape (1,)."""
        widths = [
            making.narrowest_pole(pattern.astype(np.int8), self._mask[part], self._cell)
            for part, pattern in zip(self._of, _patterns(case.response, self._of), strict=True)
        ]
        return np.array([min(widths)])


def _euler(p: Any) -> Any:
    """Cells - adjacent pairs + blocks of four of a region given by weights in [0, 1], shape (...)."""
    right, above = _neighbours(p)
    pairs_x, pairs_y = p * right, p * above
    blocks = pairs_x * _neighbours(pairs_x)[1]
    return p.sum((-2, -1)) - pairs_x.sum((-2, -1)) - pairs_y.sum((-2, -1)) + blocks.sum((-2, -1))


def _neighbours(p: Any) -> tuple[Any, Any]:
    """The next cell along x and along y, 0 beyond the array; shapes of ``p`` (..., ny, nx).

    By matrix products: the derivative of a slice pads an array that has just been computed (see ``pair_fourier``).
    """
    rows, columns = p.shape[-2:]
    return p @ np.eye(columns, k=-1), np.eye(rows, k=1) @ p
