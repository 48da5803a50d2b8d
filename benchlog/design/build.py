"""Make a design from the data of its file."""

import hashlib
import math
import re
from collections.abc import Iterable, Mapping
from itertools import pairwise

from msgspec import UnsetType

from benchlog import quantity
from benchlog.circuit.amplifier import Amplifier
from benchlog.design.amplifiers import ReadAmplifier, read_amplifier
from benchlog.design.budget import read_budget
from benchlog.design.entries import optional
from benchlog.design.file import DesignFile, SweepFile, ToleranceFile
from benchlog.design.model import Design, LevelAbove, PlacedStage, SweepSettings
from benchlog.design.stages import read_stage
from benchlog.errors import DesignFileError
from benchlog.quantity import shown

# What holds where a design states no tolerance: ordinary film resistors and capacitors, and a
# typical value from a data sheet.  Common practice.
DEFAULT_TOLERANCES: Mapping[str, float] = {"resistor": 0.01, "capacitor": 0.1, "second_pole": 0.2}

_LONGEST_NAME = 200
_PLAIN_NAME = re.compile(r"[A-Za-z0-9_-]{1,40}")


def build_design(file: DesignFile, *, text: str, content: bytes) -> Design:
    """Make a design.

    Args:
        file: The data of the file.
        text: The file as text.
        content: The file's bytes, which its hash is over.

    Raises:
        DesignFileError: Something that the keys alone do not show: names that meet nothing, limits
            out of order, parts that make no circuit.
        QuantityError: An entry is not a quantity of the wanted kind.
    """
    defaults = _tolerances(file.tolerance)
    rails_v = _rails(file)
    stages = [
        read_stage(stage, place, defaults=defaults)
        for place, stage in enumerate(file.stage, start=1)
    ]
    read = [
        read_amplifier(name, table, rails_v=rails_v, pole_tolerance=defaults["second_pole"])
        for name, table in file.amplifier.items()
    ]
    placed = tuple(stage.placed for stage in stages)
    amplifiers = tuple(one.amplifier for one in read)
    _check_names(placed, amplifiers)
    return Design(
        name=_words(file.name, "name"),
        revision=_words(file.revision, "revision"),
        text=text,
        sha256=hashlib.sha256(content).hexdigest(),
        stages=placed,
        amplifiers=amplifiers,
        figure_amplifier=_figure_amplifier(file, amplifiers),
        tolerances=_gathered([stage.tolerances for stage in stages], read),
        budget=read_budget(file.budget),
        rails_v=rails_v,
        drive_level_vrms=None
        if isinstance(file.drive, UnsetType)
        else quantity.level_vrms(file.drive.level, field="drive.level"),
        sweep=_sweep(file.sweep),
    )


def _words(text: str, where: str) -> str:
    words = text.strip()
    if not words or len(words) > _LONGEST_NAME or not words.isprintable():
        raise DesignFileError(
            f"{where} is {'empty' if not words else 'too long or has unprintable characters'}",
            where=where,
            expected=f"one line of at most {_LONGEST_NAME} characters",
        )
    return words


def _tolerances(file: ToleranceFile) -> dict[str, float]:
    stated = {
        key: optional(getattr(file, key), quantity.percent, f"tolerance.{key}")
        for key in DEFAULT_TOLERANCES
    }
    return {
        key: DEFAULT_TOLERANCES[key] if value is None else value for key, value in stated.items()
    }


def _gathered(
    stages: list[Mapping[str, float]], amplifiers: list[ReadAmplifier]
) -> dict[str, float]:
    tables = [*stages, *(one.tolerances for one in amplifiers)]
    return {name: value for table in tables for name, value in table.items()}


def _rails(file: DesignFile) -> tuple[float, float] | None:
    if isinstance(file.rails, UnsetType):
        return None
    rails_v = [
        quantity.volt(entry, field=f"rails[{place}]")
        for place, entry in enumerate(file.rails, start=1)
    ]
    if len(rails_v) != 2 or not rails_v[0] < rails_v[1]:
        raise DesignFileError(
            "rails are not the lowest and the highest supply voltage",
            where="rails",
            expected='two voltages that rise, for example ["-12 V", "12 V"]',
        )
    return rails_v[0], rails_v[1]


