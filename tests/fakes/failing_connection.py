"""Connections to SQLite that fail on purpose, for ``Logbook(..., factory=...)``."""

import sqlite3
import sys
from collections.abc import Callable, Iterable, Iterator
from contextlib import contextmanager
from typing import Any


def disk_error() -> sqlite3.OperationalError:
    """Return the exception that SQLite raises when the disk fails."""
    error = sqlite3.OperationalError("disk I/O error")
    error.sqlite_errorcode = sqlite3.SQLITE_IOERR
    error.sqlite_errorname = "SQLITE_IOERR"
    return error


def busy_error() -> sqlite3.OperationalError:
    """Return the exception that SQLite raises when another program holds the file."""
    error = sqlite3.OperationalError("database is locked")
    error.sqlite_errorcode = sqlite3.SQLITE_BUSY
    error.sqlite_errorname = "SQLITE_BUSY"
    return error


class ImpatientConnection(sqlite3.Connection):
    """A connection that does not wait for a busy file, so that tests need not either."""

    def __init__(self, *args: Any, **options: Any) -> None:  # noqa: ANN401 - sqlite3's own
        super().__init__(*args, **{**options, "timeout": 0})


class FullDiskConnection(sqlite3.Connection):
    """A connection to a file that cannot grow by a single page."""

    def __init__(self, *args: Any, **options: Any) -> None:  # noqa: ANN401 - sqlite3's own
        super().__init__(*args, **options)
        self.execute("PRAGMA max_page_count = 1")  # SQLite makes this the size it has now


class Fault:
    """When to fail; shared by all connections of one class, and tells what became of it.

    Args:
        nth: The statement that fails, counted from 1 over all connections.
        times: How many statements fail, from the nth on; 1 by default.
        forever: All later statements fail too.
        after: Fail when the statement has been carried out, as a lost answer does.
        prefix: Count only statements that start so.
        error: Makes the exception.
    """

    def __init__(
        self,
        nth: int,
        *,
        times: int = 1,
        forever: bool = False,
        after: bool = False,
        prefix: str = "",
        error: Callable[[], sqlite3.Error] = disk_error,
    ) -> None:
        self.nth = nth
        self.times = sys.maxsize if forever else times
        self.after = after
        self.prefix = prefix
        self.error = error
        self.count = 0

    @property
    def happened(self) -> bool:
        """Tell whether a statement has failed yet."""
        return self.count >= self.nth

    @contextmanager
    def around(self, sql: str) -> Iterator[None]:
        """Count a statement; fail before or after it when its turn has come."""
        self.count += sql.startswith(self.prefix)
        due = self.nth <= self.count < self.nth + self.times and sql.startswith(self.prefix)
        if due and not self.after:
            raise self.error()
        yield
        if due:
            raise self.error()


def failing_connection(fault: Fault) -> type[sqlite3.Connection]:
    """Return a class of connections whose statements fail as ``fault`` says."""

    class FailingCursor(sqlite3.Cursor):
        def execute(self, sql: str, parameters: Any = (), /) -> "FailingCursor":  # noqa: ANN401
            with fault.around(sql):
                super().execute(sql, parameters)
            return self

        def executemany(self, sql: str, rows: Iterable[Any], /) -> "FailingCursor":
            with fault.around(sql):
                super().executemany(sql, rows)
            return self

    class FailingConnection(sqlite3.Connection):
        def cursor(self, _: Any = None) -> FailingCursor:  # type: ignore[override]  # noqa: ANN401
            return FailingCursor(self)

        def execute(self, sql: str, parameters: Any = (), /) -> FailingCursor:  # noqa: ANN401
            return self.cursor().execute(sql, parameters)

        def executemany(self, sql: str, rows: Iterable[Any], /) -> FailingCursor:
            return self.cursor().executemany(sql, rows)

    return FailingConnection
