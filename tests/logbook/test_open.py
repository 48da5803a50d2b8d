"""Opening a file that is not as it should be gives one clear error each."""

import os
import sqlite3
import subprocess
import sys
from pathlib import Path

import pytest

from benchlog.errors import LogbookError
from benchlog.logbook import open as opening
from benchlog.logbook.journal import journal_mode
from benchlog.logbook.store import Logbook
from tests.fakes.failing_connection import ImpatientConnection
from tests.fakes.sample_sweep import sample_start


def _text(folder: Path) -> Path:
    path = folder / "notes.txt"
    path.write_text("dear diary, " * 100)
    return path


def _foreign(folder: Path) -> Path:
    path = folder / "other.db"
    with sqlite3.connect(path) as connection:
        connection.execute("CREATE TABLE recipes (name TEXT)")
    connection.close()
    return path


def _empty(folder: Path) -> Path:
    path = folder / "empty.db"
    path.touch()
    return path


_NO_LOGBOOK = [
    (_text, "this file is not a logbook: it is no SQLite file"),
    (_foreign, "this file is a SQLite file, but not a logbook"),
    (_empty, "this file is empty, so it is no logbook yet"),
    (lambda folder: folder, "this is a folder, not a logbook"),
    (lambda folder: folder / "nothing.db", "there is no logbook here"),
    (lambda folder: folder / "no" / "where.db", "the logbook's folder does not exist"),
    (lambda folder: _empty(folder) / "below.db", "the logbook's folder does not exist"),
]


@pytest.mark.parametrize(("make", "said"), _NO_LOGBOOK, ids=range(len(_NO_LOGBOOK)))
@pytest.mark.parametrize("read_only", [False, True])
def test_what_is_no_logbook_is_said_so(
    tmp_path: Path, make: object, said: str, *, read_only: bool
) -> None:
    """One error that names the file and what to do; and nothing is made or changed."""
    path: Path = make(tmp_path)  # type: ignore[operator]
    before = {found: found.stat().st_size for found in tmp_path.rglob("*")}
    with pytest.raises(LogbookError, match=said) as caught:
        Logbook(path, read_only=read_only)
    assert caught.value.where == str(path)
    assert caught.value.hint or caught.value.expected
    assert {found: found.stat().st_size for found in tmp_path.rglob("*")} == before


def test_creating_over_another_file_is_refused(tmp_path: Path) -> None:
    """``create`` makes a logbook where there is nothing, never inside somebody else's file."""
    for make in (_text, _foreign):
        path = make(tmp_path)
        before = path.read_bytes()
        with pytest.raises(LogbookError, match="not a logbook"):
            Logbook(path, create=True)
        assert path.read_bytes() == before


def test_creating_where_a_logbook_is_opens_it(path: Path) -> None:
    """Its name and its rows stay."""
    with Logbook(path) as logbook:
        name = logbook.info().uuid
        logbook.begin_sweep(sample_start())
    with Logbook(path, create=True) as logbook:
        assert logbook.info().uuid == name
        assert logbook.info().sweeps == 1


def test_strange_characters_in_the_path_are_only_characters(
    tmp_path: Path, empty_logbook_bytes: bytes
) -> None:
    """A path is never read as a URI with options in it."""
    path = tmp_path / "a %20 b?mode=memory#c ü.db"
    path.write_bytes(empty_logbook_bytes)
    with Logbook(str(path)) as logbook:
        logbook.begin_sweep(sample_start())
    assert [found.name for found in tmp_path.iterdir()] == [path.name]


