"""What a stage gives with a real amplifier in it: ``H = H_ideal / (1 + NG/A)``."""

from typing import Protocol

import numpy as np

from benchlog.circuit.amplifier import Amplifier
from benchlog.circuit.topologies import Divider, OpenLoop, Values
from benchlog.curve import ComplexArray


class Stage(Protocol):
    """What every topology can say; each takes ``s`` and the impedance of what drives it."""

    def signal_gain(self, s: ComplexArray, source_ohm: Values) -> Values:
        """Return the gain with an ideal amplifier, from the source's open-circuit voltage."""

    def noise_gain(self, s: ComplexArray, source_ohm: Values) -> Values:
        """Return the inverse of the feedback factor."""


def stage_response(
    stage: Stage, amplifier: Amplifier | None, *, s: ComplexArray, source_ohm: Values = 0.0
) -> ComplexArray:
    """Return a stage's gain at complex frequencies.

    Args:
        stage: The topology with its parts.
        amplifier: What is in it; None only for a passive stage.
        s: Radians per second, shape (n,).
        source_ohm: Impedance of what drives it; 0 when gain counts from the stage's input.

    Returns:
        Gain, V/V, shape (n,).

    Source:
        Closed loop of an amplifier A with feedback 1/NG: any textbook of electronics.
    """
    signal = stage.signal_gain(s, source_ohm) + 0j * s
    if amplifier is None:
        return np.asarray(signal)
    inverse_gain = amplifier.inverse_gain(s)
    if isinstance(stage, OpenLoop):
        return np.asarray(signal / inverse_gain)
    return np.asarray(signal / (1.0 + stage.noise_gain(s, source_ohm) * inverse_gain))


def output_impedance(stage: Stage, *, s: ComplexArray, source_ohm: Values) -> Values:
    """Return the impedance with which a stage drives the next one; an amplifier's is zero."""
    return stage.output_impedance(s, source_ohm) if isinstance(stage, Divider) else 0.0
