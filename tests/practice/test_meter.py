"""The practice voltmeter."""

import math
from dataclasses import replace

import numpy as np
import pytest

from benchlog.practice.meter import (
    FILTER_SETTLE_S,
    RANGES_V,
    READING_S,
    make_meter,
    settle_s,
)
from benchlog.practice.scpi import Instrument
from benchlog.practice.world import PERFECT, Drive, Quality, World
from tests.fakes.practice_talk import answer, errors

LONG = 1e3


def bench(
    level_vrms: float,
    *,
    frequency_hz: float = 1e3,
    quality: Quality = PERFECT,
    seed: int = 0,
) -> Instrument:
    """Return a meter on a cable that carries a level since time 0."""
    world = World(quality=quality, seed=seed)
    world.set_drive(Drive(frequency_hz=frequency_hz, emf_vrms=level_vrms, on=True), 0.0)
    return make_meter(world, "input")


def read(meter: Instrument, message: str = "READ?", now_s: float = LONG) -> float:
    """Return a reading."""
    reply = answer(meter, message, now_s)
    assert reply is not None
    return float(reply)


@pytest.mark.parametrize(
    "message",
    [
        "READ?",
        "MEAS:VOLT:AC?",
        "MEASure:AC? 1",
        "MEAS:VOLT:AC? DEF,MIN",
        "CONF:VOLT:AC;:READ?",
        "CONF:VOLT:AC 1,1E-6;:INIT;:FETC?",
        "CONF:AC AUTO;:READ?",
        "SENS:FUNC 'VOLT:AC';:INIT:IMM;*WAI;:FETCH?",
        "VOLT:AC:RANG 1 V;:READ?",
        "SENS:VOLT:AC:RANG:AUTO ON;:READ?",
        "VOLT:AC:RANG:AUTO ONCE;:READ?",
    ],
)
def test_every_way_to_read_gives_the_level(message: str) -> None:
    """To its last digits; errors stay away."""
    meter = bench(0.5)
    assert read(meter, message) == pytest.approx(0.5, rel=1e-6)
    assert errors(meter) == []


def test_reading_format() -> None:
    """Seven digits with sign and exponent."""
    reply = answer(bench(0.01414214), "READ?", LONG)
    assert reply is not None
    assert len(reply) == len("+1.414214E-02")
    assert reply.startswith("+1.41")
    assert reply.endswith("E-02")


def test_two_meters_differ_a_little_and_always_the_same() -> None:
    """The gain error belongs to the instrument: it is no noise, and it is within its bound."""
    quality = Quality(noise_rel=0.0, source_error_rel=0.0)

    def readings() -> list[float]:
        return [read(bench(0.5, quality=quality, seed=seed)) for seed in range(20)]

    errors_rel = [value / 0.5 - 1 for value in readings()]
    assert readings() == readings()
    assert len(set(errors_rel)) == 20
    assert 0.5 * quality.meter_error_rel < max(errors_rel) < 1.01 * quality.meter_error_rel


@pytest.mark.parametrize(
    ("expected_v", "range_v"),
    [("0", 0.1), ("0.1", 0.1), ("0.12", 0.1), ("0.121", 1), ("5", 10), ("99", 100), ("700", 700)],
)
def test_range_is_the_smallest_that_holds_the_level(expected_v: str, range_v: float) -> None:
    """A range reads up to 1.2 times its name."""
    meter = bench(0.01)
    assert read(meter, f"CONF:VOLT:AC {expected_v};:VOLT:AC:RANG?") == range_v
    assert answer(meter, "VOLT:AC:RANG:AUTO?") == "0"


def test_range_queries() -> None:
    """MIN and MAX name the ends; the configuration is a string."""
    meter = bench(0.01)
    assert read(meter, "VOLT:AC:RANG? MIN") == RANGES_V[0]
    assert read(meter, "VOLT:AC:RANG:UPP? MAX") == RANGES_V[-1]
    assert answer(meter, "VOLT:AC:RANG MAX;RANG:AUTO?;:CONF?") == (
        '0;"VOLT:AC +7.000000E+02,+7.000000E-04"'
    )
    assert answer(meter, "FUNC?") == '"VOLT:AC"'
    assert answer(meter, "CONF:VOLT:AC;:VOLT:AC:RANG:AUTO?") == "1"
    assert errors(meter) == []


def test_fixed_range_overloads_and_automatic_does_not() -> None:
    """Overload is infinity on the wire and no error."""
    meter = bench(0.5)
    assert read(meter, "CONF:VOLT:AC 0.1;:READ?") == 9.9e37
    assert read(meter, "CONF:VOLT:AC;:READ?") == pytest.approx(0.5, rel=1e-3)
    assert read(bench(5000.0), "READ?") == 9.9e37
    assert errors(meter) == []


@pytest.mark.parametrize(
    ("message", "number"),
    [
        ("FETC?", -230),
        ("CONF:VOLT:AC 1000", -222),
        ("VOLT:AC:RANG -1", -222),
        ("VOLT:AC:BAND 0.9", -222),
        ("CONF:VOLT:AC 1 A", -131),
        ("MEAS:VOLT:DC?", -113),
        ("FUNC 'CURR'", -224),
        ("READ", -113),
    ],
)
def test_refused(message: str, number: int) -> None:
    """Each mistake has its number."""
    meter = bench(0.5)
    assert answer(meter, message, LONG) is None
    assert errors(meter) == [number]


