"""A schedule held against what the bench can do and the board may see."""

from dataclasses import replace

import pytest

from benchlog.errors import ScheduleError
from benchlog.sweep.limits import Band, BenchLimits, BoardLimit, check_bench, check_harm
from benchlog.sweep.schedule import spaced_schedule

BENCH = BenchLimits(
    bands=(
        Band(name="source", low_hz=1.0, high_hz=1e6),
        Band(name="output meter", low_hz=3.0, high_hz=3e5),
    ),
    source_low_vrms=0.001,
    source_high_vrms=5.0,
    max_level_vrms=1.0,
)


@pytest.mark.parametrize(
    ("frequency_hz", "level_vrms"),
    [(3.0, 0.001), (3e5, 1.0), (1e3, 1.0 * (1 + 1e-12))],
)
def test_the_edges_are_allowed(frequency_hz: float, level_vrms: float) -> None:
    """Both ends of every range belong to it, and a rounding error is no offence."""
    schedule = spaced_schedule([frequency_hz], level_vrms)

    check_bench(schedule, replace(BENCH, source_high_vrms=1.0))
    check_harm(schedule, BENCH, board=[BoardLimit(level_vrms=level_vrms, why="slew rate")])


@pytest.mark.parametrize(
    ("frequencies_hz", "level_vrms", "message"),
    [
        (
            [10.0, 2.9],
            0.1,
            "the output meter does not cover 2.9 Hz\n"
            "  where:    schedule, point 2\n"
            "  expected: 3 Hz to 300 kHz\n"
            "  do:       change start or stop, or use another instrument",
        ),
        ([0.5], 0.1, "the source does not cover 500 mHz"),
        ([3.1e5], 0.1, "the output meter does not cover 310 kHz"),
        (
            [10.0],
            0.0009,
            "the source cannot be set to 900 uVrms\n"
            "  where:    schedule, point 1\n"
            "  expected: 1 mVrms to 5 Vrms\n"
            "  do:       change the level, or fit another attenuator and enter it in the bench"
            " file",
        ),
        ([10.0], 5.1, "the source cannot be set to 5.1 Vrms"),
    ],
)
def test_what_instruments_cannot_do(
    frequencies_hz: list[float], level_vrms: float, message: str
) -> None:
    """Out of an instrument's range is refused, with the point, the range and what to do."""
    with pytest.raises(ScheduleError) as caught:
        check_bench(spaced_schedule(frequencies_hz, level_vrms), BENCH)

    assert str(caught.value).startswith(message)


def test_the_ceiling_of_the_bench() -> None:
    """A level above max_level is refused, and the ceiling counts at the source."""
    with pytest.raises(ScheduleError) as caught:
        check_harm(spaced_schedule([10.0], 0.11, attenuation=10.0), BENCH)

    assert str(caught.value) == (
        "the source would be set to 1.1 Vrms, over the bench's ceiling\n"
        "  where:    schedule, point 1\n"
        "  expected: at most 1 Vrms (max_level in the bench file)\n"
        "  do:       lower the level; only if you are sure, allow levels beyond the limits"
    )


def test_what_the_design_bears() -> None:
    """A level above the board's limit at that frequency is refused with what limits."""
    board = [
        BoardLimit(level_vrms=0.2, why="output swing"),
        BoardLimit(level_vrms=0.05, why="slew rate"),
    ]

    with pytest.raises(ScheduleError) as caught:
        check_harm(spaced_schedule([10.0, 1e5], 0.1), BENCH, board=board)

    assert str(caught.value) == (
        "100 mVrms at 100 kHz is more than this design bears at its input (slew rate)\n"
        "  where:    schedule, point 2\n"
        "  expected: at most 50 mVrms at the board's input\n"
        "  do:       lower the level in [drive]; only if you are sure, allow levels beyond the"
        " limits"
    )


def test_a_bench_without_a_ceiling() -> None:
    """No max_level means that only the source's own range counts."""
    free = BenchLimits(bands=(), source_low_vrms=0.0, source_high_vrms=5.0)

    check_harm(spaced_schedule([10.0], 4.9), free)
