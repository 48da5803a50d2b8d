"""What became of a board, or of many: one row for each sweep, with its verdict of record."""

import sqlite3
from collections.abc import Callable, Sequence
from dataclasses import fields
from datetime import date
from typing import TYPE_CHECKING, Any, TypedDict

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


class Wanted(TypedDict, total=False):
    """Which sweeps a history shows; what is left out or None lets all through.

    Attributes:
        design: Name of the design, or at least six digits from the start of its SHA-256.
        verdict: The word of the verdict of record.
        since, until: First and last day (whole days, UTC) or moment of the sweep's start.
        lot, operator: Exactly as recorded.
        instrument: Part of the identity of an instrument that was used, capitals or not.
        limit: At most so many, the newest.
    """

    design: str | None
    verdict: str | None
    since: str | date | None
    until: str | date | None
    lot: str | None
    operator: str | None
    instrument: str | None
    limit: int | None


def history(
    connection: sqlite3.Connection, serial: str | None, wanted: Wanted
) -> tuple[HistoryRow, ...]:
    """Return the sweeps of a serial (or of all) that pass the filters, oldest first.

    Raises:
        LogbookError: A filter is not a date or not a verdict.
    """
    asked = {"serial": serial, **wanted}
    limit = asked.pop("limit", None)
    given = {name: value for name, value in asked.items() if value is not None}
    if unknown := given.keys() - _CONDITION.keys():
        raise TypeError(f"history has no filter {', '.join(sorted(unknown))}")
    values = [_READ_VALUE.get(name, str)(value) for name, value in given.items()]
    where = " AND ".join(_CONDITION[name] for name in given)
    found = connection.execute(
        f"{_HISTORY} {'WHERE' if where else ''} {where}"
        " ORDER BY s.started_at DESC, s.id DESC LIMIT ?",
        (*values, -1 if limit is None else limit),
    ).fetchall()
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


def _verdict_word(word: str) -> str:
    if word not in VERDICT_ORDER:
        raise LogbookError(
            f"{word!r} is no verdict", where="verdict", expected=", ".join(VERDICT_ORDER)
        )
    return word


_CONDITION = {
    "serial": "s.serial = ?",
    "verdict": "v.overall = ?",
    "since": "s.started_at >= ?",
    "until": "s.started_at < ?",
    "lot": "s.lot = ? AND s.lot <> ''",  # the second half lets the index of lots be used
    "operator": "s.operator = ?",
    "design": f"""s.design IN (
        SELECT id FROM {names.DESIGN}, (SELECT ? AS asked)
        WHERE name = asked
        OR (length(asked) >= 6 AND substr(sha256, 1, length(asked)) = lower(asked)))""",
    "instrument": f"""s.id IN (
        SELECT sweep FROM {names.SWEEP_INSTRUMENT} WHERE instrument IN (
            SELECT id FROM {names.INSTRUMENT} WHERE instr(lower(identity), lower(?)) > 0))""",
}

# How a filter's value is read; all others are plain text.
_READ_VALUE: dict[str, Callable[[Any], str]] = {
    "verdict": _verdict_word,
    "since": door.earliest,
    "until": door.latest,
}


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
