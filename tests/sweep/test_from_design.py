"""The schedule that a design is swept with.

The invented design has gain 48 and GBW 3 MHz, so its corner is 3 MHz / 48 = 62.5 kHz.
"""

import math
from dataclasses import replace

import pytest

from benchlog.circuit.amplifier import Amplifier
from benchlog.circuit.topologies import NonInverting
from benchlog.design.model import LevelAbove, PlacedStage, SweepSettings
from benchlog.errors import ScheduleError
from benchlog.sweep.from_design import Override, board_limits, schedule_for
from benchlog.sweep.limits import Band, BenchLimits
from tests.fakes.designs import one_stage

WIDE = BenchLimits(
    bands=(Band(name="source", low_hz=0.1, high_hz=2e7),),
    source_low_vrms=1e-4,
    source_high_vrms=5.0,
)
LEVEL_VRMS = 0.02 / 2 / math.sqrt(2)


def test_from_a_thousandth_of_the_corner_to_thirty_times() -> None:
    """62.5 Hz to 1.875 MHz, in two digits, ten points a decade: 46 points."""
    schedule = schedule_for(one_stage(), WIDE)

    frequencies = [step.frequency_hz for step in schedule.steps]
    assert frequencies[0] == 62.0
    assert frequencies[-1] == 1.9e6
    assert len(frequencies) == math.ceil(10 * math.log10(1.9e6 / 62)) + 1
    assert frequencies == sorted(frequencies)
    assert [step.position for step in schedule.steps] == [*range(len(frequencies))]
    assert schedule.notes == ()


def test_levels_and_predicted_outputs() -> None:
    """The design's level at the board, times the attenuation at the source; outputs by the gain."""
    schedule = schedule_for(one_stage(), replace(WIDE, attenuation=10.0))

    assert {step.level_vrms for step in schedule.steps} == {LEVEL_VRMS * 10}
    assert schedule.steps[0].output_vrms == pytest.approx(48 * LEVEL_VRMS, rel=1e-5)
    at_end = 48 * LEVEL_VRMS / math.hypot(1, 1.9e6 / 62.5e3)
    assert schedule.steps[-1].output_vrms == pytest.approx(at_end, rel=1e-9)
    assert schedule.statement() == (
        "The board's input will see at most 7.071 mVrms (20 mVpp)"
        " (the source is set to 70.71 mVrms (200 mVpp)),"
        " its output at most 339.4 mVrms (960 mVpp), at 62 Hz."
    )


def test_a_slow_board_starts_at_ten_hertz() -> None:
    """Below 10 Hz readings take too long; a thousandth of a 3 kHz corner is not measured."""
    slow = (Amplifier(gbw_hz=144e3),)

    schedule = schedule_for(one_stage(amplifiers=slow), WIDE)

    assert schedule.steps[0].frequency_hz == 10.0
    assert schedule.steps[-1].frequency_hz == 90e3


def test_a_lower_corner_gets_its_decade() -> None:
    """A coupled board is swept from a tenth of its lower corner."""
    stage = NonInverting(feedback_ohm=47e3, ground_ohm=1e3, bias_ohm=47e3, coupling_f=1e-6)
    coupled = (PlacedStage(topology="non-inverting", stage=stage, amplifier="main"),)

    schedule = schedule_for(one_stage(stages=coupled), WIDE)

    lower_corner_hz = 1 / (2 * math.pi * 47e3 * 1e-6)
    assert schedule.steps[0].frequency_hz == pytest.approx(lower_corner_hz / 10, rel=0.03)


def test_ends_nobody_asked_for_stay_inside_the_instruments() -> None:
    """A meter that ends earlier shortens the default span, and the schedule says so."""
    narrow = replace(
        WIDE, bands=(*WIDE.bands, Band(name="output meter", low_hz=100.0, high_hz=3e5))
    )

    schedule = schedule_for(one_stage(), narrow)

    assert (schedule.steps[0].frequency_hz, schedule.steps[-1].frequency_hz) == (100.0, 3e5)
    assert schedule.notes == (
        "The sweep starts at 100 Hz instead of 62 Hz: no instrument reaches lower.",
        "The sweep stops at 300 kHz instead of 1.9 MHz: not every instrument goes higher.",
    )


def test_ends_that_were_asked_for_are_refused_outside() -> None:
    """What a person or the design asks for is not changed silently."""
    narrow = replace(
        WIDE, bands=(*WIDE.bands, Band(name="output meter", low_hz=100.0, high_hz=3e5))
    )

    with pytest.raises(ScheduleError, match="the output meter does not cover 1 MHz"):
        schedule_for(one_stage(), narrow, override=Override(stop_hz=1e6, per_decade=1))


