"""The shape of a bench file: what may stand in it, and nothing else."""

import datetime
from typing import Annotated, Literal

import msgspec
from msgspec import Meta

Text = Annotated[str, Meta(max_length=200)]
Address = Annotated[
    str,
    Meta(
        max_length=200,
        description="a VISA resource name",
        examples=["TCPIP::192.0.2.7::5025::SOCKET"],
    ),
]
DriverName = Annotated[
    str,
    Meta(
        max_length=200,
        description="the name of a shipped driver, or the path of a driver file",
        examples=["meter_generic"],
    ),
]
Quantity = Annotated[str, Meta(max_length=40)]
Due = Annotated[datetime.date, Meta(description="a date without quotes, such as 2027-03-31")]


class _Table(msgspec.Struct, forbid_unknown_fields=True, frozen=True, kw_only=True):
    """A table of a file; a key that is not in it is a mistake, not an extra."""


class AttenuatorTable(_Table, frozen=True, kw_only=True):
    """A fixed attenuator between source and board."""

    loss: Annotated[Quantity, Meta(description="a loss in decibels", examples=["20 dB"])]
    u: Annotated[Quantity, Meta(description="its uncertainty", examples=["0.05 dB"])] = "0 dB"
    place: Literal["before input meter", "after input meter"] = "before input meter"


class SourceTable(_Table, frozen=True, kw_only=True):
    """The signal source."""

    driver: DriverName
    address: Address
    identity: Text | None = None
    impedance: Annotated[Quantity, Meta(description="a resistance", examples=["50 ohm"])] = "50 ohm"
    load: (
        Annotated[
            Quantity,
            Meta(
                description="what the display counts with, high impedance where nothing is said",
                examples=["high impedance"],
            ),
        ]
        | None
    ) = None
    attenuator: (
        Annotated[Quantity, Meta(description="a loss in decibels", examples=["20 dB"])]
        | AttenuatorTable
        | None
    ) = None
    calibration_due: Due | None = None


class MeterTable(_Table, frozen=True, kw_only=True):
    """A voltmeter."""

    driver: DriverName
    address: Address
    identity: Text | None = None
    calibration_due: Due | None = None


class BenchTables(_Table, frozen=True, kw_only=True):
    """A whole bench file."""

    name: Text
    logbook: Text = "logbook.db"
    mains: Literal["50 Hz", "60 Hz"] = "50 Hz"
    max_level: (
        Annotated[
            Quantity,
            Meta(description="the highest open-circuit level of the source", examples=["2 Vpp"]),
        ]
        | None
    ) = None
    source: SourceTable
    output_meter: MeterTable
    input_meter: MeterTable | None = None
