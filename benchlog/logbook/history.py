"""What became of a board, or of many: one row for each sweep, with its verdict of record."""

import sqlite3
from collections.abc import Sequence
from dataclasses import dataclass, fields
from datetime import date
from typing import TYPE_CHECKING, Any

from benchlog.errors import LogbookError
from benchlog.logbook import door, names
from benchlog.logbook.codec import from_json
from benchlog.logbook.rows import HistoryRow
from benchlog.records import FIGURE_NAMES, VERDICT_ORDER, Figures, Verdict

if TYPE_CHECKING:
    import pandas as pd

_HISTORY = f"""
SELECT s.uuid, s.serial, s.kind, s.started_at, e.ended_at, coalesce(e.state, 'unfinished'),
       coalesce(e.why, ''), s.simulated, s.operator, s.lot, s.reason, s.note, s.reference,
       s.capture_sha256, d.name, d.revision, d.sha256, f.id, f.record, f.made_at,
       v.id, v.record, v.made_at
FROM {names.SWEEP} s
LEFT JOIN {names.SWEEP_END} e ON e.sweep = s.id
LEFT JOIN {names.DESIGN} d ON d.id = s.design
LEFT JOIN {names.VERDICT} v ON v.id = (
  SELECT given.id
  FROM {names.FIGURES} judged JOIN {names.VERDICT} given ON given.figures = judged.id
  WHERE judged.sweep = s.id ORDER BY given.number DESC, given.made_at DESC LIMIT 1)
LEFT JOIN {names.FIGURES} f ON f.id = coalesce(v.figures, (
  SELECT newest.id FROM {names.FIGURES} newest
  WHERE newest.sweep = s.id ORDER BY newest.number DESC, newest.made_at DESC LIMIT 1))
"""


@dataclass(frozen=True, slots=True, kw_only=True)
class Filters:
    """Which sweeps a history shows; every None lets all through.

    Attributes:
        serial: The board, exactly.
        design: Name of the design, or the start of its SHA-256.
        verdict: The word of the verdict of record.
        since, until: First and last day (whole days, UTC) or moment of the sweep's start.
        lot, operator: Exactly as recorded.
        instrument: Part of the identity of an instrument that was used.
        limit: At most so many, the newest.
    """

    serial: str | None = None
    design: str | None = None
    verdict: str | None = None
    since: str | date | None = None
    until: str | date | None = None
    lot: str | None = None
    operator: str | None = None
    instrument: str | None = None
    limit: int | None = None


def history(connection: sqlite3.Connection, wanted: Filters) -> tuple[HistoryRow, ...]:
    """Return the sweeps that pass the filters, oldest first.

    Raises:
        LogbookError: A filter is not a date or not a verdict.
    """
    conditions, values = _conditions(wanted)
    sql = _HISTORY
    if conditions:
        sql += " WHERE " + " AND ".join(conditions)
    sql += " ORDER BY s.started_at DESC, s.id DESC"
    if wanted.limit is not None:
        sql += " LIMIT ?"
        values.append(int(wanted.limit))
    found = connection.execute(sql, values).fetchall()
    return tuple(_history_row(row) for row in reversed(found))


def history_frame(rows: Sequence[HistoryRow]) -> "pd.DataFrame":
    """Return history rows as a table: one column per field, figure, its u and its bound.

    Serials stay text; the verdict is its word; times are UTC.
    """
    import pandas as pd

    plain = [field.name for field in fields(HistoryRow) if field.name not in {"figures", "verdict"}]
    columns: dict[str, list[Any]] = {name: [getattr(row, name) for row in rows] for name in plain}
    columns["verdict"] = [row.verdict.overall if row.verdict else None for row in rows]
    columns["shape"] = [row.figures.shape if row.figures else None for row in rows]
    for name in FIGURE_NAMES:
        found = [row.figures.figure(name) if row.figures else None for row in rows]
        columns[name] = [figure.value if figure else None for figure in found]
        columns[f"u_{name}"] = [figure.u if figure else None for figure in found]
        columns[f"bound_{name}"] = [figure.bound if figure else None for figure in found]
    frame = pd.DataFrame(columns)
    for name in ("started_at", "ended_at", "extracted_at", "judged_at"):
        frame[name] = pd.to_datetime(frame[name], utc=True, format="ISO8601")
    return frame


def _conditions(wanted: Filters) -> tuple[list[str], list[Any]]:
    verdict = None if wanted.verdict is None else _verdict_word(wanted.verdict)
    asked: list[tuple[str, Any]] = [
        ("s.serial = ?", wanted.serial),
        ("v.overall = ?", verdict),
        ("s.started_at >= ?", None if wanted.since is None else door.earliest(wanted.since)),
        ("s.started_at < ?", None if wanted.until is None else door.latest(wanted.until)),
        ("s.lot = ?", wanted.lot),
        ("s.operator = ?", wanted.operator),
        (_BY_DESIGN, wanted.design),
        (_BY_INSTRUMENT, wanted.instrument),
    ]
    given = [(condition, value) for condition, value in asked if value is not None]
    return [condition for condition, _ in given], [value for _, value in given]


_BY_DESIGN = f"""s.design IN (
  SELECT id FROM {names.DESIGN}, (SELECT ? AS asked)
  WHERE name = asked OR (length(asked) >= 6 AND substr(sha256, 1, length(asked)) = lower(asked)))"""

_BY_INSTRUMENT = f"""s.id IN (
  SELECT used.sweep FROM {names.INSTRUMENT} i
  JOIN {names.SWEEP_INSTRUMENT} used ON used.instrument = i.id
  WHERE instr(lower(i.identity), lower(?)) > 0)"""


def _verdict_word(word: str) -> str:
    if word not in VERDICT_ORDER:
        raise LogbookError(
            f"{word!r} is no verdict", expected=", ".join(VERDICT_ORDER), where="verdict"
        )
    return word


def _history_row(row: tuple[Any, ...]) -> HistoryRow:
    return HistoryRow(
        sweep=row[0],
        serial=row[1],
        kind=row[2],
        started_at=row[3],
        ended_at=row[4],
        state=row[5],
        why=row[6],
        simulated=bool(row[7]),
        operator=row[8],
        lot=row[9],
        reason=row[10],
        note=row[11],
        reference=row[12],
        capture_sha256=row[13],
        design_name=row[14],
        design_revision=row[15],
        design_sha256=row[16],
        figures_id=row[17],
        figures=None if row[18] is None else from_json(row[18], Figures),
        extracted_at=row[19],
        verdict_id=row[20],
        verdict=None if row[21] is None else from_json(row[21], Verdict),
        judged_at=row[22],
    )
