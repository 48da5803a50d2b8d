"""Message exchange and the commands that every instrument has."""

import pytest

from benchlog.practice.meter import make_meter
from benchlog.practice.scpi import Instrument
from benchlog.practice.source import make_source
from benchlog.practice.world import World
from tests.fakes.practice_talk import answer, errors


@pytest.fixture
def source() -> Instrument:
    """A source that has just been switched on."""
    return make_source(World())


@pytest.fixture
def meter() -> Instrument:
    """A meter that has just been switched on."""
    return make_meter(World(), "output")


@pytest.mark.parametrize(
    ("message", "response"),
    [
        ("*OPC?", "1"),
        ("*opc?;*TST?", "1;0"),
        ("SYST:VERS?", "1999.0"),
        ("system:version?;error?", '1999.0;0,"No error"'),
        ("FREQ 2 kHz", None),
        ("FREQ 2 kHz;FREQ?", "+2.00000000000E+03"),
        ("SOUR:FREQ 2 kHz;VOLT 0.1;:FREQ?;VOLT?", "+2.00000000000E+03;+1.00000000000E-01"),
        ("SOUR:FREQ 2 kHz;*OPC?;FREQ?", "1;+2.00000000000E+03"),
        ("OUTP:LOAD 50;STAT ON;STAT?", "1"),
        ("VOLT:UNIT VPP;*OPC?;UNIT?", "1;VPP"),
        (";;*OPC?;", "1"),
        ("", None),
        ("\r", None),
        (" *OPC? \r", "1"),
    ],
)
def test_compound_messages(source: Instrument, message: str, response: str | None) -> None:
    """Responses are joined; the header path carries on, and common commands leave it alone."""
    assert answer(source, message) == response
    assert errors(source) == []


@pytest.mark.parametrize(
    ("message", "numbers"),
    [
        ("SOUR:FREQ 2 kHz;OUTP ON", [-113]),
        ("OUTP:LOAD 50;FREQ 1", [-113]),
        ("FREQUE 1", [-113]),
        ("FREQ2 1", [-114]),
        ("FREQ", [-109]),
        ("FREQ 1,2", [-108]),
        ("*RST 1", [-108]),
        ("*RST?", [-113]),
        ("FREQ? 1", [-128]),
        ("*ESE 256", [-222]),
        ("*ESE -1", [-222]),
        ("*SRE 1E30", [-222]),
        ("STAT:QUES:ENAB 32768", [-222]),
        ("FREQ 'x", [-151]),
        ("FREQ 0;VOLT 1E9;OUTP ON", [-222, -222]),
    ],
)
def test_errors_of_messages(source: Instrument, message: str, numbers: list[int]) -> None:
    """Each mistake leaves its number in the queue."""
    assert answer(source, message) is None
    assert errors(source) == numbers


def test_command_error_gives_up_the_rest_of_the_message(source: Instrument) -> None:
    """What came before it is done, what comes after is not."""
    assert answer(source, "*OPC?;BOGUS;FREQ 5 kHz;FREQ?") == "1"
    assert answer(source, "FREQ?") == "+1.00000000000E+03"
    assert errors(source) == [-113]
    assert answer(source, "FREQ 1 V;FREQ 5 kHz;FREQ?") is None
    assert answer(source, "FREQ?") == "+1.00000000000E+03"
    assert errors(source) == [-131]


def test_execution_error_goes_on_with_the_message(source: Instrument) -> None:
    """A value out of range changes nothing and stops nothing."""
    assert answer(source, "FREQ 1 GHZ;FREQ?;VOLT 0.2;VOLT?") == (
        "+1.00000000000E+03;+2.00000000000E-01"
    )
    assert errors(source) == [-222]


def test_execution_error_found_while_reading_goes_on_too(meter: Instrument) -> None:
    """What counts is the class of the number, not where it was found."""
    assert answer(meter, "FUNC 'CURR';:VOLT:AC:BAND 1;BAND?") == "+1.000000E+00"
    assert errors(meter) == [-224]


def test_nothing_can_be_asked_after_an_indefinite_response(source: Instrument) -> None:
    """``*IDN?`` has to be the last query of a message: -440."""
    identity = answer(source, "*IDN?")
    assert answer(source, "*IDN?;FREQ 2 kHz;*OPC?;FREQ 3 kHz") == identity
    assert errors(source) == [-440]
    assert answer(source, "FREQ?") == "+2.00000000000E+03"
    assert answer(source, "*OPC?;*IDN?") == f"1;{identity}"
    assert errors(source) == []


