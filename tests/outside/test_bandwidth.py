"""Published closed-loop bandwidths, finite gains and slewing, against the circuit's response."""

import math

import numpy as np
import pytest

from benchlog.circuit.amplifier import Amplifier
from benchlog.circuit.chain import Chain
from benchlog.circuit.drive import SLEW_USED, drive_limit
from benchlog.circuit.nominal import Nominal, nominal_figures
from benchlog.circuit.stage import Stage
from benchlog.circuit.topologies import Follower, Inverting, NonInverting, OpenLoop


def figures(stage: Stage, **amplifier: float) -> Nominal:
    """Return the figures of a single stage."""
    return nominal_figures(Chain(((stage, Amplifier(**amplifier)),)))  # type: ignore[arg-type]


def non_inverting(gain: float) -> Stage:
    """Return a stage with an ideal gain."""
    return NonInverting(feedback_ohm=(gain - 1) * 1e3, ground_ohm=1e3) if gain > 1 else Follower()


def inverting(gain: float) -> Stage:
    """Return a stage with an ideal gain of minus this."""
    return Inverting(input_ohm=1e3, feedback_ohm=gain * 1e3)


def test_feedback_widens_the_open_loop_corner() -> None:
    """Malvino & Bates, Electronic Principles, 7th ed., Ex. 19-12, p. 724: 2500 times 20 Hz."""
    # 1 + A B = 2500 with an open-loop corner of 20 Hz.
    stage = non_inverting(40.0)
    found = figures(stage, open_loop_gain=2499 * 40.0, gbw_hz=20 * 2499 * 40.0)
    assert found.corner_hz == pytest.approx(50e3, rel=1e-9)


def test_unity_frequency_over_gain() -> None:
    """Malvino & Bates, Ex. 19-13: unity-gain frequency 1 MHz, gain 10: 100 kHz."""
    assert figures(non_inverting(10), gbw_hz=1e6).corner_hz == pytest.approx(100e3, rel=1e-9)


def test_slew_rate_limits_the_peak() -> None:
    """Malvino & Bates, Ex. 19-13: 0.5 V/us at 100 kHz: 0.796 V peak (the book truncates)."""
    chain = Chain(((Follower(), Amplifier(gbw_hz=1e12, slew_rate_v_per_s=0.5e6)),))
    limit = drive_limit(chain, np.array([100e3]))
    peak_v = math.sqrt(2) * limit.level_vrms[0] / SLEW_USED
    assert peak_v == pytest.approx(0.796, abs=5e-4)


@pytest.mark.parametrize(
    ("slew_v_per_us", "peak_v", "full_power_hz", "digits"),
    [
        # NPTEL 117107094, unit 7, page 1.
        (2.0, 12.0, 26.5e3, 50.0),
        # Franco, Design with Operational Amplifiers (from memory): 741, 13 V swing.
        (0.5, 13.0, 6.1e3, 50.0),
        # SR / (2 pi Vp) with the typical values of the data sheets: TI SNOSC25C (741), ADI OP27,
        # ST TL072, ST LM358, each at 10 V peak.
        (0.5, 10.0, 7.958e3, 0.5),
        (2.8, 10.0, 44.56e3, 5.0),
        (16.0, 10.0, 254.6e3, 50.0),
        (0.6, 10.0, 9.549e3, 0.5),
        # Sivakumar, Linear Integrated Circuit, Ex. 5.33: full-power bandwidth 5 kHz at 10 V peak.
        (0.31416, 10.0, 5.0e3, 0.1),
    ],
)
def test_full_power_bandwidth(
    slew_v_per_us: float, peak_v: float, full_power_hz: float, digits: float
) -> None:
    """The frequency at which a sine of this peak just asks for the whole slew rate."""
    chain = Chain(((Follower(), Amplifier(gbw_hz=1e12, slew_rate_v_per_s=1e6 * slew_v_per_us)),))
    at_1_hz_v = math.sqrt(2) * drive_limit(chain, np.array([1.0])).level_vrms[0] / SLEW_USED
    assert at_1_hz_v / peak_v == pytest.approx(full_power_hz, abs=digits)


