"""Points of first-order responses, cascades and two-pole loops, by exact textbook formulas."""

import math

import numpy as np
import pytest

from benchlog.circuit.amplifier import Amplifier
from benchlog.circuit.chain import Chain
from benchlog.circuit.nominal import nominal_figures
from benchlog.circuit.topologies import Divider, Follower, NonInverting
from benchlog.notation import decibels

CORNER_HZ = 62_500.0


def preamp_chain(stages: int = 1, gain: float = 48.0) -> Chain:
    """Return equal one-pole stages, each with its corner at ``CORNER_HZ``."""
    amplifier = Amplifier(gbw_hz=CORNER_HZ * gain)
    stage = NonInverting(feedback_ohm=(gain - 1) * 1e3, ground_ohm=1e3)
    return Chain(((stage, amplifier),) * stages)


@pytest.mark.parametrize(
    ("ratio", "gain_db", "phase_deg"),
    [
        # 1/(1 + j f/fc), any textbook; printed to four and three places.
        (0.1, -0.0432, -5.711),
        (0.2, -0.1703, -11.310),
        (0.5, -0.9691, -26.565),
        (1, -3.0103, -45.0),
        (2, -6.9897, -63.435),
        (5, -14.1497, -78.690),
        (10, -20.0432, -84.289),
        # Where -3.000 dB is read as the corner, it is 0.24 % low.
        (0.997628, -3.0000, -44.932),
        (0.15262, -0.1, -8.677),
        (0.50885, -1.0, -26.970),
    ],
)
def test_first_order_low_pass(ratio: float, gain_db: float, phase_deg: float) -> None:
    """Gain below the plateau and phase, against frequency over corner."""
    response = preamp_chain().response(np.array([ratio * CORNER_HZ]))[0] / 48.0
    assert decibels(abs(response)) == pytest.approx(gain_db, abs=6e-5)
    assert math.degrees(np.angle(response)) == pytest.approx(phase_deg, abs=1e-3)


@pytest.mark.parametrize(
    ("count", "shrinkage"),
    [
        # sqrt(2^(1/n) - 1); textbooks print 0.64 and 0.51 for two and three (Sedra & Smith, from
        # memory; formula as on brainkart.com, "Frequency Response of Multistage Amplifiers").
        (1, 1.0),
        (2, 0.643594),
        (3, 0.509825),
        (4, 0.434979),
        (5, 0.385614),
        (6, 0.349946),
        (7, 0.322629),
        (8, 0.300845),
    ],
)
def test_equal_stages_shrink_the_bandwidth(count: int, shrinkage: float) -> None:
    """Some equal one-pole stages keep so much of one stage's bandwidth."""
    found = nominal_figures(preamp_chain(count, gain=4.0)).corner_hz
    assert found == pytest.approx(shrinkage * CORNER_HZ, rel=2e-6)


@pytest.mark.parametrize(
    ("count", "growth"), [(2, 1.55377), (3, 1.96146), (4, 2.29896), (5, 2.59327)]
)
def test_equal_couplings_raise_the_lower_corner(count: int, growth: float) -> None:
    """Some equal couplings multiply the lower corner by the inverse of the shrinkage."""
    stage = Follower(bias_ohm=47e3, coupling_f=1e-6)
    chain = Chain(((stage, Amplifier(gbw_hz=1e9)),) * count)
    single_hz = 1 / (2 * math.pi * 47e3 * 1e-6)
    assert nominal_figures(chain).lower_corner_hz == pytest.approx(growth * single_hz, rel=1e-5)


@pytest.mark.parametrize(("count", "corner_hz"), [(1, 1e3), (2, 20.352e3), (3, 50.982e3)])
def test_a_thousand_in_one_two_or_three_stages(count: int, corner_hz: float) -> None:
    """Computed for this project: total gain 1000 from 1 MHz amplifiers."""
    gain = 1000 ** (1 / count)
    stage = NonInverting(feedback_ohm=(gain - 1) * 1e3, ground_ohm=1e3)
    chain = Chain(((stage, Amplifier(gbw_hz=1e6)),) * count)
    assert nominal_figures(chain).corner_hz == pytest.approx(corner_hz, rel=2e-5)


