"""The n-th call to an instrument fails, for every n until a sweep passes untouched.

Whatever fails: a kept point has the gain of its own frequency, none is kept twice or left out
before a later one, the source is off, and the file is sound.
"""

import shutil
import sqlite3
from collections.abc import Iterator
from contextlib import closing
from pathlib import Path

import pytest

from benchlog.bench.runner import SweepResult, run_sweep
from benchlog.errors import IdentityError, LinkTimeout
from benchlog.logbook.store import Logbook
from benchlog.records import Point
from benchlog.sweep.schedule import spaced_schedule
from tests.fakes.fake_bench import Failure, FakeBench, true_gain
from tests.fakes.sample_sweep import sample_start

SCHEDULE = spaced_schedule([100.0, 1e4, 1e6], 0.01)
FAR = 500


def failures(**how: object) -> Iterator[Failure]:
    """Give failures at the 1st, 2nd, ... call until one is not reached any more."""
    for nth in range(1, FAR):
        failure = Failure(nth=nth, **how)  # type: ignore[arg-type]
        yield failure
        if not failure.happened:
            assert nth > 5
            return
    pytest.fail("the sweep never passed untouched")


def assert_sound(bench: FakeBench, result: SweepResult, kept: tuple[Point, ...]) -> None:
    """Nothing wrong, nothing lost, source off or loudly not."""
    assert [point.position for point in kept] == [*range(len(kept))]
    for point in kept:
        assert point.gain == pytest.approx(true_gain(point.frequency_hz), rel=1e-12)
        assert point.frequency_hz == SCHEDULE.steps[point.position].frequency_hz
    assert (result.state == "complete") == (len(kept) == len(SCHEDULE.steps))
    if result.source_off:
        assert not bench.knobs.on
    else:
        assert "COULD NOT BE SWITCHED OFF" in result.why


@pytest.mark.parametrize("power_cycle", [False, True])
@pytest.mark.parametrize("after", [False, True])
def test_once(*, after: bool, power_cycle: bool) -> None:
    """One failure anywhere is recovered from: the sweep is complete and right."""
    for failure in failures(after=after, power_cycle=power_cycle):
        bench, kept = FakeBench(failure=failure), list[Point]()

        result = run_sweep(bench, SCHEDULE, keep=kept.append)

        assert_sound(bench, result, tuple(kept))
        assert (result.state, result.source_off) == ("complete", True), failure
        in_switching_off = bench.calls.count("source.switch_off") > 1
        assert len(result.recoveries) == (failure.happened and not in_switching_off)


@pytest.mark.parametrize("after", [False, True])
def test_for_good(*, after: bool) -> None:
    """A bench that stays away fails the sweep; what was kept before stays right."""
    for failure in failures(after=after, for_good=True):
        bench, kept = FakeBench(failure=failure), list[Point]()

        result = run_sweep(bench, SCHEDULE, keep=kept.append)

        assert_sound(bench, result, tuple(kept))
        assert result.source_off != failure.happened
        assert isinstance(result.error, LinkTimeout) == failure.happened


@pytest.mark.parametrize("role", ["source", "input_meter", "output_meter"])
def test_one_instrument_for_good(role: str) -> None:
    """A meter that stays away does not keep the source on."""
    for failure in failures(for_good=True, only=role):
        bench, kept = FakeBench(failure=failure), list[Point]()

        result = run_sweep(bench, SCHEDULE, keep=kept.append)

        assert_sound(bench, result, tuple(kept))
        assert result.source_off == (role != "source" or not failure.happened)


def test_another_instrument_answers() -> None:
    """Trouble that trying again cannot cure ends the sweep at once, source off."""
    for failure in failures(error=lambda: IdentityError("another instrument answers")):
        bench, kept = FakeBench(failure=failure), list[Point]()

        result = run_sweep(bench, SCHEDULE, keep=kept.append)

        assert_sound(bench, result, tuple(kept))
        assert result.recoveries == ()
        assert result.source_off


@pytest.mark.parametrize("for_good", [False, True])
def test_with_the_logbook(tmp_path: Path, *, for_good: bool) -> None:
    """What the file holds afterwards is exactly what was kept, and the file is sound."""
    empty = tmp_path / "empty.db"
    Logbook(empty, create=True).close()
    for failure in failures(for_good=for_good):
        path = tmp_path / "logbook.db"
        shutil.copy(empty, path)
        bench, start = FakeBench(failure=failure), sample_start()
        with Logbook(path) as logbook:
            logbook.begin_sweep(start)
            result = run_sweep(
                bench,
                SCHEDULE,
                keep=lambda point: logbook.add_point(start.uuid, point),  # noqa: B023 - used at once
            )
            logbook.end_sweep(start.uuid, result.state, result.why)
            assert logbook.points(start.uuid) == result.points
        assert_sound(bench, result, result.points)
        with closing(sqlite3.connect(path)) as connection:
            assert connection.execute("PRAGMA integrity_check").fetchall() == [("ok",)]
            assert connection.execute("PRAGMA foreign_key_check").fetchall() == []
