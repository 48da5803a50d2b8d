"""Records as JSON text and back, exactly.

The JSON is strict: the degrees of freedom of a type B term are often infinite, and JSON has no
infinity, so an infinite number is the text ``"inf"`` (or ``"-inf"``).  On the way back the field's
own type says that a number is meant.  NaN is refused.
"""

import math
from typing import Any, TypeVar

import msgspec

from benchlog.errors import LogbookError

T = TypeVar("T")


def to_json(record: object, what: str) -> str:
    """Return a record (or a tuple of records) as strict JSON text.

    Args:
        record: A frozen record of ``benchlog.records``, or a tuple of them.
        what: Its name, for the error.

    Raises:
        LogbookError: A number in it is NaN, or a text is none.
    """
    plain = _plain(msgspec.to_builtins(record), what)
    try:
        return msgspec.json.encode(plain).decode()
    except UnicodeEncodeError as error:
        raise _not_text(what) from error


def from_json(body: str, kind: type[T]) -> T:
    """Return the record that ``to_json`` wrote.

    Raises:
        LogbookError: The text is not such a record: the file was changed, or is newer.
    """
    try:
        # Not strict only for one thing: a text "inf" where the field is a number.
        return msgspec.convert(msgspec.json.decode(body), kind, strict=False)
    except msgspec.MsgspecError as error:
        raise LogbookError(
            f"a stored {kind.__name__} cannot be read: {error}",
            hint="the logbook was written by another version, or changed behind its back",
        ) from error


def json_object(body: str, what: str) -> str:
    """Return a JSON object's text as it came.

    Raises:
        LogbookError: It is not strict JSON, or not an object.
    """
    try:
        msgspec.json.decode(body, type=dict[str, Any])
    except UnicodeEncodeError as error:
        raise _not_text(what) from error
    except msgspec.MsgspecError as error:
        raise LogbookError(
            f"the {what} are not a JSON object: {error}", where=what, expected='text like {"a": 1}'
        ) from error
    return body


def _not_text(what: str) -> LogbookError:
    return LogbookError(f"a text in the {what} holds bytes that are not text", where=what)


def _plain(value: Any, what: str) -> Any:  # noqa: ANN401 - any JSON value
    """Return the same builtins with infinity as text."""
    if isinstance(value, dict):
        return {key: _plain(inner, what) for key, inner in value.items()}
    if isinstance(value, list | tuple):
        return [_plain(inner, what) for inner in value]
    if isinstance(value, float) and not math.isfinite(value):
        if math.isnan(value):
            raise LogbookError(f"a number in the {what} is NaN, which the logbook does not keep")
        return str(value)
    return value
