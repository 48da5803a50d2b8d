"""The schedule: which frequencies and levels are measured, in which order."""

import math
from collections.abc import Sequence
from dataclasses import dataclass

from benchlog.errors import ScheduleError
from benchlog.notation import si

MOST_PER_DECADE = 1000
# Rounding moves a frequency by at most a hundredth of the distance to its neighbour.
_ROUNDING = 0.01


@dataclass(frozen=True, slots=True, kw_only=True)
class Step:
    """One point to be measured.

    Attributes:
        position: Place in the schedule, counted from 0.
        frequency_hz: What the source is set to.
        level_vrms: What the source is set to, V RMS; a fixed attenuator comes after it.
        output_vrms: What the design predicts at the board's output; None without a design.
    """

    position: int
    frequency_hz: float
    level_vrms: float
    output_vrms: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Schedule:
    """Steps in the order in which they are measured.

    Attributes:
        steps: At least one.
        attenuation: Source level over level at the board's input: 10 for a 20 dB attenuator.
        meter_before_attenuator: True where an input meter reads the level before the attenuator.
        notes: Sentences for people about choices that were made, such as a shortened span.

    Raises:
        ScheduleError: No step, or one that no bench can be set to.
    """

    steps: tuple[Step, ...]
    attenuation: float = 1.0
    meter_before_attenuator: bool = False
    notes: tuple[str, ...] = ()

    def __post_init__(self) -> None:
        if not self.steps:
            raise ScheduleError(
                "the schedule has no point",
                where="schedule",
                expected="at least one frequency",
                hint="check start, stop and points per decade",
            )
        if not (math.isfinite(self.attenuation) and self.attenuation > 0):
            raise ScheduleError(
                f"the attenuation is {self.attenuation}",
                where="attenuator",
                expected="a finite ratio above zero",
                hint="check the attenuator in the bench file",
            )
        for step in self.steps:
            _check_step(step)
        if len({step.position for step in self.steps}) != len(self.steps):
            raise ScheduleError("two points have the same position", where="schedule")

    def at_board(self, level_vrms: float) -> float:
        """Return the level at the board's input for a level programmed at the source."""
        return level_vrms / self.attenuation

    def at_input_meter(self, level_vrms: float) -> float:
        """Return the level that an input meter sees for a level programmed at the source."""
        return level_vrms if self.meter_before_attenuator else self.at_board(level_vrms)

    @property
    def attenuation_after_meter(self) -> float:
        """Level at the input meter over level at the board's input."""
        return self.attenuation if self.meter_before_attenuator else 1.0

    @property
    def highest_level_vrms(self) -> float:
        """The highest level the source is set to."""
        return max(step.level_vrms for step in self.steps)

    @property
    def highest_input_vrms(self) -> float:
        """The highest level at the board's input."""
        return self.at_board(self.highest_level_vrms)

    @property
    def loudest(self) -> Step | None:
        """The step with the highest predicted output; None without a prediction."""
        known = [(step.output_vrms, step) for step in self.steps if step.output_vrms is not None]
        return max(known, key=lambda pair: pair[0])[1] if known else None

    def frequencies(self) -> tuple[float, ...]:
        """Return the frequencies in the order in which they are measured, hertz."""
        return tuple(step.frequency_hz for step in self.steps)

    def settings(self) -> dict[str, object]:
        """Return what is needed to make this schedule again, for a sweep's record as JSON."""
        return {
            "frequency_hz": list(self.frequencies()),
            "level_vrms": [step.level_vrms for step in self.steps],
            "attenuation": self.attenuation,
            "meter_before_attenuator": self.meter_before_attenuator,
            "notes": list(self.notes),
        }

    def statement(self) -> str:
        """Say what will be applied, before anything is switched on."""
        text = f"The board's input will see at most {_level(self.highest_input_vrms)}"
        if self.attenuation != 1:
            text += f" (the source is set to {_level(self.highest_level_vrms)})"
        loudest = self.loudest
        if loudest is None or loudest.output_vrms is None:
            return f"{text}; what its output will give is not known."
        output, frequency_hz = _level(loudest.output_vrms), loudest.frequency_hz
        return f"{text}, its output at most {output}, at {si(frequency_hz, 'Hz')}."