def test_instruments_with_nothing_in_common() -> None:
    """A source and a meter that never meet cannot sweep."""
    bands = (*WIDE.bands, Band(name="output meter", low_hz=3e7, high_hz=1e9))

    with pytest.raises(ScheduleError, match="no frequency in common"):
        schedule_for(one_stage(), replace(WIDE, bands=bands))


def test_the_design_and_then_the_person_decide() -> None:
    """[sweep] of the design stands against the defaults, the person against both."""
    design = one_stage(
        sweep=SweepSettings(
            start_hz=100.0,
            stop_hz=1e6,
            per_decade=5,
            levels=(LevelAbove(above_hz=1e4, level_vrms=0.001),),
        )
    )

    schedule = schedule_for(design, WIDE)
    assert len(schedule.steps) == 21
    assert [step.level_vrms for step in schedule.steps] == [LEVEL_VRMS] * 10 + [0.001] * 11

    override = Override(start_hz=1e3, per_decade=1, level_vrms=0.002)
    schedule = schedule_for(design, WIDE, override=override)
    assert [step.frequency_hz for step in schedule.steps] == [1e3, 1e4, 1e5, 1e6]
    assert {step.level_vrms for step in schedule.steps} == {0.002}


def test_a_design_without_a_level() -> None:
    """100 mVpp at the output is a small signal for any board."""
    schedule = schedule_for(one_stage(drive_level_vrms=None), WIDE)

    assert schedule.steps[0].output_vrms == pytest.approx(0.1 / 2 / math.sqrt(2), rel=1e-4)
    assert schedule.notes == ("The design names no level: 100 mVpp at the output is used.",)


@pytest.mark.parametrize(
    ("amplifier", "rails_v", "level_vrms", "why"),
    [
        # 80 % of 10.5 V peak over gain 48: 0.175 V peak, 0.1237 V RMS
        (
            Amplifier(gbw_hz=3e6, output_swing_v=10.5),
            None,
            0.8 * 10.5 / 48 / math.sqrt(2),
            "output swing of stage 1",
        ),
        # 80 % of the nearer rail
        (Amplifier(gbw_hz=3e6), (-12.0, 15.0), 0.8 * 12 / 48 / math.sqrt(2), "rails"),
        # one supply: half of it either way
        (Amplifier(gbw_hz=3e6), (0.0, 12.0), 0.8 * 6 / 48 / math.sqrt(2), "rails"),
        (
            Amplifier(gbw_hz=3e6, output_swing_v=5.0),
            (-12.0, 12.0),
            0.8 * 5 / 48 / math.sqrt(2),
            "output swing of",
        ),
        # a third of 0.3 V/us at 10 kHz over the gain there
        (
            Amplifier(gbw_hz=3e6, slew_rate_v_per_s=0.3e6),
            None,
            0.1e6 / (2 * math.pi * 1e4) / (48 / math.hypot(1, 1e4 / 62.5e3)) / math.sqrt(2),
            "slew rate of stage 1",
        ),
    ],
)
def test_what_a_board_bears(
    amplifier: Amplifier,
    rails_v: tuple[float, float] | None,
    level_vrms: float,
    why: str,
) -> None:
    """Swing, rails and slew rate each limit; the lowest counts and is named.

    Source:
        A sine of peak Vp changes by at most 2 pi f Vp; the margins are common practice.
    """
    limit = board_limits(one_stage(amplifiers=(amplifier,), rails_v=rails_v), [1e4])[0]

    corner_loss = math.hypot(1, 1e4 / 62.5e3) if "slew" not in why else 1.0
    assert limit.level_vrms == pytest.approx(level_vrms * corner_loss, rel=1e-6)
    assert limit.why.startswith(why)


def test_overdrive_needs_to_be_allowed() -> None:
    """A level beyond the design's limits is refused, or allowed and then noted."""
    override = Override(level_vrms=0.2)

    with pytest.raises(ScheduleError, match=r"200 mVrms at 62 Hz is more than this design bears"):
        schedule_for(one_stage(), WIDE, override=override)
    schedule = schedule_for(one_stage(), WIDE, override=override, beyond_limits=True)

    assert schedule.highest_input_vrms == 0.2
    assert schedule.notes == (
        "Allowed beyond the limits: 200 mVrms at 62 Hz is more than this design bears at its input"
        " (output swing of stage 1).",
    )


def test_the_instruments_range_cannot_be_allowed_away() -> None:
    """The flag lets a person overdrive a board, not ask a source for what it cannot do."""
    with pytest.raises(ScheduleError, match="the source cannot be set to 20 Vrms"):
        schedule_for(one_stage(), WIDE, override=Override(level_vrms=20.0), beyond_limits=True)
