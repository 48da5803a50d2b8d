"""The practice bench's AC voltmeter: true RMS, five ranges, three low-frequency filters."""

import math
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cache

from benchlog.practice.common import COMMON_COMMANDS
from benchlog.practice.error_table import ScpiError
from benchlog.practice.parameters import (
    INFINITY,
    Boolean,
    Choice,
    Limits,
    Number,
    Text,
    Value,
    nr1,
    nr3,
)
from benchlog.practice.scpi import Command, Instrument, Moment
from benchlog.practice.tree import HeaderTree
from benchlog.practice.world import Place, World, uniform_draw

RANGES_V = (0.1, 1.0, 10.0, 100.0, 700.0)
OVERRANGE = 1.2
"""A range reads up to this multiple of its name (common practice)."""

FILTER_SETTLE_S = {1.0: 0.4, 10.0: 0.012, 200.0: 0.003}
"""Low-frequency filter, named by the lowest frequency it is good for -> its settling time."""

SETTLE_CYCLES = 2.5
"""Periods of the signal that settling takes beyond that."""

READING_S = 4e-3
RANGE_CHANGE_S = 2e-3

FLOOR_V = 2e-6
FLOOR_PER_RANGE = 1e-5
"""The meter's own noise, added in quadrature: a fixed part and a part of the range."""

RANGE = Limits(minimum=0.0, maximum=RANGES_V[-1] * OVERRANGE, default=RANGES_V[0])
FILTER = Limits(minimum=min(FILTER_SETTLE_S), maximum=20e6, default=10.0)


def settle_s(filter_hz: float, frequency_hz: float) -> float:
    """Return how long after a change a reading is right to its last digit."""
    return FILTER_SETTLE_S[filter_hz] + SETTLE_CYCLES / frequency_hz


@dataclass(slots=True)
class Meter:
    """The meter's settings and its last reading.

    Attributes:
        world: The table it stands on.
        identity: What ``*IDN?`` answers.
        place: Where its leads go.
        range_v: The range in use.
        automatic: Whether it chooses the range itself.
        filter_hz: The low-frequency filter in use.
        reading_v: The last reading; None after a reset.
        changed: Whether range or filter changed since that reading.
        busy_until_s: When the reading is there.
    """

    world: World
    identity: str
    place: Place
    range_v: float = RANGES_V[0]
    automatic: bool = True
    filter_hz: float = FILTER.default
    reading_v: float | None = None
    changed: bool = False
    busy_until_s: float = -math.inf

    def reset(self, now_s: float) -> None:
        """Take the settings of ``*RST``."""
        self.range_v, self.automatic, self.filter_hz = RANGES_V[0], True, FILTER.default
        self.reading_v, self.changed, self.busy_until_s = None, False, now_s

    def choose_range(self, value: Value) -> None:
        """Take the smallest range that holds a level, and keep it."""
        level_v = RANGE.resolve(value)
        self.automatic = False
        self.use_range(_range_for(level_v))

    def use_range(self, range_v: float) -> None:
        """Switch to a range."""
        self.changed = self.changed or range_v != self.range_v
        self.range_v = range_v

    def start(self, now_s: float) -> None:
        """Begin a reading; it is there at ``busy_until_s``."""
        own_settling_s = FILTER_SETTLE_S[self.filter_hz] if self.changed else 0.0
        begin_s = now_s + own_settling_s
        level_v = self.level_v(begin_s)
        if self.automatic and not self._suits(level_v):
            self.use_range(_range_for(level_v))
            begin_s += RANGE_CHANGE_S
        self.changed = False
        self.reading_v = self._digits(level_v)
        self.busy_until_s = begin_s + READING_S

    def level_v(self, now_s: float) -> float:
        """Return what the detector makes of the level at the terminals at one time."""
        look = self.world.look(self.place, now_s)
        seed, quality = self.world.seed, self.world.quality
        frequency_hz = look.drive.frequency_hz
        pole_hz = quality.meter_pole_hz * (1 + 0.02 * uniform_draw(seed, self.place, "pole"))
        gain = 1 + quality.meter_error_rel * uniform_draw(seed, self.place, "gain")
        gain /= math.hypot(1.0, frequency_hz / pole_hz)
        gain *= _filter_gain(self.filter_hz, frequency_hz)
        gain *= 1 - _transient(look.since_change_s, settle_s(self.filter_hz, frequency_hz))
        return look.level_vrms * gain * (1 + quality.noise_rel * look.draw)

    def _suits(self, level_v: float) -> bool:
        return 0.1 * self.range_v <= level_v <= OVERRANGE * self.range_v or (
            self.range_v == RANGES_V[0] and level_v <= self.range_v
        )

    def _digits(self, level_v: float) -> float:
        if level_v > OVERRANGE * self.range_v:
            return INFINITY
        return math.hypot(level_v, FLOOR_V, FLOOR_PER_RANGE * self.range_v)


def make_meter(world: World, place: Place) -> Instrument:
    """Return a voltmeter at the board's input or output that has just been switched on."""
    serial = {"input": "PM-0001", "output": "PM-0002"}[place]
    device = Meter(
        world=world, identity=f"benchlog practice,AC voltmeter,{serial},1.0", place=place
    )
    return Instrument(device, _tree())


def _range_for(level_v: float) -> float:
    return next((range_v for range_v in RANGES_V if level_v <= OVERRANGE * range_v), RANGES_V[-1])


def _filter_gain(filter_hz: float, frequency_hz: float) -> float:
    """Return how much of a signal below its filter the detector still sees."""
    below = max(filter_hz / frequency_hz - 1.0, 0.0)
    return 1.0 / math.sqrt(1.0 + 0.1 * below**2)