def test_a_write_protected_file_is_refused_before_a_sweep(
    path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """A sweep must not start when its points could not be kept; reading is still possible."""
    allowed = os.access
    monkeypatch.setattr(os, "access", lambda what, mode: not mode & os.W_OK and allowed(what, mode))
    with pytest.raises(LogbookError, match="the logbook cannot be written to"):
        Logbook(path)
    with Logbook(path, read_only=True) as logbook:
        assert logbook.history() == ()


def test_a_logbook_opened_for_reading_takes_nothing(path: Path) -> None:
    """Writing to it is one clear error."""
    with (
        Logbook(path, read_only=True) as logbook,
        pytest.raises(LogbookError, match="the logbook cannot be written to"),
    ):
        logbook.begin_sweep(sample_start())


def test_a_locked_logbook_is_said_to_be_in_use(path: Path) -> None:
    """Both when opening and when writing."""
    other = sqlite3.connect(path, isolation_level=None)
    with Logbook(path, factory=ImpatientConnection) as logbook:
        other.execute("BEGIN EXCLUSIVE")
        with pytest.raises(LogbookError, match="in use by another program"):
            logbook.begin_sweep(sample_start())
        with pytest.raises(LogbookError, match="in use by another program"):
            logbook.history()
        with pytest.raises(LogbookError, match="in use by another program"):
            Logbook(path, factory=ImpatientConnection)
        other.execute("ROLLBACK")
        logbook.begin_sweep(sample_start())
    other.close()


def test_a_damaged_file_is_said_to_be_damaged(path: Path) -> None:
    """A file cut short is neither used nor repaired."""
    whole = path.read_bytes()
    path.write_bytes(whole[: len(whole) // 2])
    with pytest.raises(LogbookError, match="the logbook is damaged"):
        Logbook(path)


@pytest.mark.parametrize(
    ("spoil", "said"),
    [
        ("DROP TABLE verdict", "damaged: table verdict is missing"),
        (
            "DROP TRIGGER logbook_keeps_its_rows; DELETE FROM logbook",
            "damaged: its own name is missing",
        ),
        (
            "INSERT INTO _sqlite_migrations (migration_set, name, applied_at)"
            " VALUES ('benchlog', '0099_teleport', 'later')",
            r"newer than this program \(.*\): it has 0099_teleport",
        ),
    ],
)
def test_a_spoilt_or_newer_logbook_is_refused(path: Path, spoil: str, said: str) -> None:
    """What this program does not know it does not touch."""
    connection = sqlite3.connect(path)
    connection.executescript(spoil)
    connection.close()
    with pytest.raises(LogbookError, match=said) as caught:
        Logbook(path)
    assert caught.value.where == str(path)


def test_connections_are_set_for_safety(logbook: Logbook) -> None:
    """Foreign keys on, every commit on the disk, triggers not to be gone around."""
    wanted = {
        "foreign_keys": 1,
        "synchronous": 2,  # FULL
        "recursive_triggers": 1,
        "trusted_schema": 0,
        "busy_timeout": 5000,
        "journal_mode": journal_mode(sqlite3.sqlite_version_info),
    }
    found = {name: logbook._connection.execute(f"PRAGMA {name}").fetchone()[0] for name in wanted}
    assert found == wanted


def test_the_journal_mode_is_changed_to_the_sound_one(
    path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """A logbook made elsewhere with a write-ahead log goes back where that is not sound."""
    for mode in ("wal", "delete"):
        monkeypatch.setattr(opening, "journal_mode", lambda _, mode=mode: mode)
        with Logbook(path) as logbook:
            assert logbook.info().journal_mode == mode


def test_an_unsound_journal_mode_that_others_hold_is_refused(
    path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Where the write-ahead log can lose rows, it is not shared."""
    other = sqlite3.connect(path, isolation_level=None)
    other.execute("PRAGMA journal_mode = wal")
    other.execute("SELECT count(*) FROM sweep").fetchone()
    monkeypatch.setattr(opening, "journal_mode", lambda _: "delete")
    with pytest.raises(LogbookError, match="in use by another program"):
        Logbook(path, factory=ImpatientConnection)
    other.close()


def test_too_old_a_sqlite_is_said_so(path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Without STRICT tables nothing is opened."""
    monkeypatch.setattr(sqlite3, "sqlite_version_info", (3, 36, 0))
    with pytest.raises(LogbookError, match="which is too old"):
        Logbook(path)


def test_closing_twice_is_quiet(path: Path) -> None:
    """A second close does nothing; using it afterwards is one clear error."""
    logbook = Logbook(path)
    logbook.close()
    logbook.close()
    with pytest.raises(LogbookError, match="cannot be used"):
        logbook.history()


def test_opening_an_up_to_date_logbook_is_cheap(path: Path) -> None:
    """The libraries that take long to import are left alone."""
    script = (
        "import sys\n"
        "from benchlog.logbook.store import Logbook\n"
        f"Logbook({str(path)!r}).history('0042')\n"
        "slow = {'sqlite_utils', 'numpy', 'pandas'} & set(sys.modules)\n"
        "sys.exit(str(slow) if slow else 0)\n"
    )
    run = subprocess.run(
        [sys.executable, "-c", script], check=False, capture_output=True, text=True
    )
    assert run.returncode == 0, run.stderr
