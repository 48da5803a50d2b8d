"""The frozen records that a logbook gives back beside those of ``benchlog.records``."""

from dataclasses import dataclass

from benchlog.records import Figures, SweepStart, SweepState, Verdict


@dataclass(frozen=True, slots=True, kw_only=True)
class StoredDesign:
    """A design as it was written when it was first used.

    Attributes:
        sha256: Names the text.
        name, revision: As the text says.
        text: The whole design file.
    """

    sha256: str
    name: str
    revision: str
    text: str


@dataclass(frozen=True, slots=True, kw_only=True)
class StoredSweep:
    """A sweep as the logbook knows it.

    Attributes:
        start: What was known when it began, as it was given.
        state: ``"unfinished"`` while there is no end row.
        why: What ended it, where that needs saying.
        ended_at: UTC, ISO 8601; None while unfinished.
        design: The design it was made to, if any.
    """

    start: SweepStart
    state: SweepState
    why: str
    ended_at: str | None
    design: StoredDesign | None


@dataclass(frozen=True, slots=True, kw_only=True)
class StoredFigures:
    """One extraction of one sweep.

    Attributes:
        id: Its number in this file, for ``add_verdict``.
        sweep: The sweep's UUID.
        made_at: UTC, ISO 8601.
        settings: What the extraction was told, JSON text.
        figures: What it found.
    """

    id: int
    sweep: str
    made_at: str
    settings: str
    figures: Figures


@dataclass(frozen=True, slots=True, kw_only=True)
class StoredVerdict:
    """One decision on one set of figures.

    Attributes:
        id: Its number in this file.
        figures_id: The figures it was given on.
        made_at: UTC, ISO 8601.
        budget_text: The limits as they were written.
        design_sha256: The design that the budget came from, if any.
        verdict: Line by line.
    """

    id: int
    figures_id: int
    made_at: str
    budget_text: str
    design_sha256: str | None
    verdict: Verdict


@dataclass(frozen=True, slots=True, kw_only=True)
class HistoryRow:
    """One sweep of one board, with its figures and the verdict of record.

    The figures are those that the latest verdict was given on; without a verdict, the latest.

    Attributes:
        sweep: UUID.
        started_at, ended_at: UTC, ISO 8601.
        state, why: How it ended; ``"unfinished"`` without an end.
        design_name, design_revision, design_sha256: The design it was made to; None without one.
        figures_id, figures, extracted_at: None where nothing was extracted.
        verdict_id, verdict, judged_at: None where nothing was judged.
    """

    sweep: str
    serial: str
    kind: str
    started_at: str
    ended_at: str | None
    state: SweepState
    why: str
    simulated: bool
    operator: str
    lot: str
    reason: str
    note: str
    reference: str
    capture_sha256: str | None
    design_name: str | None
    design_revision: str | None
    design_sha256: str | None
    figures_id: int | None
    figures: Figures | None
    extracted_at: str | None
    verdict_id: int | None
    verdict: Verdict | None
    judged_at: str | None


@dataclass(frozen=True, slots=True, kw_only=True)
class BoardRow:
    """One board: how often it was swept, and when last."""

    serial: str
    sweeps: int
    last_started_at: str


@dataclass(frozen=True, slots=True, kw_only=True)
class LogbookInfo:
    """What a logbook holds and how it is kept.

    Attributes:
        path: The file.
        uuid: This logbook's name; sweeps keep it when logbooks are merged.
        created_at: UTC, ISO 8601.
        program: The program version that made it.
        migrations: Names of the schema steps applied, in order.
        journal_mode: ``"delete"`` or ``"wal"``.
        sqlite_version: The SQLite that Python is linked with.
        size_bytes: Size of the file, without journal.
        boards, designs, sweeps, points, figures, verdicts: Counts of rows.
        unfinished: UUIDs of the sweeps without an end, oldest first.
        first_started_at, last_started_at: When the first and the last sweep began.
    """

    path: str
    uuid: str
    created_at: str
    program: str
    migrations: tuple[str, ...]
    journal_mode: str
    sqlite_version: str
    size_bytes: int
    boards: int
    designs: int
    sweeps: int
    points: int
    figures: int
    verdicts: int
    unfinished: tuple[str, ...]
    first_started_at: str | None
    last_started_at: str | None
