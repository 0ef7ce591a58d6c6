"""Ctrl-C and SIGTERM during a run: heard at once, obeyed when what is being written is whole."""

from __future__ import annotations

import signal
import threading
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from types import FrameType


@contextmanager
def heard() -> Iterator[Callable[[], bool]]:
    """Note Ctrl-C and SIGTERM instead of breaking off at once; a second one does break off.

    Yields a function that tells whether one came. Signals that were ignored stay ignored; outside
    the main thread, where Python tells nobody of signals, nothing changes.
    """
    came: list[int] = []

    def hear(number: int, frame: FrameType | None) -> None:
        if came:
            raise KeyboardInterrupt
        came.append(number)

    before = {}
    if threading.current_thread() is threading.main_thread():
        for number in (signal.SIGINT, signal.SIGTERM):
            if signal.getsignal(number) not in (signal.SIG_IGN, None):
                before[number] = signal.signal(number, hear)
    try:
        yield lambda: bool(came)
    finally:
        for number, handler in before.items():
            signal.signal(number, handler)