def test_abort_takes_the_reading_away() -> None:
    """A reading under way is lost; one that was there stays."""
    meter = bench(0.5)
    assert answer(meter, "INIT;:ABOR;:FETC?", LONG) is None
    assert errors(meter) == [-230]
    answer(meter, "INIT", LONG)
    assert answer(meter, "ABOR;:FETC?", 2 * LONG) is not None


def test_reset() -> None:
    """Automatic range, middle filter, no reading."""
    meter = bench(0.5)
    answer(meter, "VOLT:AC:RANG 10;BAND 1;:READ?", LONG)
    assert answer(meter, "*RST;:VOLT:AC:RANG:AUTO?;:VOLT:AC:BAND?") == "1;+1.000000E+01"
    assert answer(meter, "FETC?") is None


@pytest.mark.parametrize(
    ("wanted", "filter_hz"),
    [("1", 1), ("MIN", 1), ("9.9", 1), ("10", 10), ("100 HZ", 10), ("200", 200), ("MAX", 200)],
)
@pytest.mark.parametrize("header", ["VOLT:AC:BAND", "SENS:DET:BAND"])
def test_filter_is_the_fastest_that_still_passes(
    header: str, wanted: str, filter_hz: float
) -> None:
    """Two spellings of the same setting."""
    meter = bench(0.5)
    assert read(meter, f"{header} {wanted};:{header}?") == filter_hz


@pytest.mark.parametrize("filter_hz", sorted(FILTER_SETTLE_S))
@pytest.mark.parametrize("frequency_hz", [20.0, 1e3, 1e5])
def test_patience_always_gives_the_same_digits(filter_hz: float, frequency_hz: float) -> None:
    """After the settling time nothing is left of the change; before, it shows."""
    meter = bench(0.05, frequency_hz=frequency_hz)
    answer(meter, f"VOLT:AC:BAND {filter_hz};:READ?", LONG)
    settled = answer(meter, "READ?", LONG)
    settling_s = settle_s(filter_hz, frequency_hz)
    assert answer(meter, "READ?", settling_s) == settled
    assert answer(meter, "READ?", settling_s * 0.99) != settled
    assert read(meter, now_s=settling_s / 2) < 0.9 * read(meter)
    assert read(meter, now_s=0.0) < 0.01 * read(meter)


def test_signal_below_the_filter_reads_low() -> None:
    """The wrong filter is a visible mistake; the right one passes all."""
    meter = bench(0.05, frequency_hz=20.0)
    right = read(meter, "VOLT:AC:BAND 10;:READ?")
    assert read(meter, "VOLT:AC:BAND 1;:READ?") == right
    assert read(meter, "VOLT:AC:BAND 200;:READ?") < 0.4 * right


def test_own_changes_are_waited_for() -> None:
    """A reading after a change of filter or range takes longer, and is right."""
    meter = bench(0.05)
    calm = meter.handle("READ?", LONG)
    fast = meter.handle("VOLT:AC:BAND 200;:READ?", LONG)
    slow = meter.handle("VOLT:AC:BAND 1;:READ?", LONG)
    again = meter.handle("READ?", LONG)
    assert calm is not None
    assert fast is not None
    assert slow is not None
    assert again is not None
    assert calm.ready_at_s - LONG == pytest.approx(READING_S)
    assert fast.ready_at_s - LONG == pytest.approx(FILTER_SETTLE_S[200.0] + READING_S)
    assert slow.ready_at_s - LONG == pytest.approx(FILTER_SETTLE_S[1.0] + READING_S)
    assert again.ready_at_s - LONG == pytest.approx(READING_S)
    assert calm.text == fast.text == slow.text == again.text


def test_band_ends_in_one_pole() -> None:
    """Down by 3 dB near the pole, which is each meter's own; a tenth of it costs half a percent."""
    quality = replace(PERFECT, meter_pole_hz=1e6)

    def gain(frequency_hz: float) -> float:
        return read(bench(0.5, frequency_hz=frequency_hz, quality=quality)) / 0.5

    assert gain(1e5) == pytest.approx(1 / math.hypot(1, 0.1), rel=5e-4)
    assert gain(1e6) == pytest.approx(math.sqrt(0.5), rel=0.011)
    assert gain(1e6) != pytest.approx(math.sqrt(0.5), rel=1e-6)


@pytest.mark.parametrize("seed", range(5))
@pytest.mark.parametrize(
    ("frequency_hz", "limit_rel"), [(10.0, 6e-4), (1e5, 6e-4), (1e6, 2e-3), (1e7, 2e-3)]
)
def test_meter_keeps_what_its_driver_promises(
    seed: int, frequency_hz: float, limit_rel: float
) -> None:
    """The accuracy table of the generic driver holds for every meter, noise left aside."""
    quality = Quality(noise_rel=0.0, source_error_rel=0.0)
    reading = read(bench(0.05, frequency_hz=frequency_hz, quality=quality, seed=seed))
    assert abs(reading / 0.05 - 1) < limit_rel


def test_floor_adds_in_quadrature() -> None:
    """Nothing at the terminals reads the meter's own noise; a level hides it."""
    floor = read(bench(0.0))
    assert floor == pytest.approx(math.hypot(2e-6, 1e-6), rel=1e-6)
    meter = bench(3e-6)
    assert read(meter) == pytest.approx(math.hypot(3e-6, floor), rel=1e-3)


def test_noise_of_readings_has_the_stated_size() -> None:
    """Standard deviation of 400 readings; bounds are four standard errors."""
    meter = bench(0.05, quality=Quality())
    readings = np.array([read(meter) for _ in range(400)])
    scatter = readings.std(ddof=1) / readings.mean()
    assert scatter == pytest.approx(Quality().noise_rel, rel=4 / math.sqrt(800))
