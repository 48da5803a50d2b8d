"""Every error this tool raises, its exit code, and how it reads to a person.

Two families: ``Misuse`` is our own fault (a programming error, never caught); everything else is
the world's fault and is caught once, by the command line.  Each error tells what happened, where,
what was expected and what to do next.
"""

from copy import copy
from typing import Self


class ExitCode:
    """What a command's exit status means (the README lists them for scripts)."""

    ALL_PASS = 0
    NOT_DONE = 1
    USAGE = 2
    SOME_FAIL = 3
    UNDECIDED = 4
    INSTRUMENT = 5
    STOPPED = 130
    TERMINATED = 143


class Misuse(RuntimeError):  # noqa: N818 - a word of the house, not an -Error of the world
    """A part of this program was used out of turn; this is a bug to report."""


class BenchlogError(Exception):
    """Something in the world is not as it must be; the message says what to do.

    Args:
        what: One sentence: what happened.
        where: File with key path or line, or instrument with address.
        expected: What would have been accepted.
        hint: What to do next.
    """

    exit_code = ExitCode.NOT_DONE

    def __init__(
        self,
        what: str,
        *,
        where: str | None = None,
        expected: str | None = None,
        hint: str | None = None,
    ) -> None:
        super().__init__(what)
        self.what = what
        self.where = where
        self.expected = expected
        self.hint = hint

    def __str__(self) -> str:
        """Compose the lines that a person reads."""
        labelled = (("where", self.where), ("expected", self.expected), ("do", self.hint))
        lines = [self.what]
        lines += [f"  {label + ':':<10}{text}" for label, text in labelled if text]
        return "\n".join(lines)

    def at(self, where: str) -> Self:
        """Return the same error with the place put in front of what it already names."""
        placed = copy(self)
        placed.where = f"{where}: {self.where}" if self.where else where
        return placed


class QuantityError(BenchlogError, ValueError):
    """A text is not a quantity of the wanted kind."""


class CurveError(BenchlogError, ValueError):
    """A curve's arrays are malformed: shapes, signs or order that no curve can have."""


class FileFormatError(BenchlogError, ValueError):
    """A file that a person wrote does not hold what it must."""


class DesignFileError(FileFormatError):
    """A design file is wrong."""


class BenchFileError(FileFormatError):
    """A bench file is wrong."""


class DriverFileError(FileFormatError):
    """A driver file is wrong."""


class CaptureError(FileFormatError):
    """A capture cannot be read as a curve."""


class ScheduleError(BenchlogError, ValueError):
    """What is to be measured is empty, out of range, or would overdrive the board."""


class LogbookError(BenchlogError):
    """The logbook refused, is damaged, or is newer than this program."""


class InstrumentError(BenchlogError):
    """The bench is in trouble; exit code 5."""

    exit_code = ExitCode.INSTRUMENT


class LinkError(InstrumentError, OSError):
    """The wire to an instrument failed."""


class LinkTimeout(LinkError):  # noqa: N818 - a kind of LinkError
    """No answer in time; the link is dirty until it is recovered."""


class LinkLost(LinkError):  # noqa: N818 - a kind of LinkError
    """The instrument went away."""


class LinkRefused(LinkError):  # noqa: N818 - a kind of LinkError
    """The instrument could not be opened or did not identify itself."""


class IdentityError(InstrumentError):
    """Another instrument answers than the one expected."""


class CommandRefused(InstrumentError):  # noqa: N818 - a kind of InstrumentError
    """The instrument put an error in its queue."""


class ReplyError(InstrumentError, ValueError):
    """A reply does not follow the grammar of its query; ``raw`` keeps it as it came."""

    def __init__(
        self,
        what: str,
        *,
        where: str | None = None,
        expected: str | None = None,
        hint: str | None = None,
        raw: str = "",
    ) -> None:
        super().__init__(what, where=where, expected=expected, hint=hint)
        self.raw = raw


class SweepStopped(BenchlogError):  # noqa: N818 - not a fault
    """A person or the system stopped the work."""

    exit_code = ExitCode.STOPPED
