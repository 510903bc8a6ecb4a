"""A progress bar on stderr for work of a known extent, once it takes longer than two seconds."""

from __future__ import annotations

import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager

from rich.console import Console
from rich.progress import BarColumn, Progress, TextColumn, TimeElapsedColumn

_PATIENCE = 2.0


@contextmanager
def bar(console: Console) -> Iterator[Callable[[str, float], None]]:
    """Yield a watcher that is told what is being done and the share that is done, 0 to 1."""
    started = time.monotonic()
    progress = Progress(
        TextColumn("{task.description}"), BarColumn(), TextColumn("{task.percentage:3.0f} %"), TimeElapsedColumn(),
        console=console, transient=True,
    )  # fmt: skip
    task = progress.add_task("", total=1.0)
    shown = False

    def tell(what: str, share: float) -> None:
        nonlocal shown
        if not shown and time.monotonic() - started > _PATIENCE:
            shown = True
            progress.start()
        progress.update(task, description=what, completed=share)

    try:
        yield tell
    finally:
        if shown:
            progress.stop()
