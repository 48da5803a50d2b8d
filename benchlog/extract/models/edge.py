"""What ends a response at its lower side: a coupling capacitor, or one in the ground leg."""

from typing import Protocol

import numpy as np
from scipy.special import expit

from benchlog.curve import FloatArray


class Edge(Protocol):
    """A lower edge with one parameter: the logarithm of its pole."""

    @property
    def name(self) -> str:
        """What the shape's name gets at its end."""
        ...

    def evaluate(
        self, ln_pole: FloatArray, ln_gain: FloatArray, ln_frequency: FloatArray
    ) -> tuple[FloatArray, FloatArray, FloatArray]:
        """Return ln magnitude and its derivatives by ln pole and ln gain, all (sweeps, points).

        Args:
            ln_pole: Shape (sweeps, 1).
            ln_gain: Of the plateau, shape (sweeps, 1).
            ln_frequency: Shape (sweeps, points).
        """
        ...

    def phase(
        self, ln_pole: FloatArray, ln_gain: FloatArray, ln_frequency: FloatArray
    ) -> tuple[FloatArray, FloatArray, FloatArray]:
        """Return the phase in radians and its derivatives, as ``evaluate``."""
        ...


class HighPass:
    """``|H| = 1 / sqrt(1 + (fl/f)^2)``: a coupling capacitor."""

    name = "lower-corner"

    def evaluate(
        self, ln_pole: FloatArray, ln_gain: FloatArray, ln_frequency: FloatArray
    ) -> tuple[FloatArray, FloatArray, FloatArray]:
        """Return ln magnitude and derivatives; the gain does not enter."""
        del ln_gain
        twice = 2.0 * (ln_pole - ln_frequency)
        return -0.5 * np.logaddexp(0.0, twice), -expit(twice), np.zeros_like(twice)

    def phase(
        self, ln_pole: FloatArray, ln_gain: FloatArray, ln_frequency: FloatArray
    ) -> tuple[FloatArray, FloatArray, FloatArray]:
        """Return the phase and derivatives; the gain does not enter."""
        del ln_gain
        turn, by = _turn(ln_pole - ln_frequency)
        return turn, by, np.zeros_like(turn)


class Shelf:
    """``H = (s + wp/G) / (s + wp)``: a ground-leg capacitor, with which gain G falls to 1."""

    name = "shelf"

    def evaluate(
        self, ln_pole: FloatArray, ln_gain: FloatArray, ln_frequency: FloatArray
    ) -> tuple[FloatArray, FloatArray, FloatArray]:
        """Return ln magnitude and derivatives."""
        pole = 2.0 * (ln_pole - ln_frequency)
        zero = pole - 2.0 * ln_gain
        values = 0.5 * np.logaddexp(0.0, zero) - 0.5 * np.logaddexp(0.0, pole)
        return values, expit(zero) - expit(pole), -expit(zero)

    def phase(
        self, ln_pole: FloatArray, ln_gain: FloatArray, ln_frequency: FloatArray
    ) -> tuple[FloatArray, FloatArray, FloatArray]:
        """Return the phase and derivatives."""
        pole, by_pole = _turn(ln_pole - ln_frequency)
        zero, by_zero = _turn(ln_pole - ln_gain - ln_frequency)
        return pole - zero, by_pole - by_zero, by_zero


def _turn(ln_ratio: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return the arc tangent of a ratio, and its derivative by the ratio's logarithm."""
    ratio = np.exp(np.clip(ln_ratio, -300.0, 300.0))
    return np.arctan(ratio), ratio / (1.0 + ratio**2)
