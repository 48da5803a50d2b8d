"""Whatever is sent, an instrument answers by the standard or not at all."""

import re
from collections.abc import Callable

import pytest
from hypothesis import given
from hypothesis import strategies as st

from benchlog.practice.error_table import ERROR_TEXTS
from benchlog.practice.meter import make_meter
from benchlog.practice.scpi import Instrument
from benchlog.practice.source import make_source
from benchlog.practice.world import World
from tests.fakes.practice_talk import answer

WORDS = (
    *("FREQ", "freq:cw", "VOLT", "VOLT:AC", "RANG", ":OUTP", "LOAD", "*IDN?", "*OPC?", "*WAI"),
    *("READ?", "FETC?", "INIT", "CONF:VOLT:AC", "MEAS:AC?", "SYST:ERR?", "*ESE", "STAT:QUES"),
    *(" ", " ", ";", ";", ":", ",", "?", "1", "1E3", "-.5", "1E400", "kHz", "MV", "INF", "MAX"),
    *("'a'", '"', "#13abc", "#H1F", "(1)", "\r", "\t", "\xb5", "\x00", "ON", "*"),
)
MESSAGES = st.one_of(
    st.text(st.characters(max_codepoint=255), max_size=40),
    st.lists(st.sampled_from(WORDS), max_size=12).map("".join),
)
RESPONSE = re.compile(r"[ -~]+")


@pytest.mark.parametrize("make", [make_source, lambda world: make_meter(world, "output")])
@given(message=MESSAGES)
def test_no_message_breaks_an_instrument(make: Callable[[World], Instrument], message: str) -> None:
    """A response is one line of printable ASCII; every error has a number that the table knows."""
    instrument = make(World())
    response = instrument.handle(message, 0.0)
    assert response is None or RESPONSE.fullmatch(response.text)
    entries = answer(instrument, "SYST:ERR:ALL?")
    assert entries is not None
    for number in re.findall(r"(-?\d+),\"", entries):
        assert int(number) in ERROR_TEXTS
    assert answer(instrument, "*OPC?") == "1"
