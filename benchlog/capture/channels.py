"""Which columns of a time record are time, input and output, and in which units."""

import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Literal, TypeAlias

from benchlog.capture.columns import kind_of, split_name
from benchlog.errors import CaptureError

Side: TypeAlias = Literal["input", "output"]

# What a person may say beside the sides: which column holds the times, and their unit.
TIME, TIME_UNIT = "time", "time unit"
_TIME = re.compile(r"(time|t|zeit|x|sec(ond)?s?|s|abscissa)([ _.-].*|\d*)?", re.IGNORECASE)
_SECONDS = {"s": 1.0, "sec": 1.0, "ms": 1e-3, "us": 1e-6, "µs": 1e-6, "ns": 1e-9, "ps": 1e-12}
_VOLTS = {"v": 1.0, "volt": 1.0, "volts": 1.0, "mv": 1e-3, "uv": 1e-6, "µv": 1e-6, "kv": 1e3}
_EXTREME = re.compile(r"[ _.-]*\(?(min|max)(imum)?\)?$", re.IGNORECASE)
_COUNT = re.compile(r"(n|no|nr|index|sample|samples|point|points|#)\.?", re.IGNORECASE)


@dataclass(frozen=True, slots=True, kw_only=True)
class Channel:
    """One signal of a record.

    Attributes:
        name: As the file calls it.
        places: Its column, or the two columns of its lowest and highest values.
        volts: What makes a value one in volts; 1 where the file names no unit.
        time_place: The column of its times; None where the file has none.
        seconds: What makes a time one in seconds.
    """

    name: str
    places: tuple[int, ...]
    volts: float
    time_place: int | None
    seconds: float


def is_record(header: Sequence[Sequence[str]], *, has_step: bool, asked: Mapping[str, str]) -> bool:
    """Tell a time record from a swept table: it has times or a sample interval, no frequencies."""
    if TIME in asked:
        return True
    names = [split_name(cell)[0] for cell in (header[0] if header else ())]
    if any(kind_of(name) == "frequency" for name in names):
        return False
    return has_step or any(map(is_time, names))


def is_time(name: str) -> bool:
    """Tell whether a column of this name holds times."""
    return _TIME.fullmatch(name) is not None


def is_time_or_volts(unit: str) -> bool:
    """Tell whether a word is a unit of time or of voltage."""
    return unit.lower() in _SECONDS or unit.lower() in _VOLTS


def find_channels(
    header: Sequence[Sequence[str]], width: int, *, asked: Mapping[str, str]
) -> dict[Side, Channel]:
    """Return the input and the output channel.

    Args:
        header: Rows of words above the numbers, top first.
        width: Columns of the block.
        asked: Which column is what, by ``"input"``, ``"output"``: names, or places of the signal
            from 1; ``TIME``: name, or place of the column from 1; ``TIME_UNIT``.

    Raises:
        CaptureError: It is not clear which column is which.
    """
    named = _named(header, width)
    if TIME in asked:
        named = [
            ("time" if asked[TIME].lower() in {name.lower(), str(place)} else name, unit)
            for place, (name, unit) in enumerate(named, start=1)
        ]
    channels = _channels(named, asked)
    sides: dict[Side, Channel] = {}
    for side in ("input", "output"):
        wanted = asked.get(side)
        fitting = [
            channel
            for place, channel in enumerate(channels, start=1)
            if (wanted is None and kind_of(channel.name) == side)
            or (wanted is not None and wanted.lower() in {channel.name.lower(), str(place)})
        ]
        if len(fitting) == 1:
            sides[side] = fitting[0]
    if len(sides) < 2 or sides["input"] is sides["output"]:
        names = [channel.name for channel in channels]
        if len(set(names)) < len(names) or len(names) < 2:
            names = [str(place) for place in range(1, max(len(names), 2) + 1)]
        raise CaptureError(
            "it is not clear which channel is the board's input and which its output",
            where=f"header: {', '.join(channel.name for channel in channels) or 'none'}",
            expected="channels named input and output, or told apart by you",
            hint=f"say it: --column input={names[0]} --column output={names[-1]}",
        )
    return sides


def _named(header: Sequence[Sequence[str]], width: int) -> list[tuple[str, str]]:
    if not header:
        return [(f"column {place + 1}", "") for place in range(width)]
    named = [split_name(cell) for cell in header[0]]
    if len(header) == 2:
        named = [
            (name, unit.strip("()[] ") or inner)
            for (name, inner), unit in zip(named, header[1], strict=True)
        ]
    return named


def _channels(named: Sequence[tuple[str, str]], asked: Mapping[str, str]) -> list[Channel]:
    """Return the signals in the order of their columns, lowest and highest values paired."""
    channels: list[Channel] = []
    time_place: int | None = None
    seconds = 1.0
    for place, (name, unit) in enumerate(named):
        if _COUNT.fullmatch(name):
            continue
        if _TIME.fullmatch(name):
            time_place, seconds = place, _seconds(asked.get(TIME_UNIT) or unit, name)
            continue
        stem = _EXTREME.sub("", name).strip()
        if channels and stem != name and channels[-1].name == stem:
            before = channels.pop()
            channels.append(
                Channel(
                    name=stem,
                    places=(*before.places, place),
                    volts=before.volts,
                    time_place=before.time_place,
                    seconds=before.seconds,
                )
            )
            continue
        channels.append(
            Channel(
                name=stem,
                places=(place,),
                volts=_volts(unit, name),
                time_place=time_place,
                seconds=seconds,
            )
        )
    return channels


def _seconds(unit: str, name: str) -> float:
    known = _SECONDS.get((unit or "s").strip().lower())
    if known is None:
        raise CaptureError(
            f"the time column {name!r} has the unit {unit!r}, which is not known here",
            where=f"column {name!r}",
            expected=f"one of: {', '.join(_SECONDS)}",
            hint="say it with --unit time=us (or another of these)",
        )
    return known


def _volts(unit: str, name: str) -> float:
    known = _VOLTS.get((unit or "v").strip().lower())
    if known is None:
        raise CaptureError(
            f"the channel {name!r} has the unit {unit!r}, which is no voltage",
            where=f"column {name!r}",
            expected=f"one of: {', '.join(_VOLTS)}",
        )
    return known
