"""``verify``: agreement of two physics paths for every quantity, loud disagreement, exit codes, a whole archive."""

from __future__ import annotations

import json
from dataclasses import replace
from pathlib import Path

import numpy as np
import polewright
import pytest
from numpy.typing import NDArray
from polewright.models.blank import Rectangle
from polewright.models.part import Part
from polewright.objectives.catalogue import CATALOGUE
from polewright.runs import cli
from polewright.runs import verify as verify_module
from polewright.runs.archive import read_run, write_run
from polewright.runs.records import Run
from polewright.runs.report.extras import ReportExtras
from polewright.runs.report.page import render
from polewright.runs.verification.checks import TOLERANCE, Check
from polewright.runs.verification.second_pair import SecondPath
from polewright.runs.verify import verified_status, verify

from ..models.library import library_force
from ..tolerances import LIBRARY_FORCE, worst
from .verified import blocks, require, run_of, spec_of, stripes

CEILING = "at_most = 1e6"
FEW = "[tolerances]\nsamples = 12\n"
EVERYTHING = "".join(
    [
        require("axial_force", gap_mm=[0.3, 1.0]),
        require("holding_force", gap_mm=0.05),
        require("peel_force", gap_mm=0.3, arm_mm=10.0, edge="+y"),
        require("tilt_moment", CEILING, gap_mm=0.5),
        require("axial_stiffness", gap_mm=0.4),
        require("force_sensitivity", "at_least = -1e9", gap_mm=0.5),
        require("lateral_stiffness", gap_mm=0.4),
        require("lateral_force", gap_mm=0.5, offset_mm=[[1.0, 0.3], [2.0, 0.0]]),
        require("slide_force", gap_mm=0.4, travel_mm=2.0, axis="y", friction=0.2),
        require("opening_work", between_mm=[0.2, 6.0]),
        require("stand_off", CEILING, between_mm=[0.1, 6.0]),
        require("peak_force", which="repulsion", between_mm=[0.1, 6.0]),
        require("stray_field", CEILING, of="base", side="back", distance_mm=4.0),
        require("stray_field", CEILING, of="pair", side="around", distance_mm=4.0, gap_mm=0.3),
        require("field_at", CEILING, of="mover", point_mm=[[1.0, 2.0, 9.0], [0.0, 0.0, 6.0]]),
        require("field_reach", CEILING, of="pair", gap_mm=0.3),
        require("net_moment", CEILING, of="both"),
        require("pole_count", CEILING),
        require("pole_edge_length", CEILING),
        require("narrowest_pole", of="base"),
    ]
)
HOLD = require("holding_force", "at_least = 1.0", gap_mm=0.3) + FEW


def two_faced() -> tuple[NDArray[np.int8], NDArray[np.int8]]:
    """Fine opposed poles beside a coarse matched one: repels near, holds far, so that every quantity exists."""
    a, b = stripes((8, 8), 1).copy(), -stripes((8, 8), 1)
    a[:, 5:], b[:, 5:] = 1, 1
    return a, b


@pytest.fixture(scope="module")
def everything() -> Run:
    return verify(run_of(spec_of(EVERYTHING + FEW, "[8.0, 8.0]"), *two_faced()))


def held(value: float | None = None) -> Run:
    """A run of two stripes that hold each other, with a reported hold of one's own."""
    spec, a = spec_of(HOLD), stripes((6, 8), 4)
    return run_of(spec, a, a) if value is None else run_of(spec, a, a, values=np.array([value]))


def test_every_quantity_is_checked_and_both_paths_agree(everything: Run) -> None:
    found = (everything.verification or {})["second_path"]
    assert found["ok"], found["failed"]
    assert found["largest"] <= TOLERANCE
    assert found["unchecked"] == []
    told = [str(check["what"]) for check in found["checks"]]
    for column in everything.columns:
        assert any(column.label in what for what in told), column.label
    assert {column.name for column in everything.columns} == set(CATALOGUE)
    assert all(check["kernel"] is not None for check in found["checks"])


def test_the_pair_of_the_check_shows_every_behaviour(everything: Run) -> None:
    assert np.isfinite(everything.designs[0].values).all()


def test_second_path_against_the_field_library() -> None:
    part = Part(Rectangle(4e-3, 3e-3), 1e-3, 2e-3, 1.2)
    a, b = blocks((3, 4), 1, 1), blocks((3, 4), 2, 1)
    force, _ = library_force(part, part, a, b, 0.5e-3, 0.3e-3, 0.0, 1000)
    assert worst(SecondPath(part, part, a, b).force(0.5e-3, 0.3e-3), force) < LIBRARY_FORCE[1000]


def test_a_wrong_number_is_said_loudly_and_a_missed_requirement_counts() -> None:
    true = float(held().designs[0].values[0])
    assert true > 1.0
    wrong = verify(held(true * (1.0 + 1e-5)))
    found = (wrong.verification or {})["second_path"]
    assert not found["ok"]
    assert found["largest"] == pytest.approx(1e-5, rel=0.9)
    assert "holding_force" in found["failed"][0]
    assert found["missed"] == []
    assert verified_status(wrong) == "met"


