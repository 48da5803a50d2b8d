"""Figures of a design's own response: which corners there are, and where."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from benchlog.circuit.amplifier import Amplifier
from benchlog.circuit.chain import Chain
from benchlog.circuit.nominal import nominal_figures
from benchlog.circuit.topologies import Divider, Follower, Inverting, NonInverting

AMPLIFIER = Amplifier(gbw_hz=3e6)


def test_low_pass_has_no_lower_corner() -> None:
    """A stage that passes direct current."""
    stage = NonInverting(feedback_ohm=47e3, ground_ohm=1e3)
    found = nominal_figures(Chain(((stage, AMPLIFIER),)))
    assert found.gain == pytest.approx(48.0)
    assert found.gain_db == pytest.approx(33.6248, abs=1e-4)
    assert found.corner_hz == pytest.approx(62_500.0, rel=1e-12)
    assert found.lower_corner_hz is None
    assert found.peaking_db == 0.0
    assert found.peaking_hz is None
    assert found.noise_gain == pytest.approx(48.0)
    assert found.gbw_hz == 3e6


def test_feedback_capacitor_takes_the_corner_over() -> None:
    """Two poles in an inverting stage: below each of them alone."""
    plain = Inverting(input_ohm=10e3, feedback_ohm=47e3)
    capped = Inverting(input_ohm=10e3, feedback_ohm=47e3, feedback_capacitor_f=100e-12)
    pole_hz = 1 / (2 * math.pi * 47e3 * 100e-12)
    corner_hz = nominal_figures(Chain(((capped, AMPLIFIER),))).corner_hz or 0.0
    assert corner_hz < pole_hz < (nominal_figures(Chain(((plain, AMPLIFIER),))).corner_hz or 0.0)
    by_sum_hz = 1 / (1 / pole_hz + 5.7 / 3e6)
    assert corner_hz == pytest.approx(by_sum_hz, rel=0.02)


def test_shelf_has_a_lower_corner_by_formula() -> None:
    """Below the shelf the gain is 1: the corner is fp sqrt(1 - 2/G^2), none for G <= sqrt 2."""
    fast = Amplifier(gbw_hz=1e12)
    pole_hz = 1 / (2 * math.pi * 1e3 * 1e-6)
    for gain in (1.5, 2.0, 10.0):
        stage = NonInverting(feedback_ohm=(gain - 1) * 1e3, ground_ohm=1e3, ground_capacitor_f=1e-6)
        found = nominal_figures(Chain(((stage, fast),))).lower_corner_hz
        assert found == pytest.approx(pole_hz * math.sqrt(1 - 2 / gain**2), rel=1e-6)
    shallow = NonInverting(feedback_ohm=400.0, ground_ohm=1e3, ground_capacitor_f=1e-6)
    assert nominal_figures(Chain(((shallow, fast),))).lower_corner_hz is None


@pytest.mark.parametrize(("ratio", "has_corners"), [(2.3, False), (2.5, True), (30, True)])
def test_corners_vanish_when_the_edges_meet(ratio: float, has_corners: bool) -> None:  # noqa: FBT001
    """With both poles closer than 2.41 the response never reaches plateau/sqrt(2)."""
    low_hz, high_hz = 1e3, ratio * 1e3
    stage = Follower(bias_ohm=10e3, coupling_f=1 / (2 * math.pi * 10e3 * low_hz))
    found = nominal_figures(Chain(((stage, Amplifier(gbw_hz=high_hz)),)))
    assert found.gain == pytest.approx(1.0)
    assert (found.corner_hz is not None) is has_corners
    assert (found.lower_corner_hz is not None) is has_corners


def test_corners_are_crossings_of_the_whole_response() -> None:
    """With poles a decade apart both corners are pulled inwards, by the same factor."""
    stage = Follower(bias_ohm=10e3, coupling_f=1 / (2 * math.pi * 10e3 * 1e3))
    chain = Chain(((stage, Amplifier(gbw_hz=10e3)),))
    found = nominal_figures(chain)
    for corner_hz in (found.corner_hz, found.lower_corner_hz):
        at_corner = abs(chain.response(np.array([corner_hz or 0.0]))[0])
        assert at_corner == pytest.approx(math.sqrt(0.5), rel=1e-9)
    assert (found.corner_hz or 0) * (found.lower_corner_hz or 0) == pytest.approx(1e7, rel=1e-9)
    assert 1e3 < (found.lower_corner_hz or 0) < (found.corner_hz or 0) < 10e3


def test_with_peaking_the_corner_is_the_last_crossing_below_the_plateau() -> None:
    """The peak's own skirts do not count; -3 dB is relative to the plateau."""
    peaky = Amplifier(gbw_hz=1e6, second_pole_hz=2e5)
    found = nominal_figures(Chain(((Follower(), peaky),)))
    f0_hz, q = math.sqrt(1e6 * 2e5), math.sqrt(1e6 / 2e5)
    assert found.peaking_db == pytest.approx(20 * math.log10(q / math.sqrt(1 - 0.25 / q**2)))
    assert found.peaking_hz == pytest.approx(f0_hz * math.sqrt(1 - 0.5 / q**2), rel=1e-3)
    zeta_term = 1 - 0.5 / q**2
    expected_hz = f0_hz * math.sqrt(zeta_term + math.sqrt(zeta_term**2 + 1))
    assert found.corner_hz == pytest.approx(expected_hz, rel=1e-9)


