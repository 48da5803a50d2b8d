"""What ends a response at its upper side: one pole, two poles, n equal poles.

Each gives the logarithm of its magnitude, 0 far below its corner, with derivatives by the
logarithms of its own parameters.
"""

from typing import Protocol

import numpy as np

from benchlog.curve import FloatArray
from benchlog.extract.models.polynomial import shared_row

_FARTHEST = 300.0
_HALF = 0.5


class Rolloff(Protocol):
    """An upper edge; arrays of parameters have shape (sweeps, own parameters)."""

    @property
    def name(self) -> str:
        """As the record shows it."""
        ...

    @property
    def parameters(self) -> tuple[str, ...]:
        """Names of the parameters."""
        ...

    @property
    def poles(self) -> int:
        """How many poles there are: the slope far above the corner."""
        ...

    @property
    def root(self) -> float:
        """n, where ``|H|^(-2/n)`` is a polynomial in the square of frequency."""
        ...

    @property
    def degree(self) -> int:
        """Of that polynomial."""
        ...

    def of_polynomial(self, coefficients: FloatArray, ln_unit: float) -> FloatArray:
        """Return the parameters for coefficients of f^2, f^4 ..., shape (sweeps, parameters).

        Args:
            coefficients: Over the constant, shape (sweeps, degree); NaN comes from bad ones.
            ln_unit: Logarithm of what frequency is counted in.
        """
        ...

    def evaluate(
        self, parameters: FloatArray, ln_frequency: FloatArray
    ) -> tuple[FloatArray, FloatArray]:
        """Return ln magnitude (sweeps, points) and derivatives (sweeps, points, parameters)."""
        ...

    def phase(
        self, parameters: FloatArray, ln_frequency: FloatArray
    ) -> tuple[FloatArray, FloatArray]:
        """Return the phase in radians and its derivatives, shapes as ``evaluate``."""
        ...

    def start(self, ln_corner: FloatArray) -> FloatArray:
        """Guess the parameters from a half-power corner, shape (sweeps,)."""
        ...

    def ln_fallen(self, parameters: FloatArray, ln_fall: FloatArray | float) -> FloatArray:
        """Return where this alone has last fallen by so much, NaN for none, shape (sweeps,).

        Args:
            parameters: Shape (sweeps, own parameters); the first is the logarithm of a frequency.
            ln_fall: Above zero; shape (sweeps,) or one for all.
        """
        ...


class OnePole:
    """``|H| = 1 / sqrt(1 + (f/fc)^2)``."""

    name = "one-pole"
    poles = degree = 1
    root = 1.0
    parameters: tuple[str, ...] = ("ln_corner",)

    def evaluate(
        self, parameters: FloatArray, ln_frequency: FloatArray
    ) -> tuple[FloatArray, FloatArray]:
        """Return ln magnitude and its derivative by ln fc."""
        ratio = _squared(ln_frequency, parameters)
        above = 1.0 + ratio
        ratio /= above
        np.log(above, out=above)
        above *= -_HALF
        return above, ratio[:, :, None]

    def phase(
        self, parameters: FloatArray, ln_frequency: FloatArray
    ) -> tuple[FloatArray, FloatArray]:
        """Return the phase and its derivative by ln fc."""
        x = np.sqrt(_squared(ln_frequency, parameters))
        return -np.arctan(x), (x / (1.0 + x**2))[:, :, None]

    def of_polynomial(self, coefficients: FloatArray, ln_unit: float) -> FloatArray:
        """Return the corner."""
        return ln_unit - _HALF * np.log(coefficients)

    def start(self, ln_corner: FloatArray) -> FloatArray:
        """Take the corner."""
        return ln_corner[:, None].copy()

    def ln_fallen(self, parameters: FloatArray, ln_fall: FloatArray | float) -> FloatArray:
        """Return where this has fallen by so much."""
        ln_fallen: FloatArray = parameters[:, 0] + _HALF * np.log(np.expm1(2.0 * ln_fall))
        return ln_fallen


