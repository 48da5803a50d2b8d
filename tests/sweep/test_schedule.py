"""Frequencies and levels of a schedule."""

import itertools
import json
import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from benchlog.errors import ScheduleError
from benchlog.sweep.schedule import Schedule, Step, log_spaced, spaced_schedule

# The tenth parts of a decade to four digits are the numbers 10^(n/10).
TENTHS = (10.0, 12.59, 15.85, 19.95, 25.12, 31.62, 39.81, 50.12, 63.10, 79.43)


def test_whole_decades_hit_round_numbers() -> None:
    """Every decade has the same digits, and 100, 1000 ... are exact."""
    frequencies = log_spaced(10.0, 1e6, 10)

    expected = [float(f"{tenth}e{decade}") for decade in range(5) for tenth in TENTHS]
    assert frequencies == (*expected, 1e6)


def test_coarse_spacing_keeps_four_digits() -> None:
    """Few points a decade do not make them rougher."""
    assert log_spaced(10.0, 1e3, 2) == (10.0, 31.62, 100.0, 316.2, 1e3)


def test_twenty_decades_do_not_drift() -> None:
    """The hundredth frequency is as round as the first."""
    assert log_spaced(1e-5, 1e15, 5)[95] == 1e14


@pytest.mark.parametrize(
    ("start_hz", "stop_hz", "per_decade", "count"),
    [
        (100.0, 1e6, 10, 41),
        (10.0, 3e6, 10, 56),
        (38.5, 1.2345e6, 7, 33),
        (100.0, 200.0, 1, 2),
        (100.0, 100.0, 10, 1),
        (999.0, 1001.0, 1000, 2),
    ],
)
def test_counts(start_hz: float, stop_hz: float, per_decade: int, count: int) -> None:
    """At least so many per decade as asked, between exact ends."""
    frequencies = log_spaced(start_hz, stop_hz, per_decade)

    assert len(frequencies) == count
    assert (frequencies[0], frequencies[-1]) == (start_hz, stop_hz)


@given(
    st.floats(1e-2, 1e6),
    st.floats(0.0, 6.0),
    st.integers(1, 1000),
)
def test_laws_of_spacing(start_hz: float, decades: float, per_decade: int) -> None:
    """Ends exact, rising, never further apart than asked but for the rounding."""
    stop_hz = start_hz * 10**decades
    frequencies = log_spaced(start_hz, stop_hz, per_decade)

    assert frequencies[0] == start_hz
    assert frequencies[-1] == stop_hz
    gaps = [math.log10(b / a) for a, b in itertools.pairwise(frequencies)]
    assert all(gap > 0 for gap in gaps)
    assert all(gap <= 1.03 / per_decade + 1e-5 for gap in gaps)


@pytest.mark.parametrize(
    ("start_hz", "stop_hz", "per_decade", "message"),
    [
        (0.0, 1e3, 10, "start is 0 Hz"),
        (-1.0, 1e3, 10, "start is -1 Hz"),
        (math.nan, 1e3, 10, "start is nan Hz"),
        (10.0, math.inf, 10, "stop is inf Hz"),
        (1e3, 10.0, 10, "stop (10 Hz) lies below start (1 kHz)"),
        (10.0, 1e3, 0, "0 points per decade"),
        (10.0, 1e3, 1001, "1001 points per decade"),
    ],
)
def test_impossible_spans(start_hz: float, stop_hz: float, per_decade: int, message: str) -> None:
    """What cannot be spaced is refused with what was given."""
    with pytest.raises(ScheduleError) as caught:
        log_spaced(start_hz, stop_hz, per_decade)

    assert caught.value.what == message
    assert caught.value.where
    assert caught.value.expected
    assert caught.value.hint


def test_an_empty_schedule_is_refused() -> None:
    """A sweep of nothing is a mistake, not a success."""
    with pytest.raises(ScheduleError) as caught:
        Schedule(steps=())

    assert str(caught.value) == (
        "the schedule has no point\n"
        "  where:    schedule\n"
        "  expected: at least one frequency\n"
        "  do:       check start, stop and points per decade"
    )


@pytest.mark.parametrize("bad", [0.0, -1.0, math.nan, math.inf])
def test_a_point_that_is_no_number_is_refused(bad: float) -> None:
    """Frequencies, levels and attenuation must be finite and above zero."""
    with pytest.raises(ScheduleError, match=r"the frequency of point 2 is .* Hz"):
        spaced_schedule([10.0, bad], 0.1)
    with pytest.raises(ScheduleError, match=r"the level of point 1 is .* V RMS"):
        spaced_schedule([10.0], bad)
    with pytest.raises(ScheduleError, match="attenuation is"):
        Schedule(steps=spaced_schedule([10.0], 0.1).steps, attenuation=bad)


def test_positions_are_unique() -> None:
    """Two points at one position could not be told apart in the logbook."""
    step = Step(position=3, frequency_hz=10.0, level_vrms=0.1)

    with pytest.raises(ScheduleError, match="two points have the same position"):
        Schedule(steps=(step, step))


def test_levels_at_both_ends_of_an_attenuator() -> None:
    """20 dB between source and board: the source is set ten times higher."""
    schedule = spaced_schedule([10.0, 20.0], 0.01, attenuation=10.0)

    assert schedule.highest_level_vrms == pytest.approx(0.1)
    assert schedule.highest_input_vrms == pytest.approx(0.01)
    assert schedule.at_board(0.1) == pytest.approx(0.01)


@pytest.mark.parametrize(
    ("attenuation", "outputs", "statement"),
    [
        (
            1.0,
            (None, None),
            "The board's input will see at most 7.071 mVrms (20 mVpp);"
            " what its output will give is not known.",
        ),
        (
            1.0,
            (0.339, 0.2),
            "The board's input will see at most 7.071 mVrms (20 mVpp),"
            " its output at most 339 mVrms (958.8 mVpp), at 100 Hz.",
        ),
        (
            10.0,
            (0.339, 3.39),
            "The board's input will see at most 7.071 mVrms (20 mVpp)"
            " (the source is set to 70.71 mVrms (200 mVpp)),"
            " its output at most 3.39 Vrms (9.588 Vpp), at 200 Hz.",
        ),
    ],
)
def test_what_will_be_applied_is_said(
    attenuation: float, outputs: tuple[float | None, float | None], statement: str
) -> None:
    """The highest level at the board's input and output, in a sentence."""
    steps = tuple(
        Step(
            position=place,
            frequency_hz=100.0 * (place + 1),
            level_vrms=0.02 / 2 / math.sqrt(2) * attenuation,
            output_vrms=output,
        )
        for place, output in enumerate(outputs)
    )

    assert Schedule(steps=steps, attenuation=attenuation).statement() == statement


def test_settings_make_the_schedule_again() -> None:
    """What a sweep's record holds is enough to program the same points."""
    schedule = spaced_schedule(log_spaced(10.0, 1e5, 3), 0.01, attenuation=10.0)

    settings = json.loads(json.dumps(schedule.settings()))

    steps = zip(settings["frequency_hz"], settings["level_vrms"], strict=True)
    assert schedule == Schedule(
        steps=tuple(
            Step(position=place, frequency_hz=frequency_hz, level_vrms=level_vrms)
            for place, (frequency_hz, level_vrms) in enumerate(steps)
        ),
        attenuation=settings["attenuation"],
        meter_before_attenuator=settings["meter_before_attenuator"],
        notes=tuple(settings["notes"]),
    )
