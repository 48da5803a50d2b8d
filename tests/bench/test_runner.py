"""The one loop of a sweep, on a bench in memory."""

import pytest

from benchlog.bench.runner import Progress, SweepResult, run_sweep, time_model
from benchlog.bench.stop import StopFlag
from benchlog.errors import (
    CommandRefused,
    IdentityError,
    InstrumentError,
    LinkLost,
    LinkTimeout,
    LogbookError,
    ReplyError,
)
from benchlog.records import Point, PointFlag, Status
from benchlog.sweep.actions import Recovery
from benchlog.sweep.schedule import log_spaced, spaced_schedule
from benchlog.sweep.stepper import OFF_FAILED
from tests.fakes.fake_bench import Failure, FakeBench, true_gain

SCHEDULE = spaced_schedule(log_spaced(100.0, 1e6, 2), 0.01)


def sweep(bench: FakeBench, kept: list[Point] | None = None, **options: object) -> SweepResult:
    """Sweep the common schedule; everything kept goes to a list."""
    keep = ([] if kept is None else kept).append
    return run_sweep(bench, SCHEDULE, **{"keep": keep, **options})  # type: ignore[arg-type]


def assert_right(points: list[Point] | tuple[Point, ...]) -> None:
    """Every point has the gain of its own frequency."""
    for point in points:
        assert point.gain == pytest.approx(true_gain(point.frequency_hz), rel=1e-12)


def test_a_healthy_sweep() -> None:
    """All points, in order, right, kept as they came; the source is off at the end."""
    bench, kept = FakeBench(), list[Point]()

    result = sweep(bench, kept)

    assert (result.state, result.why) == ("complete", "All points were measured.")
    assert [point.frequency_hz for point in result.points] == [
        step.frequency_hz for step in SCHEDULE.steps
    ]
    assert tuple(kept) == result.points
    assert_right(result.points)
    assert (result.recoveries, result.source_off, result.error) == ((), True, None)
    assert bench.was_on
    assert not bench.knobs.on


def test_every_point_is_kept_before_the_next_is_set() -> None:
    """Nothing is sent to an instrument between a point's last reading and its being durable."""
    bench = FakeBench()

    def keep(point: Point) -> None:
        assert bench.calls[-1] == "output_meter.check_errors"
        assert bench.calls.count("source.set_point") == point.position + 1

    assert run_sweep(bench, SCHEDULE, keep=keep).state == "complete"


def test_gain_from_the_programmed_level() -> None:
    """With one meter, gain is the output over the level that was programmed."""
    bench = FakeBench(two_meters=False)

    result = sweep(bench)

    assert_right(result.points)
    assert {point.input_vrms for point in result.points} == {None}


@pytest.mark.parametrize("status", [Status.OVERLOAD, Status.NOT_A_NUMBER])
def test_a_state_is_a_flagged_point_and_not_a_retry(status: Status) -> None:
    """Overload and not-a-number are answers: kept with their raw text, never asked for again."""
    frequency_hz = SCHEDULE.steps[3].frequency_hz
    bench = FakeBench(states={("output_meter", frequency_hz): status})

    result = sweep(bench)

    point = result.points[3]
    flag = {Status.OVERLOAD: PointFlag.OVERLOAD, Status.NOT_A_NUMBER: PointFlag.NOT_A_NUMBER}
    assert (point.gain, point.flags, point.attempts) == (None, flag[status], 1)
    assert point.raw is not None
    assert point.raw.endswith("9.9E37")
    assert result.state == "complete"
    assert_right(result.points[:3] + result.points[4:])


@pytest.mark.parametrize(
    ("error", "retriable"),
    [
        (LinkTimeout("no answer", where="meter"), True),
        (LinkLost("gone", where="meter"), True),
        (ReplyError("not a number", where="meter", raw="?!"), True),
        (IdentityError("another instrument answers", where="meter"), False),
        (CommandRefused("-222 Data out of range", where="meter"), False),
        (InstrumentError("something else", where="meter"), False),
    ],
    ids=lambda value: type(value).__name__,
)
def test_which_troubles_are_measured_again(error: InstrumentError, *, retriable: bool) -> None:
    """A link's troubles begin the point again; another instrument or a refusal ends the sweep."""
    failure = Failure(nth=3, only="output_meter.read_level", error=lambda: error)
    bench = FakeBench(failure=failure)

    result = sweep(bench)

    why = f"{error.what} (meter)"
    if retriable:
        assert result.state == "complete"
        assert result.recoveries == (Recovery(position=2, attempt=1, why=why),)
        assert [point.attempts for point in result.points][:4] == [1, 1, 2, 1]
        assert result.error is None
        assert bench.calls.count("source.recover") == 1
    else:
        assert (result.state, result.why) == ("failed", why)
        assert result.error is error
        assert len(result.points) == 2
    assert_right(result.points)
    assert not bench.knobs.on


