"""Wrong assembly against symmetries: what must not change, what must change sign exactly."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray
from polewright.runs.spec import Spec
from polewright.runs.verification.asked import asked_of
from polewright.runs.verification.assembly import _ways, assembly
from polewright.runs.verification.state import State

from .verified import HEAD, blocks, require, run_of, silent, spec_of, stripes

FREE = '[conditions]\nlateral = "free"\n'
HOLD = require("holding_force", "at_least = 1.0", gap_mm=0.3)
DISC = HEAD.replace('shape = "rectangle"\nsize_mm = {size}', 'shape = "disc"\ndiameter_mm = 8.0')


def ways(spec: Spec, a: NDArray[np.int8], b: NDArray[np.int8]) -> dict[str, dict[str, Any]]:
    """Return the records by name."""
    run = run_of(spec, a, b)
    state = State(run.base, run.mover, a.astype(float), b.astype(float))
    records = assembly(spec, asked_of(spec, run.base, run.mover), state, silent)
    return {record["name"]: record for record in records}


def force(record: dict[str, Any]) -> float:
    return float(record["values"][0]["value"])


def test_a_pair_with_half_turn_symmetry_fits_either_way() -> None:
    half = blocks((6, 4), 1, 1)
    b = np.concatenate([half, half[::-1, ::-1]], axis=1)
    record = ways(spec_of(HOLD), b, b)["mover turned by 180 deg"]
    assert record["text"] == "Changes nothing: it fits either way."
    assert not record["dangerous"]
    assert record["values"][0]["label"] == "axial force at 0.3 mm"


def test_a_pair_that_is_odd_under_half_a_turn_repels_as_much_as_it_held() -> None:
    a = stripes((6, 8), 4)
    found = ways(spec_of(HOLD), a, a)
    nominal = -float(run_of(spec_of(HOLD), a, a).designs[0].values[0])
    turned = found["mover turned by 180 deg"]
    assert force(turned) == pytest.approx(-nominal, rel=1e-9)
    assert turned["dangerous"]
    assert turned["text"].startswith("It repels with ")
    assert "at 0.3 mm instead of holding " in turned["text"]
    assert "It then misses holding_force at 0.3 mm gap." in turned["text"]


def test_upside_down_a_uniform_mover_shows_its_other_pole() -> None:
    one = np.ones((6, 8), np.int8)
    found = ways(spec_of(HOLD), one, one)
    assert set(found) == {
        "mover turned by 180 deg", "mover upside down, tipped over about x", "mover upside down, tipped over about y"
    }  # fmt: skip
    nominal = -float(run_of(spec_of(HOLD), one, one).designs[0].values[0])
    assert force(found["mover upside down, tipped over about x"]) == pytest.approx(-nominal, rel=1e-9)
    assert found["mover turned by 180 deg"]["text"].endswith("it fits either way.")


def test_upside_down_stripes_about_their_own_axis() -> None:
    """Tipped about y (along the stripes) an even number of stripes comes back to itself: mirrored and reversed."""
    a = stripes((6, 8), 2)
    found = ways(spec_of(HOLD), a, a)
    assert found["mover upside down, tipped over about y"]["text"].endswith("it fits either way.")
    assert found["mover upside down, tipped over about x"]["dangerous"]


def test_long_stripes_shifted_by_one_repel_almost_as_much() -> None:
    """Of infinite stripes the force changes sign with a shift by one; here twelve of thirteen pairs remain."""
    a = stripes((12, 26), 2)
    spec = spec_of(HOLD + FREE, "[26.0, 12.0]")
    found = ways(spec, a, a)
    nominal = -float(run_of(spec, a, a).designs[0].values[0])
    for side in "+-":
        shifted = found[f"mover shifted by one pole (2 mm) along {side}x"]
        assert force(shifted) / -nominal == pytest.approx(12.0 / 13.0, abs=0.05)
        assert shifted["dangerous"]


def test_a_guide_prevents_shifts() -> None:
    a = stripes((6, 8), 2)
    shifted = ways(spec_of(HOLD), a, a)["mover shifted by one pole (2 mm) along +x"]
    assert not shifted["dangerous"]
    assert "A guide prevents this" in shifted["text"]


def test_a_quarter_turn_is_counter_clockwise_as_seen_from_above() -> None:
    spec = spec_of(HOLD, "[6.0, 6.0]")
    run = run_of(spec, blocks((6, 6), 1), blocks((6, 6), 2))
    mark = np.zeros((6, 6))
    mark[1, 4] = 1.0  # at (x, y) = (1.5, -1.5) cells
    turned = {way.name: way.state.b for way in _ways(spec, State(run.base, run.mover, np.ones((6, 6)), mark))}
    (row,), (column,) = np.nonzero(turned["mover turned by 90 deg"])
    assert (run.mover.x[column], run.mover.y[row]) == (-run.mover.y[1], run.mover.x[4])


def test_a_disc_turns_by_quarters_and_a_rectangle_does_not() -> None:
    def turns(spec: Spec, a: NDArray[np.int8]) -> set[str]:
        return {name for name in ways(spec, a, a) if "turned" in name}

    round_mask = run_of(spec_of(HOLD, head=DISC), np.ones((8, 8), np.int8), np.ones((8, 8), np.int8)).base.mask
    disc = np.where(round_mask, stripes((8, 8), 2), 0).astype(np.int8)
    assert turns(spec_of(HOLD, head=DISC), disc) == {f"mover turned by {angle} deg" for angle in (90, 180, 270)}
    assert turns(spec_of(HOLD), stripes((6, 8), 2)) == {"mover turned by 180 deg"}


def test_a_much_stronger_force_is_dangerous_too() -> None:
    """A mover that meets poles of its own size only when turned holds far more than anyone expects."""
    a, b = stripes((8, 8), 2), np.ascontiguousarray(stripes((8, 8), 2).T)
    b[:, :2] = 1
    found = ways(spec_of(require("axial_force", gap_mm=0.3), "[8.0, 8.0]"), a, b)
    turned = found["mover turned by 270 deg"]
    assert turned["dangerous"]
    assert "times as much" in turned["text"] or "instead of" in turned["text"]


def test_a_spec_without_poses_is_looked_at_where_its_cells_suit() -> None:
    a = stripes((6, 8), 2)
    found = ways(spec_of(require("pole_count", "at_most = 9")), a, a)
    labels = [row["label"] for row in found["mover turned by 180 deg"]["values"]]
    assert labels == ["axial force at 0.3 mm", "axial force at 1 mm", "axial force at 3 mm", "pole_count of both parts"]


def test_a_force_that_vanishes_has_no_sign_to_warn_of() -> None:
    """Crossed stripes neither hold nor repel but for rounding."""
    a = stripes((8, 8), 2)
    found = ways(spec_of(HOLD, "[8.0, 8.0]"), a, a)
    for turned in (found["mover turned by 90 deg"], found["mover turned by 270 deg"]):
        assert turned["text"].startswith("It neither holds nor repels at 0.3 mm instead of holding ")
        assert not turned["dangerous"]
        assert turned["changes"]
