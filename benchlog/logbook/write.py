"""Append rows: sweeps, points, ends, figures, verdicts; each inside its caller's transaction."""

import sqlite3
from collections.abc import Iterable, Sequence
from itertools import chain
from typing import Any, TypeAlias

from benchlog.errors import LogbookError
from benchlog.logbook import door, names
from benchlog.logbook.codec import json_object, to_json
from benchlog.records import FIGURE_NAMES, Figures, InstrumentUsed, Point, SweepStart, Verdict

Row: TypeAlias = tuple[Any, ...]

_SWEEP_COLUMNS = (
    "uuid, origin, serial, kind, started_at, design, reference, source_ohm, simulated,"
    " operator, lot, reason, note, settings, terms, capture_sha256"
)
_INSERT_SWEEP = (
    f"INSERT INTO {names.SWEEP} ({_SWEEP_COLUMNS}) VALUES ({', '.join('?' * 16)}) RETURNING id"
)
_INSERT_POINT = (
    f"INSERT INTO {names.POINT} (sweep, position, repeat, frequency_hz, level_vrms, input_vrms,"
    " output_vrms, gain, u_gain_rel, phase_deg, flags)"
    " VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?)"
)
_INSERT_STORY = (
    f"INSERT INTO {names.POINT_STORY} (sweep, position, repeat, attempts, raw)"
    " VALUES (?, ?, ?, ?, ?)"
)
_FIGURE_COLUMNS = tuple(
    chain.from_iterable((name, f"u_{name}", f"bound_{name}") for name in FIGURE_NAMES)
)
_INSERT_FIGURES = (
    f"INSERT INTO {names.FIGURES} (sweep, origin, number, made_at, method, shape, settings, record,"
    f" {', '.join(_FIGURE_COLUMNS)})"
    f" VALUES ({', '.join('?' * (8 + len(_FIGURE_COLUMNS)))}) RETURNING id"
)
_INSERT_VERDICT = (
    f"INSERT INTO {names.VERDICT}"
    " (figures, origin, number, made_at, overall, design, budget, record)"
    " VALUES (?, ?, ?, ?, ?, ?, ?, ?) RETURNING id"
)
_COUNT_POINTS = f"SELECT count(*) FROM {names.POINT} WHERE sweep = ?"
_LAST_REPEAT = f"SELECT max(repeat) FROM {names.POINT} WHERE sweep = ? AND position = ?"
_LAST_FIGURES = f"SELECT max(number) FROM {names.FIGURES} WHERE sweep = ?"
# Verdicts are counted over all figures of a sweep, so that the newest decision is the highest.
_LAST_VERDICT = (
    f"SELECT max(v.number) FROM {names.FIGURES} given JOIN {names.FIGURES} f USING (sweep)"
    f" JOIN {names.VERDICT} v ON v.figures = f.id WHERE given.id = ?"
)


def sweep_id(connection: sqlite3.Connection, uuid: str) -> int:
    """Return a sweep's number in this file.

    Raises:
        LogbookError: There is no sweep of this UUID.
    """
    row = connection.execute(f"SELECT id FROM {names.SWEEP} WHERE uuid = ?", (uuid,)).fetchone()
    if row is None:
        raise LogbookError(f"the logbook has no sweep {uuid}")
    return int(row[0])


def document(connection: sqlite3.Connection, body: str, what: str) -> int:
    """Return the row of a text, writing it if it is new."""
    sha256 = door.sha256_of(door.text(body, what))
    found = connection.execute(
        f"SELECT id FROM {names.DOCUMENT} WHERE sha256 = ?", (sha256,)
    ).fetchone()
    if found is not None:
        return int(found[0])
    return _insert(
        connection,
        f"INSERT INTO {names.DOCUMENT} (sha256, body) VALUES (?, ?) RETURNING id",
        (sha256, body),
    )


