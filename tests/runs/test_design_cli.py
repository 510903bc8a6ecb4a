"""``polewright design`` as a user and a pipeline meet it: exit codes, messages, one JSON object, nothing lost."""

from __future__ import annotations

import json
import math
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from polewright.runs.archive import read_run
from polewright.runs.cli import run

from ..models import references as ref
from .specs import NEAR_FAR, spec_text, write

IMPOSSIBLE = NEAR_FAR.format(near=1e4, far=0.1)
UNIFORM = "1,1,1\n1,1,1\n1,1,1\n"


@pytest.fixture
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """A folder of its own to work in, with one spec."""
    monkeypatch.chdir(tmp_path)
    write(tmp_path / "s.toml", spec_text())
    return tmp_path


def answer(capsys: pytest.CaptureFixture[str], *arguments: str) -> tuple[int, str, str]:
    """Exit code, stdout and stderr of one command line."""
    code = run(arguments)
    captured = capsys.readouterr()
    return code, captured.out, captured.err


def result(capsys: pytest.CaptureFixture[str], *arguments: str) -> tuple[int, dict[str, Any]]:
    """Exit code and the one object on stdout, which may hold no NaN."""

    def refuse(word: str) -> None:
        pytest.fail(f"JSON holds {word}")

    code, output, _ = answer(capsys, *arguments, "--json")
    found: dict[str, Any] = json.loads(output, parse_constant=refuse)
    return code, found


def assert_contract(found: dict[str, Any]) -> None:
    """DESIGN section 8: keys, words and types of the JSON object of a run."""
    named = "polewright command spec_sha256 status run stop_reason elapsed_s evaluations designs front limits"
    assert {*named.split(), "verification", "warnings"} <= set(found)
    assert found["status"] in ("met", "missed", "impossible", "interrupted", "error")
    assert found["command"] == "design"
    assert len(found["spec_sha256"]) == 64
    assert isinstance(found["evaluations"], int)
    assert found["elapsed_s"] >= 0.0
    assert all(isinstance(line, str) for line in found["warnings"])
    feasible = [each["feasible"] for each in found["designs"]]
    assert feasible == sorted(feasible, reverse=True)
    for each in found["designs"]:
        assert {"id", "feasible", "worst_margin", "quantities"} <= set(each)
        assert isinstance(each["feasible"], bool)
        for entry in each["quantities"]:
            assert set(entry) == {"name", "label", "unit", "value", "bound", "kind", "margin", "ok"}
            assert entry["kind"] in ("at_least", "at_most", "equal_to", "improve")
            if entry["kind"] == "improve":
                assert entry["bound"] is None
                assert entry["margin"] is None
            elif isinstance(entry["value"], list):
                assert len(entry["bound"]) == len(entry["value"])
        required = [entry["ok"] for entry in each["quantities"] if entry["kind"] != "improve"]
        assert each["feasible"] == all(required)


