"""Everything that enters the logbook passes here once and leaves as plain Python.

SQLite takes ``numpy.float32`` and ``numpy.int64`` for bytes, turns NaN into NULL without a word and
stores infinity; so numbers become ``float`` and ``int`` here, or are refused by name.
"""

import hashlib
import math
from contextlib import suppress
from datetime import UTC, date, datetime, timedelta
from typing import SupportsFloat, SupportsInt
from uuid import UUID

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


def whole(value: SupportsInt, field: str) -> int:
    """Return a plain ``int`` that SQLite can keep.

    Raises:
        LogbookError: It does not fit into 64 bits.
    """
    plain = int(value)
    if plain.bit_length() > 63:
        raise LogbookError(f"{field} is {plain}, which is too large", where=field)
    return plain


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


def uuid(value: str) -> str:
    """Return a UUID in its usual form.

    Raises:
        LogbookError: It is none, or written in another form (capitals, no dashes).
    """
    with suppress(ValueError):
        if str(UUID(value)) == value:
            return value
    raise LogbookError(
        f"{value!r} is no UUID", where="uuid", expected="32 small hexadecimal digits, four dashes"
    )


def utc_time(value: str, field: str) -> str:
    """Return a moment as it came, once it is known to be UTC in the form that Python writes.

    Raises:
        LogbookError: It is not a moment, or not in UTC, or written otherwise (these are sorted).
    """
    with suppress(ValueError):
        to_the_second = datetime.fromisoformat(value).isoformat()[:19]
        if value.startswith(to_the_second) and value.endswith("+00:00"):
            return value
    raise LogbookError(
        f"{field} {value!r} is not a time in UTC",
        where=field,
        expected='ISO 8601 with its offset, as in "2027-03-31T09:15:00+00:00"',
    )


def utc_now() -> str:
    """Return this moment in UTC, ISO 8601 to the millisecond."""
    return datetime.now(UTC).isoformat(timespec="milliseconds")


def earliest(since: str | date) -> str:
    """Return the text that sorts before everything from ``since`` on (a day, or a moment).

    Raises:
        LogbookError: It is no date.
    """
    return _moment(since, "since").isoformat()


def latest(until: str | date) -> str:
    """Return the text that sorts after everything up to ``until``; a day is meant whole.

    Raises:
        LogbookError: It is no date.
    """
    whole_day = len(str(until)) == len("2027-03-31")
    # One millisecond more than asked for keeps "...:00+00:00" on the right side of "...:00.5".
    step = timedelta(days=1) if whole_day else timedelta(milliseconds=1)
    return _moment(until, "until", step).isoformat()


def sha256_of(body: str) -> str:
    """Return the SHA-256 of a text's UTF-8 bytes, in hexadecimal."""
    return hashlib.sha256(body.encode()).hexdigest()


def _moment(given: str | date, field: str, step: timedelta = timedelta(0)) -> datetime:
    try:
        moment = datetime.fromisoformat(str(given)) + step
        return moment.replace(tzinfo=UTC) if moment.tzinfo is None else moment.astimezone(UTC)
    except (ValueError, OverflowError) as error:
        raise LogbookError(
            f"{field} {str(given)!r} is not a date",
            where=field,
            expected='a day as in "2027-03-31", or a time as in "2027-03-31T09:15:00+00:00"',
        ) from error
