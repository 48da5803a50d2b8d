"""SCPI-99 and IEEE 488.2 numbers that a practice instrument must show.

Source:
    SCPI-99, volume 2, 21.8, as seen in a public transcription of its table; marks "from memory"
    where the standard's text was not at hand.
"""

import pytest

from benchlog.practice.error_table import ERROR_TEXTS, error_entry, event_bit
from benchlog.practice.meter import make_meter
from benchlog.practice.scpi import Instrument
from benchlog.practice.source import make_source
from benchlog.practice.world import World

# A selection of every class, typed again from the published table.
PUBLISHED = {
    -101: "Invalid character",
    -102: "Syntax error",
    -103: "Invalid separator",
    -104: "Data type error",
    -108: "Parameter not allowed",
    -109: "Missing parameter",
    -111: "Header separator error",
    -112: "Program mnemonic too long",
    -113: "Undefined header",
    -114: "Header suffix out of range",
    -121: "Invalid character in number",
    -123: "Exponent too large",
    -124: "Too many digits",
    -128: "Numeric data not allowed",
    -131: "Invalid suffix",
    -134: "Suffix too long",
    -138: "Suffix not allowed",
    -141: "Invalid character data",
    -144: "Character data too long",
    -148: "Character data not allowed",
    -151: "Invalid string data",
    -158: "String data not allowed",
    -161: "Invalid block data",
    -168: "Block data not allowed",
    -171: "Invalid expression",
    -178: "Expression data not allowed",
    -213: "Init ignored",
    -221: "Settings conflict",
    -222: "Data out of range",
    -224: "Illegal parameter value",
    -230: "Data corrupt or stale",
    -350: "Queue overflow",
    -363: "Input buffer overrun",
    -410: "Query INTERRUPTED",
    -420: "Query UNTERMINATED",
    -430: "Query DEADLOCKED",
    -440: "Query UNTERMINATED after indefinite response",
}


@pytest.mark.parametrize("number", sorted(PUBLISHED))
def test_every_number_has_its_published_text(number: int) -> None:
    """Number and text stand together as in the table."""
    assert ERROR_TEXTS[number] == PUBLISHED[number]
    assert error_entry(number) == f'{number},"{PUBLISHED[number]}"'


@pytest.mark.parametrize(
    ("number", "bit"),
    [
        (-100, 5),
        (-199, 5),
        (-200, 4),
        (-299, 4),
        (-300, 3),
        (-399, 3),
        (1, 3),
        (32767, 3),
        (-400, 2),
        (-499, 2),
        (-500, 7),
        (-600, 6),
        (-700, 1),
        (-800, 0),
    ],
)
def test_class_of_an_error_sets_its_bit(number: int, bit: int) -> None:
    """Each class of numbers belongs to one bit of the event register (same table)."""
    assert event_bit(number) == 2**bit


def _instruments() -> list[Instrument]:
    world = World()
    return [make_source(world), make_meter(world, "input"), make_meter(world, "output")]


@pytest.mark.parametrize("instrument", _instruments(), ids=["source", "input", "output"])
class TestIdentity:
    """``*IDN?`` of every instrument (IEEE 488.2, 10.14, from memory)."""

    def test_has_four_fields_in_at_most_72_characters(self, instrument: Instrument) -> None:
        """Manufacturer, model, serial, firmware; no semicolon inside."""
        response = instrument.handle("*IDN?", 0.0)
        assert response is not None
        fields = response.text.split(",")
        assert len(fields) == 4
        assert all(fields)
        assert len(response.text) <= 72
        assert ";" not in response.text

    def test_says_that_it_is_a_practice_bench(self, instrument: Instrument) -> None:
        """The manufacturer field marks every result as simulated."""
        assert instrument.device.identity.split(",")[0] == "benchlog practice"


@pytest.mark.parametrize(
    ("message", "weight"),
    [("*OPC", 1), ("FETC?;*WAI", 16), ("BOGUS", 32), ("*IDN?;*IDN?", 4)],
)
def test_event_register_weights(message: str, weight: int) -> None:
    """OPC 1, QYE 4, EXE 16, CME 32, power on 128 (weights as published)."""
    meter = make_meter(World(), "input")
    response = meter.handle("*ESR?", 0.0)
    assert response is not None
    assert response.text == "128"
    meter.handle(message, 0.0)
    response = meter.handle("*ESR?", 0.0)
    assert response is not None
    assert int(response.text) == weight


def test_infinity_and_the_not_a_number_code_are_the_published_numbers() -> None:
    """9.9E37 is infinity and a legal reply to a load query; it is a plain finite double."""
    source = make_source(World())
    response = source.handle("OUTP:LOAD INF;LOAD?", 0.0)
    assert response is not None
    assert float(response.text) == 9.9e37


@pytest.mark.parametrize(
    ("written", "value"), [("#HA2F", 2607), ("#Q62", 50), ("#B01011", 11), ("#H7B", 123)]
)
def test_non_decimal_numbers(written: str, value: int) -> None:
    """Hexadecimal, octal and binary as published; the register takes what fits eight bits."""
    meter = make_meter(World(), "input")
    response = meter.handle(f"*ESE {written};*ESE?;:SYST:ERR?", 0.0)
    assert response is not None
    expected = f'{value};0,"No error"' if value < 256 else '0;-222,"Data out of range"'
    assert response.text == expected


def test_full_queue_ends_in_overflow_and_stays_in_order() -> None:
    """First in, first out; the last entry becomes -350 (SCPI-99, from memory)."""
    meter = make_meter(World(), "input")
    for _ in range(30):
        meter.handle("BOGUS", 0.0)
    entries = []
    for _ in range(21):
        response = meter.handle("SYST:ERR?", 0.0)
        assert response is not None
        entries.append(response.text)
    assert entries == ['-113,"Undefined header"'] * 19 + ['-350,"Queue overflow"', '0,"No error"']
