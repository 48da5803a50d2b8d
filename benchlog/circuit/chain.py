"""Stages in cascade, from the board's input to its output."""

from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from typing import Any

import numpy as np

from benchlog.circuit.amplifier import Amplifier, Scalars, complex_frequency
from benchlog.circuit.parts import (
    Factors,
    Part,
    scaled_amplifier,
    scaled_stage,
    stage_parts,
    without_capacitors,
)
from benchlog.circuit.stage import Stage, output_impedance, stage_response
from benchlog.circuit.topologies import Divider
from benchlog.curve import ComplexArray, FloatArray
from benchlog.errors import Misuse

_NO_FACTORS: Mapping[str, float] = {}


@dataclass(frozen=True, slots=True)
class Chain:
    """A board's stages in order.

    Args:
        stages: Each topology with the amplifier in it; None for a passive stage.
        figure_amplifier: Name of the amplifier whose GBW is the figure; the first one if None.
        tolerances: Part name to relative tolerance, for ``parts()``.

    Raises:
        Misuse: No stage, an amplifier missing or too many, or two amplifiers of one name.
    """

    stages: tuple[tuple[Stage, Amplifier | None], ...]
    figure_amplifier: str | None = field(default=None, kw_only=True)
    tolerances: Mapping[str, float] = field(default_factory=dict, kw_only=True)

    def __post_init__(self) -> None:
        if not self.stages:
            raise Misuse("a chain needs a stage")
        known: dict[str, Amplifier] = {}
        for stage, amplifier in self.stages:
            if (amplifier is None) is not isinstance(stage, Divider):
                raise Misuse("every stage but a divider has an amplifier")
            if amplifier is not None and known.setdefault(amplifier.name, amplifier) != amplifier:
                raise Misuse(f"two different amplifiers are called {amplifier.name!r}")
        if self.figure_amplifier is not None and self.figure_amplifier not in known:
            raise Misuse(f"no amplifier is called {self.figure_amplifier!r}")

    def response(
        self,
        frequency_hz: FloatArray,
        *,
        gbw_hz: Scalars | None = None,
        factors: Factors | None = None,
        source_ohm: Scalars = 0.0,
    ) -> ComplexArray:
        """Return the gain from the board's input to its output.

        Args:
            frequency_hz: Hertz, above zero, shape (n,).
            gbw_hz: Replaces the GBW of the amplifier whose GBW is the figure.
            factors: Multiplies parts by name (see ``parts``); like ``gbw_hz`` these may be arrays
                that broadcast against the frequencies: (sweeps, 1) gives (sweeps, n).
            source_ohm: Output resistance of the source when gain counts from its open-circuit
                level; 0 when the level is read at the board's input.

        Returns:
            Gain, V/V, complex, shape (n,) or as broadcast.
        """
        s = complex_frequency(frequency_hz)
        return self._through(s, self._changed(factors, gbw_hz), source_ohm)[-1]

    def at_each_output(self, frequency_hz: FloatArray) -> tuple[ComplexArray, ...]:
        """Return the gain from the board's input to each stage's output, each of shape (n,)."""
        return tuple(self._through(complex_frequency(frequency_hz), self.stages, 0.0))

    def plateau(self, *, factors: Factors | None = None, source_ohm: Scalars = 0.0) -> Scalars:
        """Return the gain between the corners: series capacitors short, all others absent.

        The loss through finite open-loop gain is in it; that through finite bandwidth is not.
        """
        changed = self._changed(factors, None)
        flat = tuple((without_capacitors(stage), amplifier) for stage, amplifier in changed)
        gain = np.abs(self._through(np.zeros(1, complex), flat, source_ohm)[-1])
        return float(gain[0]) if gain.ndim == 1 else gain

    @property
    def figure_stages(self) -> tuple[int, ...]:
        """Places, counted from 1, of the stages that hold the amplifier whose GBW is the figure."""
        name = self._figure_name
        return tuple(
            place
            for place, (_, amplifier) in enumerate(self.stages, start=1)
            if amplifier is not None and amplifier.name == name
        )

    @property
    def gbw_hz(self) -> float:
        """Typical GBW of the amplifier whose GBW is the figure.

        Raises:
            Misuse: The chain is passive.
        """
        for amplifier in self.amplifiers():
            if amplifier.name == self._figure_name:
                return float(amplifier.gbw_hz)
        raise Misuse("a passive chain has no GBW")

    @property
    def noise_gain(self) -> float:
        """Mid-band noise gain where the GBW is the figure; the largest if there are several.

        Raises:
            Misuse: The chain is passive.
        """
        if not self.figure_stages:
            raise Misuse("a passive chain has no noise gain")
        at_rest = np.zeros(1, complex)
        flat = [without_capacitors(self.stages[place - 1][0]) for place in self.figure_stages]
        return max(float(np.abs(stage.noise_gain(at_rest, 0.0))) for stage in flat)

    def parts(self) -> tuple[Part, ...]:
        """Return every part that has a tolerance of its own, with names that ``factors`` takes.

        These are the resistors and capacitors of each stage, second poles, and the GBW of every
        amplifier but the one whose GBW is the figure.
        """
        found = [
            item
            for place, (stage, _) in enumerate(self.stages, start=1)
            for item in stage_parts(stage, place)
        ]
        for amplifier in self.amplifiers():
            named = f"amplifier.{amplifier.name}"
            if amplifier.name != self._figure_name:
                found.append((f"{named}.gbw", float(amplifier.gbw_hz), "Hz"))
            if amplifier.second_pole_hz is not None:
                found.append((f"{named}.second_pole", float(amplifier.second_pole_hz), "Hz"))
        return tuple(
            Part(name=name, value=value, unit=unit, tolerance=self.tolerances.get(name, 0.0))
            for name, value, unit in found
        )

    def amplifiers(self) -> tuple[Amplifier, ...]:
        """Return each amplifier once, in the order in which the signal meets them."""
        met = {one.name: one for _, one in reversed(self.stages) if one is not None}
        return tuple(reversed(met.values()))

    @property
    def _figure_name(self) -> str | None:
        if self.figure_amplifier is not None:
            return self.figure_amplifier
        return next((one.name for _, one in self.stages if one is not None), None)

    def _changed(
        self, factors: Factors | None, gbw_hz: Scalars | None
    ) -> tuple[tuple[Stage, Amplifier | None], ...]:
        """Return the stages with other part values; a factor that names no part is a bug."""
        factors = _NO_FACTORS if factors is None else factors
        if factors:
            unknown = set(factors) - {part.name for part in self.parts()}
            if unknown:
                raise Misuse(f"no part is called {min(unknown)!r}")
        if not factors and gbw_hz is None:
            return self.stages
        figure = self._figure_name
        changed = []
        for place, (stage, amplifier) in enumerate(self.stages, start=1):
            other = None if amplifier is None else scaled_amplifier(amplifier, factors)
            if other is not None and gbw_hz is not None and other.name == figure:
                other = replace(other, gbw_hz=gbw_hz)
            changed.append((scaled_stage(stage, place, factors), other))
        return tuple(changed)

    @staticmethod
    def _through(
        s: ComplexArray,
        stages: tuple[tuple[Stage, Amplifier | None], ...],
        source_ohm: Scalars,
    ) -> list[ComplexArray]:
        """Return the gain from the input to the output of each stage."""
        gain: ComplexArray = np.ones_like(s)
        driving: Any = source_ohm
        gains = []
        for stage, amplifier in stages:
            gain = gain * stage_response(stage, amplifier, s=s, source_ohm=driving)
            driving = output_impedance(stage, s=s, source_ohm=driving)
            gains.append(gain)
        return gains
