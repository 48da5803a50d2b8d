"""What a sweep asks of the bench: the face that roles, clock and every stand-in must show."""

from typing import Protocol

from benchlog.records import Reading


class Role(Protocol):
    """What is asked of every instrument."""

    def prepare(self) -> None:
        """Bring the instrument to a known state; a source has its output off then."""

    def check_errors(self) -> None:
        """Read the error queue to its end; raise CommandRefused where it held something."""

    def recover(self) -> None:
        """Make the link clean and prove that the same instrument answers."""

    def settle_s(self, frequency_hz: float) -> float:
        """Return how long it takes to settle at a frequency, seconds."""
        ...


class SourceRole(Role, Protocol):
    """What is asked of a source."""

    def set_point(self, *, frequency_hz: float, level_vrms: float) -> None:
        """Program frequency and level; the output stays as it is."""

    def switch_on(self) -> None:
        """Switch the output on."""

    def switch_off(self) -> None:
        """Switch the output off; returns only when the instrument took the command."""


class MeterRole(Role, Protocol):
    """What is asked of a meter."""

    def read_level(self, *, frequency_hz: float, expected_vrms: float | None) -> Reading:
        """Take one reading; a number or a state."""
        ...

    def reading_s(self, frequency_hz: float) -> float:
        """Return how long one reading takes, seconds."""
        ...


class ClockFace(Protocol):
    """What is asked of a clock."""

    def now_s(self) -> float:
        """Return seconds since some fixed moment."""
        ...

    def wait(self, seconds: float) -> None:
        """Wait; returns early only when the work is to be stopped."""


class SweepBench(Protocol):
    """What is asked of a bench."""

    @property
    def source(self) -> SourceRole:
        """The signal source."""
        ...

    @property
    def output_meter(self) -> MeterRole:
        """The meter at the board's output."""
        ...

    @property
    def input_meter(self) -> MeterRole | None:
        """The meter at the board's input, where there is one."""
        ...

    @property
    def clock(self) -> ClockFace:
        """The clock that waits are made on."""
        ...


def meters_of(bench: SweepBench) -> tuple[MeterRole, ...]:
    """Return the meters in the order in which they are read."""
    present = (bench.input_meter, bench.output_meter)
    return tuple(meter for meter in present if meter is not None)
