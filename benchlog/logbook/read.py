"""Read rows back as the records that were written."""

import sqlite3
from typing import Any

from benchlog.errors import LogbookError
from benchlog.logbook import names
from benchlog.logbook.codec import from_json
from benchlog.logbook.refusal import damaged
from benchlog.logbook.rows import (
    BoardRow,
    LogbookInfo,
    StoredDesign,
    StoredFigures,
    StoredSweep,
    StoredVerdict,
)
from benchlog.records import (
    Figures,
    InstrumentUsed,
    Point,
    PointFlag,
    SweepStart,
    Term,
    Verdict,
)

_UUID_LENGTH = 36

_SELECT_SWEEP = f"""
SELECT s.id, s.uuid, s.serial, s.kind, s.started_at, s.reference, s.source_ohm, s.simulated,
       s.operator, s.lot, s.reason, s.note, s.capture_sha256,
       settings.body, terms.body, d.sha256, d.name, d.revision, d.body,
       coalesce(e.state, 'unfinished'), coalesce(e.why, ''), e.ended_at
FROM {names.SWEEP} s
JOIN {names.DOCUMENT} settings ON settings.id = s.settings
JOIN {names.DOCUMENT} terms ON terms.id = s.terms
LEFT JOIN {names.DESIGN} d ON d.id = s.design
LEFT JOIN {names.SWEEP_END} e ON e.sweep = s.id
"""

_SELECT_POINTS = f"""
SELECT p.position, p.repeat, p.frequency_hz, p.level_vrms, p.input_vrms, p.output_vrms, p.gain,
       p.u_gain_rel, p.phase_deg, p.flags, coalesce(t.attempts, 1), t.raw
FROM {names.POINT} p
LEFT JOIN {names.POINT_STORY} t
  ON t.sweep = p.sweep AND t.position = p.position AND t.repeat = p.repeat
WHERE p.sweep = ? ORDER BY p.position, p.repeat
"""

_SELECT_FIGURES = f"""
SELECT f.id, s.uuid, f.made_at, settings.body, f.record
FROM {names.FIGURES} f
JOIN {names.SWEEP} s ON s.id = f.sweep
JOIN {names.DOCUMENT} settings ON settings.id = f.settings
WHERE f.sweep = ? ORDER BY f.number DESC, f.made_at DESC LIMIT 1
"""

_SELECT_VERDICT = f"""
SELECT v.id, v.figures, v.made_at, budget.body, d.sha256, v.record
FROM {names.VERDICT} v
JOIN {names.DOCUMENT} budget ON budget.id = v.budget
JOIN {names.FIGURES} f ON f.id = v.figures
LEFT JOIN {names.DESIGN} d ON d.id = v.design
WHERE f.sweep = ? ORDER BY v.number DESC, v.made_at DESC LIMIT 1
"""

_UNFINISHED = (
    f"SELECT s.id FROM {names.SWEEP} s LEFT JOIN {names.SWEEP_END} e ON e.sweep = s.id"
    " WHERE e.sweep IS NULL"
)


def find_sweep(connection: sqlite3.Connection, uuid: str) -> tuple[int, str]:
    """Return a sweep's number in this file and its UUID, from its UUID or the start of it.

    Raises:
        LogbookError: No sweep's UUID starts so, or more than one.
    """
    lowered = uuid.strip().lower()
    # A range, unlike LIKE, is answered by the index, and no character in it is special.
    found = connection.execute(
        f"SELECT id, uuid FROM {names.SWEEP} WHERE uuid >= ? AND uuid < ? ORDER BY uuid LIMIT 3",
        (lowered, lowered + "\U0010ffff"),
    ).fetchall()
    if not found or not lowered:
        raise LogbookError(
            f"the logbook has no sweep {uuid!r}", hint="`benchlog history` lists the sweeps"
        )
    if len(found) > 1:
        several = ", ".join(row[1] for row in found[:2])
        raise LogbookError(
            f"more than one sweep starts with {uuid!r}: {several} ...", hint="give more of it"
        )
    return int(found[0][0]), str(found[0][1])


def sweep(connection: sqlite3.Connection, sweep_id: int) -> StoredSweep:
    """Return a sweep as it began and as it ended."""
    row = connection.execute(f"{_SELECT_SWEEP} WHERE s.id = ?", (sweep_id,)).fetchone()
    if row is None:
        raise damaged(f"sweep number {sweep_id} has lost what it refers to")
    return _stored_sweep(connection, row)


def sweeps_of(connection: sqlite3.Connection, serial: str) -> tuple[StoredSweep, ...]:
    """Return every sweep of a serial, oldest first."""
    return _sweeps_where(connection, "s.serial = ?", serial)


def captures(connection: sqlite3.Connection, sha256: str) -> tuple[StoredSweep, ...]:
    """Return every sweep that came from a file with these bytes, oldest first."""
    return _sweeps_where(connection, "s.capture_sha256 = ?", sha256)


def points(connection: sqlite3.Connection, sweep_id: int) -> tuple[Point, ...]:
    """Return a sweep's points by position, each followed by its checks."""
    return tuple(
        Point(
            position=row[0],
            kind="check" if row[1] else "point",
            frequency_hz=row[2],
            level_vrms=row[3],
            input_vrms=row[4],
            output_vrms=row[5],
            gain=row[6],
            u_gain_rel=row[7],
            phase_deg=row[8],
            flags=PointFlag(row[9]),
            attempts=row[10],
            raw=row[11],
        )
        for row in connection.execute(_SELECT_POINTS, (sweep_id,))
    )


