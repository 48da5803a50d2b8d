"""Links over real sockets: what every wire must do, and the traps of this one."""

import time
from collections.abc import Iterator

import pytest

from benchlog.bench.driver import LinkSettings
from benchlog.bench.link import VisaWire, open_link
from benchlog.bench.replay import Exchange, RecordingWire, ReplayWire
from benchlog.bench.wire import Wire
from benchlog.errors import (
    IdentityError,
    LinkError,
    LinkLost,
    LinkRefused,
    LinkTimeout,
    Misuse,
    ReplyError,
)
from benchlog.practice.faults import Fault
from benchlog.practice.server import PracticeServer
from benchlog.practice.world import World
from tests.bench import wire_checks
from tests.fakes.scpi_server import IDENTITY, ScpiServer, scpi_server

QUICK = LinkSettings(timeout_s=0.3)


@pytest.fixture
def instrument() -> Iterator[ScpiServer]:
    """Yield an instrument that answers ``GOOD?``."""
    with scpi_server(GOODq=b"1.25\r\n") as running:
        yield running


def opened(instrument: ScpiServer, settings: LinkSettings = QUICK) -> VisaWire:
    """Open a link to it."""
    return open_link(instrument.address, settings=settings)


@pytest.mark.parametrize("check", wire_checks.ALL)
def test_link_over_tcp_is_a_wire(check: object, instrument: ScpiServer) -> None:
    """Every check of every wire."""
    assert callable(check)
    check(lambda: opened(instrument))


@pytest.mark.parametrize("check", wire_checks.ALL)
def test_recorded_link_is_a_wire(check: object, instrument: ScpiServer) -> None:
    """Writing down changes nothing."""
    assert callable(check)
    check(lambda: RecordingWire(opened(instrument)))


@pytest.mark.parametrize("check", wire_checks.ALL)
def test_replay_is_a_wire(check: object) -> None:
    """A recording stands in for the instrument."""
    assert callable(check)
    identity = IDENTITY.decode().strip()
    good = Exchange("GOOD?", "1.25")
    tapes = {
        wire_checks.check_says_who_is_there: [Exchange("*IDN?", identity)],
        wire_checks.check_answers_come_without_terminator: [good],
        wire_checks.check_close_twice_is_quiet: [],
        wire_checks.check_no_answer_makes_it_dirty: [Exchange("NEVER?", None)],
        wire_checks.check_recovery_makes_it_clean: [Exchange("NEVER?", None), good, good],
    }

    def make() -> Wire:
        return ReplayWire(tapes[check], identity=identity)

    check(make)


def test_open_means_identified(instrument: ScpiServer) -> None:
    """The identity was asked for, padding is gone."""
    wire = opened(instrument)

    assert wire.identity == "Invented Works,AC-1,0042,1.0"
    assert instrument.asked == ["*IDN?"]
    wire.close()


@pytest.mark.parametrize(
    "address",
    ["", "10.0.0.7", "TCPIP::127.0.0.1::SOCKET", "TCPIP::::5025::SOCKET", "MAGIC::1::INSTR"],
)
def test_malformed_addresses_are_refused_at_once(address: str) -> None:
    """With an example of a good one."""
    with pytest.raises(LinkRefused) as refused:
        open_link(address, settings=QUICK)

    assert "SOCKET" in str(refused.value.expected or refused.value.hint or "check address")


def test_closed_port_is_refused() -> None:
    """Opening a socket there succeeds in the library; a link is not fooled."""
    with pytest.raises(LinkRefused) as refused:
        open_link("TCPIP::127.0.0.1::9::SOCKET", settings=QUICK)

    assert refused.value.where == "TCPIP::127.0.0.1::9::SOCKET"
    assert "switched on" in str(refused.value.hint)


@pytest.mark.parametrize("identity", [None, b"\n", b"\x01\x02\n"], ids=["silent", "empty", "odd"])
def test_who_does_not_identify_is_refused(identity: bytes | None) -> None:
    """Silence and rubbish alike."""
    with scpi_server() as instrument:
        instrument.answers["*IDN?"] = identity
        with pytest.raises(LinkRefused):
            opened(instrument)


