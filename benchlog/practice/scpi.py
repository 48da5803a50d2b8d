"""An instrument that follows SCPI-99 and IEEE 488.2: program messages in, responses out.

Pure: time is a number that is passed in, and an answer says when it would be ready.  What the
commands do belongs to the devices (``source``, ``meter``); this module knows how messages are
exchanged.
"""

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from typing import Any, Protocol, TypeAlias

from benchlog.practice.error_table import (
    QUERY_AFTER_INDEFINITE,
    QUERY_INTERRUPTED,
    QUERY_UNTERMINATED,
    ScpiError,
)
from benchlog.practice.message import Unit, parse_unit, split_units
from benchlog.practice.parameters import Parameter, Value, read_parameters
from benchlog.practice.status import Status
from benchlog.practice.tree import HeaderTree


class Device(Protocol):
    """What is behind the connector: a source, a meter."""

    identity: str
    busy_until_s: float

    def reset(self, now_s: float) -> None:
        """Take the settings of ``*RST``."""


@dataclass(slots=True)
class Moment:
    """The execution of one program message.

    Attributes:
        now_s: The instrument's time; a command that waits moves it on.
        status: Error queue and registers.
        responses: Response message units so far.
    """

    now_s: float
    status: Status
    responses: list[str] = field(default_factory=list)

    def wait_until(self, when_s: float) -> None:
        """Let time pass inside the instrument before the next command is executed."""
        self.now_s = max(self.now_s, when_s)


# The device is of the kind that the command table was written for; tables are data, so the type
# cannot say which.
Handler: TypeAlias = Callable[[Any, Moment, Sequence[Value]], str | None]


@dataclass(frozen=True, slots=True, kw_only=True)
class Command:
    """One entry of an instrument's command table.

    Attributes:
        run: What it does; a query returns its response.
        parameters: What its data elements may be.
        required: How many of them must be there.
        indefinite: True where the response has no end of its own, so that nothing may follow.
    """

    run: Handler
    parameters: tuple[Parameter, ...] = ()
    required: int = 0
    indefinite: bool = False


@dataclass(frozen=True, slots=True)
class Response:
    """A response message, without terminator, and when it is ready."""

    text: str
    ready_at_s: float


class Instrument:
    """One instrument: a device, its command table and its message exchange.

    Args:
        device: What the commands act on.
        tree: The command table.

    Attributes:
        free_at_s: When it is done with the last message; ``*WAI`` holds up the next one too.
    """

    def __init__(self, device: Device, tree: HeaderTree[Command]) -> None:
        self.device = device
        self.status = Status()
        self.free_at_s = -math.inf
        self._tree = tree
        self._waiting: Response | None = None

    def handle(self, message: str, now_s: float) -> Response | None:
        """Execute a program message and return its response, as an instrument on a stream does.

        A stream hides whether a reply was read, so that neither -410 nor -420 can arise here.

        Args:
            message: The text before the terminator.
            now_s: When it arrived.
        """
        moment = Moment(now_s=now_s, status=self.status)
        self.status.catch_up(now_s)
        self._execute(message, moment)
        self.free_at_s = moment.now_s
        if not moment.responses:
            return None
        return Response(";".join(moment.responses), moment.now_s)

    def write(self, message: str, now_s: float) -> None:
        """Take a program message over a bus that knows who talks (IEEE 488.2, 6.3).

        A response that nobody read is thrown away and reported as -410.
        """
        if self._waiting is not None:
            self.status.report(QUERY_INTERRUPTED)
        self._waiting = self.handle(message, now_s)

    def read(self) -> Response | None:
        """Return the waiting response; with none there, report -420 and return None."""
        response, self._waiting = self._waiting, None
        if response is None:
            self.status.report(QUERY_UNTERMINATED)
        return response

    def clear_output(self) -> None:
        """Do what a device clear does: forget the response that waits."""
        self._waiting = None

    def _execute(self, message: str, moment: Moment) -> None:
        path: tuple[str, ...] = ()
        indefinite = False
        try:
            for text in split_units(message):
                unit = parse_unit(text)
                if unit is None:
                    continue
                if indefinite and unit.query:
                    self.status.report(QUERY_AFTER_INDEFINITE)
                    return
                header = unit.mnemonics if unit.rooted or unit.common else path + unit.mnemonics
                command = self._tree.find(header, query=unit.query)
                self._run(command, unit, moment)
                indefinite = indefinite or command.indefinite
                path = path if unit.common else header[:-1]
        except ScpiError as error:
            self.status.report(error.number)

    def _run(self, command: Command, unit: Unit, moment: Moment) -> None:
        """Execute one unit; an execution error is reported and the message goes on."""
        try:
            values = read_parameters(command.parameters, unit.elements, required=command.required)
            response = command.run(self.device, moment, values)
        except ScpiError as error:
            if error.ends_message:
                raise
            self.status.report(error.number)
            return
        if response is not None:
            moment.responses.append(response)
