"""The roles on a bench: what a sweep may ask of a source and of a meter."""

import math

from benchlog.bench.dialogue import Dialogue
from benchlog.bench.driver import Driver
from benchlog.bench.wire import Wire
from benchlog.errors import BenchlogError
from benchlog.records import Reading, Status, Term


def display_ratio(*, load_ohm: float | None, source_ohm: float) -> float:
    """Return what a source's display shows over the level at its open output.

    A source that counts with a load shows what it would give into that load.  A board draws next
    to nothing and gets the open-circuit level: twice the display at 50 ohm and 50 ohm.

    Args:
        load_ohm: What the display counts with; None is taken as high impedance.
        source_ohm: Output resistance of the source.
    """
    if load_ohm is None or math.isinf(load_ohm):
        return 1.0
    return load_ohm / (load_ohm + source_ohm)


class Source:
    """The signal source; levels are open-circuit levels, V RMS.

    Args:
        wire: An open link to it.
        driver: How to talk to it.
        load_ohm: What its display is to count with, infinity for high impedance; None leaves it
            as it is.
        display_ratio: What its display shows over the open-circuit level; see ``display_ratio``.
    """

    def __init__(
        self,
        wire: Wire,
        driver: Driver,
        *,
        load_ohm: float | None = None,
        display_ratio: float = 1.0,
    ) -> None:
        self._dialogue = Dialogue(wire, driver, role="source")
        self._load_ohm = load_ohm
        self._display_ratio = display_ratio
        self._closed = False

    @property
    def identity(self) -> str:
        """What the instrument answers to ``*IDN?``."""
        return self._dialogue.wire.identity

    @property
    def driver(self) -> Driver:
        """How to talk to it."""
        return self._dialogue.driver

    def prepare(self) -> None:
        """Bring it to a known state, the output off, and prove that it took the commands."""
        self._dialogue.order("prepare")
        if self._load_ohm is not None and math.isinf(self._load_ohm):
            self._dialogue.order("set_high_impedance")
        elif self._load_ohm is not None:
            self._dialogue.order("set_load", load_ohm=self._load_ohm)
        self._dialogue.check_errors()

    def set_point(self, *, frequency_hz: float, level_vrms: float) -> None:
        """Program frequency and open-circuit level; the output stays as it is."""
        self._dialogue.order(
            "set_point", frequency_hz=frequency_hz, level_vrms=level_vrms * self._display_ratio
        )

    def switch_on(self) -> None:
        """Switch the output on."""
        self._dialogue.order("switch_on")

    def switch_off(self) -> None:
        """Switch the output off; returns only when the instrument took the command."""
        self._dialogue.order("switch_off")

    def settle_s(self, frequency_hz: float) -> float:
        """Return how long it takes to settle at a frequency, seconds."""
        return self.driver.settle_s(frequency_hz)

    def check_errors(self) -> None:
        """Read the error queue to its end, where anything was ordered since the last time."""
        self._dialogue.check_errors()

    def recover(self) -> None:
        """Make the link clean and prove that the same instrument answers."""
        self._dialogue.recover()

    def close(self) -> None:
        """Close the link, the output off: nobody watches the source after that; twice is quiet."""
        if self._closed:
            return
        self._closed = True
        try:
            if not self._dialogue.wire.dirty:
                self.switch_off()
        except BenchlogError:
            # Whoever ran a sweep has switched off already, or has said loudly that it failed.
            pass
        finally:
            self._dialogue.close()


class Meter:
    """A voltmeter; see ``Source`` for the parts they have in common.

    Args:
        wire: An open link to it.
        driver: How to talk to it.
        role: ``"input meter"`` or ``"output meter"``.
    """

    def __init__(self, wire: Wire, driver: Driver, *, role: str) -> None:
        self._dialogue = Dialogue(wire, driver, role=role)

    @property
    def identity(self) -> str:
        """What the instrument answers to ``*IDN?``."""
        return self._dialogue.wire.identity

    @property
    def driver(self) -> Driver:
        """How to talk to it."""
        return self._dialogue.driver

    def prepare(self) -> None:
        """Bring it to a known state and prove that it took the commands."""
        self._dialogue.order("prepare")
        self._dialogue.check_errors()

    def read_level(self, *, frequency_hz: float, expected_vrms: float | None = None) -> Reading:
        """Take one reading: a number or a state, never a guess.

        Args:
            frequency_hz: What is being read.
            expected_vrms: What the design predicts, for instruments that are given a range.

        Raises:
            ReplyError: The reply is neither; it is kept in the error.
            LinkError: The wire failed.
        """
        del expected_vrms  # a driver with ranges will want it
        number, raw = self._dialogue.number("read", frequency_hz=frequency_hz)
        value = None if number.value is None else self.driver.to_vrms(number.value)
        if value is not None and value < 0:
            # The magnitude of an AC level is never negative: this is no such level.
            return Reading(value_vrms=None, status=Status.NOT_A_NUMBER, raw=raw)
        return Reading(value_vrms=value, status=number.status, raw=raw)

    def settle_s(self, frequency_hz: float) -> float:
        """Return how long it takes to settle at a frequency, seconds."""
        return self.driver.settle_s(frequency_hz)

    def reading_s(self, frequency_hz: float) -> float:
        """Return how long one reading takes, seconds."""
        return self.driver.reading_s(frequency_hz)

    def terms(self) -> tuple[Term, ...]:
        """Return what its accuracy table adds to the uncertainty of a gain."""
        return self.driver.terms(self._dialogue.role)

    def check_errors(self) -> None:
        """Read the error queue to its end, where anything was ordered since the last time."""
        self._dialogue.check_errors()

    def recover(self) -> None:
        """Make the link clean and prove that the same instrument answers."""
        self._dialogue.recover()

    def close(self) -> None:
        """Close the link; twice is quiet."""
        self._dialogue.close()
