"""A bench in memory for tests of the runner: harsh about order, and failing on request.

It knows nothing of links or messages.  A reading taken too early, with the output off or from an
instrument that lost its settings is wrong by a factor, so that a wrong point shows in its gain.
"""

import math
from collections.abc import Callable
from dataclasses import dataclass, field

from benchlog.errors import BenchlogError, LinkTimeout, Misuse
from benchlog.records import Reading, Status

GAIN = 48.0
CORNER_HZ = 62.5e3


def true_gain(frequency_hz: float) -> float:
    """Return the gain of the invented board."""
    return GAIN / math.hypot(1, frequency_hz / CORNER_HZ)


def no_answer() -> BenchlogError:
    """Return what a link raises when nothing comes."""
    return LinkTimeout("no answer within 1 s", where="fake")


@dataclass
class Failure:
    """Which call fails, and how.

    Attributes:
        nth: The call that fails, counted from 1 over all instruments; 0 for none.
        for_good: All later calls fail too.
        after: The call was carried out, but nobody heard of it.
        power_cycle: The instrument lost its settings.
        error: Makes the exception.
        only: Count only calls whose name starts so.
    """

    nth: int = 0
    for_good: bool = False
    after: bool = False
    power_cycle: bool = False
    error: Callable[[], BaseException] = no_answer
    only: str = ""
    count: int = 0

    def due(self, name: str) -> bool:
        """Count a call; tell whether it fails."""
        if not name.startswith(self.only):
            return False
        self.count += 1
        due = self.count >= self.nth if self.for_good else self.count == self.nth
        return due and self.nth > 0

    @property
    def happened(self) -> bool:
        """Tell whether the call was reached."""
        return 0 < self.nth <= self.count


class FakeClock:
    """A clock that is a number."""

    def __init__(self) -> None:
        self.time_s = 0.0
        self.waits: list[float] = []
        self.on_wait: Callable[[], None] = lambda: None

    def now_s(self) -> float:
        """Return the number."""
        return self.time_s

    def wait(self, seconds: float) -> None:
        """Add to the number."""
        self.waits.append(seconds)
        self.time_s += seconds
        self.on_wait()


@dataclass
class Knobs:
    """What the source is set to."""

    frequency_hz: float = 1e3
    level_vrms: float = 0.0
    on: bool = False
    changed_s: float = -1e9


class FakeRole:
    """What source and meters have in common."""

    def __init__(self, bench: "FakeBench", name: str) -> None:
        self.bench = bench
        self.name = name
        self.dirty = False
        self.prepared = False

    def settle_s(self, frequency_hz: float) -> float:
        """Return a few periods."""
        return max(0.02, 3 / frequency_hz)

    def prepare(self) -> None:
        """Know one's settings again."""
        with_effect = self.reach("prepare")
        self.prepared = True
        self.lose(with_effect)

    def check_errors(self) -> None:
        """Find nothing in the queue."""
        self.lose(self.reach("check_errors"))

    def recover(self) -> None:
        """Make the link clean."""
        failing = self.reach("recover", clean=False)
        self.dirty = False
        self.lose(failing)

    def reach(self, call: str, *, clean: bool = True) -> bool:
        """Reach the instrument; return whether the answer gets lost on the way back."""
        if clean and self.dirty:
            raise Misuse(f"{self.name}.{call} on a dirty link")
        name = f"{self.name}.{call}"
        self.bench.calls.append(name)
        self.bench.on_call(name)
        failure = self.bench.failure
        if not failure.due(name):
            return False
        self.dirty = True
        if failure.power_cycle:
            self.lose_settings()
        if not failure.after:
            raise failure.error()
        return True

    def lose(self, lost: bool) -> None:  # noqa: FBT001 - read as a word here
        """Lose the answer."""
        if lost:
            self.dirty = True
            raise self.bench.failure.error()

    def lose_settings(self) -> None:
        """Forget everything, as after a power cycle."""
        self.prepared = False


class FakeSource(FakeRole):
    """A signal source."""

    def prepare(self) -> None:
        """Know one's settings again, output off."""
        lost = self.reach("prepare")
        self.prepared = True
        self.bench.knobs.on = False
        self.lose(lost)

    def set_point(self, *, frequency_hz: float, level_vrms: float) -> None:
        """Set frequency and level."""
        lost = self.reach("set_point")
        knobs = self.bench.knobs
        knobs.frequency_hz, knobs.level_vrms = frequency_hz, level_vrms
        knobs.changed_s = self.bench.clock.now_s()
        self.lose(lost)

    def switch_on(self) -> None:
        """Switch the output on."""
        lost = self.reach("switch_on")
        self.bench.knobs.on = True
        self.bench.was_on = True
        self.bench.knobs.changed_s = self.bench.clock.now_s()
        self.lose(lost)

    def switch_off(self) -> None:
        """Switch the output off."""
        lost = self.reach("switch_off")
        self.bench.knobs.on = False
        self.lose(lost)

    def lose_settings(self) -> None:
        """Forget everything; the output stays off after a power cycle."""
        self.prepared = False
        self.bench.knobs = Knobs()


class FakeMeter(FakeRole):
    """A voltmeter at one end of the board."""

    def reading_s(self, frequency_hz: float) -> float:  # noqa: ARG002 - the face of a meter
        """Return the time of a reading."""
        return 0.05

    def read_level(self, *, frequency_hz: float, expected_vrms: float | None) -> Reading:  # noqa: ARG002 - the face of a meter
        """Return the level, wrong by a factor when something was left undone."""
        lost = self.reach("read_level")
        bench, knobs = self.bench, self.bench.knobs
        since_s = bench.clock.now_s() - knobs.changed_s
        value_vrms = knobs.level_vrms if knobs.on else 1e-6
        if self.name == "output_meter":
            value_vrms *= true_gain(knobs.frequency_hz)
        if since_s < bench.source.settle_s(knobs.frequency_hz) - 1e-9:
            value_vrms *= 1.5
        if not (self.prepared and bench.source.prepared):
            value_vrms *= 10
        bench.clock.time_s += self.reading_s(frequency_hz)
        self.lose(lost)
        state = bench.states.get((self.name, knobs.frequency_hz))
        if state is not None:
            return Reading(value_vrms=None, status=state, raw="9.9E37")
        return Reading(value_vrms=value_vrms, status=Status.OK, raw=repr(value_vrms))


@dataclass
class FakeBench:
    """Source, two meters and a clock.

    Attributes:
        failure: Which call fails.
        calls: Every call that reached an instrument: ``"source.set_point"``.
        states: What a meter shows instead of a number, by meter and frequency.
        on_call: Looked in at every call.
        was_on: True once the output has been on.
    """

    failure: Failure = field(default_factory=Failure)
    two_meters: bool = True
    clock: FakeClock = field(default_factory=FakeClock)
    knobs: Knobs = field(default_factory=Knobs)
    calls: list[str] = field(default_factory=list)
    states: dict[tuple[str, float], Status] = field(default_factory=dict)
    on_call: Callable[[str], None] = lambda _: None
    was_on: bool = False

    def __post_init__(self) -> None:
        self.source = FakeSource(self, "source")
        self.output_meter = FakeMeter(self, "output_meter")
        self.input_meter = FakeMeter(self, "input_meter") if self.two_meters else None
