"""How long a sweep takes: settling, readings and what each point costs besides."""

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass, replace
from typing import TypeAlias

from benchlog.sweep.schedule import Step

SecondsAt: TypeAlias = Callable[[float], float]

# The first points weigh little: opening, the first range change and caches make them slow.
LEARN = 0.3


def longest(parts: Sequence[SecondsAt]) -> SecondsAt:
    """Return the settling time of several things that settle at the same time.

    Args:
        parts: Settling of the source and of each meter, seconds as functions of hertz.
    """
    return lambda frequency_hz: max(part(frequency_hz) for part in parts)


def together(parts: Sequence[SecondsAt]) -> SecondsAt:
    """Return the time of several readings that are taken one after the other."""
    return lambda frequency_hz: sum(part(frequency_hz) for part in parts)


@dataclass(frozen=True, slots=True, kw_only=True)
class TimeModel:
    """Seconds for each step.

    Attributes:
        settle_s: Settling, seconds as a function of hertz.
        reading_s: All readings of one point, seconds as a function of hertz.
        overhead_s: What a point costs besides: messages, error queues, the logbook.
    """

    settle_s: SecondsAt
    reading_s: SecondsAt
    overhead_s: float = 0.02

    def measuring_s(self, frequency_hz: float) -> float:
        """Return what settling and reading take at this frequency, without the overhead."""
        return self.settle_s(frequency_hz) + self.reading_s(frequency_hz)

    def seconds(self, frequency_hz: float) -> float:
        """Return what one point at this frequency takes, seconds."""
        return self.measuring_s(frequency_hz) + self.overhead_s

    def seconds_left(self, steps: Iterable[Step]) -> float:
        """Return what all these steps take, seconds."""
        return sum(self.seconds(step.frequency_hz) for step in steps)

    def learned(self, frequency_hz: float, took_s: float) -> "TimeModel":
        """Return the model after a point took so many seconds at this frequency."""
        seen_s = took_s - self.measuring_s(frequency_hz)
        overhead_s = self.overhead_s + LEARN * (max(seen_s, 0.0) - self.overhead_s)
        return replace(self, overhead_s=overhead_s)
