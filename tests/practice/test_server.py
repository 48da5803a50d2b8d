"""The practice instruments on real sockets."""

import socket
import time
from collections.abc import Iterator
from contextlib import contextmanager
from typing import cast, get_args

import pytest

from benchlog.errors import InstrumentError, Misuse
from benchlog.practice.bench import ROLES, Role
from benchlog.practice.board import PracticeBoard
from benchlog.practice.faults import Fault, FaultKind
from benchlog.practice.server import LONGEST_MESSAGE, PracticeServer
from benchlog.practice.wire import PracticeWires
from benchlog.practice.world import World
from tests.fakes.practice_boards import PREAMP


def place(address: str) -> tuple[str, int]:
    """Return host and port out of a resource name."""
    _, host, port, _ = address.split("::")
    return host, int(port)


class Talk:
    """A plain client with a line buffer."""

    def __init__(self, address: str) -> None:
        self.socket = socket.create_connection(place(address), timeout=5)
        self.file = self.socket.makefile("rb")

    def send(self, message: bytes) -> None:
        """Send bytes as they are."""
        self.socket.sendall(message)

    def line(self) -> str:
        """Return the next line, empty at the end of the stream."""
        return self.file.readline().decode("latin-1").rstrip("\n")

    def ask(self, message: str) -> str:
        """Send a line and return the next."""
        self.send(message.encode("latin-1") + b"\n")
        return self.line()

    def close(self) -> None:
        """Close the connection."""
        self.file.close()
        self.socket.close()


@contextmanager
def talking(server: PracticeServer, role: Role = "source") -> Iterator[Talk]:
    """Talk to one instrument."""
    talk = Talk(server.addresses[ROLES.index(role)])
    try:
        yield talk
    finally:
        talk.close()


def test_addresses_are_resource_names_in_the_order_of_the_ports() -> None:
    """Source first, then the meter at the output, then the one at the input."""
    with PracticeServer(World()) as server:
        assert server.addresses.source.startswith("TCPIP::127.0.0.1::")
        assert server.addresses.source.endswith("::SOCKET")
        for role, model in zip(
            ROLES,
            ("sine source,PS-0001", "AC voltmeter,PM-0002", "AC voltmeter,PM-0001"),
            strict=True,
        ):
            with talking(server, role) as talk:
                assert model in talk.ask("*IDN?")


CONVERSATION: tuple[tuple[Role, str], ...] = (
    ("source", "*IDN?"),
    ("source", "*RST;*CLS;:OUTP:LOAD INF;:VOLT 20 MVPP;:FREQ 1 kHz;:OUTP ON;*OPC?"),
    ("output meter", "*RST;*CLS;:VOLT:AC:BAND 200;*OPC?"),
    ("output meter", "READ?"),
    ("input meter", "CONF:VOLT:AC 0.1;:VOLT:AC:BAND 200;:READ?"),
    ("output meter", "READ?"),
    ("source", "FREQ 100 kHz;*OPC?"),
    ("output meter", "MEAS:VOLT:AC?"),
    ("input meter", "INIT;FETC?"),
    ("input meter", "BOGUS;:READ?;:SYST:ERR?"),
    ("input meter", "SYST:ERR?;ERR?"),
    ("input meter", "*ESR?;*STB?"),
    ("source", "freq?;:source:voltage:level?;*opc?"),
)


def test_sockets_and_wires_give_the_same_replies() -> None:
    """The same conversation, word for word and digit for digit, with patience."""
    board = PracticeBoard(PREAMP, seed=3)
    wires = PracticeWires(World(board, seed=7))
    opened = {role: wires.open(role) for role in ROLES}
    in_process = []
    for role, message in CONVERSATION:
        wires.clock.wait(0.02)
        try:
            in_process.append(opened[role].ask(message, timeout_s=5.0))
        except Exception:
            in_process.append("nothing")
            opened[role].recover()
    with PracticeServer(World(board, seed=7)) as server:
        talks = {role: Talk(address) for role, address in zip(ROLES, server.addresses, strict=True)}
        on_sockets = []
        for role, message in CONVERSATION:
            time.sleep(0.02)
            on_sockets.append("nothing" if "BOGUS" in message else talks[role].ask(message))
            if "BOGUS" in message:
                talks[role].send(message.encode() + b"\n")
        for talk in talks.values():
            talk.close()
    assert on_sockets == in_process
    assert "nothing" in in_process


