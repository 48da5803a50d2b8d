"""The one place where SQLite's exceptions become errors that a person can act on."""

import sqlite3
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from benchlog.errors import LogbookError

_GO_BACK = "keep the file as it is and go back to a backup"

# SQLite's primary result code is the low byte of the extended one.
_WHAT_AND_HINT = {
    sqlite3.SQLITE_BUSY: (
        "the logbook is in use by another program",
        "wait until the other program has finished, or close it",
    ),
    sqlite3.SQLITE_READONLY: (
        "the logbook cannot be written to",
        "allow writing to the file and to its folder, or work on a copy",
    ),
    sqlite3.SQLITE_FULL: (
        "there is no room left for the logbook",
        "make room on the disk; everything up to here is kept",
    ),
    sqlite3.SQLITE_NOTADB: (
        "this file is not a logbook: it is no SQLite file",
        "give the path of a logbook, or make one with `benchlog new`",
    ),
    sqlite3.SQLITE_CORRUPT: (
        "the logbook is damaged",
        _GO_BACK,
    ),
    sqlite3.SQLITE_CANTOPEN: (
        "the logbook cannot be opened",
        "look at the path and at who may read the file and its folder",
    ),
    sqlite3.SQLITE_IOERR: (
        "the disk failed under the logbook",
        "look at the disk; everything committed before is kept",
    ),
    sqlite3.SQLITE_CONSTRAINT: (
        "the logbook refused a row",
        "nothing of it was kept; report this as a bug if nothing unusual was done",
    ),
}
_UNKNOWN = ("the logbook cannot be used", "")


@contextmanager
def said_plainly(path: Path) -> Iterator[None]:
    """Turn any exception of SQLite inside the block into a ``LogbookError`` about this file."""
    try:
        yield
    except sqlite3.Error as error:
        raise refusal(error, path) from error
    except UnicodeDecodeError as error:  # SQLite's own message quotes bytes of the damaged file
        raise damaged(f"it holds bytes that are not text ({error})").at(str(path)) from error


def refusal(error: sqlite3.Error, path: Path) -> LogbookError:
    """Return the error that tells a person what SQLite said and what to do."""
    what, hint = _WHAT_AND_HINT.get(primary_code(error), _UNKNOWN)
    return LogbookError(f"{what} ({error})", where=str(path), hint=hint)


def damaged(what: str) -> LogbookError:
    """Return the error for a file that holds what no logbook can hold."""
    return LogbookError(f"the logbook is damaged: {what}", hint=_GO_BACK)


def is_busy(error: sqlite3.Error) -> bool:
    """Tell whether somebody else holds the file, so that another try can succeed."""
    return primary_code(error) in {sqlite3.SQLITE_BUSY, sqlite3.SQLITE_LOCKED}


def primary_code(error: sqlite3.Error) -> int:
    """Return SQLite's primary result code, or -1 where the module made the exception itself."""
    code: int | None = getattr(error, "sqlite_errorcode", None)
    return -1 if code is None else code & 0xFF
