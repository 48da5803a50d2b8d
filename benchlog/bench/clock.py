"""Real time, in slices short enough to be stopped."""

import time
from typing import Protocol

_SLICE_S = 0.03


class StopSign(Protocol):
    """Anything that can say that the work is to end."""

    def is_set(self) -> bool:
        """Tell whether the end was asked for."""
        ...


class RealClock:
    """The clock on the wall.

    Args:
        stop: Cuts waits short once it is set.  It is looked at and never waited on: a signal
            handler that sets it runs in the thread that waits here.
    """

    def __init__(self, stop: StopSign | None = None) -> None:
        self._stop = stop

    def now_s(self) -> float:
        """Return seconds since some fixed moment."""
        return time.monotonic()

    def wait(self, seconds: float) -> None:
        """Wait; return early once the stop sign is set."""
        end_s = self.now_s() + seconds
        while (left_s := end_s - self.now_s()) > 0:
            if self._stop is not None and self._stop.is_set():
                return
            time.sleep(min(left_s, _SLICE_S))
