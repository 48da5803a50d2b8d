"""One user of an instrument at a time: a lock by address that dies with its holder.

Two programs that share an instrument change its settings under each other's readings, and
neither notices.  The lock is the operating system's own, so a crash leaves nothing to clean up;
it covers the programs of this computer.
"""

import hashlib
import os
import tempfile
from collections.abc import Iterable
from datetime import UTC, datetime
from io import TextIOWrapper
from pathlib import Path

from benchlog.errors import LinkRefused

try:
    import fcntl
except ImportError:  # Windows: VISA libraries there lock by themselves.
    fcntl = None  # type: ignore[assignment]

_FOLDER = Path(tempfile.gettempdir()) / "benchlog-leases"


class Lease:
    """The sole use of some instruments, until it is closed.

    Args:
        addresses: What is to be used.

    Raises:
        LinkRefused: Somebody else uses one of them; nothing is held then.
    """

    def __init__(self, addresses: Iterable[str]) -> None:
        self._held: list[TextIOWrapper] = []
        try:
            for address in sorted(set(addresses)):
                self._take(address)
        except BaseException:
            self.close()
            raise

    def close(self) -> None:
        """Give the instruments back; twice is quiet."""
        while self._held:
            self._held.pop().close()

    def _take(self, address: str) -> None:
        if fcntl is None:
            return
        file = _lock_file(address)
        try:
            fcntl.flock(file, fcntl.LOCK_EX | fcntl.LOCK_NB)
        except OSError as error:
            holder = file.read().strip() or "another program"
            file.close()
            raise LinkRefused(
                f"the instrument is in use by {holder}",
                where=address,
                expected="an instrument that nobody else uses",
                hint="wait until that sweep has ended, or end it",
            ) from error
        self._held.append(file)
        file.truncate(0)
        since = datetime.now(UTC).isoformat(timespec="seconds")
        file.write(f"process {os.getpid()} since {since}\n")
        file.flush()


def _lock_file(address: str) -> TextIOWrapper:
    """Open the file that stands for an address; everybody on this computer may."""
    name = hashlib.sha256(address.upper().encode()).hexdigest()[:24]
    try:
        _FOLDER.mkdir(exist_ok=True)
        path = _FOLDER / f"{name}.lock"
        descriptor = os.open(path, os.O_RDWR | os.O_CREAT, 0o666)
    except OSError as error:
        raise LinkRefused(
            f"the lease of the instrument cannot be written: {error.strerror}",
            where=str(_FOLDER),
            hint="make the folder for temporary files writable",
        ) from error
    return os.fdopen(descriptor, "r+", encoding="utf-8")
