"""What every response shape shows to the solver."""

from typing import Protocol, runtime_checkable

from benchlog.curve import FloatArray


class Shape(Protocol):
    """A family of responses, in the logarithms of gain, of frequency and of its parameters.

    Logarithms make every parameter a relative quantity of one size, and keep gains and corners
    positive whatever step the solver takes.

    Attributes:
        name: As the record shows it: ``"one-pole"``.
        parameters: Names of the parameters, in the order of the arrays.
    """

    @property
    def name(self) -> str:
        """As the record shows it."""
        ...

    @property
    def parameters(self) -> tuple[str, ...]:
        """Names of the parameters."""
        ...

    def start(self, ln_frequency: FloatArray, ln_gain: FloatArray, used: FloatArray) -> FloatArray:
        """Guess the parameters.

        Args:
            ln_frequency: Shape (sweeps, points).
            ln_gain: Same shape.
            used: 1 where a point counts, 0 where it does not, shape (sweeps, points).

        Returns:
            Shape (sweeps, parameters).
        """
        ...

    def evaluate(
        self, parameters: FloatArray, ln_frequency: FloatArray
    ) -> tuple[FloatArray, FloatArray]:
        """Return ln gain and its derivatives.

        Args:
            parameters: Shape (sweeps, parameters).
            ln_frequency: Shape (sweeps, points).

        Returns:
            ln gain, shape (sweeps, points), and derivatives, shape (sweeps, points, parameters).
        """
        ...


@runtime_checkable
class ClosedForm(Protocol):
    """A shape that some equations linear in other parameters solve almost to the end."""

    def near(
        self, ln_frequency: FloatArray, ln_gain: FloatArray, weight: FloatArray
    ) -> FloatArray | None:
        """Return parameters far closer to the answer than its uncertainty; None without a way.

        Args:
            ln_frequency: Shape (sweeps, points).
            ln_gain: Same shape.
            weight: 0 where a point does not count, same shape.

        Returns:
            Shape (sweeps, parameters); a rough start where a sweep has no such solution.
        """
        ...
