"""Alternating linear programs: with one part fixed, conditions and worth are linear in the other part.

Each program maximizes the least condition that counts (or the worth) over the relaxed pattern of one part, exactly; at
a vertex at most as many variables are fractional as there are active conditions. Parts take turns until nothing gains.
"""

from __future__ import annotations

from typing import Literal

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import linprog

from .forms import ConditionForms
from .scoring import score
from .stopping import Budget

Array = NDArray[np.float64]

_SWEEPS = 12
_GAIN = 1e-6
_SLACK_COST = 1e3


def alternate(forms: ConditionForms, z: Array, budget: Budget) -> Array:
    """Improve both parts in turn from variables z (n,) until no turn gains; returns relaxed variables (n,)."""
    owners = [owner for owner in (0, 1) if (forms.layout.owner == owner).any()]
    best = _score(forms, z)
    for _ in range(_SWEEPS):
        before = best
        for owner in owners:
            if budget.reason() is not None or not budget.affords(1):
                return z
            candidate = best_part(forms, z, "base" if owner == 0 else "mover")
            budget.spend(1)
            reached = _score(forms, candidate)
            if reached > best:
                z, best = candidate, reached
        if best - before <= _GAIN * max(abs(best), 1.0) or len(owners) == 1:
            break
    return z


def best_part(forms: ConditionForms, z: Array, part: Literal["base", "mover"]) -> Array:
    """Optimal relaxed pattern of one part with the other fixed at z; z itself when the program has no solution."""
    a, b = forms.layout.patterns(z)
    mine = forms.layout.owner == (0 if part == "base" else 1)
    slopes = (forms.slopes_base(b) if part == "base" else forms.slopes_mover(a))[:, mine]
    rest = forms.values(z) - slopes @ z[mine]
    solution = _solve(slopes, rest, forms)
    if solution is None:
        return z
    out = z.copy()
    out[mine] = solution
    return out


def _solve(slopes: Array, rest: Array, forms: ConditionForms) -> Array | None:
    """Maximize over x in [-1, 1]^n with forms = slopes @ x + rest."""
    conditions = forms.counts.size
    n = slopes.shape[1]
    if conditions == 0:
        return np.where(slopes[-1] >= 0.0, 1.0, -1.0)
    # columns: x, then the level that all counting conditions reach (or 0 with an improve), then one common shortfall
    level = np.where(forms.counts & (not forms.improves), 1.0, 0.0)
    short = np.where(forms.counts & (not forms.improves), 0.0, -1.0)
    matrix = np.column_stack([-slopes[:conditions], level, short])
    cost = np.zeros(n + 2)
    cost[n + 1] = _SLACK_COST
    if forms.improves:
        cost[:n] = -slopes[-1]
    else:
        cost[n] = -1.0
    bounds = [(-1.0, 1.0)] * n + [(None, None) if level.any() else (0.0, 0.0), (0.0, None)]
    found = linprog(cost, A_ub=matrix, b_ub=rest[:conditions], bounds=bounds, method="highs")
    return np.asarray(found.x[:n]) if found.status == 0 else None


def _score(forms: ConditionForms, z: Array) -> float:
    values = forms.values(z)
    count = forms.counts.size
    return float(score(np, forms.counts, values[:count], values[-1] if forms.improves else None))
