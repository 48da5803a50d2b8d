"""Nothing in a logbook is changed or deleted, and nothing impossible is let in."""

import sqlite3
from pathlib import Path

import pytest

from benchlog.errors import LogbookError
from benchlog.logbook import names
from benchlog.logbook.open import open_connection
from benchlog.logbook.store import Logbook
from tests.fakes.sample_sweep import (
    DESIGN_SHA256,
    DESIGN_TEXT,
    sample_figures,
    sample_points,
    sample_start,
    sample_verdict,
)


@pytest.fixture
def full(path: Path) -> sqlite3.Connection:
    """Return a connection to a logbook with at least one row in each table."""
    start = sample_start(design_sha256=DESIGN_SHA256, kind="capture", capture_sha256="ab" * 32)
    first, *others = sample_points()
    with Logbook(path) as logbook:
        logbook.begin_sweep(start, design_text=DESIGN_TEXT, design_name="a", design_revision="b")
        logbook.add_points(start.uuid, [first, *others])
        repeated = {**{name: getattr(first, name) for name in first.__slots__}, "kind": "check"}
        logbook.add_point(start.uuid, type(first)(**{**repeated, "attempts": 2, "raw": "9.9E37"}))
        logbook.end_sweep(start.uuid, "complete")
        logbook.add_verdict(
            logbook.add_figures(start.uuid, sample_figures()), sample_verdict(), "budget"
        )
    return open_connection(path)


@pytest.mark.parametrize("table", names.KEPT_TABLES)
def test_no_row_is_deleted_changed_or_replaced(full: sqlite3.Connection, table: str) -> None:
    """DELETE, UPDATE and INSERT OR REPLACE are refused on every table."""
    columns = [row[1] for row in full.execute(f"PRAGMA table_info({table})")]
    before = full.execute(f"SELECT * FROM {table}").fetchall()
    assert before
    with pytest.raises(sqlite3.IntegrityError, match=f"only grows: {table} rows are never deleted"):
        full.execute(f"DELETE FROM {table}")
    for column in columns:
        with pytest.raises(sqlite3.IntegrityError, match=f"{table} rows are never changed"):
            full.execute(f"UPDATE {table} SET {column} = {column}")
    with pytest.raises(sqlite3.IntegrityError):
        full.execute(f"INSERT OR REPLACE INTO {table} SELECT * FROM {table}")
    assert full.execute(f"SELECT * FROM {table}").fetchall() == before
    full.close()


def test_every_table_of_the_schema_is_guarded(full: sqlite3.Connection) -> None:
    """A table added to the schema must be added to the names, and so to the test above."""
    found = full.execute("SELECT name FROM sqlite_master WHERE type = 'table'")
    ours = {row[0] for row in found} - {names.MIGRATIONS, "sqlite_sequence"}
    assert ours == set(names.KEPT_TABLES)
    full.close()


def test_every_table_is_strict(full: sqlite3.Connection) -> None:
    """Text does not slip into a number's column."""
    found = full.execute("SELECT name FROM pragma_table_list WHERE schema = 'main' AND strict = 0")
    loose = {row[0] for row in found}
    assert loose == {"sqlite_schema"}
    full.close()


_INFINITE = float("inf")

_IMPOSSIBLE = [
    ("frequency_hz", 0.0),
    ("frequency_hz", -1.0),
    ("frequency_hz", _INFINITE),
    ("frequency_hz", float("nan")),
    ("frequency_hz", "a kilohertz"),
    ("level_vrms", -0.1),
    ("level_vrms", _INFINITE),
    ("level_vrms", None),
    ("input_vrms", -0.1),
    ("output_vrms", _INFINITE),
    ("gain", -1.0),
    ("gain", _INFINITE),
    ("u_gain_rel", -1e-6),
    ("u_gain_rel", _INFINITE),
    ("phase_deg", _INFINITE),
    ("phase_deg", -_INFINITE),
    ("flags", -1),
    ("flags", 1.5),
    ("position", -1),
    ("repeat", -1),
    ("sweep", 999),
]


@pytest.mark.parametrize(("column", "value"), _IMPOSSIBLE)
def test_the_file_itself_refuses_an_impossible_point(
    path: Path, column: str, value: object
) -> None:
    """Even where this program is gone around, no such number gets in."""
    start = sample_start()
    with Logbook(path) as logbook:
        logbook.begin_sweep(start)
    connection = open_connection(path)
    row = {"sweep": 1, "position": 0, "repeat": 0, "frequency_hz": 1e3, "level_vrms": 1.0}
    changed: dict[str, object] = {**row, "flags": 0, column: value}
    with pytest.raises(sqlite3.IntegrityError):
        connection.execute(
            f"INSERT INTO {names.POINT} ({', '.join(changed)})"
            f" VALUES ({', '.join('?' * len(changed))})",
            tuple(changed.values()),
        )
    connection.close()


def test_the_file_itself_refuses_points_after_the_end(full: sqlite3.Connection) -> None:
    """The end row closes a sweep for everybody."""
    with pytest.raises(sqlite3.IntegrityError, match="this sweep has ended"):
        full.execute(
            f"INSERT INTO {names.POINT} (sweep, position, repeat, frequency_hz, level_vrms, flags)"
            " VALUES (1, 99, 0, 1e3, 1.0, 0)"
        )
    full.close()


def test_unknown_words_are_refused(logbook: Logbook) -> None:
    """A state that is none of the three is not stored."""
    start = sample_start()
    logbook.begin_sweep(start)
    with pytest.raises(LogbookError, match="refused a row"):
        logbook.end_sweep(start.uuid, "finished")  # type: ignore[arg-type]
    assert logbook.sweep(start.uuid).state == "unfinished"
