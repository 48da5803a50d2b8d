"""The schedule of a design: from its own settings, or from the corners it predicts."""

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace

from benchlog.circuit.chain import Chain
from benchlog.circuit.drive import SWING_USED, drive_limit
from benchlog.circuit.nominal import Nominal, nominal_figures
from benchlog.design.model import Design
from benchlog.errors import ScheduleError
from benchlog.notation import si
from benchlog.sweep.limits import BenchLimits, BoardLimit, check_bench, check_harm
from benchlog.sweep.schedule import Schedule, Step, log_spaced, rounded_hz

PER_DECADE = 10
# The plateau shows from a thousandth of the corner on; below 10 Hz readings take seconds each.
START_OVER_CORNER = 1e-3
LOWEST_START_HZ = 10.0
# 30 times the corner is where one pole has fallen by 29.5 dB and a second pole shows.
STOP_OVER_CORNER = 30.0
STOP_WITHOUT_CORNER_HZ = 1e6
# One pole is down to a thirtieth at 30 corners; more poles get there earlier, and below it a
# meter reads its own noise.
LEAST_GAIN = 1 / 30.1
# A lower corner needs its own decade.
LOWER_CORNER_OVER_START = 10.0
# Common practice for small-signal response: at most 100 mV peak to peak at the output.
SMALL_OUTPUT_VPP = 0.1


@dataclass(frozen=True, slots=True, kw_only=True)
class Override:
    """What a person asks for instead of what the design says; None leaves it to the design.

    Attributes:
        start_hz, stop_hz, per_decade: As in the design's ``[sweep]``.
        level_vrms: Level at the board's input for all points.
    """

    start_hz: float | None = None
    stop_hz: float | None = None
    per_decade: int | None = None
    level_vrms: float | None = None


def schedule_for(
    design: Design,
    limits: BenchLimits,
    *,
    override: Override | None = None,
    beyond_limits: bool = False,
) -> Schedule:
    """Make the schedule that a design is swept with on a bench.

    Args:
        design: Says where to start and stop and how to drive, or its corners do.
        limits: What the bench can do; ends that nobody asked for are moved into its range.
        override: What a person asks for instead.
        beyond_limits: Allow levels above the bench's ceiling and the design's drive limits; what
            was allowed is noted on the schedule.

    Returns:
        Steps with rising frequency, source levels (attenuator included) and predicted outputs.

    Raises:
        ScheduleError: Something asked for is out of range, or would overdrive the board.
    """
    asked = _asked(design, override or Override())
    chain = design.chain()
    nominal = nominal_figures(chain)
    start_hz, stop_hz, notes = _span(asked, chain, nominal, limits=limits)
    frequencies_hz = log_spaced(start_hz, stop_hz, asked.per_decade or PER_DECADE)
    levels_vrms = [_level_vrms(design, asked, nominal, at_hz=f) for f in frequencies_hz]
    if asked.level_vrms is None and design.drive_level_vrms is None:
        notes = (*notes, f"The design names no level: {_small_output()} at the output is used.")
    schedule = Schedule(
        steps=_steps(chain, frequencies_hz, levels_vrms, attenuation=limits.attenuation),
        attenuation=limits.attenuation,
        meter_before_attenuator=limits.meter_before_attenuator,
        notes=notes,
    )
    check_bench(schedule, limits)
    try:
        check_harm(schedule, limits, board=board_limits(design, frequencies_hz))
    except ScheduleError as refused:
        if not beyond_limits:
            raise
        allowed = f"Allowed beyond the limits: {refused.what}."
        return replace(schedule, notes=(*schedule.notes, allowed))
    return schedule


def board_limits(design: Design, frequencies_hz: Sequence[float]) -> tuple[BoardLimit, ...]:
    """Return the highest level at the board's input that a design bears, for each frequency.

    Output swing and slew rate limit, and the supply rails at the input and at every stage.
    """
    import numpy as np

    chain = design.chain()
    at_hz = np.array(frequencies_hz)
    limit = drive_limit(chain, at_hz)
    drive = zip(limit.level_vrms.tolist(), limit.limited_by, strict=True)
    found = [BoardLimit(level_vrms=level_vrms, why=why) for level_vrms, why in drive]
    if design.rails_v is None:
        return tuple(found)
    highest_gain = np.ones(at_hz.shape)
    for gain in chain.at_each_output(at_hz):
        highest_gain = np.maximum(highest_gain, np.abs(gain))
    railed = SWING_USED * _headroom_v(design.rails_v) / np.sqrt(2) / highest_gain
    return tuple(
        limit if limit.level_vrms <= level_vrms else BoardLimit(level_vrms=level_vrms, why="rails")
        for limit, level_vrms in zip(found, railed.tolist(), strict=True)
    )


