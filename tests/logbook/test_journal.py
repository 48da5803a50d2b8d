"""The journal mode follows the linked SQLite's version."""

import pytest

from benchlog.logbook.journal import Version, journal_mode

# Source: sqlite.org/wal.html, the WAL-reset bug: 3.7.0 to 3.51.2, mended in 3.51.3, 3.50.7, 3.44.6.
_TABLE: list[tuple[Version, str]] = [
    ((3, 6, 23), "delete"),  # no write-ahead log yet
    ((3, 7, 0), "delete"),
    ((3, 40, 1), "delete"),
    ((3, 43, 2), "delete"),
    ((3, 44, 5), "delete"),
    ((3, 44, 6), "wal"),
    ((3, 44, 9), "wal"),
    ((3, 45, 0), "delete"),
    ((3, 49, 9), "delete"),
    ((3, 50, 6), "delete"),
    ((3, 50, 7), "wal"),
    ((3, 51, 0), "delete"),
    ((3, 51, 2), "delete"),
    ((3, 51, 3), "wal"),
    ((3, 52, 0), "wal"),
    ((4, 0, 0), "wal"),
]


@pytest.mark.parametrize(("version", "mode"), _TABLE, ids=str)
def test_journal_mode_avoids_the_wal_reset_bug(version: Version, mode: str) -> None:
    """A write-ahead log is chosen only outside the range in which it can lose rows."""
    assert journal_mode(version) == mode
