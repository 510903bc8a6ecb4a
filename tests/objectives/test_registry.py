"""Every quantity of the catalogue must pass: a new one is tested by standing in the registry.

``NEAR`` says how near the surrogates that are no exact values come to them on rounded patterns.
"""

from __future__ import annotations

from collections.abc import Callable
from functools import cache
from typing import Any

import jax.numpy as jnp
import numpy as np
import pytest
from numpy.typing import NDArray
from polewright.models.patterns import checker, stripes, uniform
from polewright.models.units import FACTORS, SI_NAMES
from polewright.objectives.catalogue import CATALOGUE, Key
from polewright.objectives.plan import Plan
from polewright.objectives.registry import QUANTITIES

from ..tolerances import CANCELLED
from .examples import BASE, GAP_MM, MOVER, Compiled, bare, exact, example, problem, relaxed, rounded, spec_value

Array = NDArray[np.float64]
PATTERNS: dict[str, Callable[[NDArray[np.bool_]], NDArray[np.int8]]] = {
    "uniform": uniform,
    "checker": lambda mask: checker(mask, 1),
    "stripes along y": lambda mask: stripes(mask, 1),
    "stripes along x": lambda mask: stripes(mask, 2, axis=0),
}
NEAR = {
    "slide_force": 0.06,  # smooth maximum of 17 samples: at most log(17) / 64 above, and the peak between them
    "opening_work": 0.02,  # Gauss rule across the kink where the force changes its sign
    "stand_off": 1.0,  # the tanh that counts gaps is as wide as many forces: a direction, not a number
    "peak_force": 0.06,  # smooth maximum of 25 samples: at most log(25) / 64 above
    "stray_field": 0.12,  # smooth maximum over probes, which stand beside the peak
    "field_reach": 0.4,  # a power law through six distances
    "pole_count": 0.0,  # the Euler numbers count the poles of these patterns, none of which holds another
    "pole_edge_length": 0.0,  # exact on +1 and -1
    "narrowest_pole": 1.0,  # a mean width: what it says of the least one is its direction
}
every_quantity = pytest.mark.parametrize("name", CATALOGUE)


@cache
def compiled(name: str) -> Compiled:
    return Compiled(problem(name))


def test_catalogue_and_registry_name_the_same() -> None:
    assert list(QUANTITIES) == list(CATALOGUE)
    assert set(NEAR) == {name for name, quantity in QUANTITIES.items() if not quantity.exact_surrogate}


@every_quantity
def test_is_documented(name: str) -> None:
    entry = CATALOGUE[name]
    assert entry.unit in FACTORS
    assert entry.unit in SI_NAMES
    for text in (entry.meaning, entry.cheat):
        assert len(text) > 20
        assert text.endswith(".")
    assert QUANTITIES[name].__doc__
    assert all(key.unit in FACTORS for key in entry.keys)
    assert all(key.help or key.kind == "choice" for key in entry.keys)


@every_quantity
def test_reads_every_key(name: str) -> None:
    """A key that is taken and ignored would be a lie to the user."""
    read: set[str] = set()

    class Recorded(dict[str, Any]):
        def __getitem__(self, key: str) -> Any:
            read.add(key)
            return super().__getitem__(key)

        def get(self, key: str, default: Any = None) -> Any:
            read.add(key)
            return super().get(key, default)

    changes = {"of": "pair"} if any("pair" in key.choices for key in CATALOGUE[name].keys) else {}
    QUANTITIES[name](Recorded(example(name, **changes)), Plan(BASE, MOVER))
    assert read == {bare(key) for key in CATALOGUE[name].keys}


def changed(key: Key) -> list[Any]:
    """Other values that a spec could give a key."""
    if key.kind == "choice":
        return list(key.choices)
    value = spec_value(key)
    if key.kind == "range":
        return [(value[0] * 1.5, value[1]), (value[0], value[1] * 0.7)]
    return [tuple(1.5 * item for item in value[:1]) + value[1:]] if isinstance(value, tuple) else [1.5 * value]


@pytest.mark.parametrize(("name", "key"), [(name, key.name) for name, entry in CATALOGUE.items() for key in entry.keys])
def test_every_key_changes_the_value(name: str, key: str) -> None:
    found = next(k for k in CATALOGUE[name].keys if k.name == key)
    others = {"of": "pair"} if key == "gap_mm" and any(k.name == "of" for k in CATALOGUE[name].keys) else {}
    a, b = np.asarray(relaxed(BASE, 5)), -np.asarray(relaxed(MOVER, 6))
    seen = set()
    for value in [spec_value(found), *changed(found)]:
        asked = problem(name, **{**others, key: value})
        seen.add(float(asked.quantities[0].surrogate(asked.rows(a, b))[0]))
    assert len(seen) >= 2


@every_quantity
def test_compiled_batched_and_plain_agree(name: str) -> None:
    asked = compiled(name)
    count = asked.quantity.elements
    a, b = (jnp.stack([relaxed(part, seed) for seed in range(3)]) for part in (BASE, MOVER))
    together = np.asarray(asked.many(asked.tables, a, b))
    assert together.shape == (3, count)
    for n in range(3):
        plain = asked.quantity.surrogate(asked.asked.rows(np.asarray(a[n]), np.asarray(b[n])))
        assert np.asarray(plain) == pytest.approx(together[n], rel=1e-8, abs=0.0)
        assert np.asarray(asked.one(asked.tables, a[n], b[n])) == pytest.approx(together[n], rel=1e-8, abs=0.0)


