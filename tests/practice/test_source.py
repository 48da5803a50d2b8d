"""The practice source."""

import math

import pytest

from benchlog.practice.scpi import Instrument
from benchlog.practice.source import make_source
from benchlog.practice.world import World
from tests.fakes.practice_talk import answer, errors


@pytest.fixture
def world() -> World:
    """An empty table."""
    return World()


@pytest.fixture
def source(world: World) -> Instrument:
    """A source that has just been switched on."""
    return make_source(world)


def number(source: Instrument, query: str) -> float:
    """Return a numeric reply."""
    reply = answer(source, query)
    assert reply is not None
    return float(reply)


def test_power_on_is_off(source: Instrument, world: World) -> None:
    """Nothing comes out before somebody wants it."""
    assert answer(source, "OUTP?") == "0"
    assert not world.drive.on
    assert world.drive.frequency_hz == 1e3


@pytest.mark.parametrize(
    ("message", "frequency_hz"),
    [
        ("FREQ 2 kHz", 2e3),
        ("SOURce:FREQuency:CW 1.5 MHZ", 1.5e6),
        ("FREQ:FIX MIN", 1e-3),
        ("FREQ MAX", 20e6),
        ("FREQ 5 kHz;FREQ DEF", 1e3),
        ("FREQ 1234.5678901", 1234.56789),
    ],
)
def test_frequency(source: Instrument, world: World, message: str, frequency_hz: float) -> None:
    """Set in any way, it is put out and answered."""
    answer(source, message)
    assert world.drive.frequency_hz == pytest.approx(frequency_hz, rel=1e-12)
    assert number(source, "FREQ?") == pytest.approx(frequency_hz, rel=1e-11)
    assert errors(source) == []


@pytest.mark.parametrize("load", ["50", "INF", "600 OHM"])
@pytest.mark.parametrize(
    ("unit", "message", "vrms"),
    [
        ("VRMS", "VOLT 0.1", 0.1),
        ("VRMS", "VOLT 100 mV", 0.1),
        ("VRMS", "VOLT 20 MVPP", 0.02 / math.sqrt(8)),
        ("VPP", "VOLT 0.02", 0.02 / math.sqrt(8)),
        ("VPP", "SOUR:VOLT:LEV:IMM:AMPL 100 MVRMS", 0.1),
        ("VPK", "VOLT:AMPL 0.5", 0.5 / math.sqrt(2)),
        ("VPP", "VOLT 1 VPK", 1 / math.sqrt(2)),
    ],
)
def test_level_is_meant_across_the_load(
    source: Instrument, world: World, *, load: str, unit: str, message: str, vrms: float
) -> None:
    """What is put out is the level times (load + 50) / load; units convert as for a sine."""
    answer(source, f"VOLT:UNIT {unit};:OUTP:LOAD {load};:{message}")
    share = {"50": 0.5, "INF": 1.0, "600 OHM": 600 / 650}[load]
    assert world.drive.emf_vrms == pytest.approx(vrms / share, rel=1e-12)
    answer(source, "VOLT:UNIT VRMS")
    assert number(source, "VOLT?") == pytest.approx(vrms, rel=1e-11)


def test_shown_for_50_ohm_gives_twice_into_high_impedance(source: Instrument, world: World) -> None:
    """The usual mistake: +6.0206 dB (common practice, in every generator's manual)."""
    answer(source, "VOLT 0.1")
    assert world.drive.emf_vrms == pytest.approx(0.2)


def test_load_changes_what_is_shown_and_not_what_is_put_out(
    source: Instrument, world: World
) -> None:
    """Infinity is answered as 9.9E37, which is a legal reply here."""
    answer(source, "VOLT 0.1;:OUTP:LOAD INF")
    assert number(source, "VOLT?") == pytest.approx(0.2)
    assert number(source, "OUTP:LOAD?") == 9.9e37
    answer(source, "OUTP:LOAD 9.9E37")
    assert number(source, "OUTP:LOAD?") == 9.9e37
    answer(source, "OUTP:LOAD MIN")
    assert number(source, "OUTP:LOAD?") == 1.0
    assert world.drive.emf_vrms == pytest.approx(0.2)


@pytest.mark.parametrize(
    ("message", "number"),
    [
        ("FREQ 20.1 MHZ", -222),
        ("FREQ 0", -222),
        ("FREQ 1E400", -222),
        ("VOLT 4", -222),
        ("VOLT 1 UV", -222),
        ("VOLT -1", -222),
        ("VOLT 1 HZ", -131),
        ("OUTP:LOAD 0.5", -222),
        ("OUTP:LOAD 1E9", -222),
        ("OUTP MAYBE", -141),
        ("OUTP 'ON'", -158),
        ("VOLT:UNIT DBM", -141),
        ("FUNC SQU", -141),
    ],
)
def test_refused_settings(source: Instrument, world: World, message: str, number: int) -> None:
    """A refused setting changes nothing."""
    before = world.drive
    answer(source, message)
    assert errors(source) == [number]
    assert world.drive == before


@pytest.mark.parametrize(
    ("word", "emf_vpp"),
    [("MIN", 1e-4 * math.sqrt(8)), ("MAX", 20.0), ("DEF", 0.2), ("MAXIMUM", 20.0)],
)
def test_level_by_word(source: Instrument, world: World, word: str, emf_vpp: float) -> None:
    """The ends of the range can be named."""
    answer(source, f"VOLT {word}")
    assert world.drive.emf_vrms == pytest.approx(emf_vpp / math.sqrt(8))


def test_largest_level_is_20_vpp_open(source: Instrument, world: World) -> None:
    """10 Vpp shown for 50 ohm is the end of the range, in whatever unit."""
    answer(source, "VOLT 10 VPP")
    assert world.drive.emf_vrms == pytest.approx(20 / math.sqrt(8))
    assert number(source, "VOLT? MAX") == pytest.approx(10 / math.sqrt(8))
    answer(source, "VOLT:UNIT VPP")
    assert number(source, "VOLT? MIN") == pytest.approx(5e-5 * math.sqrt(8))
    assert number(source, "FREQ? MAX") == 20e6
    assert number(source, "OUTP:LOAD? DEF") == 50.0
    assert errors(source) == []


@pytest.mark.parametrize(("word", "on"), [("ON", True), ("1", True), ("OFF", False), ("0", False)])
def test_output(source: Instrument, world: World, word: str, *, on: bool) -> None:
    """On and off, by word and by number."""
    answer(source, f"OUTP:STAT {word}")
    assert world.drive.on is on
    assert answer(source, "OUTP?") == str(int(on))


def test_other_queries(source: Instrument) -> None:
    """Words are answered in their short form."""
    assert answer(source, "VOLT:UNIT?;:FUNC?") == "VRMS;SIN"
    answer(source, "VOLT:UNIT vpp;:FUNCtion:SHAPe SINusoid")
    assert answer(source, "VOLT:UNIT?;:FUNC:SHAP?") == "VPP;SIN"


def test_reset_switches_off(source: Instrument, world: World) -> None:
    """``*RST`` is safe."""
    answer(source, "OUTP ON;:VOLT:UNIT VPP;:OUTP:LOAD INF;:FREQ 5;*RST")
    assert not world.drive.on
    assert answer(source, "VOLT:UNIT?;:OUTP:LOAD?") == "VRMS;+5.000000E+01"


def test_operation_complete_waits_for_the_source_alone(source: Instrument) -> None:
    """It knows nothing of what hangs on it."""
    response = source.handle("FREQ 5 kHz;*OPC?", 10.0)
    assert response is not None
    assert response.ready_at_s == pytest.approx(10.001)