def test_retries_are_bounded() -> None:
    """An instrument that never comes back ends the sweep after so many tries."""
    bench = FakeBench(failure=Failure(nth=3, for_good=True, only="output_meter.read_level"))

    result = sweep(bench, retries=2)

    assert (result.state, result.why) == ("failed", "no answer within 1 s (fake)")
    assert [recovery.attempt for recovery in result.recoveries] == [1, 2]
    assert len(result.points) == 2
    assert isinstance(result.error, LinkTimeout)
    assert not bench.knobs.on


def test_a_source_that_cannot_be_switched_off() -> None:
    """It is tried three times, and then said so that nobody can miss it."""
    bench = FakeBench(failure=Failure(nth=1, for_good=True, only="source.switch_off"))

    result = sweep(bench)

    assert result.state == "complete"
    assert not result.source_off
    assert OFF_FAILED in result.why
    assert isinstance(result.error, LinkTimeout)
    assert bench.calls.count("source.switch_off") == 3
    assert bench.calls.count("source.recover") == 2


def test_only_the_source_is_recovered_before_it_is_switched_off() -> None:
    """A dead meter must not keep the source on while it is waited for."""
    bench = FakeBench(failure=Failure(nth=2, for_good=True, only="output_meter"))

    sweep(bench, retries=0)

    assert bench.calls[-3:] == ["output_meter.check_errors", "source.recover", "source.switch_off"]


class TestLogbookTrouble:
    """What happens when a point cannot be kept."""

    def test_the_sweep_ends_and_is_not_measured_again(self) -> None:
        """The failing point is asked for once, the source goes off, the reason is reported."""
        bench, kept = FakeBench(), list[Point]()
        trouble = LogbookError("the disk is full", where="logbook.db")

        def keep(point: Point) -> None:
            if point.position == 4:
                raise trouble
            kept.append(point)

        result = run_sweep(bench, SCHEDULE, keep=keep)

        assert (result.state, result.why) == ("failed", "the disk is full (logbook.db)")
        assert result.error is trouble
        assert result.points == tuple(kept)
        assert len(kept) == 4
        assert bench.calls.count("source.set_point") == 5
        assert not bench.knobs.on

    def test_an_error_nobody_thought_of_leaves_the_source_off(self) -> None:
        """A bug in keep goes on upwards, after the source was switched off."""
        bench = FakeBench()

        def keep(_: Point) -> None:
            raise ZeroDivisionError

        with pytest.raises(ZeroDivisionError) as caught:
            run_sweep(bench, SCHEDULE, keep=keep)

        assert bench.was_on
        assert not bench.knobs.on
        assert not hasattr(caught.value, "__notes__")

    def test_a_source_left_on_is_noted_on_the_error(self) -> None:
        """Where even that fails, the error carries the warning."""
        bench = FakeBench(failure=Failure(nth=1, for_good=True, only="source.switch_off"))

        def keep(_: Point) -> None:
            raise ZeroDivisionError

        with pytest.raises(ZeroDivisionError) as caught:
            run_sweep(bench, SCHEDULE, keep=keep)

        assert caught.value.__notes__ == [OFF_FAILED]
        assert bench.calls.count("source.switch_off") == 3


def test_progress_counts_down() -> None:
    """Each point is told when begun and when kept; the time left falls to nothing."""
    told: list[Progress] = []

    sweep(FakeBench(), progress=told.append)

    count = len(SCHEDULE.steps)
    assert [(each.kept, each.point is None) for each in told] == [
        pair for n in range(count) for pair in ((n, True), (n + 1, False))
    ]
    assert {each.count for each in told} == {count}
    left = [each.seconds_left for each in told]
    assert left == sorted(left, reverse=True)
    assert left[-1] == 0


def test_the_first_estimate_is_near_the_truth() -> None:
    """The time model's sum agrees with what the clock shows at the end."""
    bench, told = FakeBench(), list[Progress]()

    sweep(bench, progress=told.append)

    assert told[0].seconds_left == pytest.approx(bench.clock.now_s(), rel=0.2)
    assert time_model(bench).seconds(100.0) == pytest.approx(0.03 + 0.1, abs=0.05)