@every_quantity
def test_lists_give_one_element_each(name: str) -> None:
    """What an entry lists comes back in its order, each as if asked alone."""
    alternatives: dict[str, Any] = {
        "gap_mm": (0.7, 2.0),
        "offset_mm": ((1.0, 0.5), (0.0, 2.0)),
        "point_mm": ((1.0, -2.0, 9.0), (0.0, 0.0, 12.0)),
    }
    a, b = rounded(BASE, 3), rounded(MOVER, 4)
    for key in CATALOGUE[name].keys:
        if key.kind in ("numbers", "pairs", "points"):
            listed = exact(problem(name, **{key.name: alternatives[key.name]}), a, b)
            alone = [exact(problem(name, **{key.name: item}), a, b)[0] for item in alternatives[key.name]]
            assert listed == pytest.approx(alone, rel=1e-9)


@every_quantity
@pytest.mark.parametrize("pattern", PATTERNS)
def test_degenerate_patterns_have_finite_gradients(name: str, pattern: str) -> None:
    asked = compiled(name)
    a, b = (jnp.asarray(PATTERNS[pattern](part.mask).astype(np.float64)) for part in (BASE, MOVER))
    value, slopes = asked.slope(asked.tables, a, b, jnp.ones(asked.quantity.elements))
    assert np.isfinite(value)
    assert all(np.isfinite(slope).all() for slope in slopes)


@every_quantity
def test_blank_parts_have_no_nan_gradient(name: str) -> None:
    """A force's relative slope does not exist where there is no force; everything else does."""
    asked = compiled(name)
    a, b = jnp.zeros(BASE.shape), jnp.zeros(MOVER.shape)
    value, slopes = asked.slope(asked.tables, a, b, jnp.ones(asked.quantity.elements))
    assert np.isfinite(value) or name == "force_sensitivity"
    assert all(np.isfinite(slope).all() for slope in slopes)


@every_quantity
def test_taylor(name: str) -> None:
    """What is left beyond the linear term falls by four at each halving, down to rounding."""
    asked = compiled(name)
    a, b, da, db = (relaxed(part, seed) for part, seed in ((BASE, 5), (MOVER, 6), (BASE, 7), (MOVER, 8)))
    b = -b  # so that they hold near and push apart further out: no quantity is flat here
    weights = jnp.ones(asked.quantity.elements)
    value, (slope_a, slope_b) = asked.slope(asked.tables, a, b, weights)
    linear = (slope_a * da).sum() + (slope_b * db).sum()
    steps = 0.02 * 0.5 ** np.arange(8)
    moved = np.array([float(asked.one(asked.tables, a + h * da, b + h * db) @ weights) for h in steps])
    rests = np.abs(moved - float(value) - steps * float(linear))
    assert float(linear) != 0.0
    if rests[0] > 1e-9 * abs(float(value)):
        ratios = rests[1:] / rests[:-1]
        assert ratios[3:6] == pytest.approx(np.full(3, 0.25), rel=0.1)


@every_quantity
def test_reversing_both_patterns(name: str) -> None:
    asked = problem(name)
    a, b = rounded(BASE, 9), rounded(MOVER, 10)
    sign = -1.0 if asked.quantities[0].flips_sign else 1.0
    assert exact(asked, -a, -b) == pytest.approx(sign * exact(asked, a, b), rel=1e-6, nan_ok=True)


def test_reversing_turns_a_component_of_the_field() -> None:
    a, b = rounded(BASE, 9), rounded(MOVER, 10)
    asked = problem("field_at", component="z")
    assert not asked.reverses
    assert exact(asked, -a, -b) == pytest.approx(-exact(asked, a, b), rel=1e-12)


@every_quantity
@pytest.mark.parametrize("seed", [11, 12, 13])
def test_surrogate_on_rounded_patterns(name: str, seed: int) -> None:
    """The number that a search sees against the number that is reported."""
    asked = compiled(name)
    # poles of some width, with a force that attracts near and repels far in some of them
    a, b = stripes(BASE.mask, 2), checker(MOVER.mask, 3)
    if seed != 11:
        a, b = rounded(BASE, seed), rounded(MOVER, seed)
    if name == "pole_count" and seed != 11:
        pytest.skip("random cells enclose each other: the Euler numbers are not the count there")
    smooth = np.asarray(asked.one(asked.tables, jnp.asarray(a, dtype=jnp.float64), jnp.asarray(b, dtype=jnp.float64)))
    reported = exact(asked.asked, a, b)
    if np.isnan(reported).any():
        pytest.skip("the value does not exist for this pattern")
    tier = NEAR.get(name, CANCELLED)
    assert smooth == pytest.approx(reported, rel=max(tier, 1e-9), abs=0.0)


def test_example_gap_is_in_every_range() -> None:
    """Examples look at one region of gaps, so that what is compared belongs together."""
    assert 0.2 < GAP_MM < 5.0
