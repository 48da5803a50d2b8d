"""Clipping and slewing against numerical integration."""

import math

import numpy as np
import pytest

from benchlog.practice.large_signal import clipped_vrms, slewed_vrms


@pytest.mark.parametrize("level_vrms", [0.1, 1.0, 1.2, 2.0, 10.0, 1000.0])
def test_clipped_level_is_the_rms_of_the_clipped_wave(level_vrms: float) -> None:
    """Compared with the mean of 200,000 samples of the wave itself."""
    phase = (np.arange(200_000) + 0.5) * 2 * np.pi / 200_000
    wave = np.clip(level_vrms * math.sqrt(2) * np.sin(phase), -1.5, 1.5)
    expected = math.sqrt(float(np.mean(wave**2)))
    assert clipped_vrms(level_vrms, 1.5) == pytest.approx(expected, rel=1e-8)


@pytest.mark.parametrize(("above_v", "below_v"), [(1.5, 0.8), (0.8, 1.5), (1.5, 5.0)])
def test_uneven_limits_and_the_mean_that_a_meter_does_not_see(
    above_v: float, below_v: float
) -> None:
    """An AC meter reads the standard deviation of the wave, compared with its samples."""
    phase = (np.arange(200_000) + 0.5) * 2 * np.pi / 200_000
    wave = np.clip(2.0 * math.sqrt(2) * np.sin(phase), -below_v, above_v)
    assert clipped_vrms(2.0, above_v, below_v) == pytest.approx(float(wave.std()), rel=1e-8)


def test_no_limits_change_nothing() -> None:
    """A board without stated limits is linear."""
    assert clipped_vrms(1e3, None) == 1e3
    assert slewed_vrms(1e3, 1e9, None) == 1e3


def slewing_in_time(beyond: float) -> float:
    """Return the share of the RMS level left by an amplifier that cannot follow.

    An integrator in a loop, its input stage limited: rate = clip(w (demand - out)), with the
    loop ten times faster than the sine, run until it repeats and averaged over one period.
    """
    steps = 4000
    demand = np.sin(2 * np.pi * np.arange(steps) / steps)
    # Rates are per radian of the sine; what is asked for has a steepest rate of 1.
    loop, limit, step = 10.0, 1.0 / beyond, 2 * np.pi / steps
    reach = 1 / math.hypot(1, 1 / loop)
    out, squares = 0.0, 0.0
    for turn in range(4):
        squares = 0.0
        for wanted in demand:
            out += step * min(max(loop * (wanted - out), -limit * reach), limit * reach)
            squares += out * out if turn == 3 else 0.0
    return math.sqrt(2 * squares / steps) / reach


@pytest.mark.parametrize("beyond", [1.1, 1.25, 2.0, 5.0])
def test_slewed_level_follows_a_simulation_in_time(beyond: float) -> None:
    """Within a few percent of a loop simulated step by step, from just beyond to far beyond."""
    slew_rate = 1e6
    level_vrms = beyond * slew_rate / (2 * math.pi * 1e5) / math.sqrt(2)
    share = slewed_vrms(level_vrms, 1e5, slew_rate) / level_vrms
    assert share == pytest.approx(slewing_in_time(beyond), abs=0.04)


def test_slewing_starts_at_the_full_power_limit() -> None:
    """Up to ``2 pi f Vp = SR`` nothing happens; beyond, level is lost."""
    limit_vrms = 13e6 / (2 * math.pi * 1e6) / math.sqrt(2)
    assert slewed_vrms(limit_vrms * 0.999, 1e6, 13e6) == limit_vrms * 0.999
    assert slewed_vrms(limit_vrms * 1.1, 1e6, 13e6) < limit_vrms * 1.1 * 0.99


@pytest.mark.parametrize(("beyond", "least", "most"), [(1.1, 1.2, 2.4), (1.25, 6.0, 9.0)])
def test_loss_just_beyond_the_limit(beyond: float, least: float, most: float) -> None:
    """Percent lost, as an independent simulation in time gave for a real loop."""
    share = slewed_vrms(beyond, 1e6, 2 * math.pi * 1e6 * math.sqrt(2))
    assert least <= 100 * (1 - share / beyond) <= most


def test_far_beyond_it_is_a_triangle() -> None:
    """Its peak is SR/(4 f), its RMS that over the root of three."""
    assert slewed_vrms(1e4, 1e5, 1e6) == pytest.approx(1e6 / 4e5 / math.sqrt(3), rel=0.01)


def test_level_never_falls_when_more_is_asked_for() -> None:
    """Both limits are monotone, so a level can be searched for."""
    asked = np.geomspace(0.01, 100, 400)
    for limited in (
        [clipped_vrms(level, 1.0) for level in asked],
        [slewed_vrms(level, 1e5, 1e6) for level in asked],
    ):
        assert np.all(np.diff(limited) > 0)
