"""What a maker wrote down about a board: the circuit, its budget, how to drive and sweep it."""

import json
from collections.abc import Mapping
from dataclasses import asdict, dataclass, field

from benchlog.circuit.amplifier import Amplifier
from benchlog.circuit.chain import Chain
from benchlog.circuit.stage import Stage
from benchlog.records import RuleName


@dataclass(frozen=True, slots=True, kw_only=True)
class Line:
    """One figure with its limits.

    Attributes:
        figure: Field name of ``records.Figures``: ``"gain_db"``.
        key: The key as written in the file: ``"gain"``.
        minimum, maximum: Limits in ``unit``; at least one is there.
        unit: ``"dB"``, ``"V/V"`` or ``"Hz"``.
        rule, guard: What differs from the budget's own rule and guard; None where nothing does.
    """

    figure: str
    key: str
    minimum: float | None
    maximum: float | None
    unit: str
    rule: RuleName | None = None
    guard: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Budget:
    """What a board must meet.

    Attributes:
        rule: Decision rule of every line that names none.
        guard: Guard band in multiples of the expanded uncertainty U, for lines that name none.
        lines: At least one.
    """

    rule: RuleName
    guard: float
    lines: tuple[Line, ...]

    def text(self) -> str:
        """Return the budget as JSON text, the same text for the same budget."""
        return json.dumps(asdict(self), sort_keys=True)


@dataclass(frozen=True, slots=True, kw_only=True)
class LevelAbove:
    """A level that holds from a frequency upwards: hertz, and V RMS at the board's input."""

    above_hz: float
    level_vrms: float


@dataclass(frozen=True, slots=True, kw_only=True)
class SweepSettings:
    """What the design says about its own sweep; None where the tool is to choose.

    Attributes:
        start_hz, stop_hz: First and last frequency.
        per_decade: Points per decade.
        levels: Rising in frequency; below the first of them the drive level holds.
    """

    start_hz: float | None = None
    stop_hz: float | None = None
    per_decade: int | None = None
    levels: tuple[LevelAbove, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class PlacedStage:
    """A stage of the design: its topology's name, its parts, and the amplifier in it, by name."""

    topology: str
    stage: Stage
    amplifier: str | None


@dataclass(frozen=True, slots=True, kw_only=True)
class Design:
    """One revision of a design.

    Attributes:
        name, revision: What people call it.
        text: The file as it was read, so that it can be kept beside what was measured.
        sha256: Of the file's bytes, hexadecimal.
        stages: In the order of the signal.
        amplifiers: Every amplifier, once.
        figure_amplifier: Name of the amplifier whose GBW is the figure; None without amplifiers.
        tolerances: Part name to relative tolerance, for every part of ``chain().parts()``.
        rails_v: Lowest and highest supply voltage.
        drive_level_vrms: Level at the board's input; None when the design leaves it open.
        budget: What a board must meet.
        sweep: How to sweep it.
    """

    name: str
    revision: str
    text: str
    sha256: str
    stages: tuple[PlacedStage, ...]
    amplifiers: tuple[Amplifier, ...]
    figure_amplifier: str | None
    tolerances: Mapping[str, float]
    budget: Budget
    rails_v: tuple[float, float] | None = None
    drive_level_vrms: float | None = None
    sweep: SweepSettings = field(default_factory=SweepSettings)

    def chain(self) -> Chain:
        """Return the design's stages in cascade, with every part at its nominal value."""
        by_name = {amplifier.name: amplifier for amplifier in self.amplifiers}
        return Chain(
            tuple(
                (placed.stage, None if placed.amplifier is None else by_name[placed.amplifier])
                for placed in self.stages
            ),
            figure_amplifier=self.figure_amplifier,
            tolerances=self.tolerances,
        )

    def drive_level_at(self, frequency_hz: float) -> float | None:
        """Return the level at the board's input for one frequency, V RMS; None when left open."""
        level_vrms = self.drive_level_vrms
        for step in self.sweep.levels:
            if frequency_hz >= step.above_hz:
                level_vrms = step.level_vrms
        return level_vrms