def latest_figures(connection: sqlite3.Connection, sweep_id: int) -> StoredFigures | None:
    """Return a sweep's newest figures."""
    row = connection.execute(_SELECT_FIGURES, (sweep_id,)).fetchone()
    if row is None:
        return None
    return StoredFigures(
        id=row[0],
        sweep=row[1],
        made_at=row[2],
        settings=row[3],
        figures=from_json(row[4], Figures),
    )


def latest_verdict(connection: sqlite3.Connection, sweep_id: int) -> StoredVerdict | None:
    """Return a sweep's newest verdict, whichever of its figures it was given on."""
    row = connection.execute(_SELECT_VERDICT, (sweep_id,)).fetchone()
    if row is None:
        return None
    return StoredVerdict(
        id=row[0],
        figures_id=row[1],
        made_at=row[2],
        budget_text=row[3],
        design_sha256=row[4],
        verdict=from_json(row[5], Verdict),
    )


def design(connection: sqlite3.Connection, sha256: str) -> StoredDesign | None:
    """Return the design of this SHA-256, if any sweep was made to it."""
    row = connection.execute(
        f"SELECT sha256, name, revision, body FROM {names.DESIGN} WHERE sha256 = ?", (sha256,)
    ).fetchone()
    return None if row is None else _stored_design(row)


def boards(connection: sqlite3.Connection) -> tuple[BoardRow, ...]:
    """Return every serial with how often and when last it was swept, in order of serial."""
    found = connection.execute(
        f"SELECT serial, count(*), max(started_at) FROM {names.SWEEP}"
        " WHERE kind <> 'through' GROUP BY serial ORDER BY serial"
    )
    return tuple(BoardRow(serial=row[0], sweeps=row[1], last_started_at=row[2]) for row in found)


def info(connection: sqlite3.Connection, path: str, migrations: tuple[str, ...]) -> LogbookInfo:
    """Return what the logbook holds and how it is kept."""
    (uuid, created_at, program) = connection.execute(
        f"SELECT uuid, created_at, program FROM {names.LOGBOOK} WHERE id = ?",
        (names.THIS_LOGBOOK,),
    ).fetchone()
    (serials, first, last) = connection.execute(
        f"SELECT count(DISTINCT serial), min(started_at), max(started_at) FROM {names.SWEEP}"
    ).fetchone()
    unfinished = connection.execute(
        f"SELECT uuid FROM {names.SWEEP} WHERE id IN ({_UNFINISHED}) ORDER BY started_at, id"
    )
    return LogbookInfo(
        path=path,
        uuid=uuid,
        created_at=created_at,
        program=program,
        migrations=migrations,
        journal_mode=_pragma(connection, "journal_mode"),
        sqlite_version=sqlite3.sqlite_version,
        size_bytes=_pragma(connection, "page_count") * _pragma(connection, "page_size"),
        boards=serials,
        designs=_count(connection, names.DESIGN),
        sweeps=_count(connection, names.SWEEP),
        points=_points(connection),
        figures=_count(connection, names.FIGURES),
        verdicts=_count(connection, names.VERDICT),
        unfinished=tuple(row[0] for row in unfinished),
        first_started_at=first,
        last_started_at=last,
    )


def _sweeps_where(
    connection: sqlite3.Connection, condition: str, value: str
) -> tuple[StoredSweep, ...]:
    rows = connection.execute(
        f"{_SELECT_SWEEP} WHERE {condition} ORDER BY s.started_at, s.id", (value,)
    ).fetchall()
    return tuple(_stored_sweep(connection, row) for row in rows)


def _stored_sweep(connection: sqlite3.Connection, row: tuple[Any, ...]) -> StoredSweep:
    start = SweepStart(
        uuid=row[1],
        serial=row[2],
        kind=row[3],
        started_at=row[4],
        reference=row[5],
        source_ohm=row[6],
        simulated=bool(row[7]),
        operator=row[8],
        lot=row[9],
        reason=row[10],
        note=row[11],
        capture_sha256=row[12],
        settings=row[13],
        terms=from_json(row[14], tuple[Term, ...]),
        design_sha256=row[15],
        instruments=_instruments(connection, row[0]),
    )
    return StoredSweep(
        start=start,
        state=row[19],
        why=row[20],
        ended_at=row[21],
        design=None if row[15] is None else _stored_design(row[15:19]),
    )


def _stored_design(row: tuple[Any, ...]) -> StoredDesign:
    return StoredDesign(sha256=row[0], name=row[1], revision=row[2], text=row[3])


def _instruments(connection: sqlite3.Connection, sweep_id: int) -> tuple[InstrumentUsed, ...]:
    found = connection.execute(
        f"SELECT i.role, i.identity, i.address, i.driver, i.calibration_due"
        f" FROM {names.SWEEP_INSTRUMENT} used JOIN {names.INSTRUMENT} i ON i.id = used.instrument"
        " WHERE used.sweep = ? ORDER BY used.place",
        (sweep_id,),
    )
    return tuple(
        InstrumentUsed(
            role=row[0], identity=row[1], address=row[2], driver=row[3], calibration_due=row[4]
        )
        for row in found
    )


def _count(connection: sqlite3.Connection, table: str) -> int:
    (count,) = connection.execute(f"SELECT count(*) FROM {table}").fetchone()
    return int(count)


def _points(connection: sqlite3.Connection) -> int:
    """Count points by the end rows, which is quick, and one by one only in unfinished sweeps."""
    (count,) = connection.execute(
        f"SELECT (SELECT coalesce(sum(points), 0) FROM {names.SWEEP_END})"
        f" + (SELECT count(*) FROM {names.POINT} WHERE sweep IN ({_UNFINISHED}))"
    ).fetchone()
    return int(count)


def _pragma(connection: sqlite3.Connection, name: str) -> Any:  # noqa: ANN401 - text or number
    return connection.execute(f"PRAGMA {name}").fetchone()[0]
