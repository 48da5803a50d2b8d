"""The amplifier inside a stage: its open-loop gain and what limits its output."""

import math
from dataclasses import dataclass
from typing import TypeAlias

import numpy as np

from benchlog.curve import ComplexArray, FloatArray

# A number, or an array that broadcasts against the frequencies: shape (sweeps, 1) beside (n,).
Scalars: TypeAlias = float | FloatArray


@dataclass(frozen=True, slots=True, kw_only=True)
class Amplifier:
    """An operational amplifier, by the numbers that its data sheet gives.

    Attributes:
        gbw_hz: Typical gain-bandwidth product: open-loop gain times open-loop corner.
        gbw_min_hz, gbw_max_hz: What the maker of the amplifier guarantees, where stated.
        open_loop_gain: Gain at zero frequency, V/V.
        second_pole_hz: Second pole of the open-loop gain, if one matters.
        slew_rate_v_per_s: Fastest change of the output.
        output_swing_v: Peak that the output reaches above zero.
        output_swing_negative_v: Peak below zero, as a positive number; None is the same.
        name: What the design file calls it.
    """

    gbw_hz: Scalars
    open_loop_gain: float = math.inf
    second_pole_hz: Scalars | None = None
    slew_rate_v_per_s: float | None = None
    output_swing_v: float | None = None
    output_swing_negative_v: float | None = None
    gbw_min_hz: float | None = None
    gbw_max_hz: float | None = None
    name: str = "main"

    def inverse_gain(self, s: ComplexArray) -> ComplexArray:
        """Return 1/A(s) for ``A = A0 / (1 + s/wp) / (1 + s/w2)`` with ``A0 wp = 2 pi GBW``.

        The inverse is exact for an infinite A0 and finite everywhere.

        Args:
            s: Complex frequency, radians per second, any shape.
        """
        inverse: ComplexArray = np.asarray(
            1.0 / self.open_loop_gain + s / (2 * np.pi * self.gbw_hz), dtype=np.complex128
        )
        if self.second_pole_hz is None:
            return inverse
        return np.asarray(inverse * (1.0 + s / (2 * np.pi * self.second_pole_hz)), np.complex128)

    def response(self, frequency_hz: FloatArray) -> ComplexArray:
        """Return the open-loop gain A at some frequencies, shape as given."""
        return 1.0 / self.inverse_gain(complex_frequency(frequency_hz))

    @property
    def peak_swing_v(self) -> float | None:
        """Largest peak of a sine around zero volts that the output can give."""
        sides = (self.output_swing_v, self.output_swing_negative_v)
        known = [side for side in sides if side is not None]
        return min(known) if known else None


def complex_frequency(frequency_hz: FloatArray) -> ComplexArray:
    """Return s = j 2 pi f for frequencies in hertz, shape as given."""
    return np.asarray(2j * np.pi * np.asarray(frequency_hz), dtype=np.complex128)
