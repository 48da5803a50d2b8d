"""Source and meters: what is sent, what a reply means, what is refused and how it is told."""

import math
from collections.abc import Sequence

import pytest

from benchlog.bench.driver import Driver
from benchlog.bench.driver_read import parse_driver, read_driver
from benchlog.bench.replay import Exchange, ReplayWire
from benchlog.bench.roles import Meter, Source, display_ratio
from benchlog.errors import CommandRefused, LinkLost, LinkTimeout, Misuse, ReplyError
from benchlog.folders import data_folder
from benchlog.records import Reading, Status

PREPARE = "*CLS\nOUTPut OFF\nSOURce:VOLTage:UNIT VRMS\nSYSTem:ERRor?"
POINT = "SOURce:FREQuency 1000\nSOURce:VOLTage 0.5\n*WAI\nSYSTem:ERRor?"
ERROR, FINE = "SYSTem:ERRor?", '0,"No error"'
OFF = Exchange("OUTPut OFF\n*OPC?", "1")


def wire(exchanges: Sequence[Exchange]) -> ReplayWire:
    """Return a wire that plays this back and nothing else."""
    return ReplayWire(exchanges, identity="Invented Works,SG-7,0017,2.1", address="replay")


def source(*exchanges: Exchange, load_ohm: float | None = None) -> Source:
    """Return a source that has this conversation."""
    return Source(
        wire(exchanges),
        read_driver("source_generic"),
        load_ohm=load_ohm,
        display_ratio=display_ratio(load_ohm=load_ohm, source_ohm=50.0),
    )


def meter(*exchanges: Exchange, driver: Driver | None = None) -> Meter:
    """Return an output meter that has this conversation."""
    return Meter(wire(exchanges), driver or read_driver("meter_generic"), role="output meter")


@pytest.mark.parametrize(
    ("load_ohm", "after"),
    [
        (None, []),
        (math.inf, [Exchange(f"OUTPut:LOAD INFinity\n{ERROR}", FINE)]),
        (50.0, [Exchange(f"OUTPut:LOAD 50\n{ERROR}", FINE)]),
    ],
)
def test_source_is_prepared_with_its_output_off(
    load_ohm: float | None, after: list[Exchange]
) -> None:
    """Then the load its display counts with, where one is said; each proved by the queue."""
    prepared = source(Exchange(PREPARE, FINE), *after, OFF, load_ohm=load_ohm)

    prepared.prepare()
    prepared.check_errors()  # free: the queue was read
    prepared.close()


@pytest.mark.parametrize(
    ("load_ohm", "ratio"), [(None, 1.0), (math.inf, 1.0), (50.0, 0.5), (1000.0, 1000 / 1050)]
)
def test_display_over_open_output(load_ohm: float | None, ratio: float) -> None:
    """A divider of source resistance and load (Ohm's law); 1 kohm at 50 ohm gives 0.952."""
    assert display_ratio(load_ohm=load_ohm, source_ohm=50.0) == pytest.approx(ratio)


def test_source_sweeps() -> None:
    """One exchange for a point, one for the output."""
    sweeping = source(Exchange(POINT, FINE), Exchange("OUTPut ON\n*OPC?", "1"), OFF)

    sweeping.set_point(frequency_hz=1e3, level_vrms=0.5)
    sweeping.switch_on()
    sweeping.close()

    assert sweeping.settle_s(100.0) == 0.015


def test_open_level_is_halved_for_a_display_at_50_ohm() -> None:
    """The board sees what was asked for."""
    halved = source(Exchange(POINT, FINE), load_ohm=50.0)
    halved.set_point(frequency_hz=1e3, level_vrms=1.0)


def test_refused_point_is_told_with_the_whole_queue() -> None:
    """In the order of the queue, with role, address, and what was sent."""
    refusing = source(
        Exchange(POINT, '-222,"Data out of range;SOURce:VOLTage ""0.5"""'),
        Exchange(ERROR, '-221,"Settings conflict"'),
        Exchange(ERROR, FINE),
        OFF,
    )

    with pytest.raises(CommandRefused) as refused:
        refusing.set_point(frequency_hz=1e3, level_vrms=0.5)

    assert refused.value.what == (
        "the instrument refused 'SOURce:FREQuency 1000 | SOURce:VOLTage 0.5 | *WAI |"
        ' SYSTem:ERRor?\': -222,"Data out of range;SOURce:VOLTage "0.5""; -221,"Settings conflict"'
    )
    assert refused.value.where == "source at replay"
    refusing.close()


def test_queue_that_never_empties_is_read_thirty_times() -> None:
    """Some entries come back for ever."""
    stuck = source(*[Exchange(POINT, '-310,"System error"')], *[Exchange(ERROR, '-310,""')] * 30)

    with pytest.raises(CommandRefused) as refused:
        stuck.set_point(frequency_hz=1e3, level_vrms=0.5)

    assert refused.value.what.count("-310") == 31


@pytest.mark.parametrize("reply", ["0", "", '-113,"x"', "0.339"])
def test_output_is_off_only_when_the_source_says_so(reply: str) -> None:
    """Anything but 1 is out of step: the link is dirty, the reply is kept."""
    conversation = wire([Exchange(OFF.message, reply)])
    odd = Source(conversation, read_driver("source_generic"))

    with pytest.raises(ReplyError) as refused:
        odd.switch_off()

    assert refused.value.raw == reply
    assert refused.value.where == "source at replay, asked 'OUTPut OFF | *OPC?'"
    assert conversation.dirty
    odd.recover()
    assert not conversation.dirty


