"""What enters becomes plain Python, or is refused by name."""

from datetime import date, datetime, timedelta, timezone

import numpy as np
import pytest

from benchlog.errors import LogbookError
from benchlog.logbook import door
from benchlog.logbook.codec import to_json
from benchlog.logbook.store import Logbook
from benchlog.records import Figures, Point, PointFlag
from tests.fakes.sample_sweep import sample_points, sample_start


def test_numpy_numbers_are_stored_as_numbers(logbook: Logbook) -> None:
    """float32 and int64 would reach SQLite as bytes."""
    start = sample_start()
    logbook.begin_sweep(start)
    point = Point(
        position=np.int64(0),  # type: ignore[arg-type]
        frequency_hz=np.float32(1000.0),  # type: ignore[arg-type]
        level_vrms=np.float64(0.5),
        input_vrms=None,
        output_vrms=np.float32(0.25),  # type: ignore[arg-type]
        gain=np.int64(3),  # type: ignore[arg-type]
        flags=PointFlag(int(np.int64(4))),
    )
    logbook.add_point(start.uuid, point)
    (stored,) = logbook.points(start.uuid)
    assert stored == point
    assert type(stored.frequency_hz) is float
    assert type(stored.position) is int


@pytest.mark.parametrize("value", [float("nan"), float("inf"), -float("inf"), np.float32("nan")])
@pytest.mark.parametrize("field", ["frequency_hz", "level_vrms", "gain", "output_vrms"])
def test_numbers_that_are_none_are_refused_by_name(
    logbook: Logbook, field: str, value: float
) -> None:
    """NaN would be stored as nothing at all; the error names the field."""
    start = sample_start()
    logbook.begin_sweep(start)
    (point,) = sample_points(1)
    fields = {name: getattr(point, name) for name in point.__slots__}
    with pytest.raises(LogbookError, match=f"^{field} is (nan|inf|-inf), which the logbook"):
        logbook.add_point(start.uuid, Point(**{**fields, field: value}))
    assert logbook.points(start.uuid) == ()


def test_a_number_beyond_64_bits_is_refused() -> None:
    """SQLite's module would raise an error that is none of its own."""
    assert door.whole(2**63 - 1, "position") == 2**63 - 1
    with pytest.raises(LogbookError, match="position is 9223372036854775808, which is too large"):
        door.whole(2**63, "position")


def test_bytes_that_are_no_text_are_refused(logbook: Logbook) -> None:
    """A command line can carry bytes that are not UTF-8."""
    with pytest.raises(LogbookError, match=r"serial holds bytes that are not text: '\\udcff'"):
        logbook.begin_sweep(sample_start("\udcff"))
    with pytest.raises(LogbookError, match="the settings holds bytes that are not text"):
        logbook.begin_sweep(sample_start(settings='{"a": "\udcff"}'))
    with pytest.raises(LogbookError, match="the figures holds bytes that are not text"):
        to_json(Figures(shape="\udcff"), "figures")


@pytest.mark.parametrize("serial", ["0042", "1E05", "NA", "' OR 1=1 --", "Ω\n\t\0", "0" * 300])
def test_serials_are_text_to_the_last_character(logbook: Logbook, serial: str) -> None:
    """Leading zeros, exponents, quotes and control characters come back as they were."""
    start = sample_start(serial)
    logbook.begin_sweep(start)
    assert [row.serial for row in logbook.history(serial)] == [serial]


def test_a_board_without_serial_is_refused_but_a_through_has_none(logbook: Logbook) -> None:
    """Only a sweep with the board bypassed has no serial."""
    logbook.begin_sweep(sample_start("", kind="through"))
    with pytest.raises(LogbookError, match="refused a row"):
        logbook.begin_sweep(sample_start(""))


@pytest.mark.parametrize(
    "moment",
    [
        "",
        "yesterday",
        "2026-03-31",
        "2026-03-31T09:15:00",
        "2026-03-31T09:15:00Z",
        "2026-03-31 09:15:00+00:00",
        "20260331T091500+00:00",
        "2026-03-31T09:15:00+02:00",
    ],
)
def test_a_start_must_be_a_moment_in_utc(logbook: Logbook, moment: str) -> None:
    """History sorts these texts, so they must all be of one kind."""
    with pytest.raises(LogbookError, match=r"started_at .* is not a time in UTC"):
        logbook.begin_sweep(sample_start(started_at=moment))


@pytest.mark.parametrize("uuid", ["", "0042", "75F0751D-FD78-42DE-9C3A-724EE5F1D7F7", "{" * 36])
def test_a_sweep_is_named_by_a_uuid(logbook: Logbook, uuid: str) -> None:
    """Anything else is refused before it is written."""
    with pytest.raises(LogbookError, match="is no UUID"):
        logbook.begin_sweep(sample_start(uuid=uuid))


_EAST = timezone(timedelta(hours=2))


@pytest.mark.parametrize(
    ("since", "text"),
    [
        ("2026-03-31", "2026-03-31T00:00:00+00:00"),
        (date(2026, 3, 31), "2026-03-31T00:00:00+00:00"),
        ("2026-03-31T10:00:00+02:00", "2026-03-31T08:00:00+00:00"),
        (datetime(2026, 3, 31, 10, tzinfo=_EAST), "2026-03-31T08:00:00+00:00"),
    ],
)
def test_since_is_the_first_moment(since: str | date, text: str) -> None:
    """Days begin at midnight UTC; other offsets are turned into UTC."""
    assert door.earliest(since) == text


@pytest.mark.parametrize(
    ("until", "text"),
    [
        ("2026-02-28", "2026-03-01T00:00:00+00:00"),
        (date(2026, 12, 31), "2027-01-01T00:00:00+00:00"),
        ("2026-03-31T10:00:00+02:00", "2026-03-31T08:00:00.001000+00:00"),
    ],
)
def test_until_means_the_whole_day(until: str | date, text: str) -> None:
    """The last day is part of what is asked for."""
    assert door.latest(until) == text


@pytest.mark.parametrize("wrong", ["31.03.2026", "last week", "", "9999-12-31"])
def test_what_is_no_date_is_said_so(wrong: str) -> None:
    """One clear error with an example, also at the end of the calendar."""
    with pytest.raises(LogbookError, match=f"until '{wrong}' is not a date"):
        door.latest(wrong)
