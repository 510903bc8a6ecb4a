"""The stages of a run: structured starts, gradient and linear programs first, then rounds of local search."""

from __future__ import annotations

from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from ..models.errors import InputError
from ..models.patterns import checker, stripes, uniform
from ..objectives.problem import Problem
from .forms import ConditionForms
from .gradient import GradientDesign
from .layout import Layout
from .linear import alternate
from .local import LocalSearch
from .polish import Polish
from .pool import Pool
from .relaxed import Relaxed
from .scoring import score
from .stopping import Budget
from .tabu import STARTS, TabuSearch, affordable
from .textures import composites, crossed, noise, perturbed
from .width import keeps_width, mended, rounded

Array = NDArray[np.float64]

_DRAWN = 800
"""Structured starts drawn and judged for each set that is used."""
_WALK = 1000
_SOFTNESS = np.geomspace(0.04, 0.08, STARTS)
_PARENTS = 8
_SPREAD = 2.0
"""Mean rank of the designs that walks start from."""
_CROSSED = 4
"""One start in as many is a design with a window of another one."""
_JUDGED, _JUDGED_SLOWLY = STARTS, 5
"""Designs of a stage that are judged exactly, best first by the search's own score: where rows suffice, or not."""
_POLISHED, _DISTURBED = 3, 4
_POLISH_STEPS = 150
_REFINED = 2
_REFINE_EVERY = 4
_LOCAL_STEPS = 250
_PROGRAMS = 4
_AMPLITUDE = 0.1
"""Size of the latents that structured starts are given: small, so that the gradient may change them."""
_FAR = 0.1
"""A worst margin below minus this is far from being met."""


