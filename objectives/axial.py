"""Axial behaviour: force, hold, peel, work, stand-off, stiffness, peak and sensitivity along the gap."""

from __future__ import annotations

from typing import Any, final

import numpy as np
from numpy.typing import NDArray

from ..models.pair import Row
from ..models.units import MU0
from .case import Case
from .gaps import FINE, crossings, extreme, gap_grid
from .plan import Plan, Response
from .quantity import (
    Bound,
    Conditions,
    LinearQuantity,
    Params,
    Quantity,
    SmoothQuantity,
    gap_offsets,
    linear_value,
    smooth_maximum,
)

Array = NDArray[np.float64]
_COARSE = 25
"""Gaps that a search looks at where a quantity asks for a whole range."""


@final
class AxialForce(LinearQuantity):
    """F_z on the mover, positive pushes apart [N]."""

    def __init__(self, params: Params, plan: Plan) -> None:
        poses = gap_offsets(params)
        self.elements = len(poses)
        self.linear = linear_value([[plan.row("fz", *pose)] for pose in poses], [[1.0]] * len(poses))


@final
class HoldingForce(LinearQuantity):
    """-F_z, positive holds together [N]."""

    def __init__(self, params: Params, plan: Plan) -> None:
        poses = gap_offsets(params)
        self.elements = len(poses)
        self.linear = linear_value([[plan.row("fz", *pose)] for pose in poses], [[-1.0]] * len(poses))


@final
class AxialStiffness(LinearQuantity):
    """-dF_z/dgap [N/m]."""

    def __init__(self, params: Params, plan: Plan) -> None:
        poses = gap_offsets(params)
        self.elements = len(poses)
        self.linear = linear_value([[plan.row("kzz", *pose)] for pose in poses], [[-1.0]] * len(poses))


@final
class PeelForce(LinearQuantity):
    """(hold * c + M) / arm [N]: c from the centre to the pivot edge, M the closing moment about the parallel axis.

    Balance of moments about the pivot edge. The moment about +y lifts the side at low x, so it closes a part that
    pivots at its low-x edge; the moment about +x lifts the side at high y.
    """

    def __init__(self, params: Params, plan: Plan) -> None:
        gap, arm, edge = params["gap"], params["arm"], params["edge"]
        low_x, high_x, low_y, high_y = plan.mover.blank.bounds
        reach = {"-x": -low_x, "+x": high_x, "-y": -low_y, "+y": high_y}[edge]
        moment = plan.row("my", gap) if edge.endswith("x") else plan.row("mx", gap)
        sign = {"-x": 1.0, "+x": -1.0, "-y": -1.0, "+y": 1.0}[edge]
        self.elements = 1
        self.linear = linear_value([[plan.row("fz", gap), moment]], [[-reach / arm, sign / arm]])


@final
class ForceSensitivity(SmoothQuantity):
    """(dF_z/dgap) / F_z [1/m]."""

    def __init__(self, params: Params, plan: Plan) -> None:
        poses = gap_offsets(params)
        self.elements = len(poses)
        self._force = np.array([plan.row("fz", *pose) for pose in poses])
        self._slope = np.array([plan.row("kzz", *pose) for pose in poses])

    def surrogate(self, response: Response) -> Any:
        """Ratio [1/m], shape (..., elements); NaN where the force vanishes exactly."""
        force, slope = response.pair[..., self._force], response.pair[..., self._slope]
        return response.xp.where(force == 0.0, np.nan, slope / response.xp.where(force == 0.0, 1.0, force))


@final
class OpeningWork(Quantity):
    """Integral of the positive part of the hold over a range of gaps [J]."""

    def __init__(self, params: Params, plan: Plan) -> None:
        self.elements = 1
        self._between = params["between"]
        nodes, weights = np.polynomial.legendre.leggauss(_COARSE)
        # substitute the gap grid's own spacing, denser near contact
        low, high = (np.log1p(gap / plan.base.cell) for gap in self._between)
        s = low + (high - low) * (nodes + 1.0) / 2.0
        self._weights = weights * (high - low) / 2.0 * np.exp(s) * plan.base.cell
        self._rows = np.array([plan.row("fz", gap) for gap in np.expm1(s) * plan.base.cell])

    def surrogate(self, response: Response) -> Any:
        """Gauss quadrature of the positive part, shape (..., 1)."""
        hold = response.xp.maximum(-response.pair[..., self._rows], 0.0)
        return (hold * self._weights).sum(-1)[..., None]

    def exact(self, case: Case) -> Array:
        """Energy differences between the zeros of the force, shape (1,)."""
        gaps = gap_grid(self._between, case.base.cell, FINE)
        zeros = crossings(case.axial_force, gaps, case.axial_force(gaps))
        ends = np.unique(np.concatenate([gaps[:1], zeros, gaps[-1:]]))
        energy = case.pair([Row("energy", float(gap)) for gap in ends])
        return np.array([np.maximum(np.diff(energy), 0.0).sum()])


