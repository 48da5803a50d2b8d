"""A driver: how to talk to one kind of instrument, as frozen data."""

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

from benchlog.bench.message import Message, NumberForm
from benchlog.bench.reply import NumberGrammar
from benchlog.records import Term

# What a driver of each role is asked for, with the fields of each message.
SOURCE_MESSAGES: Mapping[str, frozenset[str]] = {
    "prepare": frozenset(),
    "set_load": frozenset({"load_ohm"}),
    "set_high_impedance": frozenset(),
    "set_point": frozenset({"frequency_hz", "level"}),
    "switch_on": frozenset(),
    "switch_off": frozenset(),
    "error": frozenset(),
}
METER_MESSAGES: Mapping[str, frozenset[str]] = {
    "prepare": frozenset(),
    "read": frozenset({"frequency_hz"}),
    "error": frozenset(),
}
MESSAGES = {"source": SOURCE_MESSAGES, "meter": METER_MESSAGES}
OPTIONAL = frozenset({"set_load", "set_high_impedance", "error"})

_PER_VRMS = {"Vrms": 1.0, "Vpk": math.sqrt(2.0), "Vpp": math.sqrt(8.0)}


@dataclass(frozen=True, slots=True, kw_only=True)
class LinkSettings:
    """How a wire behaves.

    Attributes:
        read_terminator, write_terminator: What ends an answer, and what ends a message.
        timeout_s: How long an answer may take where its message says nothing else.
        gap_s: Pause that the instrument needs before each message.
        after_open_s: Pause that it needs once the link is open.
    """

    read_terminator: str = "\n"
    write_terminator: str = "\n"
    timeout_s: float = 2.0
    gap_s: float = 0.0
    after_open_s: float = 0.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Settling:
    """From ``above_hz`` up it takes ``time_s`` and ``cycles`` periods to settle."""

    above_hz: float
    time_s: float
    cycles: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Accuracy:
    """In this band a reading is wrong by no more than ``limit_rel`` (rectangular)."""

    band_hz: tuple[float, float]
    limit_rel: float

    @property
    def u_rel(self) -> float:
        """Standard uncertainty of a rectangular distribution (JCGM 100, 4.3.7)."""
        return self.limit_rel / math.sqrt(3.0)


@dataclass(frozen=True, slots=True, kw_only=True)
class Driver:
    """How to talk to one kind of instrument.

    Attributes:
        name, role, description: What it is.
        sha256: Of the file's bytes.
        level_unit: In what the instrument counts levels.
        link, numbers: How the wire behaves and how numbers are written.
        messages: By action.
        grammars: What the answer of an action may be, where it is a number.
        frequency_range_hz, level_range_vrms: What the instrument can do.
        settling: By rising frequency.
        reading_time_s, reading_cycles: How long one reading takes.
        accuracy: By band.
    """

    name: str
    role: Literal["source", "meter"]
    description: str
    sha256: str
    level_unit: Literal["Vrms", "Vpp", "Vpk"]
    link: LinkSettings
    numbers: NumberForm
    messages: Mapping[str, Message]
    grammars: Mapping[str, NumberGrammar]
    frequency_range_hz: tuple[float, float]
    level_range_vrms: tuple[float, float] | None
    settling: tuple[Settling, ...]
    reading_time_s: float
    reading_cycles: float
    accuracy: tuple[Accuracy, ...]

    def text(
        self,
        action: str,
        *,
        frequency_hz: float | None = None,
        level_vrms: float | None = None,
        load_ohm: float | None = None,
    ) -> str:
        """Return the text of an action's message; the level is converted to the driver's unit."""
        given = {"frequency_hz": frequency_hz, "load_ohm": load_ohm}
        fields = {name: value for name, value in given.items() if value is not None}
        if level_vrms is not None:
            fields["level"] = level_vrms * _PER_VRMS[self.level_unit]
        return self.messages[action].text(fields, form=self.numbers)

    def to_vrms(self, value: float) -> float:
        """Return a value in the driver's level unit as V RMS."""
        return value / _PER_VRMS[self.level_unit]

    def settle_s(self, frequency_hz: float) -> float:
        """Return how long the instrument takes to settle at a frequency, seconds."""
        held = [row for row in self.settling if row.above_hz <= frequency_hz]
        row = held[-1] if held else self.settling[0]
        return row.time_s + row.cycles / frequency_hz

    def reading_s(self, frequency_hz: float) -> float:
        """Return how long one reading takes at a frequency, seconds."""
        return self.reading_time_s + self.reading_cycles / frequency_hz

    def terms(self, what: str) -> tuple[Term, ...]:
        """Return what the accuracy table adds to the uncertainty of a gain.

        The smallest limit is taken as one scale error common to all frequencies.  What other
        bands allow beyond it is an error common to that band: it tilts the curve.

        Args:
            what: Name of the instrument on this bench, ``"output meter"``.
        """
        if not self.accuracy:
            return ()
        best = min(self.accuracy, key=lambda row: row.limit_rel)
        source = f"accuracy table of driver {self.name}"
        scale = Term(name=f"{what} accuracy", kind="scale", u_rel=best.u_rel, source=source)
        beyond = [
            Term(
                name=f"{what} flatness",
                kind="flatness",
                u_rel=math.sqrt(row.u_rel**2 - best.u_rel**2),
                band_hz=row.band_hz,
                source=source,
            )
            for row in self.accuracy
            if row.limit_rel > best.limit_rel
        ]
        return (scale, *beyond)
