"""Behaviour across the face: lateral force and stiffness, sliding, tilt."""

from __future__ import annotations

from typing import Any, final

import numpy as np
from numpy.typing import NDArray

from ..models.pair import Row
from .case import Case
from .gaps import extreme
from .plan import Plan, Response
from .quantity import (
    LinearQuantity,
    Params,
    Quantity,
    SmoothQuantity,
    gap_offsets,
    linear_value,
    safe_norm,
    smooth_maximum,
)

Array = NDArray[np.float64]
_OFFSETS = 17
_FINE_OFFSETS = 65


@final
class LateralForce(LinearQuantity):
    """Minus the force along the direction of the offset: positive pulls back to the centre [N]."""

    def __init__(self, params: Params, plan: Plan) -> None:
        poses = gap_offsets(params)
        rows, factors = [], []
        for gap, dx, dy in poses:
            length = float(np.hypot(dx, dy))
            if length == 0.0:
                message = "offset_mm must differ from [0, 0] for lateral_force: at the centre it has no direction"
                raise ValueError(message)
            rows.append([plan.row("fx", gap, dx, dy), plan.row("fy", gap, dx, dy)])
            factors.append([-dx / length, -dy / length])
        self.elements = len(poses)
        self.linear = linear_value(rows, factors)


@final
class LateralStiffness(SmoothQuantity):
    """Least eigenvalue of -d(F_x, F_y)/d(x, y): positive is self-centring [N/m]."""

    def __init__(self, params: Params, plan: Plan) -> None:
        gap = params["gap"]
        self.elements = 1
        self._rows = np.array([plan.row("kxx", gap), plan.row("kyy", gap), plan.row("kxy", gap)])

    def surrogate(self, response: Response) -> Any:
        """Closed form of the 2 x 2 eigenvalue, shape (..., 1)."""
        stiffness = -response.pair[..., self._rows]
        mean = stiffness @ np.array([0.5, 0.5, 0.0])
        spread = stiffness @ np.array([[0.5, 0.0], [-0.5, 0.0], [0.0, 1.0]])
        return (mean - safe_norm(response.xp, spread))[..., None]


@final
class TiltMoment(SmoothQuantity):
    """Size of the moment on the mover about axes in its mating face, through the face's centre [N m]."""

    def __init__(self, params: Params, plan: Plan) -> None:
        poses = gap_offsets(params)
        self.elements = len(poses)
        self._rows = np.array([[plan.row("mx", *pose), plan.row("my", *pose)] for pose in poses])

    def surrogate(self, response: Response) -> Any:
        """Norm of (M_x, M_y), shape (..., elements)."""
        return safe_norm(response.xp, response.pair[..., self._rows])


@final
class SlideForce(Quantity):
    """Largest restoring force plus friction times hold over a travel along an axis [N]."""

    def __init__(self, params: Params, plan: Plan) -> None:
        self.elements = 1
        self._gap, self._travel, self._friction = params["gap"], params["travel"], params["friction"]
        self._along_x = params["axis"] == "x"
        poses = [self._pose(offset) for offset in np.linspace(0.0, self._travel, _OFFSETS)]
        self._lateral = np.array([plan.row(self._component(), *pose) for pose in poses])
        self._axial = np.array([plan.row("fz", *pose) for pose in poses])

    def surrogate(self, response: Response) -> Any:
        """Smooth maximum over the travel, shape (..., 1)."""
        resistance = -response.pair[..., self._lateral] - self._friction * response.pair[..., self._axial]
        return smooth_maximum(response.xp, resistance)[..., None]

    def exact(self, case: Case) -> Array:
        """Refined maximum over the travel, shape (1,)."""

        def resistance(offsets: Array) -> Array:
            poses = [self._pose(float(offset)) for offset in offsets]
            lateral = case.pair([Row(self._component(), *pose) for pose in poses])
            return np.asarray(-lateral - self._friction * case.pair([Row("fz", *pose) for pose in poses]))

        offsets = np.linspace(0.0, self._travel, _FINE_OFFSETS)
        return np.array([extreme(resistance, offsets, resistance(offsets))])

    def _component(self) -> Any:
        return "fx" if self._along_x else "fy"

    def _pose(self, offset: float) -> tuple[float, float, float]:
        return (self._gap, offset, 0.0) if self._along_x else (self._gap, 0.0, offset)
