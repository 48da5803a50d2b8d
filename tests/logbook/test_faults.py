"""The disk fails at the 1st, 2nd, ... statement: whole or gone, and nothing kept is lost."""

import itertools
import sqlite3
from collections.abc import Callable, Iterator
from dataclasses import replace
from functools import partial
from pathlib import Path

import pytest

from benchlog.errors import LogbookError
from benchlog.logbook.store import Logbook
from benchlog.records import Point
from tests.fakes.failing_connection import (
    Fault,
    FullDiskConnection,
    busy_error,
    failing_connection,
)
from tests.fakes.sample_sweep import (
    DESIGN_SHA256,
    DESIGN_TEXT,
    sample_figures,
    sample_points,
    sample_start,
    sample_verdict,
)

_START = sample_start(design_sha256=DESIGN_SHA256)
_FIRST, *_OTHERS = sample_points(3)
_POINTS = (_FIRST, *_OTHERS, replace(_FIRST, kind="check", attempts=2, raw="9.91E37"))


def _story(logbook: Logbook) -> Iterator[Callable[[], object]]:
    """Give the writes of one sweep, one after the other; each is one transaction."""
    yield lambda: logbook.begin_sweep(
        _START, design_text=DESIGN_TEXT, design_name="line preamp", design_revision="C"
    )
    for point in _POINTS:
        yield partial(logbook.add_point, _START.uuid, point)
    yield lambda: logbook.end_sweep(_START.uuid, "complete")
    yield lambda: logbook.add_figures(_START.uuid, sample_figures())
    yield lambda: logbook.add_verdict(1, sample_verdict(), "budget")


_WRITES = 1 + len(_POINTS) + 3


def _kept(path: Path) -> int:
    """Count how many writes of the story a file holds, and check that the file is sound."""
    connection = sqlite3.connect(path)
    assert connection.execute("PRAGMA integrity_check").fetchall() == [("ok",)]
    assert connection.execute("PRAGMA foreign_key_check").fetchall() == []
    connection.close()
    with Logbook(path) as logbook:
        info = logbook.info()
        if info.sweeps == 0:
            assert (info.designs, info.points) == (0, 0)
            return 0
        stored = logbook.sweep(_START.uuid)
        points = logbook.points(_START.uuid)
        assert stored.start == _START
        assert len(stored.start.instruments) == 2
        assert points == _by_position(_POINTS[: len(points)])
        ended = stored.state == "complete"
        return info.sweeps + len(points) + ended + info.figures + info.verdicts


def _by_position(points: tuple[Point, ...]) -> tuple[Point, ...]:
    return tuple(sorted(points, key=lambda point: (point.position, point.kind == "check")))


def _write_until_it_fails(path: Path, factory: type[sqlite3.Connection]) -> int:
    """Write the story; return how many writes were said to be done before the fault."""
    done = 0
    try:
        with Logbook(path, factory=factory) as logbook:
            for write in _story(logbook):
                write()
                done += 1
    except LogbookError as error:
        assert "the disk failed under the logbook" in error.what  # noqa: PT017 - counted as well
    return done


@pytest.mark.parametrize("after", [False, True], ids=["before", "after"])
@pytest.mark.parametrize("forever", [False, True], ids=["once", "forever"])
def test_what_was_said_to_be_kept_is_kept(
    path: Path, empty_logbook_bytes: bytes, *, forever: bool, after: bool
) -> None:
    """Every statement in turn fails, once or for good, before or after it was carried out."""
    for nth in itertools.count(1):
        path.write_bytes(empty_logbook_bytes)
        fault = Fault(nth, forever=forever, after=after)
        done = _write_until_it_fails(path, failing_connection(fault))
        # A commit whose answer was lost may be there; anything else that failed must not be.
        assert _kept(path) - done in ({0, 1} if after else {0})
        if not fault.happened:
            assert done == _WRITES
            break
    assert nth > 30


def test_after_one_fault_the_same_write_succeeds(path: Path, empty_logbook_bytes: bytes) -> None:
    """A fault that goes away costs nothing: the write is repeated on the open logbook."""
    for nth in itertools.count(1):
        path.write_bytes(empty_logbook_bytes)
        fault = Fault(10**9)
        with Logbook(path, factory=failing_connection(fault)) as logbook:
            fault.nth = fault.count + nth
            for write in _story(logbook):
                try:
                    write()
                except LogbookError:
                    write()
            failed = fault.happened
        assert _kept(path) == _WRITES
        if not failed:
            break
    assert nth > 20


