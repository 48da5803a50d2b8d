"""The parts list of a board: every value with the band in which a good part lies."""

from collections.abc import Mapping
from dataclasses import dataclass

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
