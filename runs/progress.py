"""Progress on stderr: one live line on a terminal, a plain line now and then elsewhere."""

from __future__ import annotations

import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager

from rich.console import Console

from .judged import finite, percent
from .records import Run

_EVERY = 30.0
"""Seconds between two lines in a log."""


@contextmanager
def shown(console: Console, *, quiet: bool = False) -> Iterator[Callable[[Run], None]]:
    """Yield a watcher for ``execute``'s stages that tells how far the search is; ``quiet`` keeps to plain lines."""
    with _line(console, "designing: building the physics and first designs", quiet=quiet) as say:
        yield lambda run: say(f"designing: {_state(run)}")


@contextmanager
def steps(console: Console, *, quiet: bool = False) -> Iterator[Callable[[str, float], None]]:
    """Yield a watcher for work of known extent, told what is being done and the share of all that is done, 0 to 1."""
    with _line(console, "verifying", quiet=quiet) as say:
        yield lambda what, share: say(f"verifying: {what}, {100.0 * share:.0f} %")


@contextmanager
def _line(console: Console, first: str, *, quiet: bool) -> Iterator[Callable[[str], None]]:
    if quiet or not console.is_terminal:
        yield _now_and_then(console)
        return
    with console.status(first) as status:
        yield status.update


def _now_and_then(console: Console) -> Callable[[str], None]:
    last = time.monotonic()

    def say(text: str) -> None:
        nonlocal last
        if time.monotonic() - last >= _EVERY:
            last = time.monotonic()
            console.print(text, markup=False, highlight=False)

    return say


def _state(run: Run) -> str:
    best = run.designs[0]
    state = "every requirement met" if best.feasible else "not every requirement met yet"
    return f"{run.evaluations} evaluations, worst margin of the best {percent(finite(best.worst_margin))}, {state}"
