"""The parts list of a board: every value with the band in which a good part lies."""

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, fields

from benchlog.design.model import Design, PlacedStage
from benchlog.practice.wiring import StageKind
from benchlog.practice.world import uniform_draw


@dataclass(frozen=True, slots=True, kw_only=True)
class Part:
    """A part as the design names it.

    Attributes:
        nominal: Its value: ohm, farad, hertz, V/V, V/s or V.
        lowest, highest: Between which a good part lies, evenly likely.
    """

    nominal: float
    lowest: float
    highest: float

    @staticmethod
    def within(nominal: float, tolerance_rel: float) -> "Part":
        """Return a part with a relative tolerance to both sides."""
        slack = nominal * tolerance_rel
        return Part(nominal=nominal, lowest=nominal - slack, highest=nominal + slack)

    def drawn(self, chance: float) -> float:
        """Return one part's value for a chance between -1 and 1; 0 gives the nominal one."""
        if self.lowest == self.highest:
            return self.nominal
        span = self.highest - self.nominal if chance > 0 else self.nominal - self.lowest
        return self.nominal + chance * span


@dataclass(frozen=True, slots=True, kw_only=True)
class PartsList:
    """What a board is made of.

    Attributes:
        kinds: The stages in order.
        parts: Parts by their path in the design file: ``"stage[1].feedback"``,
            ``"amplifier.main.gbw"``.
    """

    kinds: tuple[StageKind, ...]
    parts: Mapping[str, Part]

    def values(
        self, *, seed: int | None = None, changes: Mapping[str, float] | None = None
    ) -> dict[str, float]:
        """Return the values of one board.

        Args:
            seed: Chooses every part inside its tolerance; None takes nominal values.
            changes: Values that replace the drawn ones: wrong or broken parts.

        Raises:
            ValueError: A change names a part that the board has not.
        """
        changes = changes or {}
        unknown = sorted(set(changes) - set(self.parts))
        if unknown:
            raise ValueError(f"no part {unknown[0]!r}; there are: {', '.join(self.parts)}")
        values = {
            path: part.nominal if seed is None else part.drawn(uniform_draw(seed, path))
            for path, part in self.parts.items()
        }
        return values | dict(changes)


def parts_list(design: Design) -> PartsList:
    """Return the parts list of a design.

    Resistors, capacitors and second poles lie evenly inside their tolerance, a GBW between what
    the design gives as its least and its most; what the design gives no band for is exact.
    """
    kinds = tuple(_kind(placed) for placed in design.stages)
    parts = {
        path: Part.within(value, design.tolerances.get(path, 0.0))
        for number, placed in enumerate(design.stages, start=1)
        for path, value in _stage_parts(placed, number)
    }
    return PartsList(kinds=kinds, parts=parts | dict(_amplifier_parts(design)))


def _kind(placed: PlacedStage) -> StageKind:
    """Read what of a stage is no value; a topology has only the attributes it needs."""
    return StageKind(
        topology=placed.topology,
        amplifier=placed.amplifier,
        legs=len(getattr(placed.stage, "inputs_ohm", ())),
        driven=getattr(placed.stage, "driven", 1),
        grounded=getattr(placed.stage, "undriven", "grounded") == "grounded",
    )


def _stage_parts(placed: PlacedStage, number: int) -> Iterator[tuple[str, float]]:
    for field in fields(placed.stage):  # type: ignore[arg-type] # every topology is a dataclass
        key = field.name.removesuffix("_ohm").removesuffix("_f")
        value = getattr(placed.stage, field.name)
        if key == field.name or not value:
            continue
        path = f"stage[{number}].{key}"
        if isinstance(value, tuple):
            yield from ((f"{path}[{leg}]", float(one)) for leg, one in enumerate(value, start=1))
        else:
            yield path, float(value)


def _amplifier_parts(design: Design) -> Iterator[tuple[str, Part]]:
    for amplifier in design.amplifiers:
        prefix = f"amplifier.{amplifier.name}."
        for key, value in (("gbw", amplifier.gbw_hz), ("second_pole", amplifier.second_pole_hz)):
            if value is not None:
                tolerance = design.tolerances.get(prefix + key, 0.0)
                yield prefix + key, Part.within(float(value), tolerance)
        if amplifier.gbw_min_hz is not None or amplifier.gbw_max_hz is not None:
            yield (
                prefix + "gbw",
                _between(amplifier.gbw_min_hz, float(amplifier.gbw_hz), amplifier.gbw_max_hz),
            )
        exact = {
            "open_loop_gain": amplifier.open_loop_gain,
            "slew_rate": amplifier.slew_rate_v_per_s,
            "output_swing": amplifier.output_swing_v,
            "output_swing_negative": amplifier.output_swing_negative_v,
        }
        for key, value in exact.items():
            if value is not None:
                yield prefix + key, Part(nominal=value, lowest=value, highest=value)


def _between(lowest: float | None, nominal: float, highest: float | None) -> Part:
    """Return a part between two ends; where one is not known it lies as far off as the other."""
    below = nominal - lowest if lowest is not None else None
    above = highest - nominal if highest is not None else None
    if below is None:
        below = above or 0.0
    if above is None:
        above = below
    return Part(nominal=nominal, lowest=nominal - below, highest=nominal + above)
