"""What an amplifier does to a sine that is too large or too fast for it."""

import math

# A sine driven far beyond the slew rate comes out as a triangle, peak SR/(4 f), so its RMS over
# the RMS asked for is (pi/2) sqrt(2/3) / x, with x = 2 pi f Vp / SR.
_TRIANGLE = math.pi / 2 * math.sqrt(2 / 3)

# Bends the curve so that 10 % and 25 % beyond the limit lose about 2 % and 8 %, and the level never
# falls when more is asked for.
_ONSET = 0.28


def clipped_vrms(
    level_vrms: float, swing_v: float | None, negative_swing_v: float | None = None
) -> float:
    """Return the RMS level, without its mean, of a sine cut off above and below.

    Args:
        level_vrms: The sine as it would be without limits, V RMS.
        swing_v: Largest output, V peak; None for no limit.
        negative_swing_v: Largest output below zero, V peak; None for the same as above.

    Source:
        Mean and mean square of ``min(A sin t, V)`` over half a period, integrated by hand.
    """
    peak_v = level_vrms * math.sqrt(2)
    above_v = math.inf if swing_v is None else swing_v
    below_v = above_v if negative_swing_v is None else negative_swing_v
    if peak_v <= min(above_v, below_v):
        return level_vrms
    mean_above, square_above = _half_wave(peak_v, above_v)
    mean_below, square_below = _half_wave(peak_v, below_v)
    mean = (mean_above - mean_below) / 2
    return math.sqrt((square_above + square_below) / 2 - mean**2)


def _half_wave(peak_v: float, limit_v: float) -> tuple[float, float]:
    """Return mean and mean square of half a sine cut off at a limit."""
    kept_v = min(limit_v, peak_v)
    angle = math.asin(kept_v / peak_v)
    mean = 2 / math.pi * peak_v * (1 - math.cos(angle)) + kept_v * (1 - 2 * angle / math.pi)
    below = peak_v**2 / math.pi * (angle - math.sin(angle) * math.cos(angle))
    return mean, below + kept_v**2 * (1 - 2 * angle / math.pi)


def slewed_vrms(level_vrms: float, frequency_hz: float, slew_rate_v_per_s: float | None) -> float:
    """Return the RMS level that is left of a sine when the amplifier cannot follow it.

    Args:
        level_vrms: The sine as it would be without limits, V RMS.
        frequency_hz: Its frequency, hertz.
        slew_rate_v_per_s: Steepest output, V/s; None for no limit.

    Source:
        Nothing happens up to ``2 pi f Vp = SR``; far beyond it the output is a triangle.  The
        bend between was fitted to a simulation in time (10 % beyond: 1.2 to 2.4 % lost; 25 %
        beyond: 6 to 9 % lost).
    """
    if slew_rate_v_per_s is None:
        return level_vrms
    beyond = 2 * math.pi * frequency_hz * level_vrms * math.sqrt(2) / slew_rate_v_per_s - 1
    if beyond <= 0:
        return level_vrms
    return level_vrms / (1 + beyond**2 / (_TRIANGLE * (beyond + _ONSET)))
