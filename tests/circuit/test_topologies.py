"""Signal gain and noise gain of each topology, by hand."""

import math

import numpy as np
import pytest

from benchlog.circuit.amplifier import Amplifier, complex_frequency
from benchlog.circuit.parts import without_capacitors
from benchlog.circuit.stage import Stage, stage_response
from benchlog.circuit.topologies import (
    Difference,
    Divider,
    Follower,
    Inverting,
    NonInverting,
    OpenLoop,
    Summing,
)

S = complex_frequency(np.array([1.0]))
MATCHED = Difference(input_ohm=1e3, feedback_ohm=10e3, plus_input_ohm=1e3, plus_ground_ohm=10e3)


@pytest.mark.parametrize(
    ("stage", "signal", "noise"),
    [
        (Follower(), 1.0, 1.0),
        (NonInverting(feedback_ohm=47e3, ground_ohm=1e3), 48.0, 48.0),
        (Inverting(input_ohm=10e3, feedback_ohm=47e3), -4.7, 5.7),
        (Summing(inputs_ohm=(22e3, 33e3), feedback_ohm=66e3), -3.0, 6.0),
        (Summing(inputs_ohm=(22e3, 33e3), feedback_ohm=66e3, driven=2), -2.0, 6.0),
        (
            Summing(inputs_ohm=(22e3, 33e3), feedback_ohm=66e3, driven=2, undriven="open"),
            -2.0,
            3.0,
        ),
        (
            Summing(inputs_ohm=(20e3, 20e3), feedback_ohm=60e3, driven=1, undriven_source_ohm=10e3),
            -3.0,
            6.0,
        ),
        (MATCHED, 10.0, 11.0),
        (OpenLoop(), 1.0, 1.0),
        (Divider(series_ohm=3e3, shunt_ohm=1e3), 0.25, 1.0),
    ],
    ids=repr,
)
def test_gains_by_hand(stage: Stage, signal: float, noise: float) -> None:
    """Ideal gains from the stage's own input."""
    assert stage.signal_gain(S, 0.0) == pytest.approx(signal, rel=1e-12)
    assert stage.noise_gain(S, 0.0) == pytest.approx(noise, rel=1e-12)


@pytest.mark.parametrize(
    ("driven", "signal", "noise"),
    [
        # On its own, the minus leg is -Rf/Ri and the plus leg its divider times the noise gain.
        ("minus", -10.0, 11.0),
        ("plus", 10.0, 11.0),
        ("both", 10.0, 11.0),
    ],
)
def test_each_leg_of_a_difference_stage(driven: str, signal: float, noise: float) -> None:
    """Matched dividers give the same magnitude on either leg and between both."""
    stage = Difference(
        input_ohm=1e3,
        feedback_ohm=10e3,
        plus_input_ohm=1e3,
        plus_ground_ohm=10e3,
        driven=driven,  # type: ignore[arg-type]
    )
    assert stage.signal_gain(S, 0.0) == pytest.approx(signal, rel=1e-12)
    assert stage.noise_gain(S, 0.0) == pytest.approx(noise, rel=1e-12)


@pytest.mark.parametrize(
    ("stage", "signal", "noise"),
    [
        # An inverting leg grows by the source; signal and noise gain fall alike.
        (Inverting(input_ohm=950.0, feedback_ohm=10e3), -10.0, 11.0),
        # A plus input only divides, and without a bias resistor it does not even that.
        (NonInverting(feedback_ohm=9e3, ground_ohm=1e3), 10.0, 10.0),
        (NonInverting(feedback_ohm=9e3, ground_ohm=1e3, bias_ohm=950.0), 9.5, 10.0),
        (Follower(bias_ohm=950.0), 0.95, 1.0),
        # Only the driven leg of a summing stage carries the source.
        (Summing(inputs_ohm=(950.0, 1e3), feedback_ohm=10e3), -10.0, 21.0),
    ],
    ids=repr,
)
def test_source_resistance(stage: Stage, signal: float, noise: float) -> None:
    """50 ohm before a stage, where gain counts from the source's open-circuit level."""
    assert stage.signal_gain(S, 50.0) == pytest.approx(signal, rel=1e-12)
    assert stage.noise_gain(S, 50.0) == pytest.approx(noise, rel=1e-12)


