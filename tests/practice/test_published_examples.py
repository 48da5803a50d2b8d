"""Worked examples of textbooks, solved by the practice board's node equations."""

import math

import numpy as np
import pytest

from benchlog.practice.board import PracticeBoard
from tests.fakes.practice_boards import corner_hz, parts_list


def closed_loop(gain: float, gbw_hz: float) -> PracticeBoard:
    """Return one stage with nominal parts: inverting for a gain below zero."""
    if gain < 0:
        stage = ("inverting", {"feedback": -gain * 1e3, "input": 1e3})
    elif gain == 1:
        stage = ("follower", {})
    else:
        stage = ("non-inverting", {"feedback": (gain - 1) * 1e3, "ground": 1e3})
    return PracticeBoard(parts_list(stage, amplifier={"gbw": gbw_hz}), spread=False)


@pytest.mark.parametrize(
    ("gain", "gbw_hz", "bandwidth_hz", "digits"),
    [
        # Malvino & Bates, Electronic Principles, 7th ed., example 19-13: f_unity 1 MHz, gain 10.
        (10, 1e6, 100e3, 3),
        # Analog Electronics: Troubleshooting and Practical Learning Guide, p. 358: a 3 MHz
        # amplifier with 2k and 18k has 300 kHz for a gain of +10 or of -9.
        (10, 3e6, 300e3, 3),
        (-9, 3e6, 300e3, 3),
        # Scilab companion 2093, Exa 1.28: f3dB = ft/(1 + R2/R1) with 1 MHz and 20.
        (-20, 1e6, 47.6e3, 3),
        # Sedra/Smith, table of closed-loop bandwidths for ft = 1 MHz (remembered, recomputed).
        (1000, 1e6, 1e3, 3),
        (100, 1e6, 10e3, 3),
        (1, 1e6, 1e6, 3),
        (-1, 1e6, 0.5e6, 3),
        (-10, 1e6, 90.9e3, 3),
        (-100, 1e6, 9.90e3, 3),
    ],
)
def test_closed_loop_bandwidth(
    gain: float, gbw_hz: float, bandwidth_hz: float, digits: int
) -> None:
    """To the digits that were printed."""
    found = corner_hz(closed_loop(gain, gbw_hz))
    assert float(f"{found:.{digits - 1}e}") == pytest.approx(bandwidth_hz, rel=1e-9)


@pytest.mark.parametrize(
    ("stages", "kept"), [(1, 1.0), (2, 0.643594), (3, 0.509825), (4, 0.434979), (5, 0.385614)]
)
def test_equal_stages_shrink_the_bandwidth(stages: int, kept: float) -> None:
    """sqrt(2^(1/n) - 1), as recomputed from the textbook formula."""
    stage = ("non-inverting", {"feedback": 9e3, "ground": 1e3})
    board = PracticeBoard(parts_list(*[stage] * stages), spread=False)
    assert corner_hz(board) == pytest.approx(kept * 100e3, rel=2e-6)


def test_full_power_bandwidth() -> None:
    """Malvino & Bates, same example: 0.5 V/us at 100 kHz allows 0.795 V peak (it truncates)."""
    amplifier = {"gbw": 1e9, "slew_rate": 0.5e6}
    stage = ("non-inverting", {"feedback": 9e3, "ground": 1e3})
    board = PracticeBoard(parts_list(stage, amplifier=amplifier), spread=False)

    def share(peak_v: float) -> float:
        emf_vrms = peak_v / math.sqrt(2) / 10
        return board.levels(100e3, emf_vrms, source_ohm=0.0).output_vrms / (10 * emf_vrms)

    assert share(0.795) == pytest.approx(1.0, rel=1e-5)
    assert share(0.82) < 0.9995


@pytest.mark.parametrize(
    ("ratio", "gain_db", "phase_deg"),
    [
        (0.1, -0.0432, -5.711),
        (0.2, -0.1703, -11.310),
        (0.5, -0.9691, -26.565),
        (1, -3.0103, -45.0),
        (2, -6.9897, -63.435),
        (5, -14.1497, -78.690),
        (10, -20.0432, -84.289),
    ],
)
def test_first_order_points(ratio: float, gain_db: float, phase_deg: float) -> None:
    """Gain and phase of one pole at multiples of its corner (exact, recomputed)."""
    gain = closed_loop(1, 1e6).gain(np.array([ratio * 1e6]))[0]
    assert 20 * math.log10(abs(gain)) == pytest.approx(gain_db, abs=5e-5)
    assert math.degrees(math.atan2(gain.imag, gain.real)) == pytest.approx(phase_deg, abs=5e-4)