def test_messages_may_come_in_pieces_and_in_heaps() -> None:
    """What counts is the terminator; carriage returns are blanks."""
    with PracticeServer(World()) as server, talking(server) as talk:
        talk.send(b"*OP")
        talk.send(b"C?\r\nFREQ 2 kHz\nFREQ?\n\n*TST?\n")
        assert [talk.line() for _ in range(3)] == ["1", "+2.00000000000E+03", "0"]


def test_two_clients_share_one_instrument() -> None:
    """Each gets its own answers; settings and errors are the instrument's."""
    with (
        PracticeServer(World()) as server,
        talking(server) as one,
        talking(server) as other,
    ):
        one.send(b"FREQ 5 kHz;*OPC?\n")
        assert one.line() == "1"
        assert other.ask("FREQ?") == "+5.00000000000E+03"
        other.send(b"BOGUS\n")
        assert other.ask("*OPC?") == "1"
        assert one.ask("SYST:ERR?") == '-113,"Undefined header"'


def test_instrument_answers_one_after_the_other() -> None:
    """While it measures, a second message waits; the first answer comes first."""
    with PracticeServer(World()) as server, talking(server, "output meter") as talk:
        started = time.monotonic()
        talk.send(b"READ?\n*OPC?\nREAD?\n")
        lines = [talk.line() for _ in range(3)]
        assert [line.endswith("E-06") for line in lines] == [True, False, True]
        assert time.monotonic() - started >= 4e-3


def test_waiting_holds_up_the_next_message() -> None:
    """``*WAI`` works across messages: the question behind it is answered after the reading."""
    with PracticeServer(World()) as server, talking(server, "output meter") as talk:
        started = time.monotonic()
        talk.send(b"INIT\n*WAI\n*TST?\n")
        assert talk.line() == "0"
        assert time.monotonic() - started >= 4e-3


def test_client_that_sends_no_more_is_answered_first() -> None:
    """Closing the sending half, as command-line tools do, loses no answer."""
    with PracticeServer(World()) as server, talking(server, "output meter") as talk:
        talk.send(b"*OPC?\nREAD?\n")
        talk.socket.shutdown(socket.SHUT_WR)
        assert talk.line() == "1"
        assert talk.line().endswith("E-06")
        assert talk.line() == ""
    with PracticeServer(World()) as server, talking(server) as talk:
        talk.send(b"FREQ 5 kHz\n")
        talk.socket.shutdown(socket.SHUT_WR)
        assert talk.line() == ""
        assert server.world.drive.frequency_hz == 5e3


def test_endless_message_is_a_buffer_overrun() -> None:
    """-363, and the instrument goes on."""
    with PracticeServer(World()) as server, talking(server) as talk:
        talk.send(b"x" * (LONGEST_MESSAGE + 1))
        time.sleep(0.02)
        talk.send(b"\n*OPC?\n")
        assert talk.line() == "1"
        errors = {talk.ask("SYST:ERR?") for _ in range(3)}
        assert '-363,"Input buffer overrun"' in errors


@pytest.mark.parametrize("kind", get_args(FaultKind))
def test_faults_on_the_wire(kind: str) -> None:
    """What each fault looks like to a plain client, at the second answer."""
    fault = Fault(kind=cast("FaultKind", kind), nth=2, delay_s=0.03)
    with (
        PracticeServer(World(), faults={"source": [fault]}) as server,
        talking(server) as talk,
    ):
        assert talk.ask("*TST?") == "0"
        started = time.monotonic()
        talk.send(b"*OPC?;*TST?\n" + (b"*TST?\n" if kind == "dropped" else b""))
        seen = talk.line()
        waited_s = time.monotonic() - started
        expected = {
            "late": "1;0",
            "split": "1;0",
            "stale": "0",
            "garbled": "\xce\xc4\xcf",
            "dropped": "0",
            "closed": "",
            "overloaded": "+9.900000E+37",
        }
        assert seen == expected[kind]
        if kind in {"late", "split"}:
            assert waited_s >= 0.03


