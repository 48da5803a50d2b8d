"""Everything that enters the logbook passes here once and leaves as plain Python.

SQLite takes ``numpy.float32`` and ``numpy.int64`` for bytes, turns NaN into NULL without a word and
stores infinity; so numbers become ``float`` and ``int`` here, or are refused by name.
"""

import hashlib
import math
from datetime import UTC, date, datetime, timedelta
from typing import SupportsFloat, SupportsInt

from benchlog.errors import LogbookError


def number(value: SupportsFloat, field: str) -> float:
    """Return a finite ``float``.

    Raises:
        LogbookError: The value is NaN or infinite.
    """
    plain = float(value)
    if not math.isfinite(plain):
        raise LogbookError(
            f"{field} is {plain}, which the logbook does not keep",
            where=field,
            expected="a finite number, or nothing with a flag that says why",
        )
    return plain


def number_or_none(value: SupportsFloat | None, field: str) -> float | None:
    """Return a finite ``float``, or None as it came."""
    return None if value is None else number(value, field)


def whole(value: SupportsInt) -> int:
    """Return a plain ``int``."""
    return int(value)


def text(value: str, field: str) -> str:
    """Return text that can be written as UTF-8.

    Raises:
        LogbookError: The text holds bytes that are no text (a command line can carry them).
    """
    try:
        value.encode()
    except UnicodeEncodeError as error:
        raise LogbookError(
            f"{field} holds bytes that are not text: {value!a}",
            where=field,
            expected="text in UTF-8",
        ) from error
    return str(value)


def utc_time(value: str, field: str) -> str:
    """Return a moment as it came, once it is known to be UTC in ISO 8601.

    Raises:
        LogbookError: It is not a moment, or not in UTC: history sorts these texts.
    """
    try:
        offset = datetime.fromisoformat(value).utcoffset()
    except ValueError:
        offset = None
    if offset != timedelta(0):
        raise LogbookError(
            f"{field} {value!r} is not a time in UTC",
            where=field,
            expected='ISO 8601 with its offset, as in "2027-03-31T09:15:00+00:00"',
        )
    return value


def utc_now() -> str:
    """Return this moment in UTC, ISO 8601 to the millisecond."""
    return datetime.now(UTC).isoformat(timespec="milliseconds")


def earliest(since: str | date) -> str:
    """Return the text that sorts before everything from ``since`` on (a day, or a moment)."""
    return _moment(since, "since").isoformat()


def latest(until: str | date) -> str:
    """Return the text that sorts after everything up to ``until``; a day is meant whole."""
    moment = _moment(until, "until")
    whole_day = not isinstance(until, datetime) and len(str(until)) == len("2027-03-31")
    # One millisecond more than asked for keeps "...:00+00:00" on the right side of "...:00.5".
    step = timedelta(days=1) if whole_day else timedelta(milliseconds=1)
    return (moment + step).isoformat()


def sha256_of(body: str) -> str:
    """Return the SHA-256 of a text's UTF-8 bytes, in hexadecimal."""
    return hashlib.sha256(body.encode()).hexdigest()


def _moment(given: str | date, field: str) -> datetime:
    try:
        moment = datetime.fromisoformat(str(given))
    except ValueError as error:
        raise LogbookError(
            f"{field} {given!r} is not a date",
            where=field,
            expected='a day as in "2027-03-31", or a time as in "2027-03-31T09:15:00+00:00"',
        ) from error
    return moment.replace(tzinfo=UTC) if moment.tzinfo is None else moment.astimezone(UTC)
