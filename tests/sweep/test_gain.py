"""Readings become a point."""

import pytest

from benchlog.records import PointFlag, Reading, Status
from benchlog.sweep.gain import point_from
from benchlog.sweep.schedule import Schedule, Step

STEP = Step(position=4, frequency_hz=1e3, level_vrms=0.5)
PLAIN = Schedule(steps=(STEP,))


def ok(value_vrms: float) -> Reading:
    """Return a reading that is a number."""
    return Reading(value_vrms=value_vrms, status=Status.OK, raw=f"{value_vrms:.6E}")


OVERLOAD = Reading(value_vrms=None, status=Status.OVERLOAD, raw="+9.90000000E+37")
NOT_A_NUMBER = Reading(value_vrms=None, status=Status.NOT_A_NUMBER, raw="+9.91000000E+37")


@pytest.mark.parametrize(
    ("schedule", "input_reading", "gain", "input_vrms"),
    [
        (PLAIN, ok(0.4), 2.0 / 0.4, 0.4),
        (PLAIN, None, 2.0 / 0.5, None),
        (Schedule(steps=(STEP,), attenuation=10.0), ok(0.04), 2.0 / 0.04, 0.04),
        (Schedule(steps=(STEP,), attenuation=10.0), None, 2.0 / 0.05, None),
        (
            Schedule(steps=(STEP,), attenuation=10.0, meter_before_attenuator=True),
            ok(0.4),
            2.0 / 0.04,
            0.04,
        ),
    ],
    ids=["two meters", "programmed", "attenuated", "programmed attenuated", "meter before"],
)
def test_gain(
    schedule: Schedule, input_reading: Reading | None, gain: float, input_vrms: float | None
) -> None:
    """Output over input where it is read, otherwise over what the board gets by programming."""
    point = point_from(
        STEP, schedule, input_reading=input_reading, output_reading=ok(2.0), attempts=3
    )

    assert point.gain == pytest.approx(gain, rel=1e-15)
    assert point.input_vrms == (None if input_vrms is None else pytest.approx(input_vrms))
    assert (point.output_vrms, point.flags, point.raw) == (2.0, PointFlag.NONE, None)
    assert (point.position, point.frequency_hz, point.level_vrms) == (4, 1e3, 0.5)
    assert (point.attempts, point.kind) == (3, "point")


@pytest.mark.parametrize(
    ("input_reading", "output_reading", "flags", "raw"),
    [
        (ok(0.4), OVERLOAD, PointFlag.OVERLOAD, "4.000000E-01 | +9.90000000E+37"),
        (OVERLOAD, ok(2.0), PointFlag.OVERLOAD, "+9.90000000E+37 | 2.000000E+00"),
        (None, NOT_A_NUMBER, PointFlag.NOT_A_NUMBER, "+9.91000000E+37"),
        (
            NOT_A_NUMBER,
            OVERLOAD,
            PointFlag.NOT_A_NUMBER | PointFlag.OVERLOAD,
            "+9.91000000E+37 | +9.90000000E+37",
        ),
        (ok(0.0), ok(2.0), PointFlag.NOT_A_NUMBER, "0.000000E+00 | 2.000000E+00"),
        (ok(0.4), ok(0.0), PointFlag.NOT_A_NUMBER, "4.000000E-01 | 0.000000E+00"),
    ],
)
def test_what_is_no_gain(
    input_reading: Reading | None, output_reading: Reading, flags: PointFlag, raw: str
) -> None:
    """A state, or nothing at one end, gives a flagged point without gain, its replies kept."""
    point = point_from(
        STEP, PLAIN, input_reading=input_reading, output_reading=output_reading, attempts=1
    )

    assert point.gain is None
    assert point.flags == flags
    assert point.raw == raw
