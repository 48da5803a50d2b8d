"""Every write is one small transaction that is wholly there or wholly gone."""

import sqlite3
from collections.abc import Callable, Iterator
from contextlib import contextmanager, suppress
from pathlib import Path
from typing import TypeVar

from benchlog.errors import Misuse
from benchlog.logbook.refusal import is_busy, refusal, said_plainly

T = TypeVar("T")

# Each try already waits as long as the connection's busy timeout says.
_TRIES = 3


class Writer:
    """The one writing connection of an open logbook.

    Args:
        connection: An open connection with ``isolation_level=None``.
        path: The file, for messages.
    """

    def __init__(self, connection: sqlite3.Connection, path: Path) -> None:
        self.connection = connection
        self.path = path
        self._together = False

    def write(self, work: Callable[[sqlite3.Connection], T]) -> T:
        """Run ``work`` in a transaction of its own and commit it before returning.

        ``work`` may run again after another program was in the way; what it did before is undone.

        Raises:
            LogbookError: SQLite refused; nothing of ``work`` is kept.
        """
        if self._together:
            with said_plainly(self.path):
                return work(self.connection)
        for remaining in reversed(range(_TRIES)):
            try:
                return self._once(work)
            except sqlite3.Error as error:
                if remaining == 0 or not is_busy(error):
                    raise refusal(error, self.path) from error
        raise AssertionError("the last try returns or raises")

    @contextmanager
    def together(self) -> Iterator[None]:
        """Make all writes inside the block one transaction: all of them, or none.

        Raises:
            Misuse: One such block inside another.
        """
        if self._together:
            raise Misuse("writes are already grouped into one transaction")
        self.write(lambda _: None)  # waits for a busy file, and ends what an old fault left open
        with said_plainly(self.path), self._transaction():
            self._together = True
            try:
                yield
            finally:
                self._together = False

    def _once(self, work: Callable[[sqlite3.Connection], T]) -> T:
        with self._transaction():
            return work(self.connection)

    @contextmanager
    def _transaction(self) -> Iterator[None]:
        if self.connection.in_transaction:  # an earlier rollback failed
            self.connection.execute("ROLLBACK")
        # A deferred transaction would fail at once, without waiting, when it turns into a write.
        self.connection.execute("BEGIN IMMEDIATE")
        try:
            yield
            self.connection.execute("COMMIT")
        except BaseException:
            # SQLite rolls back by itself on some errors, and what undoes a fault may fail as well.
            with suppress(sqlite3.Error):
                if self.connection.in_transaction:
                    self.connection.execute("ROLLBACK")
            raise