def test_three_identical_stages_between_10_hz_and_10_khz() -> None:
    """holooly.com, problem 1403172: each stage 5 Hz to 19610 Hz (exactly 5.098 and 19614.6)."""
    amplifier = Amplifier(gbw_hz=19_614.6)
    stage = Follower(bias_ohm=1e6, coupling_f=1 / (2 * math.pi * 1e6 * 5.098245))
    found = nominal_figures(Chain(((stage, amplifier),) * 3))
    assert found.corner_hz == pytest.approx(10e3, rel=5e-4)
    assert found.lower_corner_hz == pytest.approx(10.0, rel=5e-4)


def test_passive_low_pass_is_first_order_too() -> None:
    """1/(2 pi R C) with no amplifier in it."""
    found = nominal_figures(Chain(((Divider(series_ohm=10e3, capacitor_f=1e-9), None),)))
    assert found.corner_hz == pytest.approx(1 / (2 * math.pi * 10e3 * 1e-9), rel=1e-9)
    assert found.gbw_hz is None
    assert found.noise_gain is None


@pytest.mark.parametrize(
    ("margin_deg", "peak_db", "at_crossover", "corner_ratio", "pole_ratio"),
    [
        # Exact; published anchors: 1.3 at 45 and 1.0 at 60 degrees (Sedra & Smith; Gray & Meyer,
        # from memory), maximally flat at 65.5 degrees.
        (30, 5.721, 1.9319, 1.5836, 0.5774),
        (45, 2.350, 1.3066, 1.6119, 1.0000),
        (50, 1.521, 1.1831, 1.6175, 1.1918),
        (60, 0.280, 1.0000, 1.6005, 1.7321),
        (65.53, 0.000, 0.9239, 1.5538, 2.1973),
        (76.345, 0.0, 0.8090, 1.3246, 4.1162),
    ],
)
def test_two_pole_loop(
    margin_deg: float, peak_db: float, at_crossover: float, corner_ratio: float, pole_ratio: float
) -> None:
    """A follower whose second pole leaves a phase margin, against its loop's crossover."""
    crossover_hz = 1e6
    second_pole_hz = crossover_hz * math.tan(math.radians(margin_deg))
    assert second_pole_hz == pytest.approx(pole_ratio * crossover_hz, rel=2e-4)
    gbw_hz = crossover_hz * math.hypot(1, crossover_hz / second_pole_hz)
    amplifier = Amplifier(gbw_hz=gbw_hz, second_pole_hz=second_pole_hz)
    chain = Chain(((Follower(), amplifier),))
    loop = amplifier.response(np.array([crossover_hz]))[0]
    assert abs(loop) == pytest.approx(1.0, abs=1e-9)
    assert 180 + math.degrees(np.angle(loop)) == pytest.approx(margin_deg, abs=1e-9)

    found = nominal_figures(chain)
    assert found.peaking_db == pytest.approx(peak_db, abs=6e-4)
    assert found.corner_hz == pytest.approx(corner_ratio * crossover_hz, rel=1e-4)
    here = abs(chain.response(np.array([crossover_hz]))[0])
    assert here == pytest.approx(at_crossover, abs=1e-4)


@pytest.mark.parametrize(
    ("ratio", "shift"),
    [(1, 1.2720), (2, 1.4142), (3, 1.3617), (5, 1.2304), (10, 1.1095), (20, 1.0525), (50, 1.0204)],
)
def test_error_of_an_ignored_second_pole(ratio: float, shift: float) -> None:
    """Computed for this project: the corner moves by this with a second pole at ratio x GBW/NG."""
    amplifier = Amplifier(gbw_hz=1e6, second_pole_hz=ratio * 1e5)
    stage = NonInverting(feedback_ohm=9e3, ground_ohm=1e3)
    found = nominal_figures(Chain(((stage, amplifier),)))
    assert found.corner_hz == pytest.approx(shift * 1e5, rel=6e-5)
