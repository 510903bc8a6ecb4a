"""Scatter against brute force, against scaling laws and against itself."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.typing import NDArray
from polewright.models.units import MU0
from polewright.runs.records import Run
from polewright.runs.resolve import parts
from polewright.runs.spec import Spec
from polewright.runs.verification import scatter as scatter_module
from polewright.runs.verification.asked import asked_of
from polewright.runs.verification.draws import VARIABLES, draw, extremes, limits_of, state_of, worst_drops
from polewright.runs.verification.leaks import leak_values
from polewright.runs.verification.scatter import _pair, _values, scatter
from polewright.runs.verification.state import State, exact_value

from .test_verify import EVERYTHING, two_faced
from .verified import require, run_of, silent, spec_of, stripes

NONE = {"remanence_percent": 0, "imbalance_percent": 0, "pole_position_mm": 0, "gap_mm": 0, "offset_mm": 0,
        "angle_deg": 0, "thickness_mm": 0, "samples": 200}  # fmt: skip
CEILING = "at_most = 1e6"


def tolerances(**given: float) -> str:
    """Return a [tolerances] table with nothing but what is given."""
    return "\n".join(["[tolerances]", *(f"{key} = {value}" for key, value in (NONE | given).items()), ""])


def found(spec: Spec, a: NDArray[np.int8], b: NDArray[np.int8]) -> dict[str, object]:
    run = run_of(spec, a, b)
    return scatter(run, spec, asked_of(spec, run.base, run.mover), nominal(run), silent)


def nominal(run: Run) -> State:
    design = run.designs[0]
    return State(run.base, run.mover, design.base.astype(float), design.mover.astype(float))


def test_interpolation_is_what_brute_force_finds_for_every_quantity() -> None:
    spec = spec_of(EVERYTHING + "[tolerances]\nsamples = 60\n", "[8.0, 8.0]")
    a, b = two_faced()
    base, mover = parts(spec)
    state = State(base, mover, a.astype(float), b.astype(float))
    asked = asked_of(spec, base, mover)
    draws = draw(spec, 3)
    pair = _pair(asked, np.array([0.0, 1e-3]), state, draws)
    for entry in asked:
        values = _values(entry, state, draws, pair)
        exact = np.array([exact_value(entry, state_of(state, draws, n)) for n in range(6)])
        assert (np.isnan(values[:6]) == np.isnan(exact)).all(), entry.label
        band = np.maximum(np.nanmax(values, axis=0) - np.nanmin(values, axis=0), 1e-12 * np.nanmax(np.abs(values)))
        assert np.nanmax(np.abs(values[:6] - exact) / band) < 0.02, entry.label


def test_force_scales_with_both_remanences() -> None:
    spec = spec_of(require("holding_force", gap_mm=0.3) + tolerances(remanence_percent=5.0))
    a = stripes((6, 8), 2)
    rows = found(spec, a, a)["requirements"]
    draws = draw(spec, 0)
    force = (1.0 + draws.column("remanence_base")) * (1.0 + draws.column("remanence_mover"))
    value = float(run_of(spec, a, a).designs[0].values[0])
    expected = value * np.percentile(force, [5, 95])
    assert [rows[0]["p5"][0], rows[0]["p95"][0]] == pytest.approx(expected.tolist(), rel=1e-6)  # type: ignore[index]
    assert rows[0]["costliest"] == "remanence"  # type: ignore[index]


def test_without_tolerances_all_pairs_are_the_nominal_one() -> None:
    leak = require("stray_field", CEILING, of="base", side="back", distance_mm=3.0)
    spec = spec_of(require("holding_force", "at_least = 1", gap_mm=0.3) + leak + tolerances())
    a = stripes((6, 8), 2)
    record = found(spec, a, a)
    for row, value in zip(record["requirements"], run_of(spec, a, a).designs[0].values, strict=True):  # type: ignore[call-overload]
        assert [*row["p5"], *row["p95"]] == pytest.approx([value, value], rel=1e-5)
        assert row["costliest"] == "none"
    assert record["share_all"] == 1.0


def test_share_is_that_of_the_pairs_that_meet_it() -> None:
    a = stripes((6, 8), 2)
    free = spec_of(require("holding_force", gap_mm=0.3) + tolerances(remanence_percent=5.0))
    value = float(run_of(free, a, a).designs[0].values[0])
    spec = spec_of(require("holding_force", f"at_least = {value!r}", gap_mm=0.3) + tolerances(remanence_percent=5.0))
    draws = draw(spec, 0)
    force = (1.0 + draws.column("remanence_base")) * (1.0 + draws.column("remanence_mover"))
    assert found(spec, a, a)["share_all"] == pytest.approx((force >= 1.0).mean())


def test_imbalance_is_the_floor_of_a_moment_that_cancels() -> None:
    spec = spec_of(require("net_moment", CEILING, of="base") + tolerances(imbalance_percent=2.0))
    a = stripes((6, 8), 2)
    record = found(spec, a, a)
    base, _ = parts(spec)
    cell = base.remanence / MU0 * base.cell**2 * base.thickness
    floor = record["imbalance_floor"]
    assert floor == {"net_moment of the base [A m2]": pytest.approx(0.01 * 48 * cell)}
    assert record["requirements"][0]["costliest"] == "N/S imbalance"  # type: ignore[index]


def test_imbalance_lifts_a_field_that_cancels() -> None:
    """Far behind fine stripes little field is left: the floor is what the worse sign of imbalance makes of it."""
    body = require("stray_field", CEILING, of="base", side="back", distance_mm=30.0)
    spec = spec_of(body + tolerances(imbalance_percent=2.0))
    a = stripes((6, 8), 1)
    run = run_of(spec, a, a)
    entry = asked_of(spec, run.base, run.mover)[0]
    sides = [
        float(exact_value(entry, State(run.base, run.mover, a + share * np.abs(a), a.astype(float)))[0])
        for share in (-0.01, 0.01)
    ]
    floor = next(iter(found(spec, a, a)["imbalance_floor"].values())) * 1e-3  # type: ignore[attr-defined]
    assert floor == pytest.approx(max(sides), rel=1e-3)
    assert floor > 1.2 * float(run.designs[0].values[0])


def test_gap_costs_most_where_only_it_varies_much() -> None:
    spec = spec_of(require("holding_force", "at_least = 1", gap_mm=0.3) + tolerances(gap_mm=0.2, remanence_percent=0.1))
    a = stripes((6, 8), 2)
    row = found(spec, a, a)["requirements"][0]  # type: ignore[index]
    assert row["costliest"] == "gap"
    assert row["cost"]["gap"] > row["cost"]["remanence"] > row["cost"]["offset"] == 0.0


def test_same_seed_same_record() -> None:
    a = stripes((6, 8), 2)
    specs = [spec_of(require("holding_force", gap_mm=0.3) + f"[search]\nseed = {seed}\n") for seed in (1, 1, 2)]
    first, again, other = (found(spec, a, a) for spec in specs)
    assert first == again
    assert first["requirements"] != other["requirements"]
    assert (first["samples"], first["seed"]) == (500, 1)
    assert any("(angle_deg) are not sampled" in note for note in first["notes"])  # type: ignore[attr-defined]


def test_draws_fill_their_limits_evenly() -> None:
    spec = spec_of(require("holding_force", gap_mm=0.3) + "[tolerances]\nsamples = 4000\n")
    draws = draw(spec, 0)
    assert np.abs(draws.share).max() <= 1.0
    np.testing.assert_allclose(draws.share.std(axis=0), 1.0 / np.sqrt(3.0), rtol=0.05)
    np.testing.assert_allclose(limits_of(spec)[[0, 2, 4, 8, 10, 11]], [0.03, 0.02, 1.5e-4, 1e-4, 5e-5, 5e-5])
    sides = extremes(spec)
    assert sides.count == 1 + 2 * len(VARIABLES)
    np.testing.assert_array_equal(sides.share[1:3, 0], [-1.0, 1.0])


def test_a_missing_nominal_value_has_no_costliest_tolerance() -> None:
    assert set(worst_drops(np.full(1 + 2 * len(VARIABLES), -np.inf)).values()) == {0.0}
    lost = np.zeros(1 + 2 * len(VARIABLES))
    lost[1] = -np.inf
    assert worst_drops(lost)["remanence"] == np.inf


def test_exact_pairs_stand_in_where_interpolation_fails(monkeypatch: pytest.MonkeyPatch) -> None:
    spec = spec_of(require("holding_force", gap_mm=0.3) + "[tolerances]\nsamples = 150\n", "[4.0, 4.0]")
    a = stripes((4, 4), 2)
    interpolated = found(spec, a, a)["requirements"][0]  # type: ignore[index]
    monkeypatch.setattr(scatter_module, "_ALLOWED", -1.0)
    exact = found(spec, a, a)["requirements"][0]  # type: ignore[index]
    assert exact["method"] == "exact evaluation of the first 100 pairs"
    assert exact["p5"] == pytest.approx(interpolated["p5"], rel=0.02)


def test_a_reach_of_nothing_is_nothing() -> None:
    spec = spec_of(require("field_reach", CEILING, of="base", field_mT=5000.0) + "[tolerances]\nsamples = 5\n")
    base, mover = parts(spec)
    state = State(base, mover, np.ones(base.shape), np.ones(mover.shape))
    entry = asked_of(spec, base, mover)[0]
    assert (leak_values(entry, state, draw(spec, 0), 0.0) == 0.0).all()
