"""The one loop of a sweep: ask the stepper, do it, feed back what came of it.

The source goes off on every way out of here: finished, stopped, interrupted, instrument in
trouble, logbook in trouble, or an error nobody thought of.
"""

from collections.abc import Callable
from dataclasses import dataclass

from benchlog.bench.faces import SourceRole, SweepBench
from benchlog.bench.perform import Performer, Progress, settle_time, time_model
from benchlog.bench.stop import StopFlag
from benchlog.errors import BenchlogError, InstrumentError, LinkLost, LinkTimeout, ReplyError
from benchlog.records import Point, SweepEnd
from benchlog.sweep.actions import (
    Action,
    EndSweep,
    Event,
    KeepPoint,
    Recovery,
    Stop,
    SwitchOff,
    Trouble,
)
from benchlog.sweep.schedule import Schedule
from benchlog.sweep.stepper import OFF_FAILED, OFF_TRIES, Stepper

# Cleaning the link and asking again helps against these; not against another instrument at the
# address, nor against one that understood and refused.
_RETRIABLE = (LinkTimeout, LinkLost, ReplyError)
_INTERRUPTED = "The sweep was interrupted at once."


@dataclass(frozen=True, slots=True, kw_only=True)
class SweepResult:
    """How a sweep ended, and what it brought.

    Attributes:
        state: How it ended.
        why: Sentences for people.
        points: The points that were kept, in order.
        recoveries: Every trouble that made a point begin again.
        source_off: False when the source could not be switched off.
        error: What made the sweep fail, or kept the source from being switched off; None when
            nothing did.
    """

    state: SweepEnd
    why: str
    points: tuple[Point, ...]
    recoveries: tuple[Recovery, ...]
    source_off: bool = True
    error: BenchlogError | None = None


def run_sweep(
    bench: SweepBench,
    schedule: Schedule,
    *,
    keep: Callable[[Point], None],
    progress: Callable[[Progress], None] | None = None,
    stop: StopFlag | None = None,
    retries: int = 2,
) -> SweepResult:
    """Measure a schedule on a bench.

    Args:
        bench: Opened instruments, and a clock that watches the same ``stop``.
        schedule: What is to be measured.
        keep: Makes a point durable before it returns; the next action waits for it.
        progress: Told where the sweep stands.
        stop: Once set, the sweep ends within one reading.
        retries: How often one point is begun again after trouble with a link.

    Returns:
        The result; trouble with instruments or logbook is in it, not raised.

    Raises:
        BaseException: Whatever else ``keep`` or ``progress`` raise; the source is off all the
            same, or the error carries a note that it is not.
    """
    flag = stop or StopFlag()
    performer = Performer(bench, schedule, keep=keep, progress=progress, stop=flag)
    stepper = Stepper(
        schedule,
        settle_time(bench),
        input_meter=bench.input_meter is not None,
        retries=retries,
    )
    try:
        return _Loop(stepper, performer, flag).to_the_end()
    except BaseException as error:
        if not performer.source_off and not _force_off(bench.source):
            error.add_note(OFF_FAILED)
        raise


class _Loop:
    """Turns what happens on the bench into what the stepper understands."""

    def __init__(self, stepper: Stepper, performer: Performer, stop: StopFlag) -> None:
        self.stepper = stepper
        self.performer = performer
        self.stop = stop
        self.error: BenchlogError | None = None

    def to_the_end(self) -> SweepResult:
        while not isinstance(action := self.stepper.next_action(), EndSweep):
            try:
                self.feed(self.event(action))
            except KeyboardInterrupt:
                self.interrupted()
        bad = action.state == "failed" or not action.source_off
        return SweepResult(
            state=action.state,
            why=action.why,
            points=tuple(self.performer.points),
            recoveries=self.stepper.recoveries,
            source_off=action.source_off,
            error=self.error if bad else None,
        )

    def feed(self, event: Event) -> None:
        known = len(self.stepper.recoveries)
        self.stepper.feed(event)
        if len(self.stepper.recoveries) > known:
            self.performer.tell_trouble(self.stepper.recoveries[-1].why)

    def event(self, action: Action) -> Event:
        """Carry an action out; errors become events here and nowhere else."""
        # A point already measured is kept, and switching off is what a stop asks for.
        if self.stop.why is not None and not isinstance(action, KeepPoint | SwitchOff):
            return Stop(why=self.stop.why)
        try:
            return self.performer.perform(action)
        except InstrumentError as error:
            self.performer.disturbed = True
            self.error = error
            return Trouble(why=_sentence(error), retriable=isinstance(error, _RETRIABLE))
        except BenchlogError as error:
            self.error = error
            return Trouble(why=_sentence(error), retriable=False)

    def interrupted(self) -> None:
        """End the sweep now; in the middle of switching off, an interrupt costs one try."""
        self.performer.disturbed = True
        match self.stepper.next_action():
            case EndSweep():
                return
            case SwitchOff():
                self.stepper.feed(Trouble(why=_INTERRUPTED, retriable=False))
            case _:
                self.stepper.feed(Stop(why=_INTERRUPTED))


def _sentence(error: BenchlogError) -> str:
    return f"{error.what} ({error.where})" if error.where else error.what


def _force_off(source: SourceRole) -> bool:
    """Switch off after an error nobody thought of; True when the source took the command."""
    for _ in range(OFF_TRIES):
        try:
            source.recover()
            source.switch_off()
        except (Exception, KeyboardInterrupt):
            # Whatever it was: the one thing that matters now is the next try.
            continue
        return True
    return False


__all__ = ["Progress", "SweepResult", "run_sweep", "settle_time", "time_model"]