def test_whole_message_goes_in_one_write(instrument: ScpiServer) -> None:
    """Separate writes would wait for each other on a network."""
    wire = opened(instrument)
    instrument.writes.clear()

    wire.ask("A 1\nB 2\nGOOD?", timeout_s=1.0)

    assert instrument.writes == [b"A 1\nB 2\nGOOD?\n"]
    wire.close()


def test_terminators_are_the_drivers() -> None:
    """CR+LF both ways."""
    with scpi_server(GOODq=b"1.25\r\n") as instrument:
        wire = opened(
            instrument,
            LinkSettings(read_terminator="\r\n", write_terminator="\r\n", timeout_s=0.3),
        )
        instrument.writes.clear()
        assert wire.ask("A\nGOOD?", timeout_s=0.3) == "1.25"
        assert instrument.writes == [b"A\r\nGOOD?\r\n"]
        wire.close()


def test_late_answer_is_never_the_answer_to_another_question(instrument: ScpiServer) -> None:
    """It comes while the link is being recovered, and is thrown away."""
    instrument.answers["SLOW?"] = b"9.99\n"
    instrument.late_s["SLOW?"] = 0.25
    wire = opened(instrument)

    with pytest.raises(LinkTimeout) as late:
        wire.ask("SLOW?", timeout_s=0.1)
    wire.recover()

    assert "within 0.1 s" in str(late.value.expected)
    assert wire.ask("GOOD?", timeout_s=1.0) == "1.25"
    wire.close()


@pytest.mark.parametrize("delay_s", [0.12, 0.3])
def test_tail_of_a_split_answer_is_never_an_answer(delay_s: float) -> None:
    """It comes while the link is being recovered, or later still."""
    fault = Fault(kind="split", nth=2, delay_s=delay_s)
    with PracticeServer(World(), faults={"output meter": [fault]}) as server:
        wire = open_link(server.addresses.output_meter, settings=QUICK)
        with pytest.raises(LinkTimeout):
            wire.ask("READ?", timeout_s=0.08)
        wire.recover()

        assert wire.ask("SYSTem:VERSion?", timeout_s=0.5) == "1999.0"
        wire.close()


def test_answer_without_terminator_is_none(instrument: ScpiServer) -> None:
    """A number could be cut in the middle; what came is not put before the next answer."""
    instrument.answers["CUT?"] = b"1.2"
    wire = opened(instrument)
    with pytest.raises(LinkTimeout):
        wire.ask("CUT?", timeout_s=0.1)
    wire.recover()

    assert wire.ask("GOOD?", timeout_s=0.5) == "1.25"
    wire.close()


def test_slow_instrument_is_told_from_a_vanished_one(instrument: ScpiServer) -> None:
    """A timeout for the one, a loss for the other."""
    instrument.answers["GONE?"] = b""
    wire = opened(instrument)
    with pytest.raises(LinkTimeout):
        wire.ask("NEVER?", timeout_s=0.1)
    wire.recover()

    with pytest.raises(LinkLost):
        wire.ask("GONE?", timeout_s=0.2)
    assert wire.dirty
    wire.close()


def test_dropped_connection_comes_back(instrument: ScpiServer) -> None:
    """By opening anew, and only to the same instrument."""
    instrument.answers["GONE?"] = b""
    wire = opened(instrument)
    with pytest.raises(LinkError):
        wire.ask("GONE?", timeout_s=0.2)

    wire.recover()

    assert wire.ask("GOOD?", timeout_s=1.0) == "1.25"
    wire.close()


def test_another_instrument_at_the_address_is_refused(instrument: ScpiServer) -> None:
    """After a recovery too."""
    instrument.answers["GONE?"] = b""
    wire = opened(instrument)
    instrument.answers["*IDN?"] = b"Other Works,AC-1,0042,1.0\n"
    with pytest.raises(LinkError):
        wire.ask("GONE?", timeout_s=0.2)

    with pytest.raises(IdentityError) as other:
        wire.recover()

    assert other.value.expected == "Invented Works,AC-1,0042,1.0"
    assert wire.dirty
    wire.close()


