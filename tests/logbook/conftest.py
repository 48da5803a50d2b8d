"""Logbooks for the tests of this room."""

from collections.abc import Iterator
from pathlib import Path

import pytest

from benchlog.logbook.store import Logbook


@pytest.fixture(scope="session")
def empty_logbook_bytes(tmp_path_factory: pytest.TempPathFactory) -> bytes:
    """Return the bytes of a new logbook; copying them is quicker than making one."""
    path = tmp_path_factory.mktemp("logbook") / "empty.db"
    Logbook(path, create=True).close()
    return path.read_bytes()


@pytest.fixture
def path(tmp_path: Path, empty_logbook_bytes: bytes) -> Path:
    """Return the path of a new logbook."""
    made = tmp_path / "logbook.db"
    made.write_bytes(empty_logbook_bytes)
    return made


@pytest.fixture
def logbook(path: Path) -> Iterator[Logbook]:
    """Return a new logbook, open; nothing is left hanging in a transaction."""
    with Logbook(path) as opened:
        yield opened
        assert not opened._connection.in_transaction
