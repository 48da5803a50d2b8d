"""One class for each topology: signal gain and noise gain from its parts.

Both are functions of complex frequency ``s`` (radians per second, any shape, never zero where a
capacitor is in series) and of the impedance of what drives the stage.  Signal gain counts from the
open-circuit voltage of that source; with zero impedance it counts from the stage's own input.
Parts are ohms and farads; an absent part is None.  Field names are the keys of the design file with
the unit behind them.

Source:
    Ideal amplifier with feedback: any textbook of electronics; noise gain is the inverse of the
    feedback factor, ``1 + Zf / (all input legs in parallel)``.
"""

from dataclasses import dataclass
from typing import Any, Literal, TypeAlias

import numpy as np
import numpy.typing as npt

from benchlog.curve import ComplexArray

# A part's value, a number or an array that broadcasts against s; or an impedance or a gain.
Values: TypeAlias = float | npt.NDArray[np.inexact[Any]]


def parallel_capacitor(resistance: Values, capacitance: Values | None, s: ComplexArray) -> Values:
    """Return the impedance of a resistor with a capacitor across it."""
    return resistance if capacitance is None else resistance / (1.0 + s * resistance * capacitance)


def series_capacitor(resistance: Values, capacitance: Values | None, s: ComplexArray) -> Values:
    """Return the impedance of a resistor with a capacitor in line."""
    return resistance if capacitance is None else resistance + 1.0 / (s * capacitance)


def capacitor_admittance(capacitance: Values | None, s: ComplexArray) -> Values:
    """Return what a capacitor to ground adds to a node; nothing when it is absent."""
    return 0.0 if capacitance is None else s * capacitance


def plus_input(
    s: ComplexArray, source_ohm: Values, *, bias_ohm: Values | None, coupling_f: Values | None
) -> Values:
    """Return what of the source arrives at a non-inverting input with a bias resistor to ground."""
    if bias_ohm is None:
        return 1.0
    return bias_ohm / (bias_ohm + source_ohm + series_capacitor(0.0, coupling_f, s))


@dataclass(frozen=True, slots=True, kw_only=True)
class Follower:
    """Output tied to the minus input, directly or through a feedback resistor."""

    feedback_ohm: Values = 0.0
    feedback_capacitor_f: Values | None = None
    input_capacitance_f: Values | None = None
    bias_ohm: Values | None = None
    coupling_f: Values | None = None

    def noise_gain(self, s: ComplexArray, source_ohm: Values) -> Values:  # noqa: ARG002 - see Stage
        """Return 1, but for what leaks through the input capacitance."""
        feedback = parallel_capacitor(self.feedback_ohm, self.feedback_capacitor_f, s)
        return 1.0 + feedback * capacitor_admittance(self.input_capacitance_f, s)

    def signal_gain(self, s: ComplexArray, source_ohm: Values) -> Values:
        """Return the noise gain times what arrives at the plus input."""
        arriving = plus_input(s, source_ohm, bias_ohm=self.bias_ohm, coupling_f=self.coupling_f)
        return arriving * self.noise_gain(s, source_ohm)


@dataclass(frozen=True, slots=True, kw_only=True)
class NonInverting:
    """Signal at the plus input; a ground leg and a feedback leg at the minus input.

    A ground capacitor makes a shelf: below it the gain falls to 1, not to 0.
    """

    feedback_ohm: Values
    ground_ohm: Values
    feedback_capacitor_f: Values | None = None
    ground_capacitor_f: Values | None = None
    input_capacitance_f: Values | None = None
    bias_ohm: Values | None = None
    coupling_f: Values | None = None

    def noise_gain(self, s: ComplexArray, source_ohm: Values) -> Values:  # noqa: ARG002 - see Stage
        """Return 1 + Zf/Zg; what drives the plus input has no part in it."""
        feedback = parallel_capacitor(self.feedback_ohm, self.feedback_capacitor_f, s)
        ground = series_capacitor(self.ground_ohm, self.ground_capacitor_f, s)
        return 1.0 + feedback * (1.0 / ground + capacitor_admittance(self.input_capacitance_f, s))

    def signal_gain(self, s: ComplexArray, source_ohm: Values) -> Values:
        """Return the noise gain times what arrives at the plus input."""
        arriving = plus_input(s, source_ohm, bias_ohm=self.bias_ohm, coupling_f=self.coupling_f)
        return arriving * self.noise_gain(s, source_ohm)


@dataclass(frozen=True, slots=True, kw_only=True)
class Inverting:
    """Signal through an input leg to the minus input; the source's resistance adds to the leg."""

    input_ohm: Values
    feedback_ohm: Values
    feedback_capacitor_f: Values | None = None
    input_capacitance_f: Values | None = None
    coupling_f: Values | None = None

    def _leg(self, s: ComplexArray, source_ohm: Values) -> Values:
        return series_capacitor(self.input_ohm + source_ohm, self.coupling_f, s)

    def noise_gain(self, s: ComplexArray, source_ohm: Values) -> Values:
        """Return 1 + Zf/Zi."""
        feedback = parallel_capacitor(self.feedback_ohm, self.feedback_capacitor_f, s)
        leak = capacitor_admittance(self.input_capacitance_f, s)
        return 1.0 + feedback * (1.0 / self._leg(s, source_ohm) + leak)

    def signal_gain(self, s: ComplexArray, source_ohm: Values) -> Values:
        """Return -Zf/Zi."""
        feedback = parallel_capacitor(self.feedback_ohm, self.feedback_capacitor_f, s)
        return -feedback / self._leg(s, source_ohm)