def test_instrument_that_stays_away_is_lost() -> None:
    """Recovery says so and names the address."""
    with scpi_server() as instrument:
        wire = opened(instrument)
    with pytest.raises(LinkLost) as lost:
        wire.recover()

    assert lost.value.where == instrument.address
    wire.close()


def test_interrupt_leaves_the_link_dirty(
    instrument: ScpiServer, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Ctrl-C in the middle of a question."""
    wire = opened(instrument)

    def interrupted(*_: object, **__: object) -> str:
        raise KeyboardInterrupt

    monkeypatch.setattr(wire._transport, "read", interrupted)
    with pytest.raises(KeyboardInterrupt):
        wire.ask("GOOD?", timeout_s=1.0)
    monkeypatch.undo()

    assert wire.dirty
    wire.recover()
    assert wire.ask("GOOD?", timeout_s=1.0) == "1.25"
    wire.close()


def test_more_answers_than_questions_are_refused(instrument: ScpiServer) -> None:
    """Whichever of them were taken could be the wrong one."""
    instrument.answers["TWICE?"] = b"1.0\n2.0\n"
    wire = opened(instrument)

    with pytest.raises(ReplyError, match="nobody asked for"):
        wire.ask("TWICE?", timeout_s=1.0)

    wire.recover()
    assert wire.ask("GOOD?", timeout_s=1.0) == "1.25"
    wire.close()


def test_answer_that_comes_between_two_questions_is_refused(instrument: ScpiServer) -> None:
    """The next answer would be the one to nothing."""
    instrument.answers["EVENT"] = b"5\n"
    instrument.late_s["EVENT"] = 0.05
    wire = opened(instrument)

    def go_on() -> None:
        # On a busy machine it may come before the message is through; refused all the same.
        wire.send("EVENT")
        end_s = time.monotonic() + 2.0
        while not wire._transport.unread() and time.monotonic() < end_s:
            time.sleep(0.001)
        wire.ask("GOOD?", timeout_s=1.0)

    with pytest.raises(ReplyError, match="nobody asked for") as refused:
        go_on()

    assert refused.value.raw == "5\n"
    assert "GOOD?" not in instrument.asked
    assert wire.dirty
    wire.close()


def test_flood_does_not_keep_recovery_for_ever(instrument: ScpiServer) -> None:
    """Bounded work, then a fresh connection."""
    instrument.answers["FLOOD?"] = b"1\n" * 5000
    wire = opened(instrument)
    with pytest.raises(ReplyError):
        wire.ask("FLOOD?", timeout_s=1.0)

    began_s = time.monotonic()
    wire.recover()

    assert time.monotonic() - began_s < 3.0
    assert wire.ask("GOOD?", timeout_s=1.0) == "1.25"
    wire.close()


def test_answers_are_latin_1_and_messages_ascii(instrument: ScpiServer) -> None:
    """Ohm signs come through; what cannot be sent is refused."""
    instrument.answers["SIGN?"] = "50 \u00b5V\n".encode("latin-1")
    wire = opened(instrument)
    assert wire.ask("SIGN?", timeout_s=1.0) == "50 \u00b5V"
    with pytest.raises(Misuse, match="only ASCII"):
        wire.ask("\u03a9?", timeout_s=1.0)
    assert not wire.dirty
    wire.close()


def test_closed_link_takes_nothing(instrument: ScpiServer) -> None:
    """That is a bug of the caller."""
    wire = opened(instrument)
    wire.close()
    with pytest.raises(Misuse, match="is closed"):
        wire.send("A")


def test_replay_refuses_what_was_not_recorded() -> None:
    """Order and words."""
    replay = ReplayWire([Exchange("A", None), Exchange("B?", "1")], identity="x")

    with pytest.raises(LinkLost, match="does not continue with 'C'"):
        replay.send("C")
    assert replay.dirty
    replay.recover()
    replay.send("A")
    assert replay.ask("B?", timeout_s=1.0) == "1"
    with pytest.raises(LinkLost, match="come to its end"):
        replay.ask("B?", timeout_s=1.0)
