"""The command line as its users see it: help, the ``spec`` commands, exit codes, streams."""

from __future__ import annotations

import json
import os
import signal
import subprocess
import sys
from pathlib import Path

import click
import polewright
import pytest
from polewright.models.errors import InputError, PolewrightError
from polewright.runs import cli
from polewright.runs.examples import NAMES, example_text

ROOT = Path(polewright.__file__).parents[1]
SMALL = """
spec_version = 1
[base]
shape = "rectangle"
size_mm = [4, 3.5]
thickness_mm = 2
material = "HF 28/28"
cell_mm = 1
[mover]
like = "base"
[[improve]]
quantity = "holding_force"
gap_mm = 1
sense = "maximize"
"""


def shell(*arguments: str, folder: Path, **environment: str) -> subprocess.CompletedProcess[str]:
    """Run the command line in a process of its own."""
    return subprocess.run(
        [sys.executable, "-m", "polewright.runs", *arguments],
        cwd=folder,
        env={**os.environ, "PYTHONPATH": str(ROOT), **environment},
        capture_output=True,
        text=True,
        timeout=60,
        check=False,
    )


def test_help_lists_every_command(capsys: pytest.CaptureFixture[str]) -> None:
    assert cli.run(["--help"]) == 0
    shown = capsys.readouterr().out
    for name, line in cli.COMMANDS.items():
        assert f"\n  {name} " in shown
        assert line in shown


def test_version(capsys: pytest.CaptureFixture[str]) -> None:
    assert cli.run(["--version"]) == 0
    assert capsys.readouterr().out == f"polewright, version {polewright.__version__}\n"