def _asked(design: Design, override: Override) -> Override:
    """Lay what a person asks for over what the design says."""
    sweep = design.sweep
    return Override(
        start_hz=sweep.start_hz if override.start_hz is None else override.start_hz,
        stop_hz=sweep.stop_hz if override.stop_hz is None else override.stop_hz,
        per_decade=sweep.per_decade if override.per_decade is None else override.per_decade,
        level_vrms=override.level_vrms,
    )


def _span(
    asked: Override, chain: Chain, nominal: Nominal, *, limits: BenchLimits
) -> tuple[float, float, tuple[str, ...]]:
    """Return start, stop and notes; an end that was asked for stays where it is."""
    low_hz = max((band.low_hz for band in limits.bands), default=0.0)
    high_hz = min((band.high_hz for band in limits.bands), default=math.inf)
    if low_hz >= high_hz:
        raise ScheduleError(
            "the instruments of this bench have no frequency in common",
            where="bench file",
            expected="source and meters whose frequency ranges overlap",
            hint="check the drivers that the bench file names",
        )
    notes = []
    start_hz, stop_hz = asked.start_hz, asked.stop_hz
    if start_hz is None:
        wanted_hz = rounded_hz(_natural_start_hz(nominal), 2)
        start_hz = max(wanted_hz, low_hz)
        if start_hz > wanted_hz:
            notes.append(_moved("starts", start_hz, wanted_hz, why="no instrument reaches lower"))
    if stop_hz is None:
        wanted_hz = rounded_hz(_natural_stop_hz(chain, nominal), 2)
        stop_hz = min(wanted_hz, high_hz)
        if stop_hz < wanted_hz:
            notes.append(
                _moved("stops", stop_hz, wanted_hz, why="not every instrument goes higher")
            )
    return start_hz, stop_hz, tuple(notes)


def _natural_start_hz(nominal: Nominal) -> float:
    start_hz = max(LOWEST_START_HZ, START_OVER_CORNER * (nominal.corner_hz or 0.0))
    if nominal.lower_corner_hz is not None:
        start_hz = min(start_hz, nominal.lower_corner_hz / LOWER_CORNER_OVER_START)
    return start_hz


def _natural_stop_hz(chain: Chain, nominal: Nominal) -> float:
    """Return 30 times the corner, or less where several poles leave too little to read there."""
    import numpy as np

    if nominal.corner_hz is None:
        return STOP_WITHOUT_CORNER_HZ
    stop_hz = STOP_OVER_CORNER * nominal.corner_hz
    count = 200
    grid_hz = [nominal.corner_hz * STOP_OVER_CORNER ** (n / count) for n in range(count)]
    gains = np.abs(chain.response(np.array(grid_hz))) / nominal.gain
    return next((f for f, gain in zip(grid_hz, gains, strict=True) if gain < LEAST_GAIN), stop_hz)


def _moved(verb: str, to_hz: float, wanted_hz: float, *, why: str) -> str:
    return f"The sweep {verb} at {si(to_hz, 'Hz')} instead of {si(wanted_hz, 'Hz')}: {why}."


def _level_vrms(design: Design, asked: Override, nominal: Nominal, *, at_hz: float) -> float:
    """Return the level at the board's input."""
    if asked.level_vrms is not None:
        return asked.level_vrms
    from_design = design.drive_level_at(at_hz)
    if from_design is not None:
        return from_design
    return SMALL_OUTPUT_VPP / (2 * math.sqrt(2)) / nominal.gain


def _steps(
    chain: Chain,
    frequencies_hz: Sequence[float],
    levels_vrms: Sequence[float],
    *,
    attenuation: float,
) -> tuple[Step, ...]:
    import numpy as np

    gains = np.abs(chain.response(np.array(frequencies_hz))).tolist()
    table = zip(frequencies_hz, levels_vrms, gains, strict=True)
    return tuple(
        Step(
            position=place,
            frequency_hz=frequency_hz,
            level_vrms=level_vrms * attenuation,
            output_vrms=level_vrms * gain,
        )
        for place, (frequency_hz, level_vrms, gain) in enumerate(table)
    )


def _headroom_v(rails_v: tuple[float, float]) -> float:
    """Return how far a signal swings either way: round 0 V, or round the middle of one supply."""
    low_v, high_v = rails_v
    return min(-low_v, high_v) if low_v < 0 < high_v else (high_v - low_v) / 2


def _small_output() -> str:
    return si(SMALL_OUTPUT_VPP, "Vpp")