def test_a_dip_and_a_hump_move_neither_corner_inwards() -> None:
    """A shelf falls below plateau/sqrt(2), a peak above it brings the gain back, then it falls."""
    shelf = NonInverting(feedback_ohm=10e3, ground_ohm=10e3, feedback_capacitor_f=1.6e-9)
    fast = Amplifier(gbw_hz=1e9, name="fast")
    peaky = Amplifier(gbw_hz=4e6, second_pole_hz=250e3, name="peaky")
    chain = Chain(((shelf, fast), (Follower(), peaky)))
    dip, hump = np.abs(chain.response(np.array([100e3, 1e6])))
    assert dip < 2 * math.sqrt(0.5) < hump
    found = nominal_figures(chain)
    assert found.corner_hz == pytest.approx(1.25e6, rel=0.1)
    assert found.lower_corner_hz is None

    coupled = Follower(bias_ohm=10e3, coupling_f=1 / (2 * math.pi * 10e3 * 100.0))
    found = nominal_figures(Chain(((coupled, fast), *chain.stages)))
    assert found.lower_corner_hz == pytest.approx(100.0, rel=0.01)
    assert found.corner_hz == pytest.approx(1.25e6, rel=0.1)


def test_a_plain_divider_has_no_corner_at_all() -> None:
    """Resistors alone are flat everywhere."""
    found = nominal_figures(Chain(((Divider(series_ohm=1e3, shunt_ohm=1e3), None),)))
    assert found.gain_db == pytest.approx(-6.0206, abs=1e-4)
    assert (found.corner_hz, found.lower_corner_hz, found.peaking_hz) == (None, None, None)


decades = st.floats(min_value=1.5, max_value=6.5).map(lambda decade: 10**decade)


@settings(max_examples=40, deadline=None)
@given(feedback_ohm=decades, leg_ohm=decades, gbw_hz=decades)
def test_bandwidth_times_noise_gain_is_gbw(
    feedback_ohm: float, leg_ohm: float, gbw_hz: float
) -> None:
    """The one line of physics, for both topologies, whatever the parts."""
    amplifier = Amplifier(gbw_hz=gbw_hz)
    for stage in (
        NonInverting(feedback_ohm=feedback_ohm, ground_ohm=leg_ohm),
        Inverting(input_ohm=leg_ohm, feedback_ohm=feedback_ohm),
    ):
        found = nominal_figures(Chain(((stage, amplifier),)))
        assert (found.corner_hz or 0) * (found.noise_gain or 0) == pytest.approx(gbw_hz, rel=1e-9)
