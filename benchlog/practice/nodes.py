"""Node equations: resistors, capacitors and op-amps between nodes, solved at many frequencies.

This is the practice board's own view of a circuit.  It knows no noise gain and no closed-loop
formula, so that it can disagree with the formulas elsewhere in this program when they are wrong.

Source:
    Modified nodal analysis (common practice): Kirchhoff's current law at every node, one more
    row for each voltage that is forced.  An op-amp forces ``V+ - V- - Vout / A(f) = 0``.
"""

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import TypeAlias

import numpy as np

from benchlog.curve import ComplexArray, FloatArray

Node: TypeAlias = str

GROUND = ""
EMF = "emf"


@dataclass(frozen=True, slots=True, kw_only=True)
class OpAmp:
    """An amplifier's open loop: ``1/A = (1/A0 + j f/GBW)(1 + j f/f2)``.

    Attributes:
        gbw_hz: A0 times the first pole.
        open_loop_gain: A0, may be infinite.
        second_pole_hz: f2; None for none.
    """

    gbw_hz: float
    open_loop_gain: float = float("inf")
    second_pole_hz: float | None = None

    def inverse_gain(self, frequency_hz: FloatArray) -> ComplexArray:
        """Return 1/A at each frequency."""
        inverse = 1.0 / self.open_loop_gain + 1j * frequency_hz / self.gbw_hz
        if self.second_pole_hz is not None:
            inverse = inverse * (1.0 + 1j * frequency_hz / self.second_pole_hz)
        return inverse.astype(np.complex128)


@dataclass(frozen=True, slots=True)
class _Placed:
    plus: Node
    minus: Node
    out: Node
    amplifier: OpAmp


@dataclass(slots=True)
class Netlist:
    """A circuit under construction; nodes come into being when they are named.

    The electromotive force of the source stands between the node ``EMF`` and ground.
    """

    _resistors: list[tuple[Node, Node, float]] = field(default_factory=list)
    _capacitors: list[tuple[Node, Node, float]] = field(default_factory=list)
    _amplifiers: list[_Placed] = field(default_factory=list)
    _transformers: list[tuple[Node, Node, float]] = field(default_factory=list)

    def resistor(self, one: Node, other: Node, ohm: float) -> None:
        """Connect two nodes by a resistor."""
        self._resistors.append((one, other, ohm))

    def capacitor(self, one: Node, other: Node, farad: float) -> None:
        """Connect two nodes by a capacitor."""
        self._capacitors.append((one, other, farad))

    def op_amp(self, plus: Node, minus: Node, *, out: Node, amplifier: OpAmp) -> None:
        """Place an amplifier that draws no current and has no output resistance."""
        self._amplifiers.append(_Placed(plus, minus, out, amplifier))

    def transformer(self, node: Node, *, of: Node, ratio: float) -> None:
        """Force a node to a multiple of another, which it does not load."""
        self._transformers.append((node, of, ratio))

    @property
    def amplifier_count(self) -> int:
        """How many amplifiers were placed."""
        return len(self._amplifiers)

    def solve(self, frequency_hz: FloatArray, *, from_amplifier: int | None = None) -> "Solution":
        """Solve for one volt of electromotive force, or one volt at an amplifier's input.

        Args:
            frequency_hz: Frequencies, shape (n,), hertz.
            from_amplifier: Which amplifier's equivalent input noise voltage is the only source
                (in the order of placing); None for the source.

        Returns:
            The voltage of every node, complex, for each frequency.
        """
        places = self._places()
        forced = len(places) + 1 + len(self._amplifiers) + len(self._transformers)
        matrix = np.zeros((frequency_hz.size, forced, forced), np.complex128)
        self._stamp_parts(matrix, places, (2j * np.pi * frequency_hz).astype(np.complex128))
        self._stamp_forced(matrix, places, frequency_hz)
        known = np.zeros((forced, 1), np.complex128)
        if from_amplifier is None:
            known[len(places)] = 1.0
        else:
            known[len(places) + 1 + from_amplifier] = -1.0
        return Solution(places, np.linalg.solve(matrix, known)[:, :, 0].astype(np.complex128))

    def _places(self) -> dict[Node, int]:
        named: list[Node] = [EMF]
        for one, other, _ in (*self._resistors, *self._capacitors):
            named += [one, other]
        for placed in self._amplifiers:
            named += [placed.plus, placed.minus, placed.out]
        for node, of, _ in self._transformers:
            named += [node, of]
        names = dict.fromkeys(name for name in named if name != GROUND)
        return {name: place for place, name in enumerate(names)}

    def _stamp_parts(
        self, matrix: ComplexArray, places: dict[Node, int], omega: ComplexArray
    ) -> None:
        ones = np.ones_like(omega)
        for one, other, ohm in self._resistors:
            _stamp(matrix, [places.get(one), places.get(other)], ones / ohm)
        for one, other, farad in self._capacitors:
            _stamp(matrix, [places.get(one), places.get(other)], omega * farad)

    def _stamp_forced(
        self, matrix: ComplexArray, places: dict[Node, int], frequency_hz: FloatArray
    ) -> None:
        row = len(places)
        matrix[:, row, places[EMF]] = matrix[:, places[EMF], row] = 1.0
        for placed in self._amplifiers:
            row += 1
            out = places[placed.out]
            matrix[:, out, row] = 1.0
            for node, sign in ((placed.plus, 1.0), (placed.minus, -1.0)):
                if node != GROUND:
                    matrix[:, row, places[node]] += sign
            matrix[:, row, out] -= placed.amplifier.inverse_gain(frequency_hz)
        for node, of, ratio in self._transformers:
            row += 1
            matrix[:, places[node], row] = matrix[:, row, places[node]] = 1.0
            matrix[:, row, places[of]] -= ratio


@dataclass(frozen=True, slots=True)
class Solution:
    """Node voltages per volt of the source."""

    _places: dict[Node, int]
    _volts: ComplexArray

    def at(self, node: Node) -> ComplexArray:
        """Return the voltage of a node at each frequency, shape (n,)."""
        return self._volts[:, self._places[node]]


def _stamp(matrix: ComplexArray, nodes: Sequence[int | None], siemens: ComplexArray) -> None:
    """Let an admittance carry current between two nodes; None is ground."""
    one, other = nodes
    for mine, yours in ((one, other), (other, one)):
        if mine is None:
            continue
        matrix[:, mine, mine] += siemens
        if yours is not None:
            matrix[:, mine, yours] -= siemens