def test_source_goes_off_when_it_is_closed() -> None:
    """Once; a link that is lost or dirty is closed without another word."""
    conversation = wire([OFF])
    closing = Source(conversation, read_driver("source_generic"))
    closing.close()
    closing.close()
    with pytest.raises(Misuse):
        conversation.send("*CLS")

    source().close()
    dirty = wire([])
    dirty.dirty = True
    Source(dirty, read_driver("source_generic")).close()


def test_meter_reads_numbers_and_states() -> None:
    """In V RMS, with the reply as it came."""
    reading = meter(
        Exchange("*CLS\nCONFigure:VOLTage:AC\nSYSTem:ERRor?", FINE),
        Exchange("READ?", "+3.39411255E-01"),
        Exchange("READ?", "+9.90000000E+37"),
        Exchange("READ?", "+9.91000000E+37"),
    )
    reading.prepare()

    assert [reading.read_level(frequency_hz=1e3) for _ in range(3)] == [
        Reading(value_vrms=0.339411255, status=Status.OK, raw="+3.39411255E-01"),
        Reading(value_vrms=None, status=Status.OVERLOAD, raw="+9.90000000E+37"),
        Reading(value_vrms=None, status=Status.NOT_A_NUMBER, raw="+9.91000000E+37"),
    ]
    assert reading.identity == "Invented Works,SG-7,0017,2.1"
    reading.close()
    reading.close()


def test_negative_level_is_no_level() -> None:
    """The magnitude of an AC voltage has no sign."""
    assert meter(Exchange("READ?", "-0.1")).read_level(frequency_hz=1e3) == Reading(
        value_vrms=None, status=Status.NOT_A_NUMBER, raw="-0.1"
    )


def test_meter_in_other_units_and_words() -> None:
    """Peak to peak behind a unit, and the maker's own word for an overload."""
    text = (data_folder("drivers") / "meter_generic.toml").read_text(encoding="utf-8")
    text = text.replace('level_unit = "Vrms"', 'level_unit = "Vpp"').replace(
        'lines = ["READ?"]', 'lines = ["READ?"]\nunit = "VPP"\noverload = ["OVLD"]'
    )
    driver, _ = parse_driver(text.encode(), "here")
    reading = meter(Exchange("READ?", "2.0 VPP"), Exchange("READ?", "OVLD"), driver=driver)

    assert reading.read_level(frequency_hz=1e3).value_vrms == pytest.approx(1 / math.sqrt(2))
    assert reading.read_level(frequency_hz=1e3).status is Status.OVERLOAD


@pytest.mark.parametrize("reply", ["", "1,234", "NaN", "1e400", "----", FINE, "1.0 V"])
def test_reading_that_is_none(reply: str) -> None:
    """Refused, kept, and told with role, address and question; the link is dirty."""
    conversation = wire([Exchange("READ?", reply)])
    odd = Meter(conversation, read_driver("meter_generic"), role="input meter")

    with pytest.raises(ReplyError) as refused:
        odd.read_level(frequency_hz=1e3)

    assert refused.value.raw == reply
    assert refused.value.where == "input meter at replay, asked 'READ?'"
    assert conversation.dirty


def test_no_answer_is_told_with_the_role() -> None:
    """So that a person knows which instrument to look at."""
    silent = meter(Exchange("READ?", None))

    with pytest.raises(LinkTimeout) as timeout:
        silent.read_level(frequency_hz=1e3)
    assert timeout.value.where == "output meter: replay"

    with pytest.raises(LinkLost) as lost:
        source().switch_on()
    assert lost.value.where == "source: replay"


def test_slow_readings_are_waited_for() -> None:
    """The time a reading takes comes on top of the patience of its message."""
    waited: list[float] = []

    class Patient(ReplayWire):
        def ask(self, message: str, *, timeout_s: float) -> str:
            waited.append(timeout_s)
            return super().ask(message, timeout_s=timeout_s)

    text = (data_folder("drivers") / "meter_generic.toml").read_text(encoding="utf-8")
    driver, _ = parse_driver(
        text.replace('time = "5 ms"', 'time = "0 s"\ncycles = 10').encode(), ""
    )
    slow = Meter(Patient([Exchange("READ?", "1.0")], identity="x"), driver, role="output meter")

    slow.read_level(frequency_hz=2.0)

    assert slow.reading_s(2.0) == 5.0
    assert waited == [10.0]


def test_driver_without_an_error_queue() -> None:
    """Nothing is asked that the instrument does not know."""
    text = (data_folder("drivers") / "meter_generic.toml").read_text(encoding="utf-8")
    text = text.replace(
        '"CONFigure:VOLTage:AC", "SYSTem:ERRor?"]\nreply = "error"', '"CONFigure:VOLTage:AC"]'
    ).replace('[message.error]\nlines = ["SYSTem:ERRor?"]\nreply = "error"\n', "")
    driver, _ = parse_driver(text.encode(), "here")
    plain = meter(Exchange("*CLS\nCONFigure:VOLTage:AC", None), driver=driver)

    plain.prepare()
    plain.check_errors()
