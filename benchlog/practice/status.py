"""The error queue and the status registers of IEEE 488.2 and SCPI-99."""

from collections import deque
from dataclasses import dataclass, field

from benchlog.practice.error_table import QUEUE_OVERFLOW, error_entry, event_bit

QUEUE_DEPTH = 20

OPERATION_COMPLETE = 1
POWER_ON = 128

# Weights in the status byte (IEEE 488.2, 11.2, and SCPI-99, volume 1, 9).
ERROR_QUEUE_BIT = 4
QUESTIONABLE_BIT = 8
MESSAGE_AVAILABLE_BIT = 16
EVENT_BIT = 32
MASTER_BIT = 64
OPERATION_BIT = 128

LARGEST_SCPI_REGISTER = 32_767


@dataclass(slots=True)
class Group:
    """One of SCPI's two status groups, which these instruments never raise."""

    condition: int = 0
    event: int = 0
    enable: int = 0

    def take_event(self) -> int:
        """Return the event register and clear it."""
        value, self.event = self.event, 0
        return value


@dataclass(slots=True)
class Status:
    """All that an instrument reports about itself.

    Attributes:
        events: Standard event status register; the power-on bit is set at the start.
        event_enable, service_enable: What ``*ESE`` and ``*SRE`` set.
        questionable, operation: SCPI's two groups.
    """

    events: int = POWER_ON
    event_enable: int = 0
    service_enable: int = 0
    questionable: Group = field(default_factory=Group)
    operation: Group = field(default_factory=Group)
    _queue: deque[int] = field(default_factory=deque)
    _complete_at_s: float | None = None

    def report(self, number: int) -> None:
        """Put an error into the queue; a full queue loses it and says so in its last entry."""
        self.events |= event_bit(number)
        if len(self._queue) < QUEUE_DEPTH:
            self._queue.append(number)
            return
        self._queue[-1] = QUEUE_OVERFLOW
        self.events |= event_bit(QUEUE_OVERFLOW)

    def next_error(self) -> str:
        """Return and remove the oldest entry."""
        return error_entry(self._queue.popleft() if self._queue else 0)

    def all_errors(self) -> str:
        """Return and remove all entries, joined by commas."""
        entries = [self.next_error()]
        while self._queue:
            entries.append(self.next_error())
        return ",".join(entries)

    def error_count(self) -> int:
        """Count the entries."""
        return len(self._queue)

    def clear(self) -> None:
        """Do what ``*CLS`` does: empty the queue and the event registers, forget ``*OPC``."""
        self._queue.clear()
        self.events = self.questionable.event = self.operation.event = 0
        self._complete_at_s = None

    def complete_at(self, when_s: float | None) -> None:
        """Remember when the operation-complete bit is to be set; None forgets it."""
        self._complete_at_s = when_s

    def catch_up(self, now_s: float) -> None:
        """Set the operation-complete bit when its time has come."""
        if self._complete_at_s is not None and now_s >= self._complete_at_s:
            self.events |= OPERATION_COMPLETE
            self._complete_at_s = None

    def take_events(self) -> int:
        """Return the standard event status register and clear it."""
        value, self.events = self.events, 0
        return value

    def byte(self, *, message_available: bool) -> int:
        """Return the status byte as ``*STB?`` does, with the master summary in bit 6."""
        summary = (
            (ERROR_QUEUE_BIT, bool(self._queue)),
            (QUESTIONABLE_BIT, bool(self.questionable.event & self.questionable.enable)),
            (MESSAGE_AVAILABLE_BIT, message_available),
            (EVENT_BIT, bool(self.events & self.event_enable)),
            (OPERATION_BIT, bool(self.operation.event & self.operation.enable)),
        )
        value = sum(weight for weight, raised in summary if raised)
        return value | MASTER_BIT if value & self.service_enable else value
