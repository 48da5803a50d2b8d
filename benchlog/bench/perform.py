"""Carrying out one action of a sweep on the bench, and telling where the sweep stands."""

from collections.abc import Callable
from dataclasses import dataclass
from itertools import accumulate

from benchlog.bench.faces import Role, SweepBench, meters_of
from benchlog.bench.stop import StopFlag
from benchlog.records import Point, Reading
from benchlog.sweep.actions import (
    Action,
    CheckErrors,
    Done,
    Event,
    KeepPoint,
    Level,
    Prepare,
    Read,
    Recover,
    SetPoint,
    Settle,
    Stop,
    SwitchOff,
    SwitchOn,
)
from benchlog.sweep.schedule import Schedule
from benchlog.sweep.time_model import TimeModel, longest, together

# A wait on a virtual clock may end a rounding error early.
_EARLY_S = 1e-6


@dataclass(frozen=True, slots=True, kw_only=True)
class Progress:
    """Where a sweep stands; told when a point is begun, kept, or begun again.

    Attributes:
        kept: Points kept so far.
        count: Points of the schedule.
        frequency_hz: What is being measured, or was measured last.
        seconds_left: Until the last point is kept, by the time model.
        point: The point just kept; None otherwise.
        trouble: Why the point is begun again; None when all is well.
    """

    kept: int
    count: int
    frequency_hz: float
    seconds_left: float
    point: Point | None = None
    trouble: str | None = None


def settle_time(bench: SweepBench) -> Callable[[float], float]:
    """Return the settling of source and meters together, seconds as a function of hertz."""
    return longest([role.settle_s for role in (bench.source, *meters_of(bench))])


def time_model(bench: SweepBench) -> TimeModel:
    """Return how long points take on this bench."""
    readings = together([meter.reading_s for meter in meters_of(bench)])
    return TimeModel(settle_s=settle_time(bench), reading_s=readings)


class Performer:
    """Does on one bench what the stepper of one sweep asks for.

    Attributes:
        points: The points kept so far.
        source_off: True once the source took the command to switch off.
        disturbed: True after trouble or an interrupt, until every link was recovered: a link may
            then hold half an answer.
    """

    def __init__(
        self,
        bench: SweepBench,
        schedule: Schedule,
        *,
        keep: Callable[[Point], None],
        progress: Callable[[Progress], None] | None,
        stop: StopFlag,
    ) -> None:
        self.points: list[Point] = []
        self.source_off = False
        self.disturbed = False
        self._bench = bench
        self._schedule = schedule
        self._keep = keep
        self._progress = progress
        self._stop = stop
        self._model = time_model(bench)
        self._measuring_left_s = _left([self._model.measuring_s(f) for f in schedule.frequencies()])
        self._began_s = bench.clock.now_s()

    def perform(self, action: Action) -> Event:
        """Carry one action out.

        Returns:
            What came of it; Stop where a wait was cut short.

        Raises:
            BenchlogError: An instrument or the logbook is in trouble.
        """
        match action:
            case Prepare() | CheckErrors() | SwitchOn():
                self._instruct(action)
            case SetPoint():
                self._set_point(action)
            case Settle():
                return self._wait(action.seconds)
            case Read():
                return Level(reading=self._read(action))
            case KeepPoint():
                self._keep_point(action.point)
            case Recover():
                return self._recover(action.pause_s)
            case SwitchOff():
                self._switch_off()
        return Done()

    def tell_trouble(self, why: str) -> None:
        """Report that the present point has to be begun again."""
        place = min(len(self.points), len(self._schedule.steps) - 1)
        self._tell(self._schedule.steps[place].frequency_hz, trouble=why)

    def _instruct(self, action: Prepare | CheckErrors | SwitchOn) -> None:
        if isinstance(action, SwitchOn):
            self._bench.source.switch_on()
            return
        for role in self._roles():
            if isinstance(action, Prepare):
                role.prepare()
            else:
                role.check_errors()

    def _roles(self) -> tuple[Role, ...]:
        """Return all roles; the source comes first because it is the one that can do harm."""
        return (self._bench.source, *meters_of(self._bench))

    def _set_point(self, action: SetPoint) -> None:
        self._began_s = self._bench.clock.now_s()
        self._tell(action.frequency_hz)
        self._bench.source.set_point(frequency_hz=action.frequency_hz, level_vrms=action.level_vrms)

    def _wait(self, seconds: float) -> Event:
        clock = self._bench.clock
        end_s = clock.now_s() + seconds
        clock.wait(seconds)
        # Whatever cut the wait short, a reading taken now would belong to an unsettled board.
        if clock.now_s() < end_s - _EARLY_S:
            return Stop(why=self._stop.why or "The sweep was stopped while it waited.")
        return Done()

    def _read(self, action: Read) -> Reading:
        meter = self._bench.output_meter
        if action.which == "input" and self._bench.input_meter is not None:
            meter = self._bench.input_meter
        return meter.read_level(
            frequency_hz=action.frequency_hz, expected_vrms=action.expected_vrms
        )

    def _keep_point(self, point: Point) -> None:
        self._keep(point)
        self.points.append(point)
        took_s = self._bench.clock.now_s() - self._began_s
        self._model = self._model.learned(point.frequency_hz, took_s)
        self._tell(point.frequency_hz, point=point)

    def _recover(self, pause_s: float) -> Event:
        waited = self._wait(pause_s)
        if isinstance(waited, Done):
            for role in self._roles():
                role.recover()
            self.disturbed = False
        return waited

    def _switch_off(self) -> None:
        if self.disturbed:
            self._bench.source.recover()
        self._bench.source.switch_off()
        self.source_off = True

    def _tell(
        self, frequency_hz: float, *, point: Point | None = None, trouble: str | None = None
    ) -> None:
        if self._progress is None:
            return
        kept, count = len(self.points), len(self._schedule.steps)
        overhead_s = self._model.overhead_s * (count - kept)
        progress = Progress(
            kept=kept,
            count=count,
            frequency_hz=frequency_hz,
            seconds_left=self._measuring_left_s[kept] + overhead_s,
            point=point,
            trouble=trouble,
        )
        self._progress(progress)


def _left(each_s: list[float]) -> list[float]:
    """Return what is left before each of some durations, and after the last."""
    return [*accumulate(reversed(each_s), initial=0.0)][::-1]
