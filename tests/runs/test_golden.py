"""Golden runs: one spec and seed give the same bytes outside /provenance in two processes, whatever else is drawn."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import h5py

from .specs import ENVIRONMENT, SEARCHED, content, differences, spec_text, write

PROGRAM = """
import random, sys
import numpy as np
np.random.seed({poison}); random.seed({poison}); np.random.random({poison})
from polewright.runs.cli import run
sys.exit(run(sys.argv[1:]))
"""


def started(folder: Path, spec: Path, poison: int) -> subprocess.Popen[bytes]:
    """A design of ``spec`` in a process of its own, with the global generators in another state and other hashes."""
    environment = {**ENVIRONMENT, "PYTHONHASHSEED": str(poison)}
    command = [sys.executable, "-c", PROGRAM.format(poison=poison), "design", str(spec), "-o", str(folder / "run.h5")]
    return subprocess.Popen(command, env=environment, stdout=subprocess.DEVNULL, stderr=subprocess.PIPE)


def archives(tmp_path: Path, text: str) -> list[Path]:
    """Archives of two processes that run at the same time."""
    spec = write(tmp_path / "s.toml", text)
    folders = [tmp_path / "one", tmp_path / "other"]
    for folder in folders:
        folder.mkdir()
    processes = [started(folder, spec, 11 + 6 * n) for n, folder in enumerate(folders)]
    for process in processes:
        _, errors = process.communicate(timeout=300)
        assert process.returncode in (0, 3), errors.decode()
    return [folder / "run.h5" for folder in folders]


def test_a_searched_run_gives_equal_bytes_in_two_processes(tmp_path: Path) -> None:
    one, other = archives(tmp_path, SEARCHED)
    assert differences(one, other) == []
    kept = content(one)
    # it really searched: several rounds, several designs
    assert kept["history/evaluations"][1][0] >= 2
    assert kept["designs/base"][1][0] >= 2


def test_a_problem_that_is_not_linear_gives_equal_bytes_in_two_processes(tmp_path: Path) -> None:
    wishes = """
[[require]]
quantity = "lateral_stiffness"
gap_mm = 0.5
at_least = 0.5

[[require]]
quantity = "stray_field"
of = "base"
side = "back"
distance_mm = 6.0
at_most = 12.0
"""
    one, other = archives(tmp_path, spec_text(5, cell=1.0, wishes=wishes, search="starts = 4\nevaluations = 1500"))
    assert differences(one, other) == []


def test_differences_are_seen(tmp_path: Path) -> None:
    one, other = tmp_path / "one.h5", tmp_path / "other.h5"
    for path, value in ((one, 1.0), (other, 2.0)):
        with h5py.File(path, "w") as file:
            file["designs/values"] = value
            file["provenance/clock"] = value
            file.attrs["seed"] = 3
    assert differences(one, other) == ["designs/values"]
    assert set(content(one)) == {"@seed", "designs/values"}
