"""The practice bench's sine source: 1 mHz to 20 MHz behind 50 ohm."""

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import cache

from benchlog.practice.common import COMMON_COMMANDS
from benchlog.practice.parameters import (
    INFINITY,
    Boolean,
    Choice,
    Limits,
    Number,
    Quantity,
    Value,
    as_float,
    nr1,
    nr3,
)
from benchlog.practice.scpi import Command, Instrument, Moment
from benchlog.practice.tree import HeaderTree
from benchlog.practice.world import Drive, World

OUTPUT_OHM = 50.0
SWITCHING_S = 1e-3
"""How long the source itself takes for a change; ``*OPC?`` waits for it and for nothing else."""

VRMS_PER = {"VRMS": 1.0, "VPP": 1 / (2 * math.sqrt(2)), "VPK": 1 / math.sqrt(2)}

FREQUENCY = Limits(minimum=1e-3, maximum=20e6, default=1e3)
EMF_VRMS = Limits(minimum=1e-4, maximum=20 * VRMS_PER["VPP"], default=0.2 * VRMS_PER["VPP"])
LOAD = Limits(minimum=1.0, maximum=1e6, default=OUTPUT_OHM)

_LIMIT_WORDS = ("MINimum", "MAXimum", "DEFault")


@dataclass(slots=True)
class Source:
    """The source's settings.

    Attributes:
        world: The table it stands on.
        identity: What ``*IDN?`` answers.
        unit: In which level is shown.
        load_ohm: The load for which level is shown; the real load does not matter to it.
        busy_until_s: When it has done what it was told.
    """

    world: World
    identity: str
    unit: str = "VRMS"
    load_ohm: float = OUTPUT_OHM
    busy_until_s: float = -math.inf

    def reset(self, now_s: float) -> None:
        """Take the settings of ``*RST``: 1 kHz, output off, level shown for 50 ohm."""
        self.unit, self.load_ohm = "VRMS", OUTPUT_OHM
        self.change(
            now_s,
            Drive(
                frequency_hz=FREQUENCY.default,
                emf_vrms=EMF_VRMS.default,
                on=False,
                source_ohm=OUTPUT_OHM,
            ),
        )

    def change(self, now_s: float, drive: Drive) -> None:
        """Put out something else."""
        self.world.set_drive(drive, now_s)
        self.busy_until_s = now_s + SWITCHING_S

    @property
    def shown_per_emf(self) -> float:
        """The factor from open-circuit level to the level shown, in the unit shown."""
        divider = 1.0 if math.isinf(self.load_ohm) else self.load_ohm / (self.load_ohm + OUTPUT_OHM)
        return divider / VRMS_PER[self.unit]


def make_source(world: World) -> Instrument:
    """Return a source that has just been switched on: output off, power-on bit set."""
    device = Source(world=world, identity="benchlog practice,sine source,PS-0001,1.0")
    device.reset(-math.inf)
    return Instrument(device, _tree())


def _set_frequency(source: Source, moment: Moment, values: Sequence[Value]) -> None:
    frequency_hz = round(FREQUENCY.resolve(values[0]), 6)
    source.change(moment.now_s, replace(source.world.drive, frequency_hz=frequency_hz))


def _frequency(source: Source, _moment: Moment, values: Sequence[Value]) -> str:
    return nr3(FREQUENCY.resolve(values[0]) if values else source.world.drive.frequency_hz, 12)


def _set_level(source: Source, moment: Moment, values: Sequence[Value]) -> None:
    value = values[0]
    if isinstance(value, str):
        emf_vrms = EMF_VRMS.resolve(value)
    else:
        scale = source.shown_per_emf
        if isinstance(value, Quantity):
            scale *= VRMS_PER[source.unit] / VRMS_PER[value.unit]
        emf_vrms = EMF_VRMS.resolve(as_float(value) / scale)
    source.change(moment.now_s, replace(source.world.drive, emf_vrms=emf_vrms))


def _level(source: Source, _moment: Moment, values: Sequence[Value]) -> str:
    emf_vrms = EMF_VRMS.resolve(values[0]) if values else source.world.drive.emf_vrms
    return nr3(emf_vrms * source.shown_per_emf, 12)


def _set_unit(source: Source, _moment: Moment, values: Sequence[Value]) -> None:
    source.unit = str(values[0])


def _unit(source: Source, _moment: Moment, _values: Sequence[Value]) -> str:
    return source.unit


def _set_output(source: Source, moment: Moment, values: Sequence[Value]) -> None:
    source.change(moment.now_s, replace(source.world.drive, on=bool(values[0])))


def _output(source: Source, _moment: Moment, _values: Sequence[Value]) -> str:
    return nr1(source.world.drive.on)


def _set_load(source: Source, _moment: Moment, values: Sequence[Value]) -> None:
    """Show the level for another load; what is put out stays as it was."""
    value = values[0]
    if value == "INF" or (not isinstance(value, str) and as_float(value) >= INFINITY):
        source.load_ohm = math.inf
    else:
        source.load_ohm = LOAD.resolve(value)


def _load(source: Source, _moment: Moment, values: Sequence[Value]) -> str:
    load_ohm = LOAD.resolve(values[0]) if values else source.load_ohm
    return nr3(INFINITY if math.isinf(load_ohm) else load_ohm)


def _set_shape(_source: Source, _moment: Moment, _values: Sequence[Value]) -> None:
    """A sine is all this source can make; the word was checked when it was read."""


def _shape(_source: Source, _moment: Moment, _values: Sequence[Value]) -> str:
    return "SIN"


@cache
def _tree() -> HeaderTree[Command]:
    limits = (Choice(words=_LIMIT_WORDS),)
    frequency = (Number(units=("HZ",)),)
    level = (Number(units=("V", "VRMS", "VPP", "VPK")),)
    load = (Number(units=("OHM",), words=(*_LIMIT_WORDS, "INFinity")),)
    unit = (Choice(words=("VRMS", "VPP", "VPK")),)
    shape = (Choice(words=("SINusoid",)),)
    carrier = "[SOURce]:FREQuency[:CW|:FIXed]"
    amplitude = "[SOURce]:VOLTage[:LEVel][:IMMediate][:AMPLitude]"
    return HeaderTree(
        (
            *COMMON_COMMANDS,
            (carrier, Command(run=_set_frequency, parameters=frequency, required=1)),
            (f"{carrier}?", Command(run=_frequency, parameters=limits)),
            (amplitude, Command(run=_set_level, parameters=level, required=1)),
            (f"{amplitude}?", Command(run=_level, parameters=limits)),
            ("[SOURce]:VOLTage:UNIT", Command(run=_set_unit, parameters=unit, required=1)),
            ("[SOURce]:VOLTage:UNIT?", Command(run=_unit)),
            ("[SOURce]:FUNCtion[:SHAPe]", Command(run=_set_shape, parameters=shape, required=1)),
            ("[SOURce]:FUNCtion[:SHAPe]?", Command(run=_shape)),
            ("OUTPut[:STATe]", Command(run=_set_output, parameters=(Boolean(),), required=1)),
            ("OUTPut[:STATe]?", Command(run=_output)),
            ("OUTPut:LOAD", Command(run=_set_load, parameters=load, required=1)),
            ("OUTPut:LOAD?", Command(run=_load, parameters=limits)),
        )
    )
