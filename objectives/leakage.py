"""What leaks: the field outside a part or the pair, how far it reaches, and the moment that it comes from."""

from __future__ import annotations

from typing import Any, final

import numpy as np
from numpy.typing import NDArray

from ..models.peak import field_reach, peak
from .case import Case
from .plan import Plan, Response
from .quantity import Params, Quantity, SmoothQuantity, safe_norm, smooth_maximum
from .sites import part_names, surface

Array = NDArray[np.float64]

_ENTRIES = 6_000_000
"""Largest number of entries of a probe matrix that a search carries along."""
_PROBES = 1500
"""Probes on a surface that a search looks at, at most."""


@final
class StrayField(Quantity):
    """Peak of |B| on a plane behind or before a part, or at a distance all around [T]."""

    def __init__(self, params: Params, plan: Plan) -> None:
        self.elements = 1
        self._of = params["of"]
        self._gap = params["gap"] if self._of == "pair" else 0.0
        self._surface = surface(plan.base, plan.mover, self._of, self._gap, params["side"], params["distance"])
        self._rows = plan.field(self._of, self._gap, self._surface.sample(_probe_count(plan)))

    def surrogate(self, response: Response) -> Any:
        """Smooth maximum of |B| over the probes, shape (..., 1)."""
        size = safe_norm(response.xp, response.linear[..., self._rows])
        return smooth_maximum(response.xp, size, 128.0)[..., None]

    def exact(self, case: Case) -> Array:
        """Refined peak over the whole surface, shape (1,)."""
        return np.array([peak(case.sources(self._of, self._gap), self._surface)[0]])


@final
class FieldAt(SmoothQuantity):
    """A component of B, or its size, at points in the base's frame [T]."""

    def __init__(self, params: Params, plan: Plan) -> None:
        points = params["point"]
        points = points if isinstance(points[0], list | tuple) else (points,)
        self.elements = len(points)
        self._axis = {"x": 0, "y": 1, "z": 2}.get(params["component"])
        self.flips_sign = self._axis is not None
        gap = params["gap"] if params["of"] == "pair" else 0.0
        self._rows = plan.field(params["of"], gap, np.array(points, dtype=np.float64))

    def surrogate(self, response: Response) -> Any:
        """B at the points, shape (..., elements)."""
        if self._axis is None:
            return safe_norm(response.xp, response.linear[..., self._rows])
        return response.linear[..., self._rows[:, self._axis]]


@final
class FieldReach(Quantity):
    """Least distance from the surface beyond which |B| stays under a level everywhere around [m].

    A search reads the peak at a few distances and interpolates where it passes the level, in logarithms: the peak
    falls steadily with the distance.
    """

    def __init__(self, params: Params, plan: Plan) -> None:
        self.elements = 1
        self._of, self._level = params["of"], params["field"]
        self._gap = params["gap"] if self._of == "pair" else 0.0
        size = float(np.hypot(*(np.array(plan.base.shape) * plan.base.cell)))
        self._distances = size * np.array([0.125, 0.25, 0.5, 1.0, 2.0, 4.0])
        count = _probe_count(plan) // self._distances.size
        self._rows = [
            plan.field(self._of, self._gap, around.sample(count))
            for around in (
                surface(plan.base, plan.mover, self._of, self._gap, "around", distance) for distance in self._distances
            )
        ]

    def surrogate(self, response: Response) -> Any:
        """Distance at which the sampled peaks pass the level, shape (..., 1)."""
        xp = response.xp
        peaks = [smooth_maximum(xp, safe_norm(xp, response.linear[..., rows]), 128.0) for rows in self._rows]
        excess = xp.log(xp.stack(peaks, axis=-1) + 1e-15) - np.log(self._level)
        logs = np.log(self._distances)
        # least-squares line through the two distances nearest the level: slope of a power law, weights smooth
        weights = xp.exp(-((excess / 2.0) ** 2)) + 1e-6
        total = weights.sum(-1)
        mean_x, mean_y = (weights * logs).sum(-1) / total, (weights * excess).sum(-1) / total
        spread = (weights * (logs - mean_x[..., None]) ** 2).sum(-1) + 1e-9
        slope = (weights * (logs - mean_x[..., None]) * (excess - mean_y[..., None])).sum(-1) / spread
        slope = xp.minimum(slope, -1.0)
        return xp.exp(mean_x - mean_y / slope)[..., None]

    def exact(self, case: Case) -> Array:
        """Refined on the true field, shape (1,)."""
        return np.array([field_reach(case.sources(self._of, self._gap), self._level)])


@final
class NetMoment(SmoothQuantity):
    """Size of the dipole moment of a part; of both, the larger one [A m2]."""

    def __init__(self, params: Params, plan: Plan) -> None:
        self.elements = 1
        of = params["of"]
        self._rows = [plan.moment(part) for part in part_names(of)]

    def surrogate(self, response: Response) -> Any:
        """Largest size, shape (..., 1)."""
        xp = response.xp
        return xp.abs(response.linear[..., np.array(self._rows)]).max(-1)[..., None]


def _probe_count(plan: Plan) -> int:
    """Probes that a search can afford: the matrix from cells to fields stays within ``_ENTRIES``."""
    cells = plan.base.mask.size + plan.mover.mask.size
    return int(np.clip(_ENTRIES // (3 * cells), 60, _PROBES))