def test_answers_never_overtake_a_late_one() -> None:
    """A stream keeps its order: that is what makes late answers dangerous."""
    late = Fault(kind="late", delay_s=0.05)
    with (
        PracticeServer(World(), faults={"source": [late]}) as server,
        talking(server) as talk,
    ):
        talk.send(b"*TST?\n*OPC?\n")
        assert [talk.line(), talk.line()] == ["0", "1"]


def test_client_that_does_not_read_holds_nobody_up(monkeypatch: pytest.MonkeyPatch) -> None:
    """Its answers wait in the server until it reads them."""

    def listen(host: str, port: int) -> socket.socket:
        listener = socket.create_server((host, port))
        listener.setsockopt(socket.SOL_SOCKET, socket.SO_SNDBUF, 8192)
        return listener

    monkeypatch.setattr("benchlog.practice.server._listen", listen)
    with (
        PracticeServer(World()) as server,
        talking(server) as lazy,
        talking(server) as other,
    ):
        question = b";".join([b"FREQ?"] * 200) + b"\n"
        lazy.send(question * 100)
        assert other.ask("*OPC?") == "1"
        assert [len(lazy.line()) for _ in range(100)] == [200 * 19 - 1] * 100


def test_boards_can_be_changed_while_it_runs() -> None:
    """The demo sweeps one board after the other."""
    with PracticeServer(World()) as server:
        assert server.world.board_label == "bypass"
        server.put_board(PracticeBoard(PREAMP, label="0042"))
        assert server.world.board_label == "0042"


def test_vanished_clients_leave_the_server_alone() -> None:
    """Connections that are reset, before and after an answer, are forgotten."""
    with PracticeServer(World()) as server:
        for message in (b"", b"*IDN?\n", b"*IDN?\n" * 100):
            talk = Talk(server.addresses.source)
            talk.send(message)
            talk.socket.setsockopt(socket.SOL_SOCKET, socket.SO_LINGER, b"\1\0\0\0\0\0\0\0")
            talk.close()
        with talking(server) as talk:
            assert talk.ask("*OPC?") == "1"


def test_end_closes_everything() -> None:
    """Clients see the end of the stream, and the ports are free again."""
    with PracticeServer(World()) as server:
        addresses = server.addresses
        talk = Talk(addresses.source)
        assert talk.ask("*OPC?") == "1"
    assert talk.line() == ""
    talk.close()
    for address in addresses:
        with pytest.raises(ConnectionRefusedError):
            socket.create_connection(place(address), timeout=1)
    with pytest.raises(Misuse, match="does not run"):
        _ = server.addresses


def test_ports_can_be_chosen_and_used_again() -> None:
    """The same ports serve a second time at once."""
    with PracticeServer(World()) as server:
        source, output, before = (place(address)[1] for address in server.addresses)
        with talking(server) as talk:
            talk.ask("*OPC?")
    with PracticeServer(World(), ports=(source, output, before)) as server:
        assert [place(address)[1] for address in server.addresses] == [source, output, before]


def test_taken_port_is_named_and_nothing_stays_open() -> None:
    """The message says which port; the ones that opened are closed again."""
    with PracticeServer(World()) as server:
        taken = place(server.addresses.source)[1]
        with (
            pytest.raises(InstrumentError, match=f"127.0.0.1 port {taken}"),
            PracticeServer(World(), ports=(0, 0, taken)),
        ):
            pass


def test_only_this_machine_is_served() -> None:
    """The practice bench is nothing for a network."""
    with pytest.raises(Misuse, match="this machine only"), PracticeServer(World(), host="0.0.0.0"):
        pass
