"""A small SCPI instrument on a real socket that answers as a test tells it to."""

import socket
import threading
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field

Answer = Callable[[str], bytes | None]


@dataclass
class ScpiServer:
    """One instrument: what it was asked, and how it answers.

    Attributes:
        answers: Reply by message, terminator included; a callable is called with the message.
            None answers nothing; ``b""`` closes the connection.
        late_s: Seconds before each reply, by message.
        asked: Every message that came, in order.
    """

    answers: dict[str, bytes | Answer | None] = field(default_factory=dict)
    late_s: dict[str, float] = field(default_factory=dict)
    asked: list[str] = field(default_factory=list)
    writes: list[bytes] = field(default_factory=list)
    port: int = 0

    @property
    def address(self) -> str:
        """The VISA resource name."""
        return f"TCPIP::127.0.0.1::{self.port}::SOCKET"

    def serve(self, connection: socket.socket) -> None:
        """Answer one client until either side closes."""
        pending = b""
        with connection:
            while data := _received(connection):
                self.writes.append(data)
                pending += data
                *lines, pending = pending.split(b"\n")
                for line in lines:
                    if not self._answer(connection, line.decode("latin-1").strip("\r")):
                        return

    def _answer(self, connection: socket.socket, message: str) -> bool:
        self.asked.append(message)
        answer = self.answers.get(message)
        if callable(answer):
            answer = answer(message)
        if answer is None:
            return True
        if answer == b"":
            return False
        if message in self.late_s:
            time.sleep(self.late_s[message])
        try:
            connection.sendall(answer)
        except OSError:
            return False
        return True


def _received(connection: socket.socket) -> bytes:
    try:
        return connection.recv(4096)
    except OSError:
        return b""


IDENTITY = b"Invented Works,AC-1,0042,1.0\n"


@contextmanager
def scpi_server(**answers: bytes | Answer | None) -> Iterator[ScpiServer]:
    """Yield a running instrument that identifies itself.

    Args:
        answers: Replies by message, with ``q`` for a question mark at the end and nothing else
            special.
    """
    given = {
        (name[:-1] + "?" if name.endswith("q") else name): answer
        for name, answer in answers.items()
    }
    instrument = ScpiServer(answers={"*IDN?": IDENTITY, **given})
    with socket.create_server(("127.0.0.1", 0)) as listener:
        instrument.port = listener.getsockname()[1]
        open_now: list[socket.socket] = []

        def accept() -> None:
            while True:
                try:
                    connection, _ = listener.accept()
                except OSError:
                    return
                open_now.append(connection)
                threading.Thread(target=instrument.serve, args=(connection,), daemon=True).start()

        acceptor = threading.Thread(target=accept, daemon=True)
        acceptor.start()
        try:
            yield instrument
        finally:
            listener.shutdown(socket.SHUT_RDWR)
            listener.close()
            for connection in open_now:
                connection.close()
            acceptor.join(2.0)
