"""Exported files: they read back as pattern files, carry their units, and never replace anything unasked."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from click.testing import CliRunner
from polewright.models.errors import InputError
from polewright.runs.archive import write_run
from polewright.runs.commands.export import command
from polewright.runs.export import export_design, files_of
from polewright.runs.records import Curve
from polewright.runs.report.cautions import CAUTIONS
from polewright.runs.spec.files import read_cells

from .fixtures import make_run
from .verified import require, spec_of

NAMES = ["base.csv", "mover.csv", "force_gap.csv", "README.txt"]


def test_patterns_read_back_as_pattern_files(tmp_path: Path) -> None:
    run = make_run()
    for design in run.designs:
        folder = tmp_path / design.id
        files = export_design(run, design, folder)
        assert [path.name for path in files] == NAMES
        for name, pattern in (("base.csv", design.base), ("mover.csv", design.mover)):
            cells = read_cells(name, folder, free_allowed=False)
            np.testing.assert_array_equal(cells.values, pattern)


def test_first_line_is_lowest_y() -> None:
    run = make_run()
    pattern = np.ones(run.base.shape, np.int8)
    pattern[0] = -1
    text = files_of(run, replace(run.designs[0], base=pattern))["base.csv"]
    first = next(line for line in text.splitlines() if not line.startswith("#"))
    assert set(first.split(",")) == {"-1"}
    assert "first value is the cell centred at x = -9.5 mm, y = -7.5 mm" in text


@pytest.mark.parametrize(
    ("name", "phrases"),
    [
        ("base.csv", ("1 shows N", "3 mm without coating", "coating 20 um", "1 mm square", "rim 0.4 mm in x")),
        ("mover.csv", ("1 shows S", "2 mm without coating", "first line at the top", "disc of 18 mm diameter")),
    ],
)
def test_headers_say_what_a_shop_must_know(name: str, phrases: tuple[str, ...]) -> None:
    run = make_run()
    header = [line for line in files_of(run, run.designs[0])[name].splitlines() if line.startswith("#")]
    text = "\n".join(header)
    for phrase in (*phrases, "d1", "Service hatch", "IDEAL", "lowest y", "README.txt", "frame"):
        assert phrase in text


def test_a_line_break_in_a_title_does_not_end_the_comment() -> None:
    run = make_run(title="hatch\n1,1,1\r\n# x")
    data = [line for line in files_of(run, run.designs[0])["base.csv"].splitlines() if not line.startswith("#")]
    assert len(data) == run.base.shape[0]


def test_curves_carry_their_units_and_belong_to_the_design() -> None:
    run = make_run()
    lines = files_of(run, run.designs[1])["force_gap.csv"].splitlines()
    assert lines[0] == "gap_mm,force_N"
    table = np.array([line.split(",") for line in lines[1:]], float)
    np.testing.assert_allclose(table[:, 0], run.curves["force_gap"].scale * 1e3, rtol=1e-8)
    np.testing.assert_allclose(table[:, 1], run.curves["force_gap"].values[1], rtol=1e-8)


def test_a_lateral_curve_says_where_it_was_taken() -> None:
    run = make_run()
    wish = require("slide_force", gap_mm=0.4, travel_mm=2.0, axis="y")
    curves = run.curves | {"lateral": Curve("offset", np.zeros(1), "mm", np.zeros((3, 1)), "N")}
    text = files_of(replace(run, spec_json=spec_of(wish).resolved_json(), curves=curves), run.designs[0])["README.txt"]
    assert "lateral.csv     restoring force over the offset along (0, 1) at 0.4 mm gap" in text


def test_the_readme_has_orientation_results_and_cautions() -> None:
    run = make_run()
    text = files_of(run, run.designs[2])["README.txt"]
    flat = " ".join(text.split())
    for heading, words in CAUTIONS:
        assert f"{heading}: {words}" in flat
    for phrase in ("turn it over about the x axis", "MISSED", "reached none", "Stable only on a guide", "IDEAL",
                   "Local codes", "licensed"):  # fmt: skip
        assert phrase in flat


def test_nothing_is_replaced_unasked(tmp_path: Path) -> None:
    run = make_run()
    folder = tmp_path / "out"
    export_design(run, run.designs[0], folder)
    (folder / "mine.txt").write_text("kept")
    before = (folder / "base.csv").read_bytes()
    with pytest.raises(InputError, match="--replace"):
        export_design(run, run.designs[1], folder)
    assert (folder / "base.csv").read_bytes() == before
    export_design(run, run.designs[1], folder, replace=True)
    assert (folder / "base.csv").read_bytes() != before
    assert (folder / "mine.txt").read_text() == "kept"
    with pytest.raises(InputError, match="is a file"):
        export_design(run, run.designs[0], folder / "mine.txt", replace=True)
    with pytest.raises(InputError, match="cannot be made"):
        export_design(run, run.designs[0], tmp_path / "none" / "out")


def test_the_command_names_its_folder_after_run_and_design(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    write_run(make_run(), tmp_path / "hatch.h5")
    done = CliRunner().invoke(command, ["hatch.h5", "--design", "d2"])
    assert done.exit_code == 0, done.output
    assert sorted(path.name for path in (tmp_path / "hatch-d2").iterdir()) == sorted(NAMES)
    assert done.stdout == ""
