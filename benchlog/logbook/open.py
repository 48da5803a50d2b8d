"""Open a logbook file: check what it is, bring it up to date, set it for safe writing."""

import os
import sqlite3
from contextlib import suppress
from pathlib import Path
from typing import TYPE_CHECKING
from uuid import uuid4

from benchlog import __version__
from benchlog.errors import LogbookError
from benchlog.folders import data_folder
from benchlog.logbook import names
from benchlog.logbook.door import utc_now
from benchlog.logbook.journal import journal_mode
from benchlog.logbook.refusal import damaged, said_plainly
from benchlog.logbook.transaction import Writer

if TYPE_CHECKING:
    from collections.abc import Callable

    from sqlite_utils import Database

# STRICT tables came with 3.37.
_OLDEST_SQLITE = (3, 37, 0)
_BUSY_TIMEOUT_MS = 5000


def open_connection(
    path: Path,
    *,
    create: bool = False,
    read_only: bool = False,
    factory: type[sqlite3.Connection] = sqlite3.Connection,
) -> sqlite3.Connection:
    """Open a logbook, making or migrating it where that is allowed.

    Args:
        path: The file.
        create: Make the logbook when there is none.
        read_only: Promise to write nothing; an archived, write-protected file can be read so.
        factory: Class of the connection; tests give one whose statements fail.

    Returns:
        A connection with foreign keys on and no implicit transactions.

    Raises:
        LogbookError: It is missing, not a logbook, newer than this program, not writable or busy.
    """
    _check_place(path, create=create, read_only=read_only)
    with said_plainly(path):
        connection = _connect(path, create=create, read_only=read_only, factory=factory)
    try:
        with said_plainly(path):
            _set_up(connection, path, create=create, read_only=read_only)
    except BaseException:
        with suppress(sqlite3.Error):
            connection.close()
        raise
    return connection


def known_migrations() -> dict[str, str]:
    """Return the schema steps that this program knows: name to SQL, in order."""
    steps = [step for step in data_folder("schema").iterdir() if step.name.endswith(".sql")]
    ordered = sorted(steps, key=lambda step: step.name)
    return {step.name.removesuffix(".sql"): step.read_text(encoding="utf-8") for step in ordered}


def applied_migrations(connection: sqlite3.Connection) -> tuple[str, ...]:
    """Return the names of the schema steps that a file has had, in order."""
    found = connection.execute(
        f"SELECT name FROM {names.MIGRATIONS} WHERE migration_set = ? ORDER BY id",
        (names.MIGRATION_SET,),
    )
    return tuple(row[0] for row in found)


def _check_place(path: Path, *, create: bool, read_only: bool) -> None:
    where = str(path)
    if sqlite3.sqlite_version_info < _OLDEST_SQLITE:
        raise LogbookError(
            f"Python is linked with SQLite {sqlite3.sqlite_version}, which is too old",
            expected="SQLite 3.37 or newer",
        )
    if path.is_dir():
        raise LogbookError("this is a folder, not a logbook", where=where, expected="a file")
    if not path.exists():
        if not path.parent.is_dir():
            raise LogbookError(
                "the logbook's folder does not exist", where=where, hint="make the folder first"
            )
        if not create or read_only:
            raise LogbookError(
                "there is no logbook here",
                where=where,
                hint="look at the path, or make a bench folder with `benchlog new`",
            )
        return
    # The journal is made beside the file, so the folder must allow writing too.
    if not read_only and not (os.access(path, os.W_OK) and os.access(path.parent, os.W_OK)):
        raise LogbookError(
            "the logbook cannot be written to",
            where=where,
            hint="allow writing to the file and to its folder, or work on a copy",
        )


def _connect(
    path: Path, *, create: bool, read_only: bool, factory: type[sqlite3.Connection]
) -> sqlite3.Connection:
    mode = "ro" if read_only else "rwc" if create else "rw"
    return sqlite3.connect(
        f"{path.resolve().as_uri()}?mode={mode}",
        uri=True,
        isolation_level=None,
        timeout=_BUSY_TIMEOUT_MS / 1000,
        factory=factory,
    )


