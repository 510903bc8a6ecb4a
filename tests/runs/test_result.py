"""The JSON result against DESIGN section 8, the exit codes and the tables people read."""

from __future__ import annotations

import io
import json
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from polewright import __version__
from polewright.models.errors import InputError, Issue
from polewright.runs.judged import bound_text, find_design, judge, merged_label, number, percent, tightest_first
from polewright.runs.result import EXIT_CODES, error_json, result_json, status_of
from polewright.runs.summary import print_summary, stderr_console
from rich.console import Console

from .fixtures import make_run, verification


def result(**changes: Any) -> dict[str, Any]:
    made = result_json(make_run(**changes), "design", Path("hatch.h5"), 1.23456)
    return dict(json.loads(json.dumps(made, allow_nan=False)))


def test_top_level_keys() -> None:
    made = result()
    assert made["polewright"] == __version__
    assert (made["command"], made["status"], made["run"]) == ("design", "met", "hatch.h5")
    assert made["spec_sha256"] == make_run().spec_sha256
    assert (made["evaluations"], made["elapsed_s"]) == (41_200, 1.235)
    assert made["stop_reason"] == make_run().stop_reason
    assert made["warnings"] == ["stand_off: stable only on a guide."]
    assert [design["id"] for design in made["designs"]] == ["d1", "d2", "d3"]


def test_quantities_stand_in_spec_order_in_the_units_of_the_spec() -> None:
    quantities = result()["designs"][0]["quantities"]
    assert [q["name"] for q in quantities] == [
        "holding_force", "axial_force", "stray_field", "stand_off", "pole_count",
    ]  # fmt: skip
    assert [q["unit"] for q in quantities] == ["N", "N", "mT", "mm", "1"]
    assert [q["kind"] for q in quantities] == ["at_least", "at_least", "at_most", "equal_to", "improve"]
    assert quantities[0] == {
        "name": "holding_force", "label": "K1 holding_force at 0.3 mm", "unit": "N", "value": 23.4, "bound": 20.0,
        "kind": "at_least", "margin": 0.17, "ok": True,
    }  # fmt: skip
    assert quantities[1]["value"] == [2.9, 2.31, 1.52]
    assert quantities[1]["bound"] == [2.0, 2.0, 1.5]
    assert quantities[1]["label"] == "axial_force at 3, 4, 5 mm"
    assert quantities[2]["value"] == pytest.approx(3.1)
    assert quantities[2]["bound"] == pytest.approx(5.0)
    assert quantities[4]["bound"] is None
    assert quantities[4]["margin"] is None


def test_what_does_not_exist_is_null_and_missed() -> None:
    design = result()["designs"][2]
    assert design["worst_margin"] is None
    stand_off = design["quantities"][3]
    assert (stand_off["value"], stand_off["margin"], stand_off["ok"]) == (None, None, False)


def test_status_and_exit_codes() -> None:
    run = make_run()
    assert status_of(run) == "met"
    assert status_of(replace(run, designs=run.designs[1:])) == "missed"
    assert status_of(replace(run, complete=False)) == "interrupted"
    assert EXIT_CODES == {"met": 0, "missed": 3, "impossible": 4, "interrupted": 130, "error": 2}


def test_verification_is_in_the_units_of_the_spec() -> None:
    found = result(verification=verification())["verification"]
    checks = found["second_path"]["checks"]
    assert checks[0]["gap_mm"] == pytest.approx(0.3)
    assert checks[1]["kernel"] == pytest.approx(1.2)
    assert checks[2]["gap_mm"] is None
    assert checks[2]["second"] == pytest.approx(3.1)
    assert found["scatter"]["requirements"][3]["p95"] == [pytest.approx(2.19)]
    assert found["scatter"]["force_band"]["gap_mm"][-1] == pytest.approx(8.0)
    assert found["assembly"][0]["values"][0]["value"] == -3.4


def test_making_json_leaves_the_run_as_it_was() -> None:
    run = make_run(verification=verification())
    result_json(run, "verify", None, 0.0)
    assert run.verification == verification()


def test_an_error_is_one_object_without_designs() -> None:
    made = error_json("design", InputError([Issue("needs x", "base.size_mm", 4), Issue("needs y")], "a.toml"))
    assert made["status"] == "error"
    assert made["designs"] == []
    assert made["errors"] == [
        {"path": "base.size_mm", "line": 4, "message": "needs x"},
        {"path": "", "line": None, "message": "a.toml: needs y"},
    ]


def test_tightest_margin_first_and_missing_values_before_all() -> None:
    run = make_run()
    first = [entry.name for entry in tightest_first(judge(run, run.designs[2]))]
    assert first == ["stand_off", "stray_field", "axial_force", "holding_force", "pole_count"]


def test_words_of_bounds_and_numbers() -> None:
    run = make_run()
    assert [bound_text(entry) for entry in judge(run, run.designs[0])] == [
        "≥ 20", "≥ 2, 2, 1.5", "≤ 5", "2 ± 0.2", "minimize",
    ]  # fmt: skip
    assert [number(x) for x in (0.0, 12345.6, 12.3456, 2.5e-6, np.nan)] == ["0", "12346", "12.35", "2.5e-06", "none"]
    assert [percent(x) for x in (None, 0.1234, -0.00001, 0.0)] == ["none", "+12.3 %", "-1e-03 %", "+0.0 %"]
    assert merged_label(["a at 1 mm", "b"]) == "a at 1 mm; b"
    assert merged_label([f"f at {n} mm" for n in range(12)]) == "f at 0, 1, 2, ..., 11 mm"


def test_designs_are_found_by_id() -> None:
    run = make_run()
    assert find_design(run, None).id == "d1"
    assert find_design(run, "d3").id == "d3"
    with pytest.raises(InputError, match="give one of d1, d2, d3"):
        find_design(run, "d9")
    with pytest.raises(InputError, match="no design"):
        find_design(replace(run, designs=()), None)


def test_the_summary_says_what_matters() -> None:
    stream = io.StringIO()
    console = Console(file=stream, width=120, highlight=False)
    run = make_run(title="[bold]hatch[/bold]", verification=verification())
    print_summary(run, console)
    text = stream.getvalue()
    assert "[bold]hatch[/bold]" in text
    assert "Every requirement is met." in text
    assert text.index("axial_force at 3, 4, 5 mm") < text.index("K1 holding_force")
    for part in (">= 20", "+1.3 %", "Second path: agrees", "91.6 %", "mover turned by 180 deg", "only on a guide",
                 "IDEAL"):  # fmt: skip
        assert part in text
    assert "\x1b" not in text


def test_no_color_is_honoured_on_a_terminal(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("NO_COLOR", "1")
    monkeypatch.setenv("FORCE_COLOR", "1")
    assert not stderr_console().is_terminal
    assert stderr_console().stderr
