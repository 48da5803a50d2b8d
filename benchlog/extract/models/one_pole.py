"""One pole: gain K / (1 + j f/fc)."""

import numpy as np
from scipy.special import expit

from benchlog.curve import FloatArray

_LN_ROOT_TWO = 0.5 * np.log(2.0)


class OnePole:
    """``ln |H| = ln K - ln(1 + (f/fc)^2) / 2``; parameters ln K and ln fc."""

    name = "one-pole"
    parameters = ("ln_gain", "ln_corner")

    def start(self, ln_frequency: FloatArray, ln_gain: FloatArray, used: FloatArray) -> FloatArray:
        """Take the plateau from the lowest points and the corner from where the gain is 3 dB down.

        Where it never is, the corner is guessed at the highest frequency.
        """
        by_frequency = np.where(used > 0, ln_frequency, np.inf)
        order = np.argsort(by_frequency, axis=1)
        lowest = order[:, : max(2, ln_frequency.shape[1] // 5)]
        counted = np.take_along_axis(used, lowest, axis=1)
        low_gain = np.take_along_axis(ln_gain, lowest, axis=1) * counted
        plateau = low_gain.sum(axis=1) / np.maximum(counted.sum(axis=1), 1.0)
        below = (used > 0) & (ln_gain < (plateau - _LN_ROOT_TWO)[:, None])
        first_below = np.where(below, ln_frequency, np.inf).min(axis=1)
        highest = np.where(used > 0, ln_frequency, -np.inf).max(axis=1)
        corner = np.where(np.isfinite(first_below), first_below, highest)
        return np.stack([plateau, corner], axis=1)

    def evaluate(
        self, parameters: FloatArray, ln_frequency: FloatArray
    ) -> tuple[FloatArray, FloatArray]:
        """Return ln gain and its derivatives by ln K and ln fc."""
        twice = 2.0 * (ln_frequency - parameters[:, 1:2])
        values = parameters[:, 0:1] - 0.5 * np.logaddexp(0.0, twice)
        derivatives = np.stack([np.ones_like(values), expit(twice)], axis=2)
        return values, derivatives
