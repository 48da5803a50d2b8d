"""The practice instruments on TCP sockets of the own machine, in real time.

One thread serves everything, so that the instruments need no locks of their own.
"""

import selectors
import socket
import time
from collections import deque
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from heapq import heappop, heappush
from itertools import count
from threading import Thread
from types import TracebackType
from typing import Self

from benchlog.errors import InstrumentError, Misuse
from benchlog.practice.bench import ROLES, Addresses, Role, make_instruments
from benchlog.practice.faults import Fault, Unkindness
from benchlog.practice.scpi import Instrument
from benchlog.practice.world import Board, World

LONGEST_MESSAGE = 65_536
INPUT_BUFFER_OVERRUN = -363


@dataclass(frozen=True, slots=True)
class _Running:
    """A server that serves: where, in which thread, and what to close to end it."""

    addresses: Addresses
    thread: Thread
    stop: socket.socket


@dataclass(slots=True)
class _Station:
    """One instrument on its port, with the messages that wait for it."""

    instrument: Instrument
    unkindness: Unkindness
    listener: socket.socket
    waiting: "deque[tuple[_Client, str]]" = field(default_factory=deque)
    busy_until_s: float = 0.0


@dataclass(slots=True)
class _Client:
    """One connection to a station."""

    station: _Station
    socket: socket.socket
    inbox: bytearray = field(default_factory=bytearray)
    outbox: bytearray = field(default_factory=bytearray)
    last_due_s: float = 0.0
    unanswered: int = 0
    finished: bool = False
    gone: bool = False


class PracticeServer:
    """Serves a practice bench while its ``with`` block runs.

    Args:
        world: The table.
        host: Where to listen; the own machine only.
        ports: Of source, output meter and input meter; 0 picks a free one.
        faults: What goes wrong with replies, by role.
    """

    def __init__(
        self,
        world: World,
        host: str = "127.0.0.1",
        ports: tuple[int, int, int] = (0, 0, 0),
        *,
        faults: Mapping[Role, Iterable[Fault]] | None = None,
    ) -> None:
        self.world = world
        self._host = host
        self._ports = ports
        self._faults = dict(faults or {})
        self._running: _Running | None = None

    @property
    def addresses(self) -> Addresses:
        """Where the instruments listen.

        Raises:
            Misuse: The server does not run.
        """
        if self._running is None:
            raise Misuse("the practice server does not run")
        return self._running.addresses

    def put_board(self, board: Board | None) -> None:
        """Put a board on the table; None bypasses it."""
        self.world.put_board(board, now_s=time.monotonic())

    def __enter__(self) -> Self:
        listeners: list[socket.socket] = []
        try:
            for port in self._ports:
                listeners.append(_listen(self._host, port))  # noqa: PERF401 - closed below when one fails
        except (InstrumentError, Misuse):
            _close_all(listeners)
            raise
        addresses = Addresses(
            *(f"TCPIP::{self._host}::{made.getsockname()[1]}::SOCKET" for made in listeners)
        )
        instruments = make_instruments(self.world)
        stations = [
            _Station(instruments[role], Unkindness(self._faults.get(role, ())), listener)
            for role, listener in zip(ROLES, listeners, strict=True)
        ]
        stop, wake = socket.socketpair()
        thread = Thread(target=_Loop(stations, wake).run, name="practice bench", daemon=True)
        thread.start()
        self._running = _Running(addresses, thread, stop)
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        if self._running is None:
            return
        running, self._running = self._running, None
        running.stop.close()
        running.thread.join()


