"""Progress of a search on stderr: a live line on a terminal, one plain line now and then elsewhere."""

from __future__ import annotations

import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager

from rich.console import Console

from .records import Run

_EVERY = 30.0
"""Seconds between two lines in a log."""


@contextmanager
def shown(console: Console, *, quiet: bool = False) -> Iterator[Callable[[Run], None]]:
    """Yield a watcher for ``execute``'s stages that tells how far the search is."""
    if not console.is_terminal or quiet:
        yield _plain(console)
        return
    with console.status("designing: building the physics and first designs") as status:

        def tell(run: Run) -> None:
            status.update(f"designing: {_line(run)}")

        yield tell


def _plain(console: Console) -> Callable[[Run], None]:
    last = time.monotonic()

    def tell(run: Run) -> None:
        nonlocal last
        if time.monotonic() - last >= _EVERY:
            last = time.monotonic()
            console.print(f"designing: {_line(run)}", markup=False, highlight=False)

    return tell


def _line(run: Run) -> str:
    best = run.designs[0]
    state = "every requirement met" if best.feasible else "not yet met"
    return f"{run.evaluations} evaluations, best worst margin {100.0 * best.worst_margin:+.2f} %, {state}"