def _check_names(stages: tuple[PlacedStage, ...], amplifiers: tuple[Amplifier, ...]) -> None:
    """Refuse a stage whose amplifier is not there, and an amplifier that no stage uses."""
    by_name = {amplifier.name: amplifier for amplifier in amplifiers}
    _check_plain(by_name)
    for place, placed in enumerate(stages, start=1):
        name = placed.amplifier
        if name is not None and name not in by_name:
            raise DesignFileError(
                f"stage[{place}].amplifier is {shown(name)}, and no amplifier has that name",
                where=f"stage[{place}].amplifier",
                expected=f"one of: {', '.join(by_name)}"
                if by_name
                else f"a table [amplifier.{name}]",
            )
        if placed.topology == "open-loop" and name is not None:
            _check_open_loop(by_name[name])
    unused = [name for name in by_name if name not in {placed.amplifier for placed in stages}]
    if unused:
        raise DesignFileError(
            f"amplifier.{unused[0]} is in no stage",
            where=f"amplifier.{unused[0]}",
            expected="every amplifier named by at least one stage",
        )


def _check_plain(names: Iterable[str]) -> None:
    """Refuse amplifier names that would make a part's key path ambiguous."""
    for name in names:
        if not _PLAIN_NAME.fullmatch(name):
            raise DesignFileError(
                f"the amplifier's name {shown(name)} is not plain",
                where="amplifier",
                expected="letters, digits, _ and -, for example [amplifier.main]",
            )


def _check_open_loop(amplifier: Amplifier) -> None:
    if math.isinf(amplifier.open_loop_gain):
        where = f"amplifier.{amplifier.name}.open_loop_gain"
        raise DesignFileError(
            f"{where} is missing, and an open-loop stage has no other gain",
            where=where,
            expected='a gain, for example "106 dB"',
        )


def _figure_amplifier(file: DesignFile, amplifiers: tuple[Amplifier, ...]) -> str | None:
    names = [amplifier.name for amplifier in amplifiers]
    if isinstance(file.gbw_of, UnsetType):
        if len(names) > 1:
            raise DesignFileError(
                f"there are {len(names)} amplifiers, and nothing says whose GBW is the figure",
                where="gbw_of",
                expected=f"one of: {', '.join(names)}",
            )
        return names[0] if names else None
    if file.gbw_of not in names:
        raise DesignFileError(
            f"gbw_of is {shown(file.gbw_of)}, and no amplifier has that name",
            where="gbw_of",
            expected=f"one of: {', '.join(names)}" if names else "no gbw_of without amplifiers",
        )
    return file.gbw_of


def _sweep(file: SweepFile) -> SweepSettings:
    start_hz = optional(file.start, quantity.hertz, "sweep.start")
    stop_hz = optional(file.stop, quantity.hertz, "sweep.stop")
    if start_hz is not None and stop_hz is not None and not start_hz < stop_hz:
        raise DesignFileError(
            "sweep.start is not below sweep.stop", where="sweep.start", expected="start below stop"
        )
    per_decade = None if isinstance(file.per_decade, UnsetType) else file.per_decade
    return SweepSettings(
        start_hz=start_hz, stop_hz=stop_hz, per_decade=per_decade, levels=_levels(file)
    )


def _levels(file: SweepFile) -> tuple[LevelAbove, ...]:
    """Read the levels of a sweep; a single one holds everywhere."""
    if isinstance(file.level, UnsetType):
        return ()
    if isinstance(file.level, str):
        level_vrms = quantity.level_vrms(file.level, field="sweep.level")
        return (LevelAbove(above_hz=0.0, level_vrms=level_vrms),)
    levels = tuple(
        LevelAbove(
            above_hz=quantity.hertz(entry.above, field=f"sweep.level[{place}].above"),
            level_vrms=quantity.level_vrms(entry.level, field=f"sweep.level[{place}].level"),
        )
        for place, entry in enumerate(file.level, start=1)
    )
    for place, (one, other) in enumerate(pairwise(levels), start=2):
        if not one.above_hz < other.above_hz:
            raise DesignFileError(
                f"sweep.level[{place}].above does not rise",
                where=f"sweep.level[{place}].above",
                expected="levels in order of rising frequency",
            )
    return levels