@final
class StandOff(Quantity):
    """The innermost gap of stable axial equilibrium under a load inside a range [m]."""

    def __init__(self, params: Params, plan: Plan) -> None:
        self.elements = 1
        self._between = params["between"]
        self._load = params["load"]
        self._grid = gap_grid(self._between, plan.base.cell, _COARSE)
        self._rows = np.array([plan.row("fz", gap) for gap in self._grid])
        self._steps = np.gradient(self._grid)
        self._reference = _force_scale(plan)

    def surrogate(self, response: Response) -> Any:
        """Length of the range over which the net force pushes apart, beyond its start; shape (..., 1)."""
        xp = response.xp
        net = response.pair[..., self._rows] - self._load
        width = 0.02 * self._reference
        share = 0.5 * (1.0 + xp.tanh(net / width))
        return self._between[0] + (share * self._steps).sum(-1)[..., None]

    def conditions(self, bound: Bound, plan: Plan) -> Conditions:
        """Net force positive up to the bound's lower end, negative from its upper end on.

        For a target both ends of its band; for a floor the net force must push apart up to it and pull at the end of
        the range; for a ceiling it must push apart at the start and pull at the ceiling.
        """
        low, high = self._between
        value, within = float(bound.value[0]), float(bound.within[0])
        push, pull = {
            "equal_to": ([value - within], [value + within]),
            "at_least": ([*np.linspace(low, value, 4)], [high]),
            "at_most": ([low], [value]),
        }[bound.kind]
        gaps = [min(max(gap, low), high) for gap in (*push, *pull)]
        signs = np.array([1.0] * len(push) + [-1.0] * len(pull))
        rows = np.array([[plan.row("fz", gap)] for gap in gaps])
        scale = max(abs(self._load), 0.02 * self._reference)
        return Conditions(rows, signs[:, None] / scale, -signs * self._load / scale, counts=bound.kind != "equal_to")

    def exact(self, case: Case) -> Array:
        """First downward zero of the net force on the true curve, NaN without one; shape (1,)."""

        def net(gaps: Array) -> Array:
            return np.asarray(case.axial_force(gaps) - self._load)

        gaps = gap_grid(self._between, case.base.cell, FINE)
        values = net(gaps)
        falling = np.nonzero((values[:-1] > 0.0) & (values[1:] <= 0.0))[0]
        if falling.size == 0:
            return np.array([np.nan])
        first = slice(int(falling[0]), int(falling[0]) + 2)
        found = crossings(net, gaps[first], values[first])
        return np.array([found[0] if found.size else gaps[first][-1]])


@final
class PeakForce(Quantity):
    """Largest repulsion or attraction over a range of gaps [N]."""

    def __init__(self, params: Params, plan: Plan) -> None:
        self.elements = 1
        self._between = params["between"]
        self._sign = 1.0 if params["which"] == "repulsion" else -1.0
        grid = gap_grid(self._between, plan.base.cell, _COARSE)
        self._rows = np.array([plan.row("fz", gap) for gap in grid])

    def surrogate(self, response: Response) -> Any:
        """Smooth maximum over the coarse grid, shape (..., 1)."""
        return smooth_maximum(response.xp, self._sign * response.pair[..., self._rows])[..., None]

    def exact(self, case: Case) -> Array:
        """Refined maximum on the true curve, shape (1,); NaN where the force never has that sign."""

        def curve(gaps: Array) -> Array:
            return self._sign * case.axial_force(gaps)

        gaps = gap_grid(self._between, case.base.cell, FINE)
        top = extreme(curve, gaps, curve(gaps))
        return np.array([top if top > 0.0 else np.nan])


def _force_scale(plan: Plan) -> float:
    """Maxwell pull of the smaller face fully covered by one pole: Br_a Br_b A / (2 mu0) [N]."""
    area = min(plan.base.cells, plan.mover.cells) * plan.base.cell**2
    return plan.base.remanence * plan.mover.remanence * area / (2.0 * MU0)