def log_spaced(start_hz: float, stop_hz: float, per_decade: int) -> tuple[float, ...]:
    """Space frequencies evenly on a logarithmic axis.

    Each is computed from its own place, so errors do not add up, and rounded to a short decimal
    number, so that a spread over whole decades hits 10, 100, 1000 on the dot.

    Args:
        start_hz: The first frequency, returned exactly.
        stop_hz: The last frequency, returned exactly; not below ``start_hz``.
        per_decade: At least so many points in each decade.

    Returns:
        Rising frequencies, hertz.

    Raises:
        ScheduleError: An end is not a frequency, the ends are swapped, or the density is absurd.
    """
    for name, end_hz in (("start", start_hz), ("stop", stop_hz)):
        if not (math.isfinite(end_hz) and end_hz > 0):
            raise ScheduleError(
                f"{name} is {end_hz:g} Hz",
                where=f"sweep.{name}",
                expected="a finite frequency above zero",
                hint='write it like "100 Hz" or "1 MHz"',
            )
    if stop_hz < start_hz:
        raise ScheduleError(
            f"stop ({si(stop_hz, 'Hz')}) lies below start ({si(start_hz, 'Hz')})",
            where="sweep.stop",
            expected="a stop at or above the start",
            hint="swap the two",
        )
    if not 1 <= per_decade <= MOST_PER_DECADE:
        raise ScheduleError(
            f"{per_decade} points per decade",
            where="sweep.per_decade",
            expected=f"a whole number from 1 to {MOST_PER_DECADE}",
            hint="10 is a good start",
        )
    if start_hz == stop_hz:
        return (start_hz,)
    decades = math.log10(stop_hz / start_hz)
    # The little bit less keeps three decades at three decades when the logarithm is a hair over.
    gaps = max(1, math.ceil(per_decade * decades - 1e-6))
    digits = _digits(decades / gaps)
    inner = (start_hz * 10 ** (decades * place / gaps) for place in range(1, gaps))
    rounded = (rounded_hz(frequency_hz, digits) for frequency_hz in inner)
    return (start_hz, *(f for f in rounded if start_hz < f < stop_hz), stop_hz)


def rounded_hz(frequency_hz: float, digits: int) -> float:
    """Round to so many significant digits."""
    return float(f"{frequency_hz:.{digits - 1}e}")


def spaced_schedule(
    frequencies_hz: Sequence[float],
    level_vrms: float,
    *,
    attenuation: float = 1.0,
) -> Schedule:
    """Make a schedule of one level at the board's input, without a design.

    Args:
        frequencies_hz: In the order in which they are measured.
        level_vrms: Level at the board's input, V RMS.
        attenuation: Source level over level at the board's input.

    Raises:
        ScheduleError: No frequency, or one that is not finite and above zero.
    """
    steps = tuple(
        Step(position=place, frequency_hz=frequency_hz, level_vrms=level_vrms * attenuation)
        for place, frequency_hz in enumerate(frequencies_hz)
    )
    return Schedule(steps=steps, attenuation=attenuation)


def _digits(gap_decades: float) -> int:
    """Return how many digits keep the rounding far below the distance to the neighbour."""
    gap_rel = 10**gap_decades - 1
    return max(4, math.ceil(-math.log10(2 * _ROUNDING * gap_rel)) + 1)


def _check_step(step: Step) -> None:
    for name, value, unit in (
        ("frequency", step.frequency_hz, "Hz"),
        ("level", step.level_vrms, "V RMS"),
    ):
        if not (math.isfinite(value) and value > 0):
            raise ScheduleError(
                f"the {name} of point {step.position + 1} is {value:g} {unit}",
                where=f"schedule, point {step.position + 1}",
                expected=f"a finite {name} above zero",
                hint="check start, stop and level",
            )


def _level(vrms: float) -> str:
    """Write a level as people set it on a bench."""
    return f"{si(vrms, 'Vrms')} ({si(2 * math.sqrt(2) * vrms, 'Vpp')})"
