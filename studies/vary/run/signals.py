"""SIGINT, SIGTERM and SIGHUP ask a study to stop; nothing is interrupted in the middle of a write."""

from __future__ import annotations

import signal
import threading
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from types import FrameType

ASKING = ("SIGINT", "SIGTERM", "SIGHUP")


@contextmanager
def heard(stop: Callable[[str], None]) -> Iterator[None]:
    """While it is left open, the signals call `stop` with their name, in the main thread, between two instructions.

    A signal that was ignored before (``nohup``, a job in the background) stays ignored. In other threads than the main
    one nothing is changed: there the caller's own means must do.
    """
    if threading.current_thread() is not threading.main_thread():
        yield
        return

    def hear(number: int, _: FrameType | None) -> None:
        stop(signal.Signals(number).name)

    before = {}
    try:
        for name in ASKING:
            number = getattr(signal, name, None)
            if number is not None and signal.getsignal(number) is not signal.SIG_IGN:
                before[number] = signal.signal(number, hear)
        yield
    finally:
        for number, handler in before.items():
            signal.signal(number, handler if handler is not None else signal.SIG_DFL)
