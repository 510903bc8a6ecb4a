"""A problem: two parts, what is required and what is to be improved, ready for a search and for exact judgement.

For a search every require becomes conditions (met when >= 0, of comparable size). Conditions that are linear in the
pair rows are collected in one matrix; the others are functions of the response. What is reported comes from ``exact``
alone.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..models.pair import pair_forms
from ..models.part import Part
from ..models.patterns import stripes, uniform
from ..models.units import FACTORS
from .case import Case
from .catalogue import CATALOGUE
from .conditions import linear_conditions, smooth_conditions
from .goals import Improve, Require, improvement, relative_margins
from .plan import Plan, Response
from .quantity import Conditional, Conditions, Quantity
from .registry import QUANTITIES

Array = NDArray[np.float64]

_ZERO_BOUND = 0.05
"""A bound of 0 is approached on the scale of this fraction of what obvious patterns reach."""


@dataclass(frozen=True, eq=False)
class Evaluation:
    """Exact judgement of one rounded design.

    Attributes:
        values: One value a column [SI], requires then improves in spec order, NaN where one does not exist.
        margins: Relative margin of each require, the worst of its elements; -inf where a value does not exist.
        feasible: Are all requires met?
        worst_margin: Least margin that counts (an equality that is met does not); NaN without requires.
        score: What designs are ranked by within equal feasibility: the improvement, else the worst margin.
    """

    values: Array
    margins: Array
    feasible: bool
    worst_margin: float
    score: float


class Problem:
    """Requires and improves on one pair.

    Attributes:
        base: The part below.
        mover: The part above.
        requires: Hard bounds, in spec order.
        improves: Directions, in spec order.
        quantities: The quantity of each require, then of each improve.
        forms: The pair's bilinear forms, one a row of the plan.
        linear_base: Matrix of the plan's linear rows on the base's cells (row, ny * nx).
        linear_mover: The same on the mover's cells.
        factors: Linear conditions, shape (condition, pair row): factors @ pair + constant >= 0.
        constant: shape (condition,).
        counts: Which of all conditions, linear ones first, enter the worst margin (equalities do not).
    """

    def __init__(self, base: Part, mover: Part, requires: Sequence[Require], improves: Sequence[Improve]) -> None:
        self.base, self.mover = base, mover
        self.requires, self.improves = tuple(requires), tuple(improves)
        plan = Plan(base, mover)
        goals: list[Require | Improve] = [*requires, *improves]
        self.quantities: tuple[Quantity, ...] = tuple(QUANTITIES[g.quantity](g.params, plan) for g in goals)
        lowered = [
            quantity.conditions(require.bound, plan) if isinstance(quantity, Conditional) else None
            for require, quantity in zip(self.requires, self.quantities, strict=False)
        ]
        self.forms = pair_forms(base, mover, plan.rows)
        self.linear_base, self.linear_mover = plan.linear_matrices()
        self._set_conditions(lowered)

    @cached_property
    def is_linear(self) -> bool:
        """Are all conditions and the improvement linear in the pair rows?"""
        return not self._smooth and self.has_linear_core

    @cached_property
    def has_linear_core(self) -> bool:
        """Is there enough that is linear in the pair rows to search by that alone: the improve, or a bound?"""
        if self.improves:
            quantity, improve = self.quantities[len(self.requires)], self.improves[0]
            return quantity.linear is not None and improve.sense != "toward" and not improve.log
        return self.constant.size > 0

    @cached_property
    def judged_by_rows(self) -> bool:
        """Is every exact value a direct function of the plan's rows, so that a design costs no more than them?"""
        return all(quantity.exact_surrogate for quantity in self.quantities)

    @property
    def reverses(self) -> bool:
        """Does reversing both patterns together leave every value as it was?"""
        return not any(quantity.flips_sign for quantity in self.quantities)

    def brush(self, part: str) -> float:
        """Least pole width that the requires ask of a part by ``narrowest_pole`` [m], 0 if none."""
        widths = [
            float(require.bound.value.max())
            for require in self.requires
            if require.quantity == "narrowest_pole"
            and require.bound.kind == "at_least"
            and require.params["of"] in (part, "both")
        ]
        return max(widths, default=0.0)

    def rows(self, a: NDArray[Any], b: NDArray[Any]) -> Response:
        """The plan's numbers for patterns a (ny, nx) and b (my, mx) in float64 NumPy."""
        a, b = np.asarray(a, dtype=np.float64), np.asarray(b, dtype=np.float64)
        linear = self.linear_base @ a.ravel() + self.linear_mover @ b.ravel()
        return Response(np, self.forms.values(a, b), linear, a, b)

    def conditions(self, response: Response) -> Any:
        """All conditions, linear ones first, shape (..., condition); met where >= 0."""
        xp = response.xp
        linear = response.pair @ self.factors.T + self.constant
        smooth = [condition(self.quantities[n].surrogate(response), xp) for n, condition in self._smooth]
        parts = [linear, *smooth]
        return xp.concatenate(parts, axis=-1)

    def improvement(self, response: Response) -> Any:
        """The first improve's worth in units of what obvious patterns reach, larger is better, shape (...)."""
        quantity = self.quantities[len(self.requires)]
        return improvement(self.improves[0], quantity.surrogate(response), response.xp) / self._improve_scale

    def linear_forms(self) -> tuple[Array, Array]:
        """Conditions of a linear problem, then the improve's worth if there is one, as rows of factors and constants.

        The worth of a list is taken as its mean here; every judgement takes its worst element.
        """
        if not self.improves:
            return self.factors, self.constant
        quantity = self.quantities[len(self.requires)]
        if quantity.linear is None:
            message = "the improve is not linear in the pair rows"
            raise ValueError(message)
        sign = 1.0 if self.improves[0].sense == "maximize" else -1.0
        worth = np.zeros((1, self.forms.count))
        scaled = sign * quantity.linear.factors / (quantity.elements * self._improve_scale)
        np.add.at(worth[0], quantity.linear.rows, scaled)
        return np.concatenate([self.factors, worth]), np.concatenate([self.constant, [0.0]])

    def exact(self, a: NDArray[Any], b: NDArray[Any]) -> Evaluation:
        """Judge rounded patterns a (ny, nx) and b (my, mx)."""
        case = self.case(a, b)
        values = [quantity.exact(case) for quantity in self.quantities]
        margins = self._margins(values)
        feasible, worst, score = self._verdict(margins, values)
        flat = np.concatenate(values) if values else np.zeros(0)
        return Evaluation(flat, margins, bool(feasible), float(worst), float(score))

    def judge_rows(self, response: Response) -> tuple[NDArray[np.bool_], Array, Array]:
        """Feasible, worst margin and score of many designs (m,) at once, where ``judged_by_rows``."""
        values = [np.asarray(quantity.surrogate(response)) for quantity in self.quantities]
        return self._verdict(self._margins(values), values)

    def overstated(self, a: NDArray[Any], b: NDArray[Any]) -> Array:
        """What the surrogate of each condition overstates it by on a rounded design, shape (condition,)."""
        case = self.case(a, b)
        out = np.zeros(self.counts.size)
        first = self.constant.size
        for number, condition in self._smooth:
            quantity = self.quantities[number]
            claimed, true = condition(quantity.surrogate(case.response), np), condition(quantity.exact(case), np)
            out[first : first + claimed.size] = np.nan_to_num(claimed - true)
            first += claimed.size
        return out

    def case(self, a: NDArray[Any], b: NDArray[Any]) -> Case:
        """Exact physics of one design at any pose."""
        return Case(self.base, self.mover, self.rows(a, b))

    def _margins(self, values: list[Array]) -> Array:
        """Relative margin of each require, shape (..., require)."""
        each = [
            relative_margins(require.bound, values[n], CATALOGUE[require.quantity].unit).min(-1)
            for n, require in enumerate(self.requires)
        ]
        leading = values[0].shape[:-1] if values else ()
        return np.stack(each, axis=-1) if each else np.zeros((*leading, 0))

    def _verdict(self, margins: Array, values: list[Array]) -> tuple[NDArray[np.bool_], Array, Array]:
        """Feasible, worst margin that counts, and score; shapes (...)."""
        feasible = np.asarray((margins >= 0.0).all(-1))
        worst = np.full(feasible.shape, np.nan, dtype=np.float64)
        if self.requires:
            equal = np.array([require.bound.kind == "equal_to" for require in self.requires])
            counting = np.where(equal & (margins >= 0.0), np.inf, margins).min(-1)
            worst = np.asarray(np.where(np.isfinite(counting) | (counting < 0.0), counting, margins.min(-1)))
        score = worst
        if self.improves:
            score = np.nan_to_num(improvement(self.improves[0], values[len(self.requires)], np), nan=-np.inf)
        return feasible, worst, np.asarray(score)

    @cached_property
    def _references(self) -> list[Response]:
        """Obvious patterns against each other: what sizes to expect."""
        masks = (self.base.mask, self.mover.mask)
        width = max(2, min(min(mask.shape) for mask in masks) // 4)
        faces = [[uniform(mask), stripes(mask, width), stripes(mask, 1)] for mask in masks]
        return [self.rows(a, b) for a in faces[0] for b in faces[1]]

    @cached_property
    def _improve_scale(self) -> float:
        improve, quantity = self.improves[0], self.quantities[len(self.requires)]
        if improve.log:
            return 1.0
        if improve.sense == "toward" and improve.target is not None and np.abs(improve.target).max() > 0.0:
            return float(np.abs(improve.target).max())
        return self._size(quantity, CATALOGUE[improve.quantity].unit)

    def _size(self, quantity: Quantity, unit: str) -> float:
        seen = np.array([np.abs(quantity.surrogate(reference)) for reference in self._references])
        size = float(np.nanmax(seen, initial=0.0))
        return size if size > 0.0 else FACTORS[unit]

    def _set_conditions(self, lowered: list[Conditions | None]) -> None:
        """Sort the requires into linear conditions and smooth ones."""
        factors, constant, counts = [], [], []
        self._smooth: list[tuple[int, Callable[[Any, Any], Any]]] = []
        smooth_counts: list[bool] = []
        for number, require in enumerate(self.requires):
            quantity, conditions = self.quantities[number], lowered[number]
            if require.quantity == "narrowest_pole" and require.bound.kind == "at_least":
                continue  # met by construction: see ``brush``
            if conditions is None and quantity.linear is not None:
                conditions = linear_conditions(quantity.linear, require.bound, self._scale(number))
            if conditions is None:
                function, many = smooth_conditions(require.bound, self._scale(number))
                self._smooth.append((number, function))
                smooth_counts += [require.bound.kind != "equal_to"] * many
                continue
            matrix = np.zeros((len(conditions.constant), self.forms.count))
            np.add.at(matrix, (np.arange(len(matrix))[:, None], conditions.rows), conditions.factors)
            factors.append(matrix)
            constant.append(conditions.constant)
            counts += [conditions.counts] * len(matrix)
        self.factors = np.concatenate(factors) if factors else np.zeros((0, self.forms.count))
        self.constant = np.concatenate(constant) if constant else np.zeros(0)
        self.counts = np.array(counts + smooth_counts, dtype=bool)

    def _scale(self, number: int) -> Array:
        """Size of each element's relative margin in the search [SI], shape (elements,)."""
        require, quantity = self.requires[number], self.quantities[number]
        if require.bound.kind == "equal_to":
            return np.maximum(require.bound.within, 1e-12 * np.abs(require.bound.value) + 1e-300)
        size = np.abs(require.bound.value)
        if require.bound.scale is not None:
            return np.maximum(size, require.bound.scale)
        if (size > 0.0).all():
            return size
        expected = _ZERO_BOUND * self._size(quantity, CATALOGUE[require.quantity].unit)
        return np.where(size > 0.0, size, expected)
