"""Which journal mode is safe with the SQLite that Python was linked with."""

from typing import Literal, TypeAlias

Version: TypeAlias = tuple[int, int, int]

# Source: sqlite.org/wal.html, the WAL-reset bug: 3.7.0 to 3.51.2, mended in 3.51.3 and carried back
# to two older series.
_MENDED_FROM: Version = (3, 51, 3)
_MENDED_SERIES = {(3, 50): 7, (3, 44): 6}


def wal_is_sound(version: Version) -> bool:
    """Tell whether a write-ahead log can be trusted with results.

    Args:
        version: SQLite's own version, as in ``sqlite3.sqlite_version_info``.

    Returns:
        False where overlapping writes and checkpoints can lose committed rows.

    Source:
        sqlite.org/wal.html, the WAL-reset bug.
    """
    carried_back_from = _MENDED_SERIES.get(version[:2])
    carried_back = carried_back_from is not None and version[2] >= carried_back_from
    return carried_back or version >= _MENDED_FROM


def journal_mode(version: Version) -> Literal["wal", "delete"]:
    """Choose the journal mode: a write-ahead log where it is sound, else the rollback journal."""
    return "wal" if wal_is_sound(version) else "delete"