class Stages:
    """What a run does, stage by stage.

    Attributes:
        problem: What is asked.
        layout: What is free.
        budget: Evaluations, seconds and interrupt.
        pool: Where designs go.
    """

    def __init__(
        self,
        problem: Problem,
        layout: Layout,
        budget: Budget,
        pool: Pool,
        starts: int,
    ) -> None:
        self.problem, self.layout, self.budget, self.pool = problem, layout, budget, pool
        self._starts = starts
        self._coarse = layout.coarse()
        self._island = 0

    def obvious(self) -> None:
        """Judge the obvious patterns, so that a run never ends with nothing.

        Raises:
            InputError: No pattern keeps the pole width under the symmetry and the given cells.
        """
        found: list[Array] = []
        faces = [
            [uniform(mask), *(make(mask, width) for make in (stripes, checker) for width in (brush, 2 * brush))]
            for mask, brush in zip(self.layout.masks, self.layout.brushes, strict=True)
        ]
        for a, b in zip(*faces, strict=True):
            found += [mended(self.layout, self.layout.variables(a, sign * b)) for sign in (1.0, -1.0)]
        for z in found:
            if self.pool.best is None or self.budget.affords(1):
                known = len(self.pool.candidates)
                self.pool.add(z, "given")
                self.budget.spend(len(self.pool.candidates) - known)
        if self.pool.best is None:
            message = (
                "no pattern found that keeps the pole width with this symmetry and the given cells; "
                "lower pole_width_min_mm, drop the symmetry or give fewer cells"
            )
            raise InputError(message)

    def run(self, number: int, random: np.random.Generator, island: int, age: int) -> None:
        """Run one stage.

        Tabu walks come first where everything is linear, since they are the strongest search a second there; relaxed
        design follows where they end far from the requires, and begins every second island where there is an improve.
        Elsewhere relaxed design, walks on what is linear, and polish take turns.

        Args:
            number: Number of the stage.
            random: The stage's own random stream.
            island: Number of the population that is bred.
            age: Rounds that it has been bred for.
        """
        self._island = island
        if number == 0 and self.tabu is None:
            self.relaxed(random)
        elif self.tabu is not None and not self._wants_relaxed(number, age):
            begins = age == 0 or self.pool.best_on(island) is None
            self.walks(self.tabu, random, fresh=STARTS if begins else 0)
            if self._coarse is not self.layout and number % _REFINE_EVERY == 1:
                self._refine(random)
        elif self.problem.is_linear:
            self.relaxed(random)
            self._refine(random)
        else:
            self._calibrate()
            self.relaxed(random)
        if not self.problem.is_linear and number > 0:
            self._calibrate()
            self.polish(random)

    def _wants_relaxed(self, number: int, age: int) -> bool:
        """Is it the turn of relaxed design in a problem that walks can search?

        Walks see the linear conditions alone. Where there are others, relaxed design comes first, and keeps most of the
        turns as long as it is ahead.
        """
        if not self.problem.is_linear:
            walked, designed = self.pool.best_of("search"), self.pool.best_of("gradient")
            ahead = designed is not None and (walked is None or designed.rank > walked.rank)
            return number == 0 or (ahead and number % 4 != 1)
        best = self.pool.best
        far = best is None or (not best.evaluation.feasible and best.evaluation.worst_margin < -_FAR)
        begins = age == 0 and self._island % 2 == 1 and (far or bool(self.problem.improves))
        # one free part is a linear program: its optimum, rounded, is where walks should begin
        program = number == 0 and not self.layout.linked and np.unique(self.layout.owner).size == 1
        return begins or program or (number == 1 and far)

    # --- relaxed searches -------------------------------------------------------------------------------------------

    def relaxed(self, random: np.random.Generator, *, programs: bool = True) -> None:
        """Gradient design from structured and smooth random starts, then linear programs from its best."""
        half = self._starts // 2
        structured = self._best_drawn(self.layout, random, half) * _AMPLITUDE
        latent = np.concatenate([structured, 3.0 * _AMPLITUDE * noise(self.layout, random, self._starts - half)])
        relaxed = self._gradient.run(latent, self.budget)
        order = self._add(np.stack([mended(self.layout, z) for z in relaxed]), "gradient")
        if programs and self.programs is not None:
            found = [alternate(self.programs, relaxed[n], self.budget) for n in order[:_PROGRAMS]]
            self._add(np.stack([mended(self.layout, z) for z in found]), "linear")

    def _best_drawn(self, layout: Layout, random: np.random.Generator, count: int) -> Array:
        """The best ``count`` of many structured starts, by the search's own score."""
        many = min(_DRAWN, self.budget.left // 2) if count else 0
        drawn = composites(layout, random, max(many, count))
        order = np.argsort(-self._scores(layout, drawn), kind="stable")
        return drawn[order[:count]]

    def _scores(self, layout: Layout, z: Array) -> Array:
        """Scores of rounded variables (m, n) of a layout, shape (m,)."""
        if not len(z):
            return np.zeros(0)
        self.budget.spend(min(len(z), self.budget.left))
        if layout is not self.layout:
            z = np.stack([self._fine(one) for one in z])
        if self._forms is not None:
            # a design costs less here than compiling the batched physics
            values = np.stack([self._forms.values(one) for one in z])
            conditions, worth = values[:, : self.problem.counts.size], values[:, -1]
        else:
            conditions, worth = self._physics.judge_many(z)
        return np.asarray(score(np, self.problem.counts, conditions, worth if self.problem.improves else None))

    def _add(self, z: Array, origin: str) -> NDArray[np.intp]:
        """Judge the best of many rounded variables exactly; returns the order of all by the search's score."""
        order = np.argsort(-self._scores(self.layout, z), kind="stable")
        for n in order[: _JUDGED if self.problem.judged_by_rows else _JUDGED_SLOWLY]:
            self.pool.add(z[n], origin, self._island)
        return order

    # --- local search -----------------------------------------------------------------------------------------------

    def walks(self, tabu: TabuSearch, random: np.random.Generator, fresh: int) -> None:
        """Tabu walks from fresh structured starts, or from the island's best designs disturbed or crossed."""
        layout = self._coarse
        known = [
            rounded(layout.variables(*self.layout.patterns(c.z))) for c in self.pool.distinct(_PARENTS, self._island)
        ]
        starts = list(self._best_drawn(layout, random, fresh))
        starts += [self._offspring(layout, known, n, random) for n in range(STARTS - fresh)]
        violation = np.geomspace(5.0, 50.0, STARTS)[random.permutation(STARTS)]
        found = tabu.run(np.stack(starts), random, self.budget, _WALK, _SOFTNESS, violation)
        self._add(np.stack([self._fine(z) for z in found]), "search")

    def _refine(self, random: np.random.Generator) -> None:
        """Moves of whole windows on the fine lattice, keeping the pole width; flips where no walk is affordable."""
        if self._local is None or (max(self.layout.brushes) == 1 and self.tabu is not None):
            return
        for candidate in self.pool.distinct(_REFINED):
            self.pool.add(self._local.run(candidate.z, random, _LOCAL_STEPS, self.budget), "polish", self._island)

    def _calibrate(self) -> None:
        """Correct the surrogates so that they are exact at the best design."""
        best = self.pool.best
        if best is not None:
            self._physics.calibrated(self.problem.overstated(*self.layout.patterns(best.z)))

    def polish(self, random: np.random.Generator) -> None:
        """Moves on any problem, judged by the physics itself, from the best designs and from disturbed ones."""
        known = [candidate.z for candidate in self.pool.distinct(_POLISHED)]
        disturbed = [self._offspring(self.layout, known, n, random) for n in range(_DISTURBED)]
        for z in [*known, *(mended(self.layout, one) for one in disturbed)]:
            self.pool.add(self._polisher.run(z, _POLISH_STEPS, self.budget), "polish", self._island)

    def _offspring(self, layout: Layout, known: list[Array], number: int, random: np.random.Generator) -> Array:
        """One of the known designs, the better the likelier: disturbed, or now and then crossed with another one."""
        z = known[min(int(random.exponential(_SPREAD)), len(known) - 1)]
        if number % _CROSSED:
            return perturbed(layout, z, random)
        other = known[int(random.integers(len(known)))]
        # a design and its reverse are the same: take the one that is nearer
        other = -other if self.problem.reverses and (other == z).mean() < 0.5 else other
        return crossed(layout, z, other, random)

    def _fine(self, z: Array) -> Array:
        """Variables of the full layout for those of the coarse one."""
        if self._coarse is self.layout:
            return z
        fine = rounded(self.layout.variables(*self._coarse.patterns(z)))
        return fine if keeps_width(self.layout, fine[None])[0] else mended(self.layout, fine)

    # --- what the stages use, built when first needed ---------------------------------------------------------------

    @cached_property
    def _physics(self) -> Relaxed:
        return Relaxed(self.problem, self.layout)

    @cached_property
    def _forms(self) -> ConditionForms | None:
        """Everything that is asked as forms, where all of it is linear."""
        return ConditionForms(self.problem, self.layout) if self.problem.is_linear else None

    @cached_property
    def _gradient(self) -> GradientDesign:
        return GradientDesign(self._physics)

    @cached_property
    def _polisher(self) -> Polish:
        return Polish(self._physics)

    @cached_property
    def programs(self) -> ConditionForms | None:
        """Forms for linear programs; none where the mover is the base's own pattern, which makes them quadratic."""
        return None if self.layout.linked else self._forms

    @cached_property
    def tabu(self) -> TabuSearch | None:
        """Walks on the linear conditions; none where there are too few, or their table would be too large."""
        if not self.problem.has_linear_core:
            return None
        forms = self._forms if self._coarse is self.layout else None
        forms = forms or ConditionForms(self.problem, self._coarse)
        return TabuSearch(forms) if affordable(forms) else None

    @cached_property
    def _local(self) -> LocalSearch | None:
        return None if self._forms is None else LocalSearch(self._forms)
