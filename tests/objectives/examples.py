"""One entry for every quantity of the catalogue, made from its keys, and a problem that asks for nothing else."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, NamedTuple

import jax
import jax.numpy as jnp
import numpy as np
from numpy.typing import NDArray
from polewright.models.blank import Disc, Rectangle
from polewright.models.pair import Row, pair_values
from polewright.models.pair_fourier import FourierForms, fourier_forms, transform_sizes, values
from polewright.models.part import Part
from polewright.models.units import to_si
from polewright.objectives.catalogue import CATALOGUE, Key
from polewright.objectives.goals import Improve
from polewright.objectives.plan import Response
from polewright.objectives.problem import Problem
from polewright.objectives.quantity import Quantity

Array = NDArray[np.float64]
MM = 1e-3

BASE = Part(Rectangle(8.0 * MM, 6.0 * MM), 1.0 * MM, 3.0 * MM, 1.3, coating=0.02 * MM)
MOVER = Part(Disc(7.0 * MM), 1.0 * MM, 2.0 * MM, 1.2, coating=0.01 * MM)

BY_KEY: dict[str, Any] = {
    "offset_mm": (1.0, 0.5),
    "travel_mm": 3.0,
    "friction": 0.2,
    "arm_mm": 8.0,
    "between_mm": (0.2, 5.0),
    "load_N": 0.1,
    "distance_mm": 4.0,
    "field_mT": 2.0,
    "point_mm": (1.0, -2.0, 9.0),
}
"""Values of keys as a spec would give them; keys that stand for a gap get ``GAP_MM``, choices their first word."""
GAP_MM = 0.7


def si(key: Key, value: Any) -> Any:
    """A value of a key in SI, lists as tuples."""
    if isinstance(value, tuple):
        return tuple(si(key, item) for item in value)
    return value if isinstance(value, str) else to_si(value, key.unit)


def bare(key: Key) -> str:
    """A key without its unit, as quantities read it."""
    return key.name if key.unit == "1" else key.name.removesuffix("_" + key.unit)


def spec_value(key: Key) -> Any:
    """The example of a key in the spec's unit."""
    if key.kind == "choice":
        return key.choices[0]
    return GAP_MM if key.name == "gap_mm" else BY_KEY[key.name]


def example(name: str, **changes: Any) -> dict[str, Any]:
    """Keys of a quantity in SI; ``changes`` are given as in a spec, with units."""
    keys = {key.name: key for key in CATALOGUE[name].keys}
    return {bare(key): si(key, changes.get(key.name, spec_value(key))) for key in keys.values()}


def problem(name: str, base: Part = BASE, mover: Part = MOVER, **changes: Any) -> Problem:
    """A problem whose only quantity is the one named."""
    return Problem(base, mover, [], [Improve(name, example(name, **changes), "maximize")])


def exact(asked: Problem, a: NDArray[Any], b: NDArray[Any]) -> Array:
    """The reported values [SI], shape (elements,)."""
    return asked.exact(a, b).values


def value(name: str, base: Part, mover: Part, a: NDArray[Any], b: NDArray[Any], **changes: Any) -> float:
    """The reported value of a quantity with one element [SI]."""
    (only,) = exact(problem(name, base, mover, **changes), a, b)
    return float(only)


def closed(base: Part, mover: Part, a: NDArray[np.int8], b: NDArray[np.int8], rows: Sequence[Row]) -> Array:
    """Pair rows of a rounded design by the closed form [SI], shape (row,)."""
    return pair_values(base, mover, a.astype(np.float64), b.astype(np.float64), rows)


class Tables(NamedTuple):
    """Arrays that compiled functions take as arguments: as constants they would take long to compile."""

    forms: FourierForms
    linear_base: jax.Array
    linear_mover: jax.Array


class Compiled:
    """The surrogate of a problem's only quantity as a search sees it."""

    def __init__(self, asked: Problem) -> None:
        self.asked = asked
        linear = (jnp.asarray(matrix) for matrix in (asked.linear_base, asked.linear_mover))
        self.tables = Tables(fourier_forms(asked.forms), *linear)
        self.one = jax.jit(self.surrogate)
        self.many = jax.jit(jax.vmap(self.surrogate, in_axes=(None, 0, 0)))
        self.slope = jax.jit(jax.value_and_grad(self._weighted, argnums=(1, 2)))

    @property
    def quantity(self) -> Quantity:
        """The quantity."""
        return self.asked.quantities[0]

    def surrogate(self, tables: Tables, a: jax.Array, b: jax.Array) -> jax.Array:
        """Values [SI], shape (elements,), of patterns a (ny, nx) and b (my, mx)."""
        pair = values(tables.forms, transform_sizes(self.asked.forms), a, b)
        linear = tables.linear_base @ a.reshape(-1) + tables.linear_mover @ b.reshape(-1)
        found: jax.Array = self.quantity.surrogate(Response(jnp, pair, linear, a, b))
        return found

    def _weighted(self, tables: Tables, a: jax.Array, b: jax.Array, weights: jax.Array) -> jax.Array:
        return self.surrogate(tables, a, b) @ weights


def relaxed(part: Part, seed: int) -> jax.Array:
    """Values in (-1, 1) on the part's cells, as a search carries them."""
    return jnp.asarray(np.where(part.mask, np.random.default_rng(seed).uniform(-1.0, 1.0, part.shape), 0.0))


def rounded(part: Part, seed: int) -> NDArray[np.int8]:
    """Random +-1 on the part's cells."""
    return np.where(part.mask, np.random.default_rng(seed).choice([-1, 1], part.shape), 0).astype(np.int8)
