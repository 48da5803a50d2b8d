"""Stopping: Ctrl-C and the system's signals become a flag that the sweep looks at."""

import signal
import threading
from collections.abc import Iterator
from contextlib import contextmanager
from types import FrameType

from benchlog.errors import ExitCode

# A closed terminal window must not leave the source on either; not every system has every signal.
_SIGNALS = tuple(
    getattr(signal, name)
    for name in ("SIGINT", "SIGTERM", "SIGHUP", "SIGBREAK")
    if hasattr(signal, name)
)


class StopFlag:
    """Set once, seen by whoever waits or loops.

    A plain attribute and not a ``threading.Event``: a signal handler runs in the middle of
    whatever the main thread does, and setting an event whose lock that thread holds would never
    return.
    """

    __slots__ = ("_asking", "exit_code", "why")

    def __init__(self) -> None:
        self.why: str | None = None
        self.exit_code = ExitCode.STOPPED
        self._asking = False

    def set(self, why: str, *, exit_code: int = ExitCode.STOPPED) -> None:
        """Ask for the end; the first reason stays."""
        if self.why is None:
            self.exit_code = exit_code
            self.why = why

    def is_set(self) -> bool:
        """Tell whether the end was asked for."""
        return self.why is not None

    @contextmanager
    def asking(self) -> Iterator[None]:
        """Let the first signal interrupt already, while nothing runs and a person is asked."""
        self._asking = True
        try:
            yield
        finally:
            self._asking = False

    def on_signal(self, number: int, _frame: FrameType | None) -> None:
        """Note a signal; interrupt where it is not the first, or where nothing runs."""
        at_once = self.is_set() or self._asking
        name = signal.Signals(number).name
        self.set(
            "The sweep was stopped by Ctrl-C."
            if name == "SIGINT"
            else f"The sweep was stopped by the system ({name}).",
            exit_code=ExitCode.TERMINATED if name == "SIGTERM" else ExitCode.STOPPED,
        )
        if at_once:
            raise KeyboardInterrupt


@contextmanager
def stop_on_signals(stop: StopFlag | None = None) -> Iterator[StopFlag]:
    """Turn the first signal into a set flag and any further one into ``KeyboardInterrupt``.

    The handlers that were there before come back at the end.  Outside the main thread no handler
    can be installed; the flag then works without signals.

    Args:
        stop: The flag to set; a new one by default.
    """
    flag = StopFlag() if stop is None else stop

    if threading.current_thread() is not threading.main_thread():
        yield flag
        return
    before = {number: signal.signal(number, flag.on_signal) for number in _SIGNALS}
    try:
        yield flag
    finally:
        for number, handler in before.items():
            signal.signal(number, handler)