def test_progress_tells_trouble() -> None:
    """A point that is begun again is told with the reason."""
    told: list[Progress] = []

    sweep(FakeBench(failure=Failure(nth=3, only="output_meter.read_level")), progress=told.append)

    troubles = [each for each in told if each.trouble]
    assert [(each.kept, each.trouble) for each in troubles] == [(2, "no answer within 1 s (fake)")]
    assert troubles[0].frequency_hz == SCHEDULE.steps[2].frequency_hz


def test_a_clock_that_cuts_waits_short_stops_the_sweep() -> None:
    """A wait that ended early for any reason never leads to a reading."""
    bench = FakeBench()
    bench.clock.on_wait = lambda: setattr(bench.clock, "time_s", bench.clock.time_s - 0.01)

    result = sweep(bench)

    assert (result.state, result.points) == ("stopped", ())
    assert result.why == "The sweep was stopped while it waited."
    assert "output_meter.read_level" not in bench.calls


class TestStop:
    """A set flag, and interrupts."""

    def test_a_stop_before_the_start(self) -> None:
        """Nothing is measured; the source is told to be off, whoever left it on."""
        stop = StopFlag()
        stop.set("enough")
        bench = FakeBench()

        result = sweep(bench, stop=stop)

        assert (result.state, result.why, result.points) == ("stopped", "enough", ())
        assert bench.calls == ["source.switch_off"]

    @pytest.mark.parametrize("nth", range(1, 61, 4))
    def test_a_stop_at_any_call(self, nth: int) -> None:
        """From the call in which the flag is set, no further reading is begun."""
        stop = StopFlag()
        bench = FakeBench()
        bench.on_call = lambda _: stop.set("enough") if len(bench.calls) == nth else None

        result = sweep(bench, stop=stop)

        assert result.state == "stopped"
        assert [name for name in bench.calls[nth:] if "read_level" in name] == []
        assert bench.calls[-1] == "source.switch_off"
        assert not bench.knobs.on
        assert_right(result.points)

    def test_a_point_already_read_is_kept(self) -> None:
        """A stop that comes while the last check runs does not throw the point away."""
        stop = StopFlag()
        bench = FakeBench()
        last = "output_meter.check_errors"
        bench.on_call = lambda name: (
            stop.set("enough") if name == last and bench.calls.count(last) == 4 else None
        )

        result = sweep(bench, stop=stop)

        # prepare is followed by one check before switching on, then one for each point
        assert len(result.points) == 3

    @pytest.mark.parametrize("nth", range(1, 62, 3))
    @pytest.mark.parametrize("after", [False, True])
    def test_an_interrupt_at_any_call(self, nth: int, *, after: bool) -> None:
        """KeyboardInterrupt ends the sweep at once: source's link recovered, output off."""
        failure = Failure(nth=nth, after=after, error=KeyboardInterrupt)
        bench = FakeBench(failure=failure)

        result = sweep(bench)

        assert (result.state, result.why) == ("stopped", "The sweep was interrupted at once.")
        assert bench.calls[nth:] == ["source.recover", "source.switch_off"]
        assert not bench.knobs.on
        assert result.source_off
        assert_right(result.points)

    def test_an_interrupt_while_switching_off_costs_one_try(self) -> None:
        """Impatience does not leave the source on."""
        failure = Failure(nth=1, only="source.switch_off", error=KeyboardInterrupt)
        bench = FakeBench(failure=failure)

        result = sweep(bench)

        assert result.state == "complete"
        assert result.source_off
        assert bench.calls[-3:] == ["source.switch_off", "source.recover", "source.switch_off"]

    def test_interrupts_for_good_do_not_keep_the_program_from_ending(self) -> None:
        """Who presses at every try gets out, told that the source is still on."""
        failure = Failure(nth=1, for_good=True, only="source.switch_off", error=KeyboardInterrupt)
        bench = FakeBench(failure=failure)

        result = sweep(bench)

        assert (result.state, result.source_off) == ("complete", False)
        assert bench.calls.count("source.switch_off") == 3

    def test_an_interrupt_in_keep(self) -> None:
        """Whether or not the point became durable, the sweep ends as stopped and off."""
        bench = FakeBench()

        def keep(point: Point) -> None:
            if point.position == 2:
                raise KeyboardInterrupt

        result = run_sweep(bench, SCHEDULE, keep=keep)

        assert (result.state, len(result.points)) == ("stopped", 2)
        assert not bench.knobs.on