def test_two_improves_are_valid_and_told(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = tmp_path / "s.toml"
    path.write_text(SMALL + '[[improve]]\nquantity = "net_moment"\nsense = "minimize"\n', encoding="utf-8")
    assert cli.run(["spec", "check", str(path)]) == 0
    assert "note: polewright design takes at most one improve, this spec has 2" in capsys.readouterr().err


@pytest.mark.parametrize(
    "arguments",
    [["nonsense"], ["spec", "chek"], ["spec", "check"], ["spec", "check", "a", "b"], ["spec", "check", "--no"]],
)
def test_wrong_usage_is_bad_input(arguments: list[str], capsys: pytest.CaptureFixture[str]) -> None:
    assert cli.run(arguments) == 2
    shown = capsys.readouterr()
    assert shown.out == ""
    assert "Error: " in shown.err
    assert cli.run([*arguments, "--json"]) == 2
    result = json.loads(capsys.readouterr().out)
    assert result["status"] == "error"
    assert result["errors"][0]["message"]


def test_check_tells_cells_rim_and_material(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    spec = tmp_path / "s.toml"
    spec.write_text(SMALL, encoding="utf-8")
    assert cli.run(["spec", "check", str(spec)]) == 0
    shown = capsys.readouterr()
    assert shown.out == ""
    assert "4 x 3 cells" in shown.err
    assert "rim 0 x 0.5 mm" in shown.err
    assert "HF 28/28, Br 0.385 T at 20 C" in shown.err
    assert "from memory" in shown.err


def test_check_with_json_prints_one_object(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    spec = tmp_path / "s.toml"
    spec.write_text(SMALL + "[conditions]\ntemperature_C = 40.0\n", encoding="utf-8")
    assert cli.run(["spec", "check", str(spec), "--json"]) == 0
    result = json.loads(capsys.readouterr().out)
    assert result["status"] == "met"
    assert len(result["spec_sha256"]) == 64
    assert result["parts"]["mover"]["cells"] == 12
    assert result["parts"]["mover"]["remanence_T"] == pytest.approx(0.385 * (1 - 0.002 * 20), abs=1e-9)


def test_schema_is_json_on_stdout(capsys: pytest.CaptureFixture[str]) -> None:
    assert cli.run(["spec", "schema"]) == 0
    shown = capsys.readouterr()
    assert shown.err == ""
    assert json.loads(shown.out)["properties"]["spec_version"]["const"] == 1


def test_examples_are_listed_and_written(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.chdir(tmp_path)
    assert cli.run(["spec", "example"]) == 0
    listed = capsys.readouterr()
    assert listed.out == ""
    assert [line.split()[0] for line in listed.err.splitlines()] == list(NAMES)
    assert list(tmp_path.iterdir()) == []
    for name in NAMES:
        assert cli.run(["spec", "example", name]) == 0
        assert (tmp_path / f"{name}.toml").read_text(encoding="utf-8") == example_text(name)
    assert capsys.readouterr().out == ""


def test_an_existing_file_is_not_overwritten_unasked(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.chdir(tmp_path)
    mine = tmp_path / "mine.toml"
    mine.write_text("precious", encoding="utf-8")
    assert cli.run(["spec", "example", "hatch", "-o", "mine.toml"]) == 2
    assert mine.read_text(encoding="utf-8") == "precious"
    assert "--replace" in capsys.readouterr().err
    assert cli.run(["spec", "example", "hatch", "-o", "mine.toml", "--replace"]) == 0
    assert mine.read_text(encoding="utf-8") == example_text("hatch")
    assert cli.run(["spec", "example", "nothing"]) == 2
    assert "hover" in capsys.readouterr().err
    assert list(tmp_path.iterdir()) == [mine]


@pytest.mark.parametrize(
    ("error", "code", "status"),
    [
        (InputError("bad"), 2, "error"),
        (PolewrightError("lost"), 1, "error"),
        (KeyboardInterrupt(), 130, "interrupted"),
        (ZeroDivisionError("oh"), 1, "error"),
    ],
)
def test_every_error_has_its_exit_code(
    error: BaseException,
    code: int,
    status: str,
    tmp_path: Path,
    monkeypatch: pytest.MonkeyPatch,
    capsys: pytest.CaptureFixture[str],
) -> None:
    def fail(*_: object, **__: object) -> None:
        raise error

    monkeypatch.setattr(click.Group, "invoke", fail)
    monkeypatch.setenv("TMPDIR", str(tmp_path))
    monkeypatch.setattr("tempfile.tempdir", None)
    assert cli.run(["spec", "--json"]) == code
    shown = capsys.readouterr()
    assert json.loads(shown.out)["status"] == status
    assert "Traceback" not in shown.err
    files = [path.read_text(encoding="utf-8") for path in tmp_path.glob("polewright-error-*.txt")]
    assert len(files) == (1 if isinstance(error, ZeroDivisionError) else 0)
    for text in files:
        assert "ZeroDivisionError: oh" in text
        assert "polewright-error-" in shown.err


def test_an_exit_code_of_a_command_is_passed_on(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(click.Group, "invoke", lambda *_: 3)
    assert cli.run(["spec"]) == 3


def test_the_module_runs_and_stays_plain(tmp_path: Path) -> None:
    done = shell("spec", "check", "missing.toml", folder=tmp_path, NO_COLOR="1")
    assert (done.returncode, done.stdout) == (2, "")
    assert done.stderr == "missing.toml: no such file; check the name and the folder\n"
    done = shell("spec", "example", folder=tmp_path)
    assert done.returncode == 0
    assert "\x1b" not in done.stderr


@pytest.mark.skipif(not hasattr(signal, "SIGPIPE"), reason="pipes of this system have no signal")
def test_a_reader_that_stops_early_is_no_error(tmp_path: Path) -> None:
    command = [sys.executable, "-m", "polewright.runs", "spec", "schema"]
    with subprocess.Popen(
        command,
        cwd=tmp_path,
        env={**os.environ, "PYTHONPATH": str(ROOT)},
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
    ) as process:
        assert process.stdout is not None
        assert process.stderr is not None
        process.stdout.read(1)
        process.stdout.close()
        assert process.stderr.read() == b""
        assert process.wait() == -signal.SIGPIPE
