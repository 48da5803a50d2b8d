"""What a bench can do and what may be done to a board, held against a schedule."""

from collections.abc import Sequence
from dataclasses import dataclass

from benchlog.errors import ScheduleError
from benchlog.notation import si
from benchlog.sweep.schedule import Schedule

# Levels come from conversions such as "20 mVpp" times 10 and may miss a round limit by rounding.
_ROUNDING = 1e-9


@dataclass(frozen=True, slots=True, kw_only=True)
class Band:
    """The frequencies one instrument covers.

    Attributes:
        name: Who covers them: ``"source"``, ``"output meter"``.
        low_hz, high_hz: From and to, both included.
    """

    name: str
    low_hz: float
    high_hz: float


@dataclass(frozen=True, slots=True, kw_only=True)
class BenchLimits:
    """What the bench's instruments can do, and the ceiling its owner has set.

    Attributes:
        bands: The source's and each meter's.
        source_low_vrms, source_high_vrms: Levels that the source can be set to.
        max_level_vrms: Ceiling of the bench file for the level set at the source; None for none.
        attenuation: Source level over level at the board's input.
        meter_before_attenuator: True where an input meter reads the level before the attenuator.
    """

    bands: tuple[Band, ...]
    source_low_vrms: float
    source_high_vrms: float
    max_level_vrms: float | None = None
    attenuation: float = 1.0
    meter_before_attenuator: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class BoardLimit:
    """The highest level one board may see at its input at one step.

    Attributes:
        level_vrms: At the board's input.
        why: What limits: ``"slew rate"``, ``"output swing"``.
    """

    level_vrms: float
    why: str


def check_bench(schedule: Schedule, limits: BenchLimits) -> None:
    """Refuse what the instruments cannot do.

    Raises:
        ScheduleError: A frequency or a level that an instrument does not cover.
    """
    for step in schedule.steps:
        for band in limits.bands:
            if not band.low_hz <= step.frequency_hz <= band.high_hz:
                raise ScheduleError(
                    f"the {band.name} does not cover {si(step.frequency_hz, 'Hz', 6)}",
                    where=_point(step.position),
                    expected=f"{si(band.low_hz, 'Hz', 6)} to {si(band.high_hz, 'Hz', 6)}",
                    hint="change start or stop, or use another instrument",
                )
        low, high = limits.source_low_vrms, limits.source_high_vrms
        if not low * (1 - _ROUNDING) <= step.level_vrms <= high * (1 + _ROUNDING):
            raise ScheduleError(
                f"the source cannot be set to {si(step.level_vrms, 'Vrms')}",
                where=_point(step.position),
                expected=f"{si(low, 'Vrms')} to {si(high, 'Vrms')}",
                hint="change the level, or fit another attenuator and enter it in the bench file",
            )


def check_harm(
    schedule: Schedule, limits: BenchLimits, *, board: Sequence[BoardLimit] = ()
) -> None:
    """Refuse what could overdrive the board or goes over the bench's ceiling.

    Args:
        schedule: What is to be measured.
        limits: The bench.
        board: One limit for each step; empty without a design.

    Raises:
        ScheduleError: A level above the ceiling or above what the design allows.
    """
    ceiling_vrms = limits.max_level_vrms
    for step in schedule.steps:
        if ceiling_vrms is not None and step.level_vrms > ceiling_vrms * (1 + _ROUNDING):
            raise ScheduleError(
                f"the source would be set to {si(step.level_vrms, 'Vrms')},"
                " over the bench's ceiling",
                where=_point(step.position),
                expected=f"at most {si(ceiling_vrms, 'Vrms')} (max_level in the bench file)",
                hint="lower the level; only if you are sure, allow levels beyond the limits",
            )
    for step, limit in zip(schedule.steps, board, strict=bool(board)):
        input_vrms = schedule.at_board(step.level_vrms)
        if input_vrms > limit.level_vrms * (1 + _ROUNDING):
            raise ScheduleError(
                f"{si(input_vrms, 'Vrms')} at {si(step.frequency_hz, 'Hz', 6)} is more than this"
                f" design bears at its input ({limit.why})",
                where=_point(step.position),
                expected=f"at most {si(limit.level_vrms, 'Vrms')} at the board's input",
                hint="lower the level in [drive]; only if you are sure, allow levels beyond the"
                " limits",
            )


def _point(position: int) -> str:
    return f"schedule, point {position + 1}"
