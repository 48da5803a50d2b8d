"""What the stepper asks for, and what it may be told: frozen records, nothing else."""

from dataclasses import dataclass
from typing import Literal, TypeAlias

from benchlog.records import Point, Reading, SweepEnd

Which: TypeAlias = Literal["input", "output"]


@dataclass(frozen=True, slots=True)
class Prepare:
    """Bring every instrument to a known state, output off."""


@dataclass(frozen=True, slots=True, kw_only=True)
class SetPoint:
    """Program the source; says nothing about its output being on."""

    frequency_hz: float
    level_vrms: float


@dataclass(frozen=True, slots=True)
class CheckErrors:
    """Read the error queues; a complaint is trouble."""


@dataclass(frozen=True, slots=True)
class SwitchOn:
    """Switch the source's output on."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Settle:
    """Wait until source, board and meters have settled."""

    seconds: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Read:
    """Take one reading.

    Attributes:
        which: The meter at the board's input or at its output.
        frequency_hz: What is being measured, so that a meter can choose filter and range.
        expected_vrms: What the design predicts there, if known.
    """

    which: Which
    frequency_hz: float
    expected_vrms: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class KeepPoint:
    """Make a point durable before anything else happens."""

    point: Point


@dataclass(frozen=True, slots=True, kw_only=True)
class Recover:
    """Make every link clean and prove who is at its far end, after a pause."""

    pause_s: float


@dataclass(frozen=True, slots=True)
class SwitchOff:
    """Switch the source's output off, cleaning its link first where that is needed."""


@dataclass(frozen=True, slots=True, kw_only=True)
class EndSweep:
    """Nothing is left to do.

    Attributes:
        state: How the sweep ended.
        why: Sentences for people.
        source_off: False when the source could not be switched off.
    """

    state: SweepEnd
    why: str
    source_off: bool


Action: TypeAlias = (
    Prepare
    | SetPoint
    | CheckErrors
    | SwitchOn
    | Settle
    | Read
    | KeepPoint
    | Recover
    | SwitchOff
    | EndSweep
)


@dataclass(frozen=True, slots=True)
class Done:
    """The action was carried out."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Level:
    """The meter answered, with a number or with a state."""

    reading: Reading


@dataclass(frozen=True, slots=True, kw_only=True)
class Trouble:
    """The action was not carried out, or nobody knows whether it was.

    Attributes:
        why: One sentence.
        retriable: True where cleaning the links and measuring again may help.
    """

    why: str
    retriable: bool


@dataclass(frozen=True, slots=True, kw_only=True)
class Stop:
    """Somebody wants the sweep to end; always in turn until it has ended."""

    why: str


Event: TypeAlias = Done | Level | Trouble | Stop
EVENTS: tuple[type[Event], ...] = (Done, Level, Trouble, Stop)


@dataclass(frozen=True, slots=True, kw_only=True)
class Recovery:
    """One trouble that made the sweep start its point again.

    Attributes:
        position: The step's place in the schedule.
        attempt: Which attempt at that point failed, counted from 1.
        why: What went wrong.
    """

    position: int
    attempt: int
    why: str
