"""What an amplifier does to a sine that is too large or too fast for it."""

import math

# A sine driven far beyond the slew rate comes out as a triangle, peak SR/(4 f), so its RMS over
# the RMS asked for is (pi/2) sqrt(2/3) / x, with x = 2 pi f Vp / SR.
_TRIANGLE = math.pi / 2 * math.sqrt(2 / 3)

# Bends the curve so that 10 % and 25 % beyond the limit lose about 2 % and 8 %, and the level never
# falls when more is asked for.
_ONSET = 0.28


def clipped_vrms(level_vrms: float, swing_v: float | None) -> float:
    """Return the RMS level of a sine cut off at plus and minus ``swing_v``.

    Args:
        level_vrms: The sine as it would be without limits, V RMS.
        swing_v: Largest output, V peak; None for no limit.

    Source:
        Mean square of ``min(A |sin t|, V)`` over a quarter period, integrated by hand.
    """
    peak_v = level_vrms * math.sqrt(2)
    if swing_v is None or peak_v <= swing_v:
        return level_vrms
    angle = math.asin(swing_v / peak_v)
    below = peak_v**2 / math.pi * (angle - math.sin(angle) * math.cos(angle))
    above = swing_v**2 * (1 - 2 * angle / math.pi)
    return math.sqrt(below + above)


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
