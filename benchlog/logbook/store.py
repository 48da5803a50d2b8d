"""The public face of the logbook.

One object is one open file.  Each write method is its own transaction, committed before it returns,
unless it runs inside ``with logbook.together():``, which makes one transaction of several.
"""

import sqlite3
from collections.abc import Iterable
from contextlib import AbstractContextManager
from pathlib import Path
from typing import TYPE_CHECKING, Self, Unpack

from benchlog.errors import Misuse
from benchlog.logbook import history, read, write
from benchlog.logbook.history import Wanted
from benchlog.logbook.open import applied_migrations, open_connection
from benchlog.logbook.refusal import said_plainly
from benchlog.logbook.rows import (
    BoardRow,
    HistoryRow,
    LogbookInfo,
    StoredDesign,
    StoredFigures,
    StoredSweep,
    StoredVerdict,
)
from benchlog.logbook.transaction import Writer
from benchlog.records import Figures, Point, SweepEnd, SweepStart, Verdict

if TYPE_CHECKING:
    import pandas as pd

    from benchlog.curve import GainCurve


class Logbook:
    """A logbook file: sweeps, points, figures and verdicts, added to and never changed.

    Args:
        path: The file.
        create: Make it when there is none.
        read_only: Promise to write nothing; a write-protected file can be read so.
        factory: Class of the connection; tests give one whose statements fail.

    Raises:
        LogbookError: The file is missing, no logbook, newer than this program, or not writable.
    """

    def __init__(
        self,
        path: str | Path,
        *,
        create: bool = False,
        read_only: bool = False,
        factory: type[sqlite3.Connection] = sqlite3.Connection,
    ) -> None:
        self.path = Path(path)
        self._connection = open_connection(
            self.path, create=create, read_only=read_only, factory=factory
        )
        self._writer = Writer(self._connection, self.path)

    def __enter__(self) -> Self:
        """Return the open logbook."""
        return self

    def __exit__(self, *_: object) -> None:
        """Close it."""
        self.close()

    def close(self) -> None:
        """Close the file; a second time does nothing."""
        self._connection.close()

    def together(self) -> AbstractContextManager[None]:
        """Make all writes inside the block one transaction: all of them, or none."""
        return self._writer.together()

    def begin_sweep(
        self,
        start: SweepStart,
        *,
        design_text: str | None = None,
        design_name: str | None = None,
        design_revision: str | None = None,
    ) -> None:
        """Write a sweep's start, its instruments and, if it is new, its design.

        Args:
            start: What is known before the first point.
            design_text: The design file that ``start.design_sha256`` names; may be left out when
                the logbook has it already.
            design_name: Its name.
            design_revision: Its revision.

        Raises:
            LogbookError: The sweep is already there, or the design is unknown and not given.
        """
        if start.design_sha256 is None and design_text is not None:
            raise Misuse("a design text was given for a sweep that names no design")

        def work(connection: sqlite3.Connection) -> None:
            design_id = None
            if start.design_sha256 is not None:
                design_id = write.design(
                    connection,
                    start.design_sha256,
                    text=design_text,
                    name=design_name or "",
                    revision=design_revision or "",
                )
            write.begin_sweep(connection, start, design_id)

        self._writer.write(work)

    def add_point(self, sweep: str, point: Point) -> None:
        """Write one point; it is on the disk when this returns.

        Raises:
            LogbookError: The sweep is unknown or has ended, or has this position already.
        """
        self.add_points(sweep, (point,))

    def add_points(self, sweep: str, points: Iterable[Point]) -> None:
        """Write many points in one transaction: all of them, or none."""
        kept = tuple(points)
        self._writer.write(lambda connection: write.add_points(connection, sweep, kept))

    def end_sweep(self, sweep: str, state: SweepEnd, why: str = "") -> None:
        """Write a sweep's end; after it the sweep takes no more points.

        Raises:
            LogbookError: The sweep is unknown or has ended already.
        """
        self._writer.write(
            lambda connection: write.end_sweep(connection, sweep, state=state, why=why)
        )

    def add_figures(self, sweep: str, figures: Figures, settings: str = "{}") -> int:
        """Write what an extraction found.

        Args:
            sweep: The sweep's UUID.
            figures: The figures.
            settings: What the extraction was told, JSON text.

        Returns:
            The number of these figures in this file, for ``add_verdict``.
        """
        return self._writer.write(
            lambda connection: write.add_figures(
                connection, sweep, figures=figures, settings=settings
            )
        )

    def add_verdict(
        self,
        figures_id: int,
        verdict: Verdict,
        budget_text: str,
        *,
        design_sha256: str | None = None,
    ) -> int:
        """Write a verdict on figures of this file.

        Args:
            figures_id: What ``add_figures`` returned.
            verdict: Line by line.
            budget_text: The limits as they were written.
            design_sha256: The design the budget came from; None means the sweep's own.

        Returns:
            The number of the verdict in this file.
        """

        def work(connection: sqlite3.Connection) -> int:
            design_id = write.design_judged(connection, figures_id, design_sha256)
            return write.add_verdict(
                connection, figures_id, verdict, budget=budget_text, design_id=design_id
            )

        return self._writer.write(work)

    def add_design(self, text: str, *, sha256: str, name: str, revision: str) -> None:
        """Keep a design's text, if it is new, so that a verdict can name it."""
        self._writer.write(
            lambda connection: write.design(
                connection, sha256, text=text, name=name, revision=revision
            )
        )

    def sweep(self, uuid: str) -> StoredSweep:
        """Return a sweep by its UUID, or by the start of it where that is enough."""
        with said_plainly(self.path):
            return read.sweep(self._connection, self._sweep_id(uuid))

    def points(self, uuid: str) -> tuple[Point, ...]:
        """Return a sweep's points by position, each followed by its checks."""
        with said_plainly(self.path):
            return read.points(self._connection, self._sweep_id(uuid))

    def curve(self, uuid: str) -> "GainCurve":
        """Return a sweep's curve, with what its gain is referred to and its type B terms.

        Raises:
            LogbookError: There is no such sweep.
            CurveError: None of its points has a gain.
        """
        from benchlog.curve import curve_from_points  # noqa: PLC0415 - brings numpy

        start = self.sweep(uuid).start
        return curve_from_points(
            self.points(start.uuid),
            reference=start.reference,
            source_ohm=start.source_ohm,
            terms=start.terms,
        )

    def latest_figures(self, uuid: str) -> StoredFigures | None:
        """Return a sweep's newest figures."""
        with said_plainly(self.path):
            return read.latest_figures(self._connection, self._sweep_id(uuid))

    def latest_verdict(self, uuid: str) -> StoredVerdict | None:
        """Return a sweep's newest verdict, whichever of its figures it was given on."""
        with said_plainly(self.path):
            return read.latest_verdict(self._connection, self._sweep_id(uuid))

    def history(
        self, serial: str | None = None, **wanted: Unpack[Wanted]
    ) -> tuple[HistoryRow, ...]:
        """Return one row for each sweep that passes the filters (see ``Wanted``), oldest first."""
        with said_plainly(self.path):
            return history.history(self._connection, serial, wanted)

    def history_frame(self, serial: str | None = None, **wanted: Unpack[Wanted]) -> "pd.DataFrame":
        """Return the same as a pandas frame: a column for each field, figure and its u."""
        return history.history_frame(self.history(serial, **wanted))

    def sweeps_of(self, serial: str) -> tuple[StoredSweep, ...]:
        """Return every sweep of a serial, oldest first."""
        with said_plainly(self.path):
            return read.sweeps_of(self._connection, serial)

    def captures(self, sha256: str) -> tuple[StoredSweep, ...]:
        """Return every sweep that came from a file with these bytes, oldest first."""
        with said_plainly(self.path):
            return read.captures(self._connection, sha256)

    def design(self, sha256: str) -> StoredDesign | None:
        """Return the design of this SHA-256, if the logbook has it."""
        with said_plainly(self.path):
            return read.design(self._connection, sha256)

    def boards(self) -> tuple[BoardRow, ...]:
        """Return every serial, with how often and when last it was swept."""
        with said_plainly(self.path):
            return read.boards(self._connection)

    def info(self) -> LogbookInfo:
        """Return what the logbook holds and how it is kept."""
        with said_plainly(self.path):
            return read.info(self._connection, str(self.path), applied_migrations(self._connection))

    def _sweep_id(self, uuid: str) -> int:
        return read.find_sweep(self._connection, uuid)[0]
