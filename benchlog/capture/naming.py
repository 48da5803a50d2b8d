"""Serials out of file names, by a pattern that a person gives."""

import re
from collections.abc import Sequence
from pathlib import Path

from benchlog.errors import CaptureError

_PLACE = "{serial}"


def serial_of(path: Path, pattern: str) -> str:
    """Return the serial in a file's name.

    Args:
        path: The file; only its name counts.
        pattern: Plain text with ``{serial}`` once, and ``*`` for anything: ``"*_{serial}.csv"``.

    Raises:
        CaptureError: The pattern has no single ``{serial}``, or the name does not fit it.
    """
    if pattern.count(_PLACE) != 1:
        raise CaptureError(
            f"the pattern {pattern!r} does not name one serial",
            where="--serial-from-name",
            expected='plain text with {serial} once, like "*_{serial}.csv"',
        )
    before, after = (_loose(part) for part in pattern.split(_PLACE))
    found = re.fullmatch(f"{before}(.+?){after}", path.name)
    if found is None:
        raise CaptureError(
            f"the name {path.name!r} does not fit the pattern {pattern!r}",
            where=str(path),
            expected="names that fit; --preview shows the serials and keeps nothing",
        )
    return found[1]


def by_serial(paths: Sequence[Path], pattern: str) -> dict[str, list[Path]]:
    """Return the files of each serial, in the order of their coming."""
    groups: dict[str, list[Path]] = {}
    for path in paths:
        groups.setdefault(serial_of(path, pattern), []).append(path)
    return groups


def _loose(text: str) -> str:
    return ".*".join(re.escape(part) for part in text.split("*"))
