"""How hard a board may be driven, and what says so."""

import math

import numpy as np
import pytest

from benchlog.circuit.amplifier import Amplifier
from benchlog.circuit.chain import Chain
from benchlog.circuit.drive import drive_limit, highest_level_vrms
from benchlog.circuit.topologies import Divider, Follower, NonInverting

STAGE = NonInverting(feedback_ohm=47e3, ground_ohm=1e3)
FREQUENCY_HZ = np.array([100.0, 1e6])


def test_swing_limits_below_and_slew_rate_above() -> None:
    """By hand: 0.8 x 10.5 V over 48, and a third of 13 V/us over 2 pi f and the gain there."""
    amplifier = Amplifier(gbw_hz=3e6, slew_rate_v_per_s=13e6, output_swing_v=10.5)
    limit = drive_limit(Chain(((STAGE, amplifier),)), FREQUENCY_HZ)
    assert limit.limited_by == ("output swing of stage 1", "slew rate of stage 1")
    assert limit.level_vrms[0] == pytest.approx(0.8 * 10.5 / math.sqrt(2) / 48, rel=1e-5)
    gain = 48 / math.hypot(1, 1e6 / 62.5e3)
    expected = 13e6 / 3 / (2 * math.pi * 1e6) / math.sqrt(2) / gain
    assert limit.level_vrms[1] == pytest.approx(expected, rel=1e-9)
    np.testing.assert_array_equal(
        highest_level_vrms(Chain(((STAGE, amplifier),)), FREQUENCY_HZ), limit.level_vrms
    )


def test_the_smaller_side_of_an_uneven_swing_counts() -> None:
    """A sine around zero clips first on the nearer side."""
    amplifier = Amplifier(gbw_hz=3e6, output_swing_v=10.5, output_swing_negative_v=5.0)
    limit = drive_limit(Chain(((STAGE, amplifier),)), FREQUENCY_HZ)
    assert limit.level_vrms[0] == pytest.approx(0.8 * 5.0 / math.sqrt(2) / 48, rel=1e-5)


def test_a_stage_inside_the_chain_may_limit() -> None:
    """What an attenuator behind it hides, the first stage still has to swing."""
    amplifier = Amplifier(gbw_hz=3e6, output_swing_v=10.0)
    pad = Divider(series_ohm=99e3, shunt_ohm=1e3)
    chain = Chain(((STAGE, amplifier), (pad, None), (Follower(), amplifier)))
    limit = drive_limit(chain, FREQUENCY_HZ)
    assert limit.limited_by[0] == "output swing of stage 1"
    assert limit.level_vrms[0] == pytest.approx(0.8 * 10.0 / math.sqrt(2) / 48, rel=1e-5)


def test_nothing_known_nothing_limits() -> None:
    """Without swing and slew rate the limit is infinite and has no name."""
    limit = drive_limit(Chain(((STAGE, Amplifier(gbw_hz=3e6)),)), FREQUENCY_HZ)
    assert np.all(np.isinf(limit.level_vrms))
    assert limit.limited_by == ("", "")