def design(
    connection: sqlite3.Connection, sha256: str, *, text: str | None, name: str, revision: str
) -> int:
    """Return the row of a design, writing it if it is new.

    Raises:
        LogbookError: The design is new and its text was not given, or is another text.
    """
    found = connection.execute(
        f"SELECT id FROM {names.DESIGN} WHERE sha256 = ?", (sha256,)
    ).fetchone()
    if found is not None:
        return int(found[0])
    if text is None:
        raise LogbookError(f"the logbook has no design {sha256}, and its text was not given")
    if door.sha256_of(door.text(text, "design")) != sha256:
        raise LogbookError(
            f"the text given for design {name!r} is not the one that its SHA-256 names",
            expected="the whole file as it was read",
        )
    return _insert(
        connection,
        f"INSERT INTO {names.DESIGN} (sha256, name, revision, body) VALUES (?, ?, ?, ?)"
        " RETURNING id",
        (
            sha256,
            door.text(name, "design name"),
            door.text(revision, "revision"),
            text,
        ),
    )


def begin_sweep(connection: sqlite3.Connection, start: SweepStart, design_id: int | None) -> None:
    """Write a sweep's start and its instruments."""
    row = (
        door.uuid(start.uuid),
        names.THIS_LOGBOOK,
        door.text(start.serial, "serial"),
        start.kind,
        door.utc_time(start.started_at, "started_at"),
        design_id,
        start.reference,
        door.number_or_none(start.source_ohm, "source_ohm"),
        int(start.simulated),
        door.text(start.operator, "operator"),
        door.text(start.lot, "lot"),
        door.text(start.reason, "reason"),
        door.text(start.note, "note"),
        document(connection, json_object(start.settings, "settings"), "settings"),
        document(connection, to_json(start.terms, "type B terms"), "type B terms"),
        start.capture_sha256,
    )
    sweep = _insert(connection, _INSERT_SWEEP, row)
    connection.executemany(
        f"INSERT INTO {names.SWEEP_INSTRUMENT} (sweep, place, instrument) VALUES (?, ?, ?)",
        [
            (sweep, place, instrument(connection, used))
            for place, used in enumerate(start.instruments)
        ],
    )


def instrument(connection: sqlite3.Connection, used: InstrumentUsed) -> int:
    """Return the row of an instrument as it was used, writing it if it is new."""
    row = (
        door.text(used.identity, "identity"),
        used.role,
        door.text(used.address, "address"),
        door.text(used.driver, "driver"),
        used.calibration_due,
    )
    found = connection.execute(
        f"SELECT id FROM {names.INSTRUMENT} WHERE identity = ? AND role = ? AND address = ?"
        " AND driver = ? AND calibration_due IS ?",
        row,
    ).fetchone()
    if found is not None:
        return int(found[0])
    return _insert(
        connection,
        f"INSERT INTO {names.INSTRUMENT} (identity, role, address, driver, calibration_due)"
        " VALUES (?, ?, ?, ?, ?) RETURNING id",
        row,
    )


def add_points(connection: sqlite3.Connection, uuid: str, points: Iterable[Point]) -> None:
    """Write points of a sweep.

    Raises:
        LogbookError: The sweep is unknown or has ended, or a point is not one.
    """
    sweep = sweep_id(connection, uuid)
    _refuse_if_ended(connection, sweep, uuid)
    rows: list[Row] = []
    stories: list[Row] = []
    checks: dict[int, int] = {}
    for point in points:
        position = door.whole(point.position, "position")
        repeat = 0
        if point.kind == "check":
            repeat = checks.get(position) or _next(connection, _LAST_REPEAT, sweep, position)
            checks[position] = repeat + 1
        rows.append((sweep, position, repeat, *_measured(point)))
        if point.attempts != 1 or point.raw is not None:
            raw = None if point.raw is None else door.text(point.raw, "raw reply")
            stories.append((sweep, position, repeat, door.whole(point.attempts, "attempts"), raw))
    connection.executemany(_INSERT_POINT, rows)
    if stories:
        connection.executemany(_INSERT_STORY, stories)


