"""Ctrl-C and SIGTERM during a search: the first asks it to stop and keep its best, the second ends the program."""

from __future__ import annotations

import signal
import threading
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from types import FrameType


@contextmanager
def watched() -> Iterator[Callable[[], bool]]:
    """Yield a function that tells whether an interrupt was asked for; handlers are put back at the end.

    Outside the main thread, where Python delivers no signals, it always says no.
    """
    asked = threading.Event()

    def note(number: int, frame: FrameType | None) -> None:  # noqa: ARG001 (the signal module's interface)
        if asked.is_set():
            raise KeyboardInterrupt
        asked.set()

    if threading.current_thread() is not threading.main_thread():
        yield asked.is_set
        return
    before = {number: signal.signal(number, note) for number in (signal.SIGINT, signal.SIGTERM)}
    try:
        yield asked.is_set
    finally:
        for number, handler in before.items():
            signal.signal(number, handler)
