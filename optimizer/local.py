"""Local search on rounded patterns: tabu moves with exact incremental updates, for linear problems.

With one part fixed every form is linear, so the effect of each single flip is known from the slopes, and of a set of
flips on one part from their sum. After a move the values and the slopes are updated exactly, never recomputed.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from .forms import ConditionForms
from .scoring import score
from .stopping import Budget
from .width import keeps_width, moves

Array = NDArray[np.float64]
Index = NDArray[np.intp]

_LOOK = 64
"""Moves examined for the pole width at a step, best first."""
_SOFTNESS = 0.03
_CHECK = 256
"""Steps between two looks at the budget."""


class LocalSearch:
    """Tabu search from rounded variables.

    Attributes:
        forms: Conditions and worth as bilinear forms.
    """

    def __init__(self, forms: ConditionForms) -> None:
        self.forms = forms
        self._single = max(forms.layout.brushes) == 1
        n = forms.layout.count
        if self._single:
            self._variables, self._targets = np.arange(n)[:, None], np.zeros((n, 1))
        else:
            self._variables, self._targets = moves(forms.layout)

    def run(self, z: Array, random: np.random.Generator, steps: int, budget: Budget) -> Array:
        """Walk ``steps`` moves from z (n,) and return the best variables met; z must keep the pole width."""
        z = z.copy()
        values, slopes = self.forms.values(z), self.forms.slopes(z)
        best, best_z = float(self._score(values)), z.copy()
        free_at = np.zeros(z.size + 1, dtype=np.intp)
        longest = max(z.size // 12, 6)
        for step in range(steps):
            if step % _CHECK == 0:
                if budget.reason() is not None or not budget.affords(min(_CHECK, steps - step)):
                    break
                budget.spend(min(_CHECK, steps - step))
            flips = self._flips(z)
            scores = self._score(values + self._effects(z, slopes, flips).T)
            idle = ~flips.any(axis=1)
            barred = (free_at[self._variables] > step).any(axis=1) & (scores <= best)
            scores[idle | barred] = -np.inf
            move = self._choose(z, flips, scores)
            if move is None:
                break
            for variable in self._variables[move][flips[move]]:
                values, slopes = self._flip(z, int(variable), values, slopes)
                free_at[variable] = step + random.integers(4, longest + 1)
            reached = float(self._score(values))
            if reached > best + 1e-12 * abs(best):
                best, best_z = reached, z.copy()
        return best_z

    def _score(self, values: Array) -> Array:
        """Score of forms (..., form); slightly soft, so that conditions next to the worst one count too."""
        count = self.forms.counts.size
        worth = values[..., -1] if self.forms.improves else None
        return np.asarray(score(np, self.forms.counts, values[..., :count], worth, softness=_SOFTNESS))

    def _flips(self, z: Array) -> NDArray[np.bool_]:
        """Which variables of each move would change, shape (move, w)."""
        if self._single:
            return np.ones(self._variables.shape, dtype=bool)
        return self._targets * z[self._variables] < 0.0

    def _effects(self, z: Array, slopes: Array, flips: NDArray[np.bool_]) -> Array:
        """Change of each form by each move, shape (form, move)."""
        single = -2.0 * z * slopes
        if self.forms.layout.linked:
            single = single + 4.0 * self.forms.curvature
        if self._single:
            return single
        return np.asarray((single[:, self._variables] * flips).sum(-1))

    def _choose(self, z: Array, flips: NDArray[np.bool_], scores: Array) -> int | None:
        """Best move whose pattern keeps the pole width, or None."""
        if self._single:
            move = int(np.argmax(scores))
            return move if np.isfinite(scores[move]) else None
        look = min(_LOOK, scores.size - 1)
        order = np.argpartition(-scores, look)[:look]
        order = order[np.isfinite(scores[order])]
        order = order[np.argsort(-scores[order], kind="stable")]
        for first in range(0, order.size, 8):
            tried = order[first : first + 8]
            trial = np.repeat(z[None], tried.size, axis=0)
            for row, move in enumerate(tried):
                trial[row, self._variables[move][flips[move]]] *= -1.0
            good = keeps_width(self.forms.layout, trial)
            if good.any():
                return int(tried[int(np.argmax(good))])
        return None

    def _flip(self, z: Array, variable: int, values: Array, slopes: Array) -> tuple[Array, Array]:
        """Reverse one variable in place; returns values and slopes after it."""
        step = -2.0 * z[variable]
        change = self.forms.slope_change(variable)
        values = values + step * slopes[:, variable] + 0.5 * step**2 * change[:, variable]
        z[variable] = -z[variable]
        return values, slopes + step * change