def end_sweep(connection: sqlite3.Connection, uuid: str, *, state: str, why: str) -> None:
    """Write a sweep's one end row."""
    sweep = sweep_id(connection, uuid)
    _refuse_if_ended(connection, sweep, uuid)
    (points,) = connection.execute(_COUNT_POINTS, (sweep,)).fetchone()
    connection.execute(
        f"INSERT INTO {names.SWEEP_END} (sweep, state, why, ended_at, points)"
        " VALUES (?, ?, ?, ?, ?)",
        (sweep, state, door.text(why, "why"), door.utc_now(), points),
    )


def add_figures(
    connection: sqlite3.Connection, uuid: str, *, figures: Figures, settings: str
) -> int:
    """Write one extraction and return its number in this file."""
    sweep = sweep_id(connection, uuid)
    row = (
        sweep,
        names.THIS_LOGBOOK,
        _next(connection, _LAST_FIGURES, sweep),
        door.utc_now(),
        door.text(figures.method, "method"),
        door.text(figures.shape, "shape"),
        document(connection, json_object(settings, "extraction settings"), "settings"),
        to_json(figures, "figures"),
        *_figure_values(figures),
    )
    return _insert(connection, _INSERT_FIGURES, row)


def add_verdict(
    connection: sqlite3.Connection,
    figures_id: int,
    verdict: Verdict,
    *,
    budget: str,
    design_id: int | None,
) -> int:
    """Write one verdict and return its number in this file."""
    row = (
        figures_id,
        names.THIS_LOGBOOK,
        _next(connection, _LAST_VERDICT, figures_id),
        door.utc_now(),
        verdict.overall,
        design_id,
        document(connection, budget, "budget"),
        to_json(verdict, "verdict"),
    )
    return _insert(connection, _INSERT_VERDICT, row)


def design_judged(
    connection: sqlite3.Connection, figures_id: int, sha256: str | None
) -> int | None:
    """Return the design behind a verdict: the one named, else that of the sweep.

    Raises:
        LogbookError: There are no such figures, or no such design.
    """
    row = connection.execute(
        f"SELECT s.design FROM {names.FIGURES} f JOIN {names.SWEEP} s ON s.id = f.sweep"
        " WHERE f.id = ?",
        (figures_id,),
    ).fetchone()
    if row is None:
        raise LogbookError(f"the logbook has no figures number {figures_id}")
    if sha256 is None:
        return None if row[0] is None else int(row[0])
    return design(connection, sha256, text=None, name="", revision="")


def _refuse_if_ended(connection: sqlite3.Connection, sweep: int, uuid: str) -> None:
    row = connection.execute(
        f"SELECT state FROM {names.SWEEP_END} WHERE sweep = ?", (sweep,)
    ).fetchone()
    if row is not None:
        raise LogbookError(f"sweep {uuid} has ended already ({row[0]}) and takes nothing more")


def _measured(point: Point) -> Row:
    """Return the stored numbers of a point, from its frequency on."""
    return (
        door.number(point.frequency_hz, "frequency_hz"),
        door.number(point.level_vrms, "level_vrms"),
        door.number_or_none(point.input_vrms, "input_vrms"),
        door.number_or_none(point.output_vrms, "output_vrms"),
        door.number_or_none(point.gain, "gain"),
        door.number_or_none(point.u_gain_rel, "u_gain_rel"),
        door.number_or_none(point.phase_deg, "phase_deg"),
        door.whole(point.flags, "flags"),
    )


def _figure_values(figures: Figures) -> Row:
    values: list[Any] = []
    for name in FIGURE_NAMES:
        figure = figures.figure(name)
        if figure is None:
            values += (None, None, None)
        else:
            values += (
                door.number(figure.value, name),
                door.number_or_none(figure.u, f"u of {name}"),
                figure.bound,
            )
    return tuple(values)


def _next(connection: sqlite3.Connection, last_sql: str, *owner: int) -> int:
    """Return one more than the highest number so far, or 1."""
    (last,) = connection.execute(last_sql, owner).fetchone()
    return int(last or 0) + 1


def _insert(connection: sqlite3.Connection, sql: str, row: Sequence[Any]) -> int:
    """Run an INSERT that returns the new row's id."""
    (new_id,) = connection.execute(sql, row).fetchone()
    return int(new_id)
