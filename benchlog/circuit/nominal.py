"""What a chain gives with every part at its nominal value: the figures of the design itself."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from benchlog.circuit.chain import Chain
from benchlog.curve import FloatArray
from benchlog.notation import decibels

HALF_POWER = np.sqrt(0.5)
# Wide enough for any board, and fine enough that no pair of crossings hides between two points.
_GRID_HZ: FloatArray = np.logspace(-4, 13, 17 * 100 + 1)
_BISECTIONS = 60


@dataclass(frozen=True, slots=True, kw_only=True)
class Nominal:
    """Figures of the design; a corner is None where the response has none.

    Attributes:
        gain, gain_db: Plateau: gain at zero frequency, or between the corners.
        corner_hz: Last downward crossing of plateau/sqrt(2), where the response stays below it.
        lower_corner_hz: First upward crossing of plateau/sqrt(2), where it comes from below.
        noise_gain: Of the stage whose GBW is the figure.
        gbw_hz: Typical, of that amplifier.
        peaking_db: How far the response rises above the plateau; 0 when it does not.
        peaking_hz: Where it is highest; None when it does not rise.
    """

    gain: float
    gain_db: float
    corner_hz: float | None
    lower_corner_hz: float | None
    noise_gain: float | None
    gbw_hz: float | None
    peaking_db: float
    peaking_hz: float | None


def nominal_figures(chain: Chain, *, source_ohm: float = 0.0) -> Nominal:
    """Compute the figures of a chain's own response.

    Args:
        chain: The board's stages.
        source_ohm: Output resistance of the source when gain counts from its open-circuit level.
    """
    plateau = float(chain.plateau(source_ohm=source_ohm))

    def relative(frequency_hz: FloatArray) -> FloatArray:
        return np.abs(chain.response(frequency_hz, source_ohm=source_ohm)) / plateau

    on_grid = relative(_GRID_HZ)
    above = on_grid >= HALF_POWER
    crossings = np.flatnonzero(above[:-1] != above[1:])
    has_upper, has_lower = crossings.size > 0 and not above[-1], crossings.size > 0 and not above[0]
    peaking_hz, height = _highest(relative, on_grid)
    has_amplifier = bool(chain.figure_stages)
    return Nominal(
        gain=plateau,
        gain_db=decibels(plateau),
        corner_hz=_crossing(relative, int(crossings[-1])) if has_upper else None,
        lower_corner_hz=_crossing(relative, int(crossings[0])) if has_lower else None,
        noise_gain=chain.noise_gain if has_amplifier else None,
        gbw_hz=chain.gbw_hz if has_amplifier else None,
        peaking_db=max(0.0, decibels(height)) if peaking_hz is not None else 0.0,
        peaking_hz=peaking_hz,
    )


def _crossing(relative: Callable[[FloatArray], FloatArray], place: int) -> float:
    """Bisect, in the logarithm of frequency, the crossing right of a place in the grid."""
    low, high = np.log(_GRID_HZ[place]), np.log(_GRID_HZ[place + 1])
    falling = relative(_GRID_HZ[place : place + 1])[0] >= HALF_POWER
    for _ in range(_BISECTIONS):
        middle = 0.5 * (low + high)
        still_before = (relative(np.exp([middle]))[0] >= HALF_POWER) == falling
        low, high = (middle, high) if still_before else (low, middle)
    return float(np.exp(0.5 * (low + high)))


def _highest(
    relative: Callable[[FloatArray], FloatArray], on_grid: FloatArray
) -> tuple[float | None, float]:
    """Return where the response is highest and how high, None where it does not rise."""
    place = int(np.argmax(on_grid))
    if on_grid[place] <= 1.0 + 1e-9 or place in {0, on_grid.size - 1}:
        return None, 1.0
    near: FloatArray = np.logspace(
        np.log10(_GRID_HZ[place - 1]), np.log10(_GRID_HZ[place + 1]), 2001
    )
    heights = relative(near)
    best = int(np.argmax(heights))
    return float(near[best]), float(heights[best])