@dataclass(frozen=True, slots=True, kw_only=True)
class Summing:
    """Several input legs at the minus input, one of them driven.

    Attributes:
        inputs_ohm: One resistor for each leg.
        driven: Which leg carries the signal, counted from 1.
        undriven: What the other legs' inputs are tied to: ``"grounded"`` legs load the summing
            node and raise the noise gain, ``"open"`` legs do nothing.
        undriven_source_ohm: Resistance through which grounded legs reach ground.
        coupling_f: A capacitor of this value in line with every leg.
    """

    inputs_ohm: tuple[Values, ...]
    feedback_ohm: Values
    driven: int = 1
    undriven: Literal["grounded", "open"] = "grounded"
    undriven_source_ohm: Values = 0.0
    feedback_capacitor_f: Values | None = None
    input_capacitance_f: Values | None = None
    coupling_f: Values | None = None

    def noise_gain(self, s: ComplexArray, source_ohm: Values) -> Values:
        """Return 1 + Zf times the sum of what each leg that is tied to something admits."""
        admitted = capacitor_admittance(self.input_capacitance_f, s)
        for place, leg_ohm in enumerate(self.inputs_ohm, start=1):
            is_driven = place == self.driven
            if is_driven or self.undriven == "grounded":
                before_ohm = source_ohm if is_driven else self.undriven_source_ohm
                admitted = admitted + 1.0 / series_capacitor(
                    leg_ohm + before_ohm, self.coupling_f, s
                )
        return 1.0 + parallel_capacitor(self.feedback_ohm, self.feedback_capacitor_f, s) * admitted

    def signal_gain(self, s: ComplexArray, source_ohm: Values) -> Values:
        """Return -Zf over the driven leg."""
        leg_ohm = self.inputs_ohm[self.driven - 1] + source_ohm
        feedback = parallel_capacitor(self.feedback_ohm, self.feedback_capacitor_f, s)
        return -feedback / series_capacitor(leg_ohm, self.coupling_f, s)


@dataclass(frozen=True, slots=True, kw_only=True)
class Difference:
    """One leg at the minus input, a divider at the plus input.

    Attributes:
        driven: ``"plus"`` or ``"minus"`` with the other input grounded, or ``"both"``: half the
            signal on each, in opposite phase, and each input through the source's resistance.
    """

    input_ohm: Values
    feedback_ohm: Values
    plus_input_ohm: Values
    plus_ground_ohm: Values
    driven: Literal["plus", "minus", "both"] = "both"
    feedback_capacitor_f: Values | None = None
    plus_ground_capacitor_f: Values | None = None
    input_capacitance_f: Values | None = None

    def _minus_leg(self, source_ohm: Values) -> Values:
        return self.input_ohm if self.driven == "plus" else self.input_ohm + source_ohm

    def noise_gain(self, s: ComplexArray, source_ohm: Values) -> Values:
        """Return 1 + Zf/Zi; the source counts only where it is in the minus leg."""
        feedback = parallel_capacitor(self.feedback_ohm, self.feedback_capacitor_f, s)
        leak = capacitor_admittance(self.input_capacitance_f, s)
        return 1.0 + feedback * (1.0 / self._minus_leg(source_ohm) + leak)

    def signal_gain(self, s: ComplexArray, source_ohm: Values) -> Values:
        """Return the gain of the driven input, or of the difference of both."""
        feedback = parallel_capacitor(self.feedback_ohm, self.feedback_capacitor_f, s)
        minus = -feedback / self._minus_leg(source_ohm)
        if self.driven == "minus":
            return minus
        lower = parallel_capacitor(self.plus_ground_ohm, self.plus_ground_capacitor_f, s)
        divided = lower / (lower + self.plus_input_ohm + source_ohm)
        plus = divided * self.noise_gain(s, source_ohm)
        return plus if self.driven == "plus" else 0.5 * (plus - minus)


@dataclass(frozen=True, slots=True, kw_only=True)
class OpenLoop:
    """The amplifier alone, measured at its own input."""

    def noise_gain(self, s: ComplexArray, source_ohm: Values) -> Values:  # noqa: ARG002 - see Stage
        """Return 1: the open-loop gain is what is measured."""
        return 1.0

    def signal_gain(self, s: ComplexArray, source_ohm: Values) -> Values:  # noqa: ARG002 - see Stage
        """Return 1, before the amplifier's own gain."""
        return 1.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Divider:
    """A passive stage: a series resistor, then a resistor and a capacitor to ground.

    Without a shunt resistor it is a low pass; what follows loads it through its own input leg.
    """

    series_ohm: Values
    shunt_ohm: Values | None = None
    capacitor_f: Values | None = None

    def _loading(self, s: ComplexArray) -> Values:
        shunt = 0.0 if self.shunt_ohm is None else 1.0 / self.shunt_ohm
        return shunt + capacitor_admittance(self.capacitor_f, s)

    def noise_gain(self, s: ComplexArray, source_ohm: Values) -> Values:  # noqa: ARG002 - see Stage
        """Return 1: there is no amplifier in it."""
        return 1.0

    def signal_gain(self, s: ComplexArray, source_ohm: Values) -> Values:
        """Return what is left at the unloaded output."""
        return 1.0 / (1.0 + (self.series_ohm + source_ohm) * self._loading(s))

    def output_impedance(self, s: ComplexArray, source_ohm: Values) -> Values:
        """Return the impedance with which this drives the next stage."""
        before = self.series_ohm + source_ohm
        return before / (1.0 + before * self._loading(s))