class _Loop:
    """The server's thread: everything that happens, in order of time."""

    def __init__(self, stations: list[_Station], wake: socket.socket) -> None:
        self._stations = stations
        self._wake = wake
        self._clients: list[_Client] = []
        self._due: list[tuple[float, int, _Client, bytes | None]] = []
        self._order = count()
        self._selector = selectors.DefaultSelector()
        self._selector.register(wake, selectors.EVENT_READ, None)
        for station in stations:
            self._selector.register(station.listener, selectors.EVENT_READ, station)

    def run(self) -> None:
        try:
            while self._step():
                pass
        finally:
            self._selector.close()
            _close_all(
                [
                    self._wake,
                    *(station.listener for station in self._stations),
                    *(client.socket for client in self._clients),
                ]
            )

    def _step(self) -> bool:
        """Wait for the next thing and do it; return False when the server is to stop."""
        for key, events in self._selector.select(self._pause_s()):
            if key.data is None:
                return False
            if isinstance(key.data, _Station):
                self._accept(key.data)
            elif events & selectors.EVENT_READ:
                self._receive(key.data)
            else:
                self._flush(key.data)
        now_s = time.monotonic()
        for station in self._stations:
            self._serve(station, now_s)
        self._deliver(now_s)
        return True

    def _pause_s(self) -> float | None:
        times = [station.busy_until_s for station in self._stations if station.waiting]
        times += [self._due[0][0]] if self._due else []
        return max(min(times) - time.monotonic(), 0.0) if times else None

    def _accept(self, station: _Station) -> None:
        try:
            accepted, _ = station.listener.accept()
        except OSError:
            return
        accepted.settimeout(0)
        accepted.setsockopt(socket.IPPROTO_TCP, socket.TCP_NODELAY, 1)
        client = _Client(station, accepted)
        self._clients.append(client)
        self._selector.register(accepted, selectors.EVENT_READ, client)

    def _receive(self, client: _Client) -> None:
        try:
            data = client.socket.recv(65_536)
        except BlockingIOError:
            return
        except OSError:
            data = b""
        if not data:
            self._finish(client)
            return
        client.inbox += data
        *lines, rest = client.inbox.split(b"\n")
        client.inbox = bytearray(rest)
        client.unanswered += len(lines)
        client.station.waiting.extend((client, bytes(line).decode("latin-1")) for line in lines)
        if len(client.inbox) > LONGEST_MESSAGE:
            client.inbox.clear()
            client.station.instrument.status.report(INPUT_BUFFER_OVERRUN)

    def _serve(self, station: _Station, now_s: float) -> None:
        """Let an instrument execute what waits for it, one message after the other."""
        while station.waiting and station.busy_until_s <= now_s:
            client, message = station.waiting.popleft()
            response = station.instrument.handle(message, now_s)
            station.busy_until_s = station.instrument.free_at_s
            if response is None:
                self._answered(client)
                continue
            due_s = max(response.ready_at_s, client.last_due_s)
            for piece in station.unkindness.spoil(response.text.encode("latin-1") + b"\n"):
                due_s += piece.pause_s
                heappush(self._due, (due_s, next(self._order), client, piece.data))
            heappush(self._due, (due_s, next(self._order), client, b""))
            client.last_due_s = due_s

    def _deliver(self, now_s: float) -> None:
        while self._due and self._due[0][0] <= now_s:
            _, _, client, data = heappop(self._due)
            if client.gone:
                continue
            if data is None:
                self._drop(client)
            elif data:
                client.outbox += data
                self._flush(client)
            else:
                self._answered(client)

    def _answered(self, client: _Client) -> None:
        """Count a message as done; whoever sends no more is let go after the last."""
        client.unanswered -= 1
        if client.finished and not client.unanswered and not client.gone:
            self._drop(client)

    def _finish(self, client: _Client) -> None:
        """Let a client go that sends no more, once it has been answered."""
        # An ended stream is readable for ever; there is nothing left to wait for.
        self._selector.unregister(client.socket)
        client.finished = True
        if not client.unanswered:
            self._drop(client)

    def _flush(self, client: _Client) -> None:
        """Send what can be sent; a client that does not read is asked again when it does."""
        try:
            sent = client.socket.send(client.outbox)
        except BlockingIOError:
            sent = 0
        except OSError:
            self._drop(client)
            return
        del client.outbox[:sent]
        if not client.finished:
            writing = selectors.EVENT_WRITE if client.outbox else 0
            self._selector.modify(client.socket, selectors.EVENT_READ | writing, client)

    def _drop(self, client: _Client) -> None:
        client.gone = True
        if not client.finished:
            self._selector.unregister(client.socket)
        client.socket.close()
        self._clients.remove(client)


def _listen(host: str, port: int) -> socket.socket:
    if not host.startswith("127."):
        raise Misuse(f"the practice bench is for this machine only, not for {host}")
    try:
        return socket.create_server((host, port))
    except OSError as error:
        raise InstrumentError(
            f"The practice bench cannot listen: {error.strerror}.",
            where=f"{host} port {port}",
            hint="choose another port, or 0 for a free one",
        ) from error


def _close_all(sockets: Iterable[socket.socket]) -> None:
    for each in sockets:
        each.close()