def _set_up(connection: sqlite3.Connection, path: Path, *, create: bool, read_only: bool) -> None:
    connection.execute("PRAGMA foreign_keys = ON")
    # Without it, INSERT OR REPLACE would delete rows past the DELETE triggers.
    connection.execute("PRAGMA recursive_triggers = ON")
    connection.execute("PRAGMA trusted_schema = OFF")
    connection.execute("PRAGMA synchronous = FULL")
    if _is_empty(connection):
        if not create:
            raise LogbookError(
                "this file is empty, so it is no logbook yet",
                where=str(path),
                hint="make one with `benchlog new`",
            )
    else:
        _check_kind(connection, path)
    _bring_up_to_date(connection, path, read_only=read_only)
    _check_tables(connection, path)
    if not read_only:
        _choose_journal(connection, path)


def _is_empty(connection: sqlite3.Connection) -> bool:
    count: int = connection.execute("SELECT count(*) FROM sqlite_master").fetchone()[0]
    return count == 0


def _check_kind(connection: sqlite3.Connection, path: Path) -> None:
    (application_id,) = connection.execute("PRAGMA application_id").fetchone()
    if application_id != names.APPLICATION_ID:
        raise LogbookError(
            "this file is a SQLite file, but not a logbook",
            where=str(path),
            hint="give the path of a logbook, or make one with `benchlog new`",
        )


def _bring_up_to_date(connection: sqlite3.Connection, path: Path, *, read_only: bool) -> None:
    known = known_migrations()
    applied = () if _is_empty(connection) else applied_migrations(connection)
    newer = [name for name in applied if name not in known]
    if newer:
        raise LogbookError(
            f"this logbook is newer than this program ({__version__}): it has {', '.join(newer)}",
            where=str(path),
            hint="use the newer benchlog that wrote it",
        )
    if len(applied) == len(known):
        return
    if read_only:
        raise LogbookError(
            "this logbook is older than this program and must be brought up to date first",
            where=str(path),
            hint="open it once for writing, for example with `benchlog logbook info`",
        )
    Writer(connection, path).write(lambda opened: _migrate(opened, known))


def _migrate(connection: sqlite3.Connection, known: dict[str, str]) -> None:
    """Apply the missing steps; the caller's transaction makes them all or nothing."""
    # Costs a quarter of a second, so only here.
    from sqlite_utils import Database, Migrations

    database = Database(connection, execute_plugins=False, strict=True)
    steps = Migrations(names.MIGRATION_SET)
    for name, script in known.items():
        steps(name=name)(_step(script))
    steps.apply(database)
    if connection.execute(f"SELECT count(*) FROM {names.LOGBOOK}").fetchone()[0] == 0:
        connection.execute(
            f"INSERT INTO {names.LOGBOOK} (id, uuid, created_at, program) VALUES (?, ?, ?, ?)",
            (names.THIS_LOGBOOK, str(uuid4()), utc_now(), f"benchlog {__version__}"),
        )


def _step(script: str) -> "Callable[[Database], None]":
    def apply(database: "Database") -> None:
        database.executescript(script)

    return apply


def _check_tables(connection: sqlite3.Connection, path: Path) -> None:
    found = {row[0] for row in connection.execute("SELECT name FROM sqlite_master")}
    missing = [name for name in names.KEPT_TABLES if name not in found]
    if missing:
        raise damaged(f"table {', '.join(missing)} is missing").at(str(path))
    this = f"SELECT count(*) FROM {names.LOGBOOK} WHERE id = ?"
    if connection.execute(this, (names.THIS_LOGBOOK,)).fetchone()[0] != 1:
        raise damaged("its own name is missing").at(str(path))


def _choose_journal(connection: sqlite3.Connection, path: Path) -> None:
    wanted = journal_mode(sqlite3.sqlite_version_info)
    (current,) = connection.execute("PRAGMA journal_mode").fetchone()
    if current == wanted:
        return
    (reached,) = connection.execute(f"PRAGMA journal_mode = {wanted}").fetchone()
    # The rollback journal is sound everywhere; a write-ahead log is not.
    if reached != wanted and wanted == "delete":
        raise LogbookError(
            f"the logbook is in a journal mode that SQLite {sqlite3.sqlite_version} cannot share",
            where=str(path),
            hint="close the other programs that use this logbook, then try again",
        )
