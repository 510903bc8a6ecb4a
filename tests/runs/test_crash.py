"""Crash safety: SIGKILL at random moments, Ctrl-C, and what a resume makes of it."""

from __future__ import annotations

import os
import random
import signal
import subprocess
import sys
import time
from collections.abc import Iterator
from pathlib import Path

import pytest
from polewright.runs.archive import read_run

from .specs import ENVIRONMENT, SEARCHED, differences, write

pytestmark = pytest.mark.skipif(os.name != "posix", reason="signals of POSIX")
KILLS = 8
LONGEST = 2.5
"""Seconds a run may live before it is killed: imports and the first stages fall into them."""


def command(folder: Path, *more: str) -> list[str]:
    """The command line of a design in ``folder``."""
    program = [sys.executable, "-m", "polewright.runs"]
    return [*program, "design", str(folder / "s.toml"), "-o", str(folder / "s.h5"), *more]


def start(folder: Path, *more: str) -> subprocess.Popen[bytes]:
    """Start it."""
    return subprocess.Popen(command(folder, *more), env=ENVIRONMENT, stdout=subprocess.PIPE, stderr=subprocess.PIPE)


@pytest.fixture(scope="module")
def whole(tmp_path_factory: pytest.TempPathFactory) -> Iterator[tuple[Path, subprocess.Popen[bytes]]]:
    """An uninterrupted run; it works in the background while others are killed."""
    folder = tmp_path_factory.mktemp("whole")
    write(folder / "s.toml", SEARCHED)
    process = start(folder)
    yield folder / "s.h5", process
    process.kill()
    process.communicate()


def ended(whole: tuple[Path, subprocess.Popen[bytes]]) -> Path:
    """The uninterrupted run's archive, when it is there."""
    path, process = whole
    _, errors = process.communicate(timeout=300)
    assert process.returncode in (0, 3), errors.decode()
    return path


def test_killed_again_and_again_it_ends_as_if_nothing_had_happened(
    whole: tuple[Path, subprocess.Popen[bytes]], tmp_path: Path
) -> None:
    write(tmp_path / "s.toml", SEARCHED)
    moments = random.Random(5)
    states = []
    for _ in range(KILLS):
        process = start(tmp_path, "--resume")
        try:
            process.wait(moments.uniform(0.2, LONGEST))
        except subprocess.TimeoutExpired:
            process.kill()
        process.communicate()
        # no archive, or one that is whole
        states.append(read_run(tmp_path / "s.h5").evaluations if (tmp_path / "s.h5").exists() else 0)
    assert states == sorted(states)  # what was reached is never lost
    process = start(tmp_path, "--resume")
    _, errors = process.communicate(timeout=300)
    assert process.returncode in (0, 3), errors.decode()
    assert differences(ended(whole), tmp_path / "s.h5") == []


def test_killed_runs_leave_other_archives_alone(tmp_path: Path) -> None:
    # --replace: until the new run has something whole to put there, the old archive stands
    write(tmp_path / "s.toml", SEARCHED)
    (tmp_path / "s.h5").write_bytes(b"an older file")
    process = start(tmp_path, "--replace")
    time.sleep(1.0)
    process.kill()
    process.communicate()
    assert (tmp_path / "s.h5").read_bytes() == b"an older file"


def interrupt_when(path: Path, process: subprocess.Popen[bytes], number: int) -> tuple[int, str, str]:
    """Send a signal once the first state is stored; return exit code, output and messages."""
    give_up = time.monotonic() + 120.0
    while not path.exists() and process.poll() is None and time.monotonic() < give_up:
        time.sleep(0.01)
    process.send_signal(number)
    output, errors = process.communicate(timeout=120)
    return process.returncode, output.decode(), errors.decode()


@pytest.mark.parametrize("number", [signal.SIGINT, signal.SIGTERM])
def test_an_interrupt_saves_and_resumes(
    number: signal.Signals, whole: tuple[Path, subprocess.Popen[bytes]], tmp_path: Path
) -> None:
    write(tmp_path / "s.toml", SEARCHED.replace("40000", "100000000"))  # would run on for long
    code, output, errors = interrupt_when(tmp_path / "s.h5", start(tmp_path), number)
    assert code == 130, errors
    assert output == ""
    assert "--resume" in errors
    assert "Traceback" not in errors
    stored = read_run(tmp_path / "s.h5")
    assert not stored.complete
    assert stored.designs
    assert not list(tmp_path.glob(".*partial"))
    # the budget is what may change: with that of the uninterrupted run it ends as that one
    write(tmp_path / "s.toml", SEARCHED)
    if number == signal.SIGINT and stored.evaluations < 20_000:
        process = start(tmp_path, "--resume")
        _, messages = process.communicate(timeout=300)
        assert process.returncode in (0, 3), messages.decode()
        assert differences(ended(whole), tmp_path / "s.h5") == []
