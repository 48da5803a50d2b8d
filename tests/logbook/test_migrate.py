"""Schema steps are applied once, in order, and wholly or not at all."""

import sqlite3
from pathlib import Path

import pytest

from benchlog.errors import LogbookError
from benchlog.logbook import open as opening
from benchlog.logbook.store import Logbook
from tests.fakes.sample_sweep import sample_points, sample_start

_NEXT = {"0002_colour": "CREATE TABLE colour (name TEXT NOT NULL) STRICT;"}
_BROKEN = {"0002_broken": "CREATE TABLE half (name TEXT) STRICT; CREATE TABLE half (name TEXT);"}


def _know_also(monkeypatch: pytest.MonkeyPatch, steps: dict[str, str]) -> None:
    known = {**opening.known_migrations(), **steps}
    monkeypatch.setattr(opening, "known_migrations", lambda: known)


def _tables(path: Path) -> set[str]:
    connection = sqlite3.connect(path)
    found = {row[0] for row in connection.execute("SELECT name FROM sqlite_master")}
    connection.close()
    return found


def test_the_steps_are_the_files_in_order() -> None:
    """Names come from the file names, which begin with their number."""
    known = list(opening.known_migrations())
    assert known[0] == "0001_logbook"
    assert known == sorted(known)
    assert [name[:4] for name in known] == [f"{number:04}" for number in range(1, len(known) + 1)]


def test_an_older_logbook_is_brought_up_to_date(
    path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Its rows stay, and the step is on its list."""
    start = sample_start()
    with Logbook(path) as logbook:
        logbook.begin_sweep(start)
        logbook.add_points(start.uuid, sample_points())
    _know_also(monkeypatch, _NEXT)
    with Logbook(path) as logbook:
        assert logbook.info().migrations[-1] == "0002_colour"
        assert logbook.points(start.uuid) == sample_points()
    assert "colour" in _tables(path)


def test_an_older_logbook_is_not_migrated_by_reading(
    path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Who promised to write nothing is told what to do."""
    _know_also(monkeypatch, _NEXT)
    with pytest.raises(LogbookError, match="older than this program"):
        Logbook(path, read_only=True)
    assert "colour" not in _tables(path)


def test_a_step_that_fails_half_way_leaves_the_old_logbook(
    path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Nothing of the step stays, and the older program still opens the file."""
    before = _tables(path)
    with monkeypatch.context() as patched:
        _know_also(patched, {**_NEXT, **_BROKEN})
        with pytest.raises(LogbookError, match="table half already exists"):
            Logbook(path)
    assert _tables(path) == before
    with Logbook(path) as logbook:
        assert logbook.info().migrations == ("0001_logbook",)


def test_a_new_logbook_that_fails_half_way_is_none(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """What is left is an empty file, in which the next try succeeds."""
    path = tmp_path / "logbook.db"
    with monkeypatch.context() as patched:
        _know_also(patched, _BROKEN)
        with pytest.raises(LogbookError, match="table half already exists"):
            Logbook(path, create=True)
    assert _tables(path) == set()
    with Logbook(path, create=True) as logbook:
        assert logbook.info().sweeps == 0


def test_every_new_logbook_has_its_own_name(tmp_path: Path) -> None:
    """Logbooks are told apart when they are merged."""
    names = set()
    for number in range(2):
        with Logbook(tmp_path / f"{number}.db", create=True) as logbook:
            names.add(logbook.info().uuid)
    assert len(names) == 2
