"""The stepper: asks for one action after another and is fed what came of each.

It touches no instrument, file or clock; ``benchlog/bench/runner.py`` does what it asks.  Its
rules stand in ``table.py`` and nowhere else.
"""

from collections.abc import Callable

from benchlog.errors import Misuse
from benchlog.records import Reading, SweepEnd
from benchlog.sweep.actions import (
    Action,
    CheckErrors,
    EndSweep,
    Event,
    KeepPoint,
    Level,
    Prepare,
    Read,
    Recover,
    Recovery,
    SetPoint,
    Settle,
    Stop,
    SwitchOff,
    SwitchOn,
    Trouble,
)
from benchlog.sweep.gain import point_from
from benchlog.sweep.schedule import Schedule, Step
from benchlog.sweep.table import TABLE, State, When

OFF_TRIES = 3
# An instrument that lost power or network needs time to come back; the first try comes at once
# because a late reply, the common case, only has to be drained.
PAUSE_S = 1.0

OFF_FAILED = (
    "THE SOURCE COULD NOT BE SWITCHED OFF and may still drive the board: switch it off by hand."
)

_PLAIN: dict[State, Action] = {
    State.PREPARING: Prepare(),
    State.CHECKING_SETTING: CheckErrors(),
    State.SWITCHING_ON: SwitchOn(),
    State.CHECKING_READINGS: CheckErrors(),
    State.SWITCHING_OFF: SwitchOff(),
}


class SweepMisuse(Misuse):
    """The stepper was fed an event out of turn; its state has not changed."""


class Stepper:
    """One run through a schedule.

    Args:
        schedule: What is to be measured.
        settle_s: Seconds to wait after a change, as a function of frequency in hertz.
        input_meter: True where the level at the board's input is read.
        retries: How often one point is begun again after trouble.
    """

    def __init__(
        self,
        schedule: Schedule,
        settle_s: Callable[[float], float],
        *,
        input_meter: bool,
        retries: int = 2,
    ) -> None:
        self.schedule = schedule
        self.state = State.PREPARING
        self.recoveries: tuple[Recovery, ...] = ()
        self._settle_s = settle_s
        self._input_meter = input_meter
        self._retries = retries
        self._index = 0
        self._attempt = 1
        self._off_attempt = 1
        self._readings: dict[State, Reading] = {}
        self._end = EndSweep(state="complete", why="All points were measured.", source_off=True)

    @property
    def step(self) -> Step:
        """The step being measured; the last one once all are done."""
        return self.schedule.steps[self._index]

    def next_action(self) -> Action:
        """Return what is to be done now: the same answer until something is fed."""
        if self.state in _PLAIN:
            return _PLAIN[self.state]
        return _ACTIONS[self.state](self)

    def feed(self, event: Event) -> None:
        """Take what came of the last action, or a wish to stop.

        Raises:
            SweepMisuse: The event has no row in the table for this state.
        """
        branches = TABLE.get((self.state, type(event)))
        if branches is None:
            raise SweepMisuse(
                f"{type(event).__name__} was fed while the sweep was in state {self.state.value!r}"
            )
        target = next(state for when, state in branches if self._holds(when, event))
        self._take(event, target)
        self.state = target

    def _holds(self, when: When, event: Event) -> bool:
        match when:
            case When.INPUT_METER:
                return self._input_meter
            case When.STEPS_LEFT:
                return self._index + 1 < len(self.schedule.steps)
            case When.RETRY:
                tries_left = self._attempt <= self._retries
                return isinstance(event, Trouble) and event.retriable and tries_left
            case When.OFF_TRIES_LEFT:
                return self._off_attempt < OFF_TRIES
        return True

    def _take(self, event: Event, target: State) -> None:
        """Remember what the event brought, before the state changes."""
        if isinstance(event, Level):
            self._readings[self.state] = event.reading
        elif target is State.STEPPING:
            self._begin(self._index + 1, attempt=1)
        elif isinstance(event, Trouble):
            self._take_trouble(event, target)
        elif isinstance(event, Stop) and self.state is not State.SWITCHING_OFF:
            self._decide("stopped", event.why)

    def _take_trouble(self, trouble: Trouble, target: State) -> None:
        if target is State.RECOVERING:
            failed = Recovery(position=self.step.position, attempt=self._attempt, why=trouble.why)
            self.recoveries = (*self.recoveries, failed)
            self._begin(self._index, attempt=self._attempt + 1)
        elif self.state is not State.SWITCHING_OFF:
            self._decide("failed", trouble.why)
        elif target is State.SWITCHING_OFF:
            self._off_attempt += 1
        else:
            why = f"{self._end.why} {OFF_FAILED} ({trouble.why})"
            self._end = EndSweep(state=self._end.state, why=why, source_off=False)

    def _begin(self, index: int, *, attempt: int) -> None:
        self._index = index
        self._attempt = attempt
        self._readings = {}

    def _decide(self, state: SweepEnd, why: str) -> None:
        self._end = EndSweep(state=state, why=why, source_off=True)

    def _set_point(self) -> SetPoint:
        return SetPoint(frequency_hz=self.step.frequency_hz, level_vrms=self.step.level_vrms)

    def _settle(self) -> Settle:
        return Settle(seconds=self._settle_s(self.step.frequency_hz))

    def _read_input(self) -> Read:
        expected_vrms = self.schedule.at_input_meter(self.step.level_vrms)
        return Read(
            which="input",
            frequency_hz=self.step.frequency_hz,
            expected_vrms=expected_vrms,
        )

    def _read_output(self) -> Read:
        return Read(
            which="output",
            frequency_hz=self.step.frequency_hz,
            expected_vrms=self.step.output_vrms,
        )

    def _keep(self) -> KeepPoint:
        point = point_from(
            self.step,
            self.schedule,
            input_reading=self._readings.get(State.READING_INPUT),
            output_reading=self._readings[State.READING_OUTPUT],
            attempts=self._attempt,
        )
        return KeepPoint(point=point)

    def _recover(self) -> Recover:
        return Recover(pause_s=PAUSE_S * (self._attempt - 2))

    def _ended(self) -> EndSweep:
        return self._end


# The actions that depend on where the sweep stands.
_ACTIONS: dict[State, Callable[[Stepper], Action]] = {
    State.SETTING: Stepper._set_point,
    State.STEPPING: Stepper._set_point,
    State.SETTLING: Stepper._settle,
    State.READING_INPUT: Stepper._read_input,
    State.READING_OUTPUT: Stepper._read_output,
    State.KEEPING: Stepper._keep,
    State.RECOVERING: Stepper._recover,
    State.ENDED: Stepper._ended,
}