def test_a_met_spec_exits_0_and_writes_the_stem(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    code, output, errors = answer(capsys, "design", "s.toml")
    assert code == 0
    assert output == ""
    assert "K1" in errors
    stored = read_run(folder / "s.h5")
    assert stored.complete
    assert stored.spec_toml == spec_text()


def test_json_is_one_object_as_contracted(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    code, found = result(capsys, "design", "s.toml", "-o", "r.h5")
    assert code == 0
    assert_contract(found)
    assert found["status"] == "met"
    assert found["run"] == "r.h5"
    assert "proven" in found["stop_reason"]
    near, far = found["designs"][0]["quantities"]
    assert (near["name"], near["unit"], near["bound"], near["kind"]) == ("holding_force", "N", 4.0, "at_least")
    assert near["margin"] == pytest.approx((near["value"] - 4.0) / 4.0)
    assert near["label"].startswith("K1")
    assert far["bound"] == [0.1, 0.1]
    assert far["margin"] == pytest.approx((min(far["value"]) - 0.1) / 0.1)
    worst = min(near["margin"], far["margin"])
    assert found["designs"][0]["worst_margin"] == pytest.approx(worst)
    assert (folder / "r.h5").exists()


def test_a_missed_spec_is_saved_and_exits_3(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    write(folder / "m.toml", spec_text(wishes=IMPOSSIBLE))
    code, found = result(capsys, "design", "m.toml")
    assert code == 3
    assert_contract(found)
    assert found["status"] == "missed"
    assert not found["designs"][0]["feasible"]
    assert any("meets every requirement: all were looked at" in line for line in found["warnings"])
    assert read_run(folder / "m.h5").complete


def test_a_value_that_does_not_exist_is_null(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    # two uniform plates that attract at every gap have no stand-off
    wishes = '[[require]]\nquantity = "stand_off"\nbetween_mm = [0.5, 5.0]\nequal_to = 2.0\nwithin = 0.5\n'
    write(folder / "p.csv", UNIFORM)
    write(folder / "n.toml", spec_text(base='pattern = "p.csv"', mover='pattern = "matched"', wishes=wishes))
    code, found = result(capsys, "design", "n.toml")
    assert code == 3
    assert_contract(found)
    entry = found["designs"][0]["quantities"][0]
    assert entry["value"] is None
    assert entry["ok"] is False
    assert math.isnan(read_run(folder / "n.h5").designs[0].values[0])


@pytest.mark.parametrize(("near", "code"), [(4.0, 0), (1e4, 3)])
def test_given_patterns_are_judged(near: float, code: int, folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    write(folder / "p.csv", UNIFORM)
    wishes = f'[[require]]\nquantity = "holding_force"\ngap_mm = 1.0\nat_least = {near}\n'
    write(folder / "g.toml", spec_text(base='pattern = "p.csv"', mover='pattern = "matched"', wishes=wishes))
    received, found = result(capsys, "design", "g.toml")
    assert received == code
    assert_contract(found)
    assert "given" in found["stop_reason"]
    assert len(found["designs"]) == 1
    # Akoun-Yonnet: a block of 6 x 6 x 3 mm, in one piece or as cells
    value = found["designs"][0]["quantities"][0]["value"]
    assert value == pytest.approx(-ref.BLOCK_6X6X3_AT_1MM, rel=1e-8)


def test_an_output_is_never_lost(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    (folder / "s.h5").write_bytes(b"something of the user's")
    code, output, errors = answer(capsys, "design", "s.toml")
    assert code == 2
    assert output == ""
    assert "--replace" in errors
    assert (folder / "s.h5").read_bytes() == b"something of the user's"
    code, found = result(capsys, "design", "s.toml")
    assert (code, found["status"], found["designs"]) == (2, "error", [])
    assert "exists" in found["errors"][0]["message"]
    assert answer(capsys, "design", "s.toml", "--replace")[0] == 0
    assert read_run(folder / "s.h5").complete


def test_a_complete_run_says_so_on_resume(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert answer(capsys, "design", "s.toml", "--resume")[0] == 0  # without an archive it starts one
    stored = (folder / "s.h5").read_bytes()
    code, _, errors = answer(capsys, "design", "s.toml", "--resume")
    assert code == 0
    assert "complete already" in errors
    assert (folder / "s.h5").read_bytes() == stored
    code, found = result(capsys, "design", "s.toml", "--resume")
    assert code == 0
    assert_contract(found)


@pytest.mark.parametrize(
    "change", [{"search": "seed = 4"}, {"cells": 4}, {"base": 'symmetry = "even-x"'}, {"wishes": IMPOSSIBLE}]
)
def test_other_changes_are_refused_on_resume(
    change: dict[str, Any], folder: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    answer(capsys, "design", "s.toml")
    stored = (folder / "s.h5").read_bytes()
    write(folder / "t.toml", spec_text(**change))
    code, output, errors = answer(capsys, "design", "t.toml", "-o", "s.h5", "--resume")
    assert (code, output) == (2, "")
    assert "only search.evaluations and search.budget_s may change" in errors
    assert (folder / "s.h5").read_bytes() == stored


def test_an_archive_of_somebody_else_is_not_resumed(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    (folder / "s.h5").write_bytes(b"not ours")
    code, _, errors = answer(capsys, "design", "s.toml", "--resume")
    assert code == 2
    assert "HDF5" in errors
    assert (folder / "s.h5").read_bytes() == b"not ours"


def test_replace_and_resume_exclude_each_other(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert answer(capsys, "design", "s.toml", "--resume", "--replace")[0] == 2
    assert not (folder / "s.h5").exists()


def test_two_improves_are_refused(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    improve = '[[improve]]\nquantity = "holding_force"\ngap_mm = {}\nsense = "maximize"\n'
    write(folder / "t.toml", spec_text(wishes=improve.format(0.3) + improve.format(1.0)))
    code, found = result(capsys, "design", "t.toml")
    assert (code, found["status"]) == (2, "error")
    assert "at most one improve" in found["errors"][0]["message"]
    assert not (folder / "t.h5").exists()


def test_patterns_of_other_cells_are_refused(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    answer(capsys, "design", "s.toml")
    write(folder / "t.toml", spec_text(4))
    code, output, errors = answer(capsys, "design", "t.toml", "--from", "s.h5")
    assert (code, output) == (2, "")
    assert "4 x 4" in errors
    assert "3 x 3" in errors
    assert not (folder / "t.h5").exists()
    code, _, errors = answer(capsys, "design", "t.toml", "--from", "none.h5")
    assert code == 2
    assert "none.h5" in errors
    code, _, _ = answer(capsys, "design", "s.toml", "--from", "s.h5", "-o", "s.h5", "--replace")
    assert code == 2  # would overwrite its own input


def test_from_evaluates_stored_patterns_under_another_spec(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    answer(capsys, "design", "s.toml")
    best = read_run(folder / "s.h5").designs[0]
    wishes = NEAR_FAR.format(near=3.0, far=0.1)
    write(folder / "t.toml", spec_text(wishes=wishes, search="evaluations = 1\nstarts = 1"))
    code, found = result(capsys, "design", "t.toml", "--from", "s.h5")
    assert code == 0
    assert_contract(found)
    stored = read_run(folder / "t.h5")
    again = [each for each in stored.designs if np.array_equal(each.base, best.base)]
    assert again[0].values.tolist() == best.values.tolist()
    assert again[0].origin == "given"


def test_an_unfitting_pole_width_is_bad_input(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    text = spec_text(6, cell=1.0, base="pole_width_min_mm = 3.0").replace("[6.0, 6.0]", "[6.0, 2.0]")
    write(folder / "t.toml", text)
    code, _, errors = answer(capsys, "design", "t.toml")
    assert code == 2
    assert "pole_width_min_mm" in errors
    assert not (folder / "t.h5").exists()
