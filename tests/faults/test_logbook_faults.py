"""The n-th statement to the logbook fails in the middle of a sweep, for every n.

Every point that keep returned for is in the file and right; at most one more is there, whose
commit was carried out but not confirmed; the source is off; the file is sound.
"""

import shutil
import sqlite3
from collections.abc import Iterator
from contextlib import closing
from pathlib import Path

import pytest

from benchlog.bench.runner import SweepResult, run_sweep
from benchlog.errors import LogbookError
from benchlog.logbook.store import Logbook
from benchlog.records import Point
from benchlog.sweep.schedule import spaced_schedule
from tests.fakes.failing_connection import Fault, failing_connection
from tests.fakes.fake_bench import FakeBench, true_gain
from tests.fakes.sample_sweep import sample_start

SCHEDULE = spaced_schedule([100.0, 1e4, 1e6], 0.01)
FAR = 500


@pytest.fixture
def logbook_file(tmp_path: Path) -> Path:
    """Return a logbook with one sweep that has begun."""
    path = tmp_path / "begun.db"
    with Logbook(path, create=True) as logbook:
        logbook.begin_sweep(START)
    return path


START = sample_start()


def sweep_into(path: Path, fault: Fault, *, bench: FakeBench, kept: list[Point]) -> SweepResult:
    """Sweep into a logbook whose statements fail, ending it as the command line would."""
    with Logbook(path, factory=failing_connection(fault)) as logbook:

        def keep(point: Point) -> None:
            logbook.add_point(START.uuid, point)
            kept.append(point)

        result = run_sweep(bench, SCHEDULE, keep=keep)
        logbook.end_sweep(START.uuid, result.state, result.why)
    return result


def stored(path: Path) -> tuple[Point, ...]:
    """Return the points in a file, once it has been found sound."""
    with closing(sqlite3.connect(path)) as connection:
        assert connection.execute("PRAGMA integrity_check").fetchall() == [("ok",)]
        assert connection.execute("PRAGMA foreign_key_check").fetchall() == []
    with Logbook(path) as logbook:
        return logbook.points(START.uuid)


def faults(**how: object) -> Iterator[Fault]:
    """Give faults at the 1st, 2nd, ... statement until one is not reached any more."""
    for nth in range(1, FAR):
        fault = Fault(nth, **how)  # type: ignore[arg-type]
        yield fault
        if not fault.happened:
            assert nth > 10
            return
    pytest.fail("the sweep never passed untouched")


@pytest.mark.parametrize("how", [{}, {"forever": True}, {"after": True}], ids=str)
def test_every_statement(logbook_file: Path, how: dict[str, object]) -> None:
    """A failing statement never loses or makes up a point, and never leaves the source on."""
    for fault in faults(**how):
        path = logbook_file.with_name("logbook.db")
        for old in logbook_file.parent.glob("logbook.db*"):
            old.unlink()
        shutil.copy(logbook_file, path)
        bench, kept = FakeBench(), list[Point]()

        try:
            result = sweep_into(path, fault, bench=bench, kept=kept)
        except LogbookError:
            pass  # opening or ending failed: reported to the caller as it is
        else:
            assert result.source_off
            assert (result.state == "complete") == (len(kept) == len(SCHEDULE.steps))
            assert isinstance(result.error, LogbookError) == (result.state == "failed")

        points = stored(path)
        assert not bench.knobs.on
        assert list(points[: len(kept)]) == kept
        assert len(points) - len(kept) in ({0, 1} if fault.after else {0})
        assert [point.position for point in points] == [*range(len(points))]
        for point in points:
            assert point.gain == pytest.approx(true_gain(point.frequency_hz), rel=1e-12)
