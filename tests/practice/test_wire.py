"""The practice instruments in the same process, with a clock that is a number."""

from typing import TYPE_CHECKING

import pytest

from benchlog.errors import IdentityError, LinkLost, LinkRefused, LinkTimeout, Misuse, ReplyError
from benchlog.practice.board import PracticeBoard
from benchlog.practice.faults import Fault, FaultKind
from benchlog.practice.wire import PracticeWire, PracticeWires, VirtualClock
from benchlog.practice.world import PERFECT, World
from tests.fakes.practice_boards import PREAMP

if TYPE_CHECKING:
    from benchlog.bench.wire import Wire


def wire_with(*faults: Fault) -> PracticeWire:
    """Return a wire to an output meter with faults."""
    return PracticeWires(World(), faults={"output meter": faults}).open("output meter")


def test_clock_moves_when_somebody_waits() -> None:
    """And only then, and never backwards."""
    clock = VirtualClock(5.0)
    clock.wait(2.0)
    clock.wait(-1.0)
    assert clock.now_s() == 7.0


def test_a_whole_measurement_takes_no_time() -> None:
    """Source, board and two meters: gain is read out over in."""
    wires = PracticeWires(World(PracticeBoard(PREAMP, spread=False), quality=PERFECT))
    source, output, before = (
        wires.open(role) for role in ("source", "output meter", "input meter")
    )
    assert source.ask("OUTP:LOAD INF;:VOLT 20 MVPP;:FREQ 1 kHz;:OUTP ON;*OPC?", timeout_s=1) == "1"
    wires.clock.wait(0.1)
    gain = float(output.ask("READ?", timeout_s=1)) / float(before.ask("READ?", timeout_s=1))
    assert gain == pytest.approx(48.0, rel=1e-3)
    assert 0.1 < wires.clock.now_s() < 0.12


def test_wire_has_the_face_of_every_wire() -> None:
    """It shows what a link to a real instrument shows (the type checker sees to the rest)."""
    wire: Wire = PracticeWires(World()).open("source")
    assert isinstance(wire, PracticeWire)
    assert (wire.address, wire.dirty) == ("practice::source", False)
    assert wire.identity == wire.ask("*IDN?", timeout_s=1.0)


def test_time_passes_while_the_instrument_is_busy() -> None:
    """An answer is there when it is ready, not before."""
    wires = PracticeWires(World())
    meter = wires.open("output meter")
    meter.ask("READ?", timeout_s=1)
    assert wires.clock.now_s() == pytest.approx(4e-3)


def test_board_put_down_now_has_to_settle() -> None:
    """Who reads at once sees it."""
    wires = PracticeWires(World(quality=PERFECT))
    source, meter = wires.open("source"), wires.open("output meter")
    source.send("VOLT 1;:OUTP ON")
    wires.clock.wait(1.0)
    settled = meter.ask("READ?", timeout_s=1)
    wires.put_board(None)
    assert wires.world.board_label == "bypass"
    assert meter.ask("READ?", timeout_s=1) != settled
    wires.clock.wait(1.0)
    assert meter.ask("READ?", timeout_s=1) == settled


def test_setting_asked_for_an_answer_times_out() -> None:
    """The wire is dirty after that, and clean again after recovery."""
    wire = wire_with()
    with pytest.raises(LinkTimeout, match=r"no answer to 'INIT' within 0\.5 s"):
        wire.ask("INIT", timeout_s=0.5)
    assert wire.dirty
    for use in (lambda: wire.send("INIT"), lambda: wire.ask("READ?", timeout_s=1)):
        with pytest.raises(Misuse, match="dirty"):
            use()
    wire.recover()
    assert not wire.dirty
    assert wire.ask("*OPC?", timeout_s=1) == "1"


def test_closed_wire_is_closed() -> None:
    """Twice is quiet; use is not."""
    wire = wire_with()
    wire.close()
    wire.close()
    for use in (wire.recover, lambda: wire.send("INIT")):
        with pytest.raises(Misuse, match="closed"):
            use()


def test_lines_are_messages_of_their_own() -> None:
    """One transmission may carry several; each waits until the one before is done."""
    wires = PracticeWires(World())
    meter = wires.open("output meter")
    assert meter.ask("VOLT:AC:BAND 200\nREAD?", timeout_s=1).endswith("E-06")
    ranged = meter.ask("INIT\nVOLT:AC:RANG 10\nVOLT:AC:RANG?", timeout_s=1)
    assert ranged == "+1.000000E+01"


def test_more_answers_than_questions_are_refused() -> None:
    """One of them would be taken for the answer to another question."""
    meter = PracticeWires(World()).open("output meter")
    meter.send("*IDN?")
    with pytest.raises(ReplyError, match="an answer came that nobody asked for") as refused:
        meter.ask("READ?", timeout_s=1)
    assert refused.value.raw.strip() == meter.identity
    assert meter.dirty