def test_inverting_bandwidth_follows_noise_gain() -> None:
    """Scilab companion 2093, Exa 1.28: A0 1e4, 1 MHz, R2/R1 = 20: 47.6 kHz, 19.9 at a tenth."""
    stage = inverting(20)
    assert figures(stage, gbw_hz=1e6).corner_hz == pytest.approx(47.619e3, abs=1)
    chain = Chain(((stage, Amplifier(gbw_hz=1e6)),))
    assert abs(chain.response(np.array([4761.9]))[0]) == pytest.approx(19.9007, abs=5e-4)


@pytest.mark.parametrize("stage", [non_inverting(10), inverting(9)], ids=["+10", "-9"])
def test_same_noise_gain_same_bandwidth(stage: Stage) -> None:
    """Analog Electronics: Troubleshooting and Practical Learning Guide, p. 358: 3 MHz, 2k/18k."""
    assert figures(stage, gbw_hz=3e6).corner_hz == pytest.approx(300e3, rel=1e-9)


@pytest.mark.parametrize(
    ("gain", "corner_hz"),
    [
        # Sedra & Smith, Microelectronic Circuits (from memory): 1 MHz amplifier.
        (1000, 1e3),
        (100, 10e3),
        (10, 100e3),
        (1, 1e6),
        (-1, 500e3),
        (-10, 90.909e3),
        (-100, 9.9010e3),
        (-1000, 0.9990e3),
    ],
)
def test_bandwidth_against_gain(gain: float, corner_hz: float) -> None:
    """Inverting and non-inverting stages of a 1 MHz amplifier."""
    stage = non_inverting(gain) if gain > 0 else inverting(-gain)
    found = figures(stage, gbw_hz=1e6)
    assert found.corner_hz == pytest.approx(corner_hz, rel=1e-5)
    assert found.gain == pytest.approx(abs(gain), rel=1e-12)


@pytest.mark.parametrize(
    ("ideal_gain", "gain", "corner_hz"),
    [
        # Computed for this project, exactly: A0 = 2e5, open-loop corner 5 Hz, GBW 1 MHz.
        (1, 0.999995, 1_000_005),
        (10, 9.999500, 100_005),
        (100, 99.950025, 10_005),
        (1000, 995.024876, 1_005),
        (10_000, 9_523.809524, 105),
    ],
)
def test_finite_open_loop_gain(ideal_gain: float, gain: float, corner_hz: float) -> None:
    """Finite gain costs low-frequency gain, and gives the same in bandwidth."""
    found = figures(non_inverting(ideal_gain), gbw_hz=1e6, open_loop_gain=2e5)
    assert found.gain == pytest.approx(gain, rel=1e-9, abs=5e-7)
    assert found.corner_hz == pytest.approx(corner_hz, rel=1e-9)
    assert found.gain * (found.corner_hz or 0) == pytest.approx(1e6, rel=1e-9)


@pytest.mark.parametrize(
    ("gbw_hz", "gain_v_per_mv", "corner_hz"),
    [
        # Typical values of data sheets: ADI OP27A/E and OP27C/G, Motorola TL07x, ST TL072.
        (8.0e6, 1800, 4.44),
        (8.0e6, 1500, 5.33),
        (4.0e6, 150, 26.7),
        (4.0e6, 200, 20.0),
    ],
)
def test_open_loop_corner_of_data_sheets(
    gbw_hz: float, gain_v_per_mv: float, corner_hz: float
) -> None:
    """The open-loop corner is GBW over open-loop gain."""
    found = figures(OpenLoop(), gbw_hz=gbw_hz, open_loop_gain=1e3 * gain_v_per_mv)
    assert found.corner_hz == pytest.approx(corner_hz, abs=0.051)
    assert found.gain == pytest.approx(1e3 * gain_v_per_mv)


def test_source_resistance_of_an_inverting_stage() -> None:
    """Computed for this project: 50 ohm before 1k and 10k, GBW 3 MHz."""
    chain = Chain(((inverting(10), Amplifier(gbw_hz=3e6)),))
    assert nominal_figures(chain).corner_hz == pytest.approx(3e6 / 11, rel=1e-9)
    through_source = nominal_figures(chain, source_ohm=50.0)
    assert through_source.corner_hz == pytest.approx(285.07e3, abs=5)
    # Common practice knows it as a gain that reads 4.8 % low on a 50 ohm generator.
    assert through_source.gain == pytest.approx(10 / 1.05, rel=1e-12)
