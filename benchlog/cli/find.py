"""Finding stored sweeps by what people can type."""

import difflib
from typing import TYPE_CHECKING

from benchlog.errors import LogbookError

if TYPE_CHECKING:
    from benchlog.logbook.rows import StoredSweep
    from benchlog.logbook.store import Logbook


def find_sweep(logbook: "Logbook", name: str) -> "StoredSweep":
    """Return a sweep by the beginning of its UUID, or the latest complete one of a serial.

    Raises:
        LogbookError: There is none, or the beginning fits several.
    """
    of_serial = logbook.sweeps_of(name)
    complete = [sweep for sweep in of_serial if sweep.state == "complete"]
    if complete:
        return complete[-1]
    if of_serial:
        raise LogbookError(
            f"serial {name} has no complete sweep: the last one is {of_serial[-1].state}",
            where=f"sweep {of_serial[-1].start.uuid[:8]}",
            hint="sweep it again, or name a sweep by the beginning of its UUID",
        )
    try:
        return logbook.sweep(name)
    except LogbookError as error:
        raise LogbookError(
            error.what,
            where=error.where,
            expected="a serial with a complete sweep, or the beginning of a sweep's UUID",
            hint=nearest_serials(logbook, name) or "`benchlog history` lists them",
        ) from error


def nearest_serials(logbook: "Logbook", serial: str) -> str | None:
    """Return a question that offers serials like the one that was not found."""
    known = [board.serial for board in logbook.boards()]
    near = difflib.get_close_matches(serial, known, n=3)
    return f"did you mean {' or '.join(near)}?" if near else None
