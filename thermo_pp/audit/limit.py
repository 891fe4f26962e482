"""A limit to the time that one output may take, so that one file never holds up a survey of thousands.

It needs a timer of the system and the main thread of a process, which the workers of this computer have. Where there is
none (Windows, threads of Dask workers and of callers, a timer that somebody else has set) there is no limit.
"""

from __future__ import annotations

import contextlib
import signal
import threading
from collections.abc import Iterator
from types import FrameType

LONGEST_S = 60.0
"""The slowest real outputs, of some hundred MB, take a few seconds."""


class TookTooLong(BaseException):
    """The time is over; no ordinary exception, so that no reader takes it for a fault of the file.

    Raised by `time_limit` only.
    """


@contextlib.contextmanager
def time_limit(seconds: float | None) -> Iterator[None]:
    """Raise `TookTooLong` in what runs inside after so many seconds; None: no limit."""
    if seconds is None or not _has_timer():
        yield
        return

    def stop(number: int, frame: FrameType | None) -> None:
        raise TookTooLong

    before = signal.signal(signal.SIGALRM, stop)
    try:
        signal.setitimer(signal.ITIMER_REAL, seconds)
        yield
    finally:
        signal.setitimer(signal.ITIMER_REAL, 0.0)
        signal.signal(signal.SIGALRM, before)


def _has_timer() -> bool:
    """Tell whether a timer can be set here, and nobody else has one."""
    if not hasattr(signal, "setitimer"):
        return False
    if threading.current_thread() is not threading.main_thread():
        return False
    set_elsewhere = signal.getitimer(signal.ITIMER_REAL)[0] > 0.0
    return not set_elsewhere and signal.getsignal(signal.SIGALRM) is not None
