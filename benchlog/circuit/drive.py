"""How hard a board may be driven before it clips or slews."""

from dataclasses import dataclass

import numpy as np

from benchlog.circuit.chain import Chain
from benchlog.curve import FloatArray

# Common practice: a fifth of the swing is kept free, and a sine may ask for a third of the slew
# rate; beyond that the gain read is no longer a small-signal gain.
SWING_USED = 0.8
SLEW_USED = 1.0 / 3.0


@dataclass(frozen=True, slots=True, kw_only=True)
class DriveLimit:
    """The highest level at the board's input, against frequency.

    Attributes:
        frequency_hz: Hertz, shape (n,).
        level_vrms: V RMS at the board's input, shape (n,); infinite where nothing limits.
        limited_by: What limits at each frequency: ``"output swing of stage 1"``; or ``""``.
    """

    frequency_hz: FloatArray
    level_vrms: FloatArray
    limited_by: tuple[str, ...]


def drive_limit(chain: Chain, frequency_hz: FloatArray) -> DriveLimit:
    """Find the highest level that neither clips nor slews any stage.

    Args:
        chain: The board's stages.
        frequency_hz: Hertz, above zero, shape (n,).

    Source:
        A sine of peak Vp changes by at most 2 pi f Vp.
    """
    frequency_hz = np.asarray(frequency_hz, dtype=np.float64)
    names, peaks = [""], [np.full(frequency_hz.shape, np.inf)]
    gains = chain.at_each_output(frequency_hz)
    for place, ((_, amplifier), gain) in enumerate(zip(chain.stages, gains, strict=True), start=1):
        if amplifier is None:
            continue
        if amplifier.peak_swing_v is not None:
            names.append(f"output swing of stage {place}")
            peaks.append(SWING_USED * amplifier.peak_swing_v / np.abs(gain))
        if amplifier.slew_rate_v_per_s is not None:
            names.append(f"slew rate of stage {place}")
            slewing_v = SLEW_USED * amplifier.slew_rate_v_per_s / (2 * np.pi * frequency_hz)
            peaks.append(slewing_v / np.abs(gain))
    table = np.array(peaks)
    lowest = np.argmin(table, axis=0)
    return DriveLimit(
        frequency_hz=frequency_hz,
        level_vrms=np.min(table, axis=0) / np.sqrt(2.0),
        limited_by=tuple(names[which] for which in lowest),
    )


def highest_level_vrms(chain: Chain, frequency_hz: FloatArray) -> FloatArray:
    """Return the highest level at the board's input, V RMS, shape (n,); see ``drive_limit``."""
    return drive_limit(chain, frequency_hz).level_vrms