def test_source_moves_a_difference_stage_through_its_minus_leg_only() -> None:
    """On the plus leg it costs gain; on the minus leg it changes the noise gain too."""
    legs = {
        driven: Difference(
            input_ohm=1e3,
            feedback_ohm=10e3,
            plus_input_ohm=1e3,
            plus_ground_ohm=10e3,
            driven=driven,
        )
        for driven in ("plus", "minus")
    }
    assert legs["plus"].noise_gain(S, 100.0) == pytest.approx(11.0)
    assert legs["plus"].signal_gain(S, 100.0) == pytest.approx(11.0 * 10 / 11.1)
    assert legs["minus"].noise_gain(S, 100.0) == pytest.approx(1 + 10 / 1.1)
    assert legs["minus"].signal_gain(S, 100.0) == pytest.approx(-10 / 1.1)


def test_feedback_capacitor_sets_a_pole_in_signal_gain() -> None:
    """1/(2 pi Rf Cf) with an ideal amplifier: -3.01 dB there."""
    stage = Inverting(input_ohm=10e3, feedback_ohm=47e3, feedback_capacitor_f=22e-12)
    pole_hz = 1 / (2 * math.pi * 47e3 * 22e-12)
    at_pole = stage.signal_gain(complex_frequency(np.array([pole_hz])), 0.0)
    assert np.abs(at_pole) == pytest.approx(4.7 / math.sqrt(2), rel=1e-12)


def test_ground_capacitor_makes_a_shelf_down_to_one() -> None:
    """Far below its corner a non-inverting stage has a gain of 1, not of 0."""
    stage = NonInverting(feedback_ohm=9e3, ground_ohm=1e3, ground_capacitor_f=1e-6)
    low, high = (
        np.abs(stage.signal_gain(complex_frequency(np.array([hz])), 0.0))[0] for hz in (1e-3, 1e6)
    )
    assert low == pytest.approx(1.0, abs=1e-6)
    assert high == pytest.approx(10.0, abs=1e-6)


def test_coupling_capacitor_blocks_direct_current() -> None:
    """Far below its corner a coupled stage has no gain, and an inverting one no noise gain."""
    far_below = complex_frequency(np.array([1e-3]))
    inverting = Inverting(input_ohm=10e3, feedback_ohm=47e3, coupling_f=1e-6)
    follower = Follower(bias_ohm=47e3, coupling_f=1e-6)
    assert np.all(np.abs(inverting.signal_gain(far_below, 0.0)) < 1e-3)
    assert np.all(np.abs(follower.signal_gain(far_below, 0.0)) < 1e-3)
    assert np.abs(inverting.noise_gain(far_below, 0.0)) == pytest.approx(1.0, abs=1e-6)


def test_input_capacitance_raises_noise_gain_alone_in_an_inverting_stage() -> None:
    """Signal gain does not see a capacitor from a virtual ground to ground."""
    stage = Inverting(input_ohm=10e3, feedback_ohm=10e3, input_capacitance_f=100e-12)
    high = complex_frequency(np.array([1e6]))
    assert stage.signal_gain(high, 0.0) == pytest.approx(-1.0)
    leak = 2j * math.pi * 1e6 * 10e3 * 100e-12
    assert stage.noise_gain(high, 0.0) == pytest.approx(2.0 + leak)


def test_mid_band_has_no_capacitors() -> None:
    """Series capacitors are short and all others absent."""
    stage = NonInverting(
        feedback_ohm=9e3,
        ground_ohm=1e3,
        feedback_capacitor_f=1e-9,
        ground_capacitor_f=1e-6,
        bias_ohm=47e3,
        coupling_f=1e-6,
    )
    flat = NonInverting(feedback_ohm=9e3, ground_ohm=1e3, bias_ohm=47e3)
    assert without_capacitors(stage) == flat
    assert without_capacitors(OpenLoop()) == OpenLoop()


def test_closed_loop_keeps_the_shape_of_its_frequencies() -> None:
    """Also where neither signal nor noise gain depends on frequency."""
    s = complex_frequency(np.logspace(1, 6, 7))
    response = stage_response(Follower(), Amplifier(gbw_hz=1e6), s=s)
    assert response.shape == (7,)
    assert stage_response(Divider(series_ohm=1e3, shunt_ohm=1e3), None, s=s).shape == (7,)


def test_phase_of_an_amplifier_alone() -> None:
    """Two poles: the open loop passes unity at its GBW, and turns by 45 degrees more at f2."""
    amplifier = Amplifier(gbw_hz=1e6, open_loop_gain=1e5, second_pole_hz=1e6)
    at = amplifier.response(np.array([1e6]))[0]
    assert abs(at) == pytest.approx(1 / math.sqrt(2), rel=1e-6)
    assert math.degrees(np.angle(at)) == pytest.approx(-135.0, abs=1e-3)
