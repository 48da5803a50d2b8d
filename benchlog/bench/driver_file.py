"""The shape of a driver file: what may stand in it, and nothing else."""

from typing import Annotated, Literal

import msgspec
from msgspec import Meta

from benchlog.bench.message import NumberFormat, ReplyKind

Text = Annotated[str, Meta(max_length=200)]
Quantity = Annotated[str, Meta(max_length=40)]
Band = Annotated[
    list[Quantity],
    Meta(
        min_length=2,
        max_length=2,
        description="the lowest and the highest frequency",
        examples=[["10 Hz", "10 MHz"]],
    ),
]
Levels = Annotated[
    list[Quantity],
    Meta(
        min_length=2,
        max_length=2,
        description="the lowest and the highest level",
        examples=[["1 mVrms", "7 Vrms"]],
    ),
]
Lines = Annotated[
    list[str],
    Meta(min_length=1, max_length=20, description="lines to send", examples=[["READ?"]]),
]
Cycles = Annotated[float, Meta(ge=0, le=1000, description="periods, from 0 to 1000", examples=[3])]
Time = Annotated[Quantity, Meta(description="a time", examples=["20 ms"])]


class _Table(msgspec.Struct, forbid_unknown_fields=True, frozen=True, kw_only=True):
    """A table of a file; a key that is not in it is a mistake, not an extra."""


class LinkTable(_Table, frozen=True, kw_only=True):
    """How the wire behaves."""

    read_terminator: Literal["\n", "\r\n", "\r"] = "\n"
    write_terminator: Literal["\n", "\r\n", "\r"] = "\n"
    timeout: Time = "2 s"
    gap: Time = "0 s"
    after_open: Time = "0 s"


class NumbersTable(_Table, frozen=True, kw_only=True):
    """How the instrument wants its numbers."""

    style: NumberFormat = "plain"
    digits: Annotated[
        int, Meta(ge=4, le=15, description="significant digits, from 4 to 15", examples=[9])
    ] = 9


class MessageTable(_Table, frozen=True, kw_only=True):
    """What is sent for one action."""

    lines: Lines
    reply: ReplyKind = "none"
    timeout: Time | None = None
    unit: Text = ""
    overload: list[Text] = []
    not_a_number: list[Text] = []


class RangeTable(_Table, frozen=True, kw_only=True):
    """What the instrument can do."""

    frequency: Band
    level: Levels | None = None


class SettlingTable(_Table, frozen=True, kw_only=True):
    """How long it takes to settle from this frequency up: a fixed time and some cycles."""

    above: Quantity = "0.001 Hz"
    time: Time
    cycles: Cycles = 0.0


class ReadingTable(_Table, frozen=True, kw_only=True):
    """How long one reading takes."""

    time: Time = "20 ms"
    cycles: Cycles = 0.0


class AccuracyTable(_Table, frozen=True, kw_only=True):
    """Limits of error in a band, in percent of the reading, taken as rectangular."""

    band: Band
    reading: Annotated[Quantity, Meta(description="a limit of error", examples=["0.1%"])]


class ExampleTable(_Table, frozen=True, kw_only=True):
    """One worked example: what is sent for an action, and what a reply means."""

    message: Text
    frequency_hz: float | None = None
    level_vrms: float | None = None
    load_ohm: float | None = None
    sends: str | None = None
    reply: str | None = None
    means: float | str | None = None


class DriverFile(_Table, frozen=True, kw_only=True):
    """A whole driver file."""

    name: Text
    role: Literal["source", "meter"]
    description: Text = ""
    level_unit: Literal["Vrms", "Vpp", "Vpk"] = "Vrms"
    link: LinkTable = LinkTable()
    numbers: NumbersTable = NumbersTable()
    message: dict[str, MessageTable]
    range: RangeTable
    settling: Annotated[list[SettlingTable], Meta(min_length=1)]
    reading: ReadingTable = ReadingTable()
    accuracy: list[AccuracyTable] = []
    example: list[ExampleTable] = []