def test_message_after_a_timeout_waits_for_the_instrument() -> None:
    """A reading under way is finished first, as on a socket."""
    wires = PracticeWires(World())
    meter = wires.open("output meter")
    with pytest.raises(LinkTimeout):
        meter.ask("VOLT:AC:BAND 1;:READ?", timeout_s=0.01)
    meter.recover()
    assert meter.ask("*TST?", timeout_s=1) == "0"
    assert wires.clock.now_s() >= 0.404


def test_late_answer_is_not_taken_for_another() -> None:
    """The trap of every stream: the next question would get the old answer."""
    wire = wire_with(Fault(kind="late", delay_s=1.0))
    with pytest.raises(LinkTimeout):
        wire.ask("READ?", timeout_s=0.5)
    wire.dirty = False
    with pytest.raises(ReplyError) as refused:
        wire.ask("*OPC?", timeout_s=1.0)
    assert refused.value.raw.strip() == "1"


def test_wait_as_a_message_of_its_own_holds_up_what_follows() -> None:
    """The question behind it is answered when the source has switched."""
    wires = PracticeWires(World())
    source = wires.open("source")
    assert source.ask("FREQ 5 kHz\n*WAI\nSYST:ERR?", timeout_s=1) == '0,"No error"'
    assert wires.clock.now_s() == pytest.approx(1e-3)


def test_recovery_throws_the_late_answer_away() -> None:
    """Whether it has arrived already or is still on its way."""
    for delay_s in (0.55, 5.0):
        wire = wire_with(Fault(kind="late", delay_s=delay_s))
        with pytest.raises(LinkTimeout):
            wire.ask("READ?", timeout_s=0.5)
        wire.recover()
        assert wire.ask("*OPC?", timeout_s=1.0) == "1"


def test_recovery_asks_once_where_once_is_enough() -> None:
    """What arrived while it waited is not taken for the identity, so nothing is opened anew."""
    wire = wire_with(Fault(kind="late", delay_s=0.55), Fault(kind="dropped", nth=3))
    with pytest.raises(LinkTimeout):
        wire.ask("READ?", timeout_s=0.5)
    wire.recover()
    with pytest.raises(LinkTimeout):
        wire.ask("*OPC?", timeout_s=0.5)


@pytest.mark.parametrize(
    ("kind", "answer"),
    [("split", "1"), ("garbled", "\xce"), ("overloaded", "+9.900000E+37")],
)
def test_spoiled_answers(kind: FaultKind, answer: str) -> None:
    """The second answer is spoiled; the first was ``0``."""
    wire = wire_with(Fault(kind=kind, nth=2, delay_s=0.1))
    assert wire.ask("*TST?", timeout_s=1.0) == "0"
    assert wire.ask("*OPC?", timeout_s=1.0) == answer


def test_stale_answer_is_refused() -> None:
    """An old answer came first, and the right one stands behind it."""
    wire = wire_with(Fault(kind="stale", nth=2))
    assert wire.ask("*TST?", timeout_s=1.0) == "0"
    with pytest.raises(ReplyError, match="nobody asked for"):
        wire.ask("*OPC?", timeout_s=1.0)


def test_dropped_connection_is_lost_and_comes_back() -> None:
    """Once is repaired by opening anew."""
    wire = wire_with(Fault(kind="closed"))
    with pytest.raises(LinkLost):
        wire.ask("READ?", timeout_s=1.0)
    assert wire.dirty
    wire.recover()
    assert wire.ask("*OPC?", timeout_s=1.0) == "1"


@pytest.mark.parametrize("kind", ["closed", "dropped"])
def test_connection_that_stays_away_is_lost(kind: FaultKind) -> None:
    """For good is for good."""
    wire = wire_with(Fault(kind=kind, for_good=True))
    with pytest.raises((LinkLost, LinkTimeout)):
        wire.ask("READ?", timeout_s=1.0)
    with pytest.raises(LinkLost, match="does not come back"):
        wire.recover()
    assert wire.dirty


def test_faults_are_counted_by_instrument() -> None:
    """A new wire does not begin the count again."""
    wires = PracticeWires(World(), faults={"source": [Fault(kind="dropped", nth=2)]})
    assert wires.open("source").ask("*OPC?", timeout_s=1.0) == "1"
    wire = wires.open("source")
    with pytest.raises(LinkTimeout):
        wire.ask("*OPC?", timeout_s=1.0)


def test_other_instrument_is_noticed() -> None:
    """Recovery compares who answers with who answered before."""
    wire = wire_with()
    wire.identity = "somebody,else,0,0"
    with pytest.raises(IdentityError, match="another instrument answers"):
        wire.recover()


def test_wires_are_opened_by_address() -> None:
    """An opener of real links can be replaced by this one."""
    wires = PracticeWires(World())
    wire = wires.open_at(wires.addresses.source)
    assert wire.address == "practice::source"
    assert wire.identity.startswith("benchlog practice,sine source")
    with pytest.raises(LinkRefused, match="no practice instrument"):
        wires.open_at("TCPIP::10.0.0.1::5025::SOCKET")
