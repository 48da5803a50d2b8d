"""A board with physics: what comes out of it when the source drives it.

A board holds its own copy of every part, off its nominal value by the chance of its seed, and
solves its own node equations.
"""

from collections.abc import Mapping

import numpy as np

from benchlog.curve import ComplexArray, FloatArray
from benchlog.design.model import Design
from benchlog.practice.large_signal import clipped_vrms, slewed_vrms
from benchlog.practice.nodes import Netlist
from benchlog.practice.parts import PartsList, parts_list
from benchlog.practice.wiring import BOARD_INPUT, stage_output, wire_board
from benchlog.practice.world import Levels

NOISE_V_PER_ROOT_HZ = 15e-9
"""Equivalent input noise of each amplifier: a middling op-amp (common practice)."""

NOISE_BAND_HZ = (1.0, 10e6)


class PracticeBoard:
    """One built board.

    Args:
        design: What it is built to: a design, or a parts list made elsewhere.
        seed: Chooses its parts inside their tolerances.
        label: Its name on the table; made from the seed when left out.
        spread: False gives every part its nominal value.
        changes: Values by path that replace the drawn ones: ``{"stage[1].ground": 1.1e3}``.

    Raises:
        ValueError: A change names a part that the board has not.
    """

    def __init__(
        self,
        design: Design | PartsList,
        *,
        seed: int = 0,
        label: str | None = None,
        spread: bool = True,
        changes: Mapping[str, float] | None = None,
    ) -> None:
        parts = design if isinstance(design, PartsList) else parts_list(design)
        self.kinds = parts.kinds
        self.values: Mapping[str, float] = parts.values(
            seed=seed if spread else None, changes=changes
        )
        self.label = label or f"board {seed}"
        self._nets: dict[float, Netlist] = {}
        self._noise: dict[float, float] = {}

    def gain(self, frequency_hz: FloatArray, *, source_ohm: float = 50.0) -> ComplexArray:
        """Return the small-signal gain from the board's input to its output, shape (n,)."""
        solution = self._net(source_ohm).solve(frequency_hz)
        return solution.at(stage_output(len(self.kinds))) / solution.at(BOARD_INPUT)

    def levels(self, frequency_hz: float, emf_vrms: float, *, source_ohm: float) -> Levels:
        """Return the steady levels for an open-circuit voltage behind a source resistance.

        Each stage in turn is held to its slew rate and its swing; what it loses is lost to all
        that follow.
        """
        solution = self._net(source_ohm).solve(np.array([frequency_hz]))
        kept = 1.0
        level_vrms = 0.0
        for number, kind in enumerate(self.kinds, start=1):
            asked_vrms = emf_vrms * kept * float(abs(solution.at(stage_output(number))[0]))
            level_vrms = self._limited(asked_vrms, frequency_hz, f"amplifier.{kind.amplifier}.")
            kept *= level_vrms / asked_vrms if asked_vrms else 1.0
        return Levels(
            input_vrms=emf_vrms * float(abs(solution.at(BOARD_INPUT)[0])),
            output_vrms=level_vrms,
            noise_vrms=self.noise_vrms(source_ohm=source_ohm),
        )

    def _limited(self, asked_vrms: float, frequency_hz: float, prefix: str) -> float:
        """Return what an amplifier makes of a level; a passive stage names none and limits none."""
        of = self.values.get
        level_vrms = slewed_vrms(asked_vrms, frequency_hz, of(prefix + "slew_rate"))
        return clipped_vrms(
            level_vrms, of(prefix + "output_swing"), of(prefix + "output_swing_negative")
        )

    def noise_vrms(self, *, source_ohm: float = 50.0) -> float:
        """Return the noise at the output that the amplifiers make, up to 10 MHz, V RMS."""
        if source_ohm not in self._noise:
            self._noise[source_ohm] = self._summed_noise(self._net(source_ohm))
        return self._noise[source_ohm]

    def _summed_noise(self, net: Netlist) -> float:
        frequency_hz = np.geomspace(*NOISE_BAND_HZ, 141)
        power = np.zeros_like(frequency_hz)
        for amplifier in range(net.amplifier_count):
            solution = net.solve(frequency_hz, from_amplifier=amplifier)
            power += np.abs(solution.at(stage_output(len(self.kinds)))) ** 2
        mean_square = np.trapezoid(power * frequency_hz, np.log(frequency_hz))
        return float(NOISE_V_PER_ROOT_HZ * np.sqrt(mean_square))

    def _net(self, source_ohm: float) -> Netlist:
        if source_ohm not in self._nets:
            self._nets[source_ohm] = wire_board(self.kinds, self.values, source_ohm=source_ohm)
        return self._nets[source_ohm]
