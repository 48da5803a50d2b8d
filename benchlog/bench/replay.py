"""Recording what goes over a wire, and playing it back without an instrument."""

from collections.abc import Sequence
from dataclasses import dataclass

from benchlog.bench.wire import Wire
from benchlog.errors import LinkLost, LinkTimeout, Misuse


@dataclass(frozen=True, slots=True)
class Exchange:
    """One message, and the answer to it; None where it had none."""

    message: str
    answer: str | None


class RecordingWire:
    """Passes everything on and writes it down; see ``Wire``."""

    def __init__(self, wire: Wire) -> None:
        self._wire = wire
        self.exchanges: list[Exchange] = []

    @property
    def address(self) -> str:
        """What was opened."""
        return self._wire.address

    @address.setter
    def address(self, address: str) -> None:
        self._wire.address = address

    @property
    def identity(self) -> str:
        """The instrument's identity."""
        return self._wire.identity

    @identity.setter
    def identity(self, identity: str) -> None:
        self._wire.identity = identity

    @property
    def dirty(self) -> bool:
        """True once half an exchange may be under way."""
        return self._wire.dirty

    @dirty.setter
    def dirty(self, dirty: bool) -> None:
        self._wire.dirty = dirty

    def send(self, message: str) -> None:
        """Send a message that has no answer."""
        self._wire.send(message)
        self.exchanges.append(Exchange(message, None))

    def ask(self, message: str, *, timeout_s: float) -> str:
        """Ask, and write question and answer down."""
        answer = self._wire.ask(message, timeout_s=timeout_s)
        self.exchanges.append(Exchange(message, answer))
        return answer

    def recover(self) -> None:
        """Make the wire clean."""
        self._wire.recover()

    def close(self) -> None:
        """Close the wire; twice is quiet."""
        self._wire.close()


class ReplayWire:
    """Plays a recording back: the same messages in the same order, and nothing else.

    Args:
        exchanges: What was recorded.
        identity: The identity of the instrument then.
        address: What to call it.
    """

    def __init__(
        self, exchanges: Sequence[Exchange], *, identity: str, address: str = "replay"
    ) -> None:
        self.address = address
        self.identity = identity
        self.dirty = False
        self._exchanges = list(exchanges)
        self._next = 0
        self._closed = False

    def send(self, message: str) -> None:
        """Take a message that has no answer."""
        self._check_usable()
        if self._take(message) is not None:
            raise self._out_of_step(message)

    def ask(self, message: str, *, timeout_s: float) -> str:
        """Answer as the instrument did."""
        self._check_usable()
        answer = self._take(message)
        if answer is None:
            self.dirty = True
            raise LinkTimeout(
                f"the recording has no answer to {message!r} (waited for {timeout_s:g} s)",
                where=self.address,
            )
        return answer

    def recover(self) -> None:
        """Make the wire clean."""
        if self._closed:
            raise Misuse(f"the link to {self.address} is closed")
        self.dirty = False

    def close(self) -> None:
        """Close the wire; twice is quiet."""
        self._closed = True

    def _check_usable(self) -> None:
        if self._closed or self.dirty:
            state = "closed" if self._closed else "dirty"
            raise Misuse(f"the link to {self.address} is {state}")

    def _take(self, message: str) -> str | None:
        if self._next >= len(self._exchanges):
            self.dirty = True
            raise LinkLost("the recording has come to its end", where=self.address)
        exchange = self._exchanges[self._next]
        if exchange.message != message:
            raise self._out_of_step(message)
        self._next += 1
        return exchange.answer

    def _out_of_step(self, message: str) -> LinkLost:
        self.dirty = True
        expected = self._exchanges[self._next].message if self._next < len(self._exchanges) else ""
        return LinkLost(
            f"the recording does not continue with {message!r}",
            where=self.address,
            expected=repr(expected),
        )