def test_a_fault_while_undoing_a_fault_is_survived(path: Path) -> None:
    """The rollback fails as well; the next write starts clean."""
    fault = Fault(10**9, times=2)
    with Logbook(path, factory=failing_connection(fault)) as logbook:
        logbook.begin_sweep(sample_start())
        start = sample_start()
        fault.nth = fault.count + 2  # the first statement after BEGIN, and then the ROLLBACK
        with pytest.raises(LogbookError, match="the disk failed"):
            logbook.begin_sweep(start)
        assert logbook._connection.in_transaction
        logbook.begin_sweep(start)
        assert logbook.sweep(start.uuid).start == start
        assert logbook.info().sweeps == 2


def test_making_a_logbook_fails_at_every_statement(tmp_path: Path) -> None:
    """Each half-made file is taken up again by the next try, and no wrong one is left."""
    for nth in itertools.count(1, 7):  # every seventh, for the sake of time
        path = tmp_path / f"{nth}.db"
        fault = Fault(nth)
        try:
            Logbook(path, create=True, factory=failing_connection(fault)).close()
        except LogbookError:
            Logbook(path, create=True).close()
        assert _kept(path) == 0
        if not fault.happened:
            break
    assert nth > 50


@pytest.mark.parametrize("prefix", ["BEGIN", "INSERT", "COMMIT"])
@pytest.mark.parametrize(("times", "kept"), [(1, True), (2, True), (3, False)])
def test_a_busy_file_is_tried_again_a_few_times(
    path: Path, prefix: str, times: int, *, kept: bool
) -> None:
    """Another program in the way is waited for, with an end to the patience."""
    fault = Fault(10**9, prefix=prefix, times=times, error=busy_error)
    start = sample_start(instruments=())
    with Logbook(path, factory=failing_connection(fault)) as logbook:
        with logbook.together():  # so that only the sweep's own row is an INSERT
            logbook.begin_sweep(sample_start(instruments=()))
        fault.nth = fault.count + 1
        if kept:
            logbook.begin_sweep(start)
        else:
            with pytest.raises(LogbookError, match="in use by another program"):
                logbook.begin_sweep(start)
        assert logbook.info().sweeps == (2 if kept else 1)


def _add_until_full(logbook: Logbook, uuid: str, points: tuple[Point, ...]) -> int:
    for kept, point in enumerate(points):
        try:
            logbook.add_point(uuid, point)
        except LogbookError as error:
            assert "there is no room left for the logbook" in error.what  # noqa: PT017
            return kept
    return len(points)


def test_a_full_disk_loses_nothing_that_was_kept(path: Path) -> None:
    """One clear error, the file stays sound, and with room again the sweep goes on."""
    start = sample_start()
    points = tuple(replace(_FIRST, position=position, raw="x" * 200) for position in range(500))
    with Logbook(path) as logbook:
        logbook.begin_sweep(start)
    with Logbook(path, factory=FullDiskConnection) as logbook:
        kept = _add_until_full(logbook, start.uuid, points)
    assert 0 < kept < len(points)
    with Logbook(path) as logbook:
        assert logbook.points(start.uuid) == points[:kept]
        logbook.add_points(start.uuid, points[kept:])
        assert logbook.points(start.uuid) == points
        assert logbook._connection.execute("PRAGMA integrity_check").fetchall() == [("ok",)]


def test_a_sweep_stopped_by_hand_leaves_no_transaction_open(path: Path) -> None:
    """Ctrl-C inside a write undoes that write and nothing else."""

    class Stopping(sqlite3.Connection):
        def executemany(self, *_: object) -> sqlite3.Cursor:
            raise KeyboardInterrupt

    start = sample_start(instruments=())
    with Logbook(path) as logbook:
        logbook.begin_sweep(start)
    with Logbook(path, factory=Stopping) as logbook:
        with pytest.raises(KeyboardInterrupt):
            logbook.add_point(start.uuid, _FIRST)
        assert not logbook._connection.in_transaction
        assert logbook.points(start.uuid) == ()
