"""Talking to one instrument in the words of its driver."""

from typing import TypeVar

from benchlog.bench.driver import Driver
from benchlog.bench.reply import Number, QueueEntry, parse_done, parse_error, parse_number
from benchlog.bench.wire import Wire
from benchlog.errors import BenchlogError, CommandRefused, ReplyError

E = TypeVar("E", bound=BenchlogError)

# SCPI-99 queues are short; some entries come back for ever.
_MOST_ERRORS = 30


class Dialogue:
    """One instrument: its wire, its driver, and its place on the bench.

    Args:
        wire: An open link.
        driver: How to talk over it.
        role: What the instrument is on this bench, for messages: ``"output meter"``.
    """

    def __init__(self, wire: Wire, driver: Driver, *, role: str) -> None:
        self.wire = wire
        self.driver = driver
        self.role = role
        self._unchecked = False

    def order(
        self,
        action: str,
        *,
        frequency_hz: float | None = None,
        level_vrms: float | None = None,
        load_ohm: float | None = None,
    ) -> None:
        """Send an action that brings no value, and take its answer where it has one.

        Raises:
            LinkError: The wire failed.
            ReplyError: The answer follows no grammar.
            CommandRefused: The answer is an entry of the error queue.
        """
        text = self.driver.text(
            action, frequency_hz=frequency_hz, level_vrms=level_vrms, load_ohm=load_ohm
        )
        message = self.driver.messages[action]
        self._unchecked = True
        if message.reply == "none":
            self._send(text)
            return
        reply = self._ask(text, message.timeout_s)
        if message.reply == "error":
            self._empty_queue(self._parsed_error(text, reply), asked=text)
            return
        try:
            parse_done(reply)
        except ReplyError as error:
            raise self._placed(error, text) from error

    def number(self, action: str, *, frequency_hz: float) -> tuple[Number, str]:
        """Ask for a number; return it, or its state, and the reply as it came.

        Raises:
            LinkError: The wire failed.
            ReplyError: The answer follows no grammar.
        """
        text = self.driver.text(action, frequency_hz=frequency_hz)
        reading_s = self.driver.reading_s(frequency_hz)
        reply = self._ask(text, self.driver.messages[action].timeout_s + reading_s)
        try:
            return parse_number(reply, self.driver.grammars[action]), reply
        except ReplyError as error:
            raise self._placed(error, text) from error

    def check_errors(self) -> None:
        """Read the error queue to its end; free when nothing was ordered since the last time.

        Raises:
            CommandRefused: The queue held something.
        """
        message = self.driver.messages.get("error")
        if not self._unchecked or message is None:
            return
        text = self.driver.text("error")
        self._empty_queue(self._parsed_error(text, self._ask(text, message.timeout_s)), asked=text)

    def recover(self) -> None:
        """Make the wire clean."""
        try:
            self.wire.recover()
        except BenchlogError as error:
            raise error.at(self.role) from error

    def close(self) -> None:
        """Close the wire; twice is quiet."""
        self.wire.close()

    def _empty_queue(self, first: QueueEntry, *, asked: str) -> None:
        if first.number == 0:
            self._unchecked = False
            return
        entries = [first, *self._rest_of_queue()]
        told = "; ".join(f'{entry.number},"{entry.text}"' for entry in entries)
        raise CommandRefused(
            f"the instrument refused {_on_one_line(asked)}: {told}",
            where=f"{self.role} at {self.wire.address}",
            expected="an empty error queue",
            hint="compare the driver file with the instrument's programming manual",
        )

    def _rest_of_queue(self) -> list[QueueEntry]:
        entries: list[QueueEntry] = []
        message = self.driver.messages.get("error")
        while message is not None and len(entries) < _MOST_ERRORS:
            text = self.driver.text("error")
            entry = self._parsed_error(text, self._ask(text, message.timeout_s))
            if entry.number == 0:
                break
            entries.append(entry)
        return entries

    def _parsed_error(self, asked: str, reply: str) -> QueueEntry:
        try:
            return parse_error(reply)
        except ReplyError as error:
            raise self._placed(error, asked) from error

    def _send(self, text: str) -> None:
        try:
            self.wire.send(text)
        except BenchlogError as error:
            raise error.at(self.role) from error

    def _ask(self, text: str, timeout_s: float) -> str:
        try:
            return self.wire.ask(text, timeout_s=timeout_s)
        except BenchlogError as error:
            raise error.at(self.role) from error

    def _placed(self, error: E, asked: str) -> E:
        # The instrument and this program are out of step: what else is under way is unknown.
        self.wire.dirty = True
        return error.at(f"{self.role} at {self.wire.address}, asked {_on_one_line(asked)}")


def _on_one_line(text: str) -> str:
    return repr(" | ".join(text.split("\n")))
