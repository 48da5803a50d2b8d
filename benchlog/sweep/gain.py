"""How the readings at one frequency become a point."""

from benchlog.records import Point, PointFlag, Reading, Status
from benchlog.sweep.schedule import Schedule, Step

_FLAGS = {
    Status.OK: PointFlag.NONE,
    Status.OVERLOAD: PointFlag.OVERLOAD,
    Status.NOT_A_NUMBER: PointFlag.NOT_A_NUMBER,
}


def point_from(
    step: Step,
    schedule: Schedule,
    *,
    input_reading: Reading | None,
    output_reading: Reading,
    attempts: int,
) -> Point:
    """Make the point of one step.

    Args:
        step: What was programmed.
        schedule: Knows the attenuation between the source and the board.
        input_reading: The level at the board's input; None without an input meter, and gain is
            then taken from the programmed level.
        output_reading: The level at the board's output.
        attempts: How often the point was asked for.

    Returns:
        The point; flagged and without a gain where a reading was a state or there was no signal.
    """
    readings = [reading for reading in (input_reading, output_reading) if reading is not None]
    flags = PointFlag.NONE
    for reading in readings:
        flags |= _FLAGS[reading.status]
    input_vrms = None
    if input_reading is not None and input_reading.value_vrms is not None:
        input_vrms = input_reading.value_vrms / schedule.attenuation_after_meter
    over_vrms = input_vrms if input_reading is not None else schedule.at_board(step.level_vrms)
    gain = _ratio(output_reading.value_vrms, over_vrms)
    if gain is None and flags is PointFlag.NONE:
        flags = PointFlag.NOT_A_NUMBER
    return Point(
        position=step.position,
        frequency_hz=step.frequency_hz,
        level_vrms=step.level_vrms,
        input_vrms=input_vrms,
        output_vrms=output_reading.value_vrms,
        gain=gain,
        flags=flags,
        attempts=attempts,
        raw=None if flags is PointFlag.NONE else " | ".join(reading.raw for reading in readings),
    )


def _ratio(over: float | None, under: float | None) -> float | None:
    """Return the gain; a reading of nothing at either end gives none."""
    if over is None or under is None or over <= 0 or under <= 0:
        return None
    return over / under
