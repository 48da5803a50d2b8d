"""The practice instruments without sockets: a wire in the same process, a clock that is a number.

For tests and for simulations longer than anyone would wait.  A ``PracticeWire`` behaves as a
stream socket does: what was not read in time is still there for the next reader.
"""

from collections import deque
from collections.abc import Iterable, Mapping

from benchlog.errors import IdentityError, LinkLost, LinkRefused, LinkTimeout, Misuse, ReplyError
from benchlog.practice.bench import ROLES, Addresses, Role, make_instruments
from benchlog.practice.faults import Fault, Unkindness
from benchlog.practice.scpi import Instrument, Response
from benchlog.practice.world import Board, World

DRAIN_S = 0.1


class VirtualClock:
    """A clock that stands still until somebody waits."""

    def __init__(self, now_s: float = 0.0) -> None:
        self._now_s = now_s

    def now_s(self) -> float:
        """Return the time, seconds from an arbitrary start."""
        return self._now_s

    def wait(self, seconds: float) -> None:
        """Let time pass."""
        self._now_s += max(seconds, 0.0)


class PracticeWire:
    """A link to one practice instrument in the same process.

    Args:
        instrument: The far end.
        clock: Passes while the instrument is busy.
        address: What to call the far end in messages.
        unkindness: What goes wrong with its replies; nothing when left out.
    """

    def __init__(
        self,
        instrument: Instrument,
        clock: VirtualClock,
        *,
        address: str,
        unkindness: Unkindness | None = None,
    ) -> None:
        self.address = address
        self.identity = instrument.device.identity
        self.dirty = False
        self._instrument = instrument
        self._clock = clock
        self._unkindness = unkindness or Unkindness()
        self._arriving: deque[tuple[float, bytes | None]] = deque()
        self._open = True

    def send(self, message: str) -> None:
        """Send a program message that has no response.

        Raises:
            Misuse: The wire is dirty or closed.
        """
        self._check_usable()
        self._transmit(message)

    def ask(self, message: str, *, timeout_s: float) -> str:
        """Send a message whose last line is a query; return the response without terminator.

        Raises:
            LinkTimeout: No response in time; the wire is dirty now.
            LinkLost: The far end closed the connection; the wire is dirty now.
            Misuse: The wire is dirty or closed.
        """
        self._check_usable()
        self._transmit(message)
        answer = self._receive(message, timeout_s)
        self._check_in_step()
        return answer

    def recover(self) -> None:
        """Throw away what has arrived and identify the instrument anew; reopen if that fails.

        Raises:
            LinkLost: It does not answer after reopening either.
            IdentityError: Something else answers.
        """
        if not self._open:
            raise Misuse(f"the wire to {self.address} is closed")
        self._clock.wait(DRAIN_S)
        self._drop_arrived()
        for reopened in (False, True):
            if reopened:
                self._arriving.clear()
            try:
                self._transmit("*IDN?")
                answer = self._receive("*IDN?", 1.0)
            except (LinkTimeout, LinkLost):
                continue
            if answer == self.identity:
                self.dirty = False
                return
            if reopened:
                raise IdentityError(
                    f"another instrument answers: {answer!r}",
                    where=self.address,
                    expected=self.identity,
                )
        raise LinkLost("the instrument does not come back", where=self.address)

    def close(self) -> None:
        """Close the wire; twice is quiet."""
        self._open = False
        self._arriving.clear()

    def _check_usable(self) -> None:
        if not self._open:
            raise Misuse(f"the wire to {self.address} is closed")
        if self.dirty:
            raise Misuse(f"the wire to {self.address} is dirty; recover it first")
        self._check_in_step()

    def _check_in_step(self) -> None:
        arrived = [data for due_s, data in self._arriving if due_s <= self._clock.now_s()]
        unasked = b"".join(data for data in arrived if data is not None)
        if unasked.strip():
            self.dirty = True
            raise ReplyError(
                "an answer came that nobody asked for: the instrument is out of step",
                where=self.address,
                raw=unasked.decode("latin-1"),
                expected="one answer to each question",
            )

    def _transmit(self, message: str) -> None:
        """Let the instrument execute each line as soon as it is done with the one before."""
        for line in message.split("\n"):
            now_s = max(self._instrument.free_at_s, self._clock.now_s())
            response = self._instrument.handle(line, now_s)
            if response is not None:
                self._answer(response)

    def _answer(self, response: Response) -> None:
        due_s = response.ready_at_s
        for piece in self._unkindness.spoil(response.text.encode("latin-1") + b"\n"):
            due_s += piece.pause_s
            self._arriving.append((due_s, piece.data))

    def _receive(self, message: str, timeout_s: float) -> str:
        deadline_s = self._clock.now_s() + timeout_s
        received = b""
        while not received.endswith(b"\n"):
            if not self._arriving or self._arriving[0][0] > deadline_s:
                self._clock.wait(deadline_s - self._clock.now_s())
                self.dirty = True
                raise LinkTimeout(
                    f"no answer to {message!r} within {timeout_s:g} s", where=self.address
                )
            due_s, data = self._arriving.popleft()
            self._clock.wait(due_s - self._clock.now_s())
            if data is None:
                self.dirty = True
                raise LinkLost("the instrument closed the connection", where=self.address)
            line, end, rest = data.partition(b"\n")
            received += line + end
            if rest:
                self._arriving.appendleft((due_s, rest))
        return received.decode("latin-1").strip("\r\n\0 ")

    def _drop_arrived(self) -> None:
        while self._arriving and self._arriving[0][0] <= self._clock.now_s():
            self._arriving.popleft()


class PracticeWires:
    """A whole practice bench in the same process, with one virtual clock.

    Args:
        world: The table.
        faults: What goes wrong with replies, by role.
    """

    def __init__(
        self, world: World, *, faults: Mapping[Role, Iterable[Fault]] | None = None
    ) -> None:
        self.world = world
        self.clock = VirtualClock()
        self.instruments = make_instruments(world)
        given = faults or {}
        self._unkindness = {role: Unkindness(given.get(role, ())) for role in self.instruments}

    @property
    def addresses(self) -> Addresses:
        """What the wires call their far ends."""
        return Addresses(*(f"practice::{role}" for role in ROLES))

    def put_board(self, board: Board | None) -> None:
        """Put a board on the table now; None bypasses it."""
        self.world.put_board(board, now_s=self.clock.now_s())

    def open(self, role: Role) -> PracticeWire:
        """Return a new wire to one of the instruments."""
        return PracticeWire(
            self.instruments[role],
            self.clock,
            address=self.addresses[ROLES.index(role)],
            unkindness=self._unkindness[role],
        )

    def open_at(self, address: str) -> PracticeWire:
        """Return a new wire to one of the addresses.

        Raises:
            LinkRefused: No practice instrument has this address.
        """
        for role, known in zip(ROLES, self.addresses, strict=True):
            if address == known:
                return self.open(role)
        raise LinkRefused(
            "there is no practice instrument at this address",
            where=address,
            expected=", ".join(self.addresses),
        )