def _transient(since_change_s: float, settling_s: float) -> float:
    """Return what is missing of the level: all after a change, exactly nothing when settled."""
    return max(1.0 - since_change_s / settling_s, 0.0) ** 2


def _configure(meter: Meter, _moment: Moment, values: Sequence[Value]) -> None:
    """Prepare for AC volts; the second value, a resolution, is taken and changes nothing."""
    if not values or values[0] in {"AUTO", "DEF"}:
        meter.automatic = True
    else:
        meter.choose_range(values[0])


def _configuration(meter: Meter, _moment: Moment, _values: Sequence[Value]) -> str:
    return f'"VOLT:AC {nr3(meter.range_v)},{nr3(meter.range_v * 1e-6)}"'


def _initiate(meter: Meter, moment: Moment, _values: Sequence[Value]) -> None:
    if moment.now_s < meter.busy_until_s:
        raise ScpiError(-213)
    meter.start(moment.now_s)


def _fetch(meter: Meter, moment: Moment, _values: Sequence[Value]) -> str:
    if meter.reading_v is None:
        raise ScpiError(-230)
    moment.wait_until(meter.busy_until_s)
    return nr3(meter.reading_v)


def _read(meter: Meter, moment: Moment, values: Sequence[Value]) -> str:
    meter.start(moment.now_s)
    return _fetch(meter, moment, values)


def _measure(meter: Meter, moment: Moment, values: Sequence[Value]) -> str:
    _configure(meter, moment, values)
    return _read(meter, moment, ())


def _abort(meter: Meter, moment: Moment, _values: Sequence[Value]) -> None:
    if moment.now_s < meter.busy_until_s:
        meter.reading_v, meter.busy_until_s = None, moment.now_s


def _set_range(meter: Meter, _moment: Moment, values: Sequence[Value]) -> None:
    meter.choose_range(values[0])


def _range(meter: Meter, _moment: Moment, values: Sequence[Value]) -> str:
    named = {"MIN": RANGES_V[0], "MAX": RANGES_V[-1], "DEF": RANGES_V[0]}
    return nr3(named[str(values[0])] if values else meter.range_v)


def _set_automatic(meter: Meter, moment: Moment, values: Sequence[Value]) -> None:
    """Choose the range alone, or never, or once for the level that is there now (ONCE)."""
    if values[0] == "ONCE":
        meter.automatic = False
        meter.use_range(_range_for(meter.level_v(moment.now_s)))
    else:
        meter.automatic = bool(values[0])


def _automatic(meter: Meter, _moment: Moment, _values: Sequence[Value]) -> str:
    return nr1(meter.automatic)


def _set_filter(meter: Meter, _moment: Moment, values: Sequence[Value]) -> None:
    """Take the slowest filter that still passes the frequency named."""
    lowest_hz = FILTER.resolve(values[0])
    filter_hz = max(known for known in FILTER_SETTLE_S if known <= lowest_hz)
    meter.changed = meter.changed or filter_hz != meter.filter_hz
    meter.filter_hz = filter_hz


def _filter(meter: Meter, _moment: Moment, values: Sequence[Value]) -> str:
    return nr3(FILTER.resolve(values[0]) if values else meter.filter_hz)


def _set_function(_meter: Meter, _moment: Moment, _values: Sequence[Value]) -> None:
    """AC volts is all this meter can measure; the name was checked when it was read."""


def _function(_meter: Meter, _moment: Moment, _values: Sequence[Value]) -> str:
    return '"VOLT:AC"'


@cache
def _tree() -> HeaderTree[Command]:
    words = ("MINimum", "MAXimum", "DEFault")
    limits = (Choice(words=words),)
    volts = Number(units=("V", "VRMS"), words=(*words, "AUTO"))
    ranged = (volts, Number(units=("V", "VRMS")))
    plain = (Number(units=("V",), words=words),)
    hertz = (Number(units=("HZ",), words=words),)
    once = (Boolean(words=("ON", "OFF", "ONCE")),)
    function = (Text(allowed=("VOLT:AC", "VOLTAGE:AC")),)
    span = "[SENSe]:VOLTage:AC:RANGe"
    filters = ("[SENSe]:VOLTage:AC:BANDwidth", "[SENSe]:DETector:BANDwidth")
    return HeaderTree(
        (
            *COMMON_COMMANDS,
            ("CONFigure[:VOLTage]:AC", Command(run=_configure, parameters=ranged)),
            ("CONFigure?", Command(run=_configuration)),
            ("MEASure[:VOLTage]:AC?", Command(run=_measure, parameters=ranged)),
            ("READ?", Command(run=_read)),
            ("INITiate[:IMMediate]", Command(run=_initiate)),
            ("FETCh?", Command(run=_fetch)),
            ("ABORt", Command(run=_abort)),
            (f"{span}[:UPPer]", Command(run=_set_range, parameters=plain, required=1)),
            (f"{span}[:UPPer]?", Command(run=_range, parameters=limits)),
            (f"{span}:AUTO", Command(run=_set_automatic, parameters=once, required=1)),
            (f"{span}:AUTO?", Command(run=_automatic)),
            *((name, Command(run=_set_filter, parameters=hertz, required=1)) for name in filters),
            *((f"{name}?", Command(run=_filter, parameters=limits)) for name in filters),
            ("[SENSe]:FUNCtion[:ON]", Command(run=_set_function, parameters=function, required=1)),
            ("[SENSe]:FUNCtion[:ON]?", Command(run=_function)),
        )
    )