class TestBus:
    """A bus knows who talks, so it can tell that a reply was not read (IEEE 488.2, 6.3)."""

    def test_reading_without_a_query_is_unterminated(self, source: Instrument) -> None:
        """-420, and there is nothing to read."""
        source.write("FREQ 2 kHz", 0.0)
        assert source.read() is None
        assert errors(source) == [-420]

    def test_unread_response_is_interrupted_and_thrown_away(self, source: Instrument) -> None:
        """-410, and the next read gets the new response."""
        source.write("FREQ?", 0.0)
        source.write("*OPC?", 0.0)
        response = source.read()
        assert response is not None
        assert response.text == "1"
        assert source.read() is None
        assert errors(source) == [-410, -420]

    def test_device_clear_is_no_error(self, source: Instrument) -> None:
        """A response that was cleared away interrupts nothing."""
        source.write("FREQ?", 0.0)
        source.clear_output()
        source.write("*OPC?", 0.0)
        assert errors(source) == []


def test_reset_leaves_status_alone(source: Instrument) -> None:
    """``*RST`` takes settings back, ``*CLS`` takes status back (from memory)."""
    answer(source, "FREQ 5 kHz;BOGUS")
    answer(source, "*ESE 4;*RST")
    assert answer(source, "FREQ?;*ESE?") == "+1.00000000000E+03;4"
    assert errors(source) == [-113]
    answer(source, "BOGUS;")
    answer(source, "*CLS")
    assert errors(source) == []
    assert answer(source, "*ESR?") == "0"


def test_service_register_ignores_its_master_bit(meter: Instrument) -> None:
    """Bit 6 of ``*SRE`` is always zero (IEEE 488.2, 11.3, from memory)."""
    assert answer(meter, "*SRE 255;*SRE?") == "191"


def test_status_byte_sees_a_response_that_waits(meter: Instrument) -> None:
    """Message available is true only behind another query."""
    assert answer(meter, "*STB?") == "0"
    assert answer(meter, "*OPC?;*STB?") == "1;16"


def test_status_groups_exist_and_stay_quiet(meter: Instrument) -> None:
    """SCPI demands them of every instrument."""
    assert answer(meter, "STAT:QUES?;OPER:COND?;EVEN?;:STAT:OPER?") == "0;0;0;0"
    assert answer(meter, "STAT:QUES:ENAB 9;ENAB?;COND?;EVEN?") == "9;0;0"
    assert answer(meter, "STAT:PRES;QUES:ENAB?") == "0"


def test_error_queue_queries(meter: Instrument) -> None:
    """One, all, and how many."""
    answer(meter, "BOGUS")
    answer(meter, "FETC?")
    assert answer(meter, "SYST:ERR:COUN?") == "2"
    assert answer(meter, "SYST:ERR:NEXT?;ALL?") == (
        '-113,"Undefined header";-230,"Data corrupt or stale"'
    )


class TestOperationComplete:
    """A reading takes time; three commands can wait for it or tell of it."""

    def test_query_waits(self, meter: Instrument) -> None:
        """The response is ready when the reading is."""
        response = meter.handle("INIT;*OPC?", 10.0)
        assert response is not None
        assert response.ready_at_s == meter.device.busy_until_s > 10.0

    def test_bit_is_set_afterwards(self, meter: Instrument) -> None:
        """``*OPC`` returns at once and sets bit 0 later."""
        answer(meter, "*CLS;INIT;*OPC", 10.0)
        assert answer(meter, "*ESR?", 10.0) == "0"
        assert answer(meter, "*ESR?", meter.device.busy_until_s) == "1"

    def test_wait_delays_what_follows(self, meter: Instrument) -> None:
        """After ``*WAI`` another reading may begin."""
        answer(meter, "INIT;*WAI;INIT", 10.0)
        assert errors(meter) == []
        answer(meter, "INIT;INIT", 20.0)
        assert errors(meter) == [-213]

    def test_wait_holds_up_the_next_message_too(self, meter: Instrument) -> None:
        """It may stand alone in its message."""
        assert meter.handle("INIT;*WAI", 10.0) is None
        assert meter.free_at_s == meter.device.busy_until_s > 10.0

    def test_idle_is_complete_at_once(self, source: Instrument) -> None:
        """With nothing pending the bit is there in the same message."""
        assert answer(source, "*CLS;*OPC;*ESR?", 10.0) == "1"