class EqualPoles:
    """n poles at one frequency: ``sqrt(2^(1/n) - 1)`` of it is left at half power.

    Args:
        count: How many.
    """

    parameters: tuple[str, ...] = ("ln_pole",)
    degree = 1

    def __init__(self, count: int) -> None:
        self.poles = count
        self.root = float(count)
        self.name = f"{count}-equal-poles"
        self._ln_shrinkage = _HALF * float(np.log(2.0 ** (1.0 / count) - 1.0))

    def evaluate(
        self, parameters: FloatArray, ln_frequency: FloatArray
    ) -> tuple[FloatArray, FloatArray]:
        """Return ln magnitude and its derivative by the logarithm of the pole."""
        ratio = _squared(ln_frequency, parameters)
        above = 1.0 + ratio
        return -_HALF * self.poles * np.log(above), (self.poles * ratio / above)[:, :, None]

    def phase(
        self, parameters: FloatArray, ln_frequency: FloatArray
    ) -> tuple[FloatArray, FloatArray]:
        """Return the phase and its derivative by the logarithm of the pole."""
        x = np.sqrt(_squared(ln_frequency, parameters))
        return -self.poles * np.arctan(x), (self.poles * x / (1.0 + x**2))[:, :, None]

    def of_polynomial(self, coefficients: FloatArray, ln_unit: float) -> FloatArray:
        """Return the pole."""
        return ln_unit - _HALF * np.log(coefficients)

    def start(self, ln_corner: FloatArray) -> FloatArray:
        """Put the poles where together they have the corner."""
        return (ln_corner - self._ln_shrinkage)[:, None]

    def ln_fallen(self, parameters: FloatArray, ln_fall: FloatArray | float) -> FloatArray:
        """Return where all together have fallen by so much."""
        each = np.expm1(2.0 / self.poles * ln_fall)
        ln_fallen: FloatArray = parameters[:, 0] + _HALF * np.log(each)
        return ln_fallen


class TwoPole:
    """``H = 1 / (1 + s/(Q w0) + (s/w0)^2)``; parameters ln f0 and ln Q."""

    name = "two-pole"
    poles = degree = 2
    root = 1.0
    parameters: tuple[str, ...] = ("ln_f0", "ln_q")

    def evaluate(
        self, parameters: FloatArray, ln_frequency: FloatArray
    ) -> tuple[FloatArray, FloatArray]:
        """Return ln magnitude and its derivatives by ln f0 and ln Q."""
        ratio = _squared(ln_frequency, parameters)
        damping = np.exp(-2.0 * np.clip(parameters[:, 1:2], -50.0, 50.0))
        below = 1.0 - ratio
        damped = ratio * damping
        size = below * below
        size += damped
        damped /= size
        below *= ratio
        below /= size
        by = np.empty((2, *size.shape))
        np.multiply(below, -2.0, out=by[0])
        by[0] += damped
        by[1] = damped
        np.log(size, out=size)
        size *= -_HALF
        return size, np.moveaxis(by, 0, 2)

    def phase(
        self, parameters: FloatArray, ln_frequency: FloatArray
    ) -> tuple[FloatArray, FloatArray]:
        """Return the phase and its derivatives by ln f0 and ln Q."""
        ratio = _squared(ln_frequency, parameters)
        damped = np.sqrt(ratio) * np.exp(-np.clip(parameters[:, 1:2], -50.0, 50.0))
        below = 1.0 - ratio
        size = below**2 + damped**2
        by = np.stack([damped * (1.0 + ratio) / size, below * damped / size], axis=2)
        return -np.arctan2(damped, below), by

    def of_polynomial(self, coefficients: FloatArray, ln_unit: float) -> FloatArray:
        """Return ln f0 and ln Q."""
        square = np.sqrt(coefficients[:, 1])
        ln_q = -_HALF * np.log(2.0 + coefficients[:, 0] / square)
        return np.stack([ln_unit - _HALF * np.log(square), ln_q], axis=1)

    def start(self, ln_corner: FloatArray) -> FloatArray:
        """Begin maximally flat."""
        return np.stack([ln_corner, np.full_like(ln_corner, -_HALF * np.log(2.0))], axis=1)

    def ln_fallen(self, parameters: FloatArray, ln_fall: FloatArray | float) -> FloatArray:
        """Return the last place where this has fallen by so much."""
        above = np.expm1(2.0 * ln_fall)
        inside = 1.0 - _HALF * np.exp(-2.0 * parameters[:, 1])
        # For a < 0 the plain form a + sqrt(a^2 + b) loses its digits.
        root = np.sqrt(inside**2 + above)
        square = np.where(inside >= 0, inside + root, above / (root - np.minimum(inside, 0.0)))
        ln_fallen: FloatArray = parameters[:, 0] + _HALF * np.log(square)
        return ln_fallen


def _squared(ln_frequency: FloatArray, parameters: FloatArray) -> FloatArray:
    """Return the square of frequency over the first parameter, kept within what exp can hold."""
    row = shared_row(ln_frequency)
    if row.shape == ln_frequency.shape:
        twice = 2.0 * (ln_frequency - parameters[:, :1])
        ratio: FloatArray = np.exp(np.minimum(twice, _FARTHEST, out=twice), out=twice)
        return ratio
    # One exponential for each point and each sweep, not for each point of each sweep.
    half = _HALF * _FARTHEST
    above = np.clip(2.0 * (row - row[0, 0]), -half, half)
    below = np.clip(2.0 * (row[0, 0] - parameters[:, :1]), -half, half)
    return np.asarray(np.exp(above) * np.exp(below))
