"""Times of calls that alternate in one process, so that both sides of a ratio see the same machine."""

from __future__ import annotations

import sys
from collections.abc import Callable
from time import perf_counter, sleep
from typing import Any

import jax
import numpy as np
import pytest
from numpy.typing import NDArray

Call = Callable[[], Any]
ATTEMPTS = 10
PAUSE_S = 0.3


def least(calls: list[Call], rounds: int, repeats: int) -> NDArray[np.float64]:
    """Least time of each call [s] over ``rounds`` in which each is called ``repeats`` times in a row."""
    best = np.full(len(calls), np.inf)
    for _ in range(rounds):
        for n, call in enumerate(calls):
            for _ in range(repeats):
                start = perf_counter()
                jax.block_until_ready(call())  # type: ignore[no-untyped-call]
                best[n] = min(best[n], perf_counter() - start)
    return best


def settle(measure: Callable[[], float], bound: float) -> float:
    """Best of some attempts at a ratio, ended by the first within ``bound``: others use the machine too."""
    best = np.inf
    for _ in range(ATTEMPTS):
        best = min(best, measure())
        if best <= bound:
            break
        sleep(PAUSE_S)
    return float(best)


def show(capsys: pytest.CaptureFixture[str], text: str) -> None:
    """Write a line past pytest's capture: a benchmark is run to be read."""
    with capsys.disabled():
        sys.stdout.write(f"\n  {text}")
        sys.stdout.flush()