def test_where_paths_disagree_the_second_decides_whether_it_is_met() -> None:
    spec = spec_of(HOLD.replace("at_least = 1.0", "at_least = 1000.0"))
    a = stripes((6, 8), 4)
    boast = run_of(spec, a, a, values=np.array([1001.0]))
    boast = replace(boast, designs=(replace(boast.designs[0], feasible=True),))
    verified = verify(boast)
    assert (verified.verification or {})["second_path"]["missed"] == ["holding_force at 0.3 mm gap"]
    assert verified_status(verified) == "missed"


def test_a_value_of_one_path_alone_fails() -> None:
    lost = Check("stand_off", "mm", None, float("nan"), 1e-3, 1.0, "itself")
    assert not lost.ok
    assert Check("stand_off", "mm", None, float("nan"), float("nan"), 1.0, "itself").ok
    assert Check("peak", "mT", None, 2.0, 1.0, 2.0, "itself", ceiling=True).ok
    assert not Check("peak", "mT", None, 2.0, 2.1, 2.0, "itself", ceiling=True).ok
    assert not Check("poles", "1", None, 2.0, 3.0, 0.0, "itself").ok


def test_slopes_in_contact_are_left_out_and_named() -> None:
    body = require("axial_stiffness", "at_least = -1e9", gap_mm=0.0) + FEW
    a = stripes((4, 4), 2)
    found = (verify(run_of(spec_of(body, "[4.0, 4.0]"), a, a)).verification or {})["second_path"]
    assert found["ok"]
    assert found["unchecked"] == [
        {"what": "axial_stiffness at 0 mm gap", "why": "the slope of the force diverges in contact"}
    ]


def test_poles_are_counted_by_hand() -> None:
    a = np.array([[1, 1, -1, -1, 1, 1]] * 2 + [[1, 1, 1, 1, 1, 1]] * 2, dtype=np.int8)
    asked = {
        "pole_count": 2.0,  # one N that reaches round one S
        "pole_edge_length": 6e-3,  # two sides of two cells and a floor of two
        "narrowest_pole": 2e-3,
    }
    verified = verify(run_of(spec_of("".join(require(name, CEILING) for name in asked) + FEW, "[6.0, 4.0]"), a, a))
    for check, (name, value) in zip((verified.verification or {})["second_path"]["checks"][-3:], asked.items(),
                                    strict=True):  # fmt: skip
        assert name in check["what"]
        assert check["second"] == pytest.approx(value)


def test_result_is_plain_and_stored_whole(everything: Run, tmp_path: Path) -> None:
    path = tmp_path / "run.h5"
    write_run(everything, path)
    assert read_run(path).verification == everything.verification
    assert (everything.verification or {})["design"] == "d1"
    text = render(everything, ReportExtras())
    for phrase in ("Second physics path: agrees", "costliest tolerance", "mover turned by 180 deg", "sets a floor"):
        assert phrase in text


def test_given_an_archive_it_is_stored_there(tmp_path: Path) -> None:
    path = tmp_path / "run.h5"
    write_run(held(), path)
    told: list[float] = []
    returned = polewright.verify(path, "d1", lambda _, share: told.append(share))
    assert read_run(path).verification == returned.verification
    assert told == sorted(told)
    assert told[-1] == pytest.approx(1.0)
    first = path.read_bytes()
    polewright.verify(path)
    assert path.read_bytes() == first


def test_command_says_met_and_missed(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = tmp_path / "run.h5"
    write_run(held(), path)
    assert cli.run(["verify", str(path)]) == 0
    assert "Second path: agrees" in capsys.readouterr().err
    spec, a = spec_of(HOLD.replace("at_least = 1.0", "at_least = 1000.0")), stripes((6, 8), 4)
    write_run(run_of(spec, a, a), path)
    assert cli.run(["verify", str(path), "--json"]) == 3
    result = json.loads(capsys.readouterr().out)
    assert (result["command"], result["status"]) == ("verify", "missed")
    assert result["verification"]["second_path"]["checks"][0]["gap_mm"] == 0.0


def test_command_refuses_bad_input(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert cli.run(["verify", str(tmp_path / "none.h5")]) == 2
    path = tmp_path / "run.h5"
    write_run(held(), path)
    before = path.read_bytes()
    assert cli.run(["verify", str(path), "--design", "d9"]) == 2
    assert path.read_bytes() == before
    assert "give one of d1" in capsys.readouterr().err


def test_interrupted_the_archive_stays_as_it_was(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def stop(*_: object) -> dict[str, object]:
        raise KeyboardInterrupt

    path = tmp_path / "run.h5"
    write_run(held(), path)
    before = path.read_bytes()
    monkeypatch.setattr(verify_module, "assembly", stop)
    assert cli.run(["verify", str(path)]) == 130
    assert path.read_bytes() == before
    assert list(tmp_path.iterdir()) == [path]


def test_a_disagreement_is_shown_by_the_command(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = tmp_path / "run.h5"
    write_run(held(2.0 * float(held().designs[0].values[0])), path)
    assert cli.run(["verify", str(path)]) == 0
    assert "Second path: Disagreement in holding_force" in " ".join(capsys.readouterr().err.split())
