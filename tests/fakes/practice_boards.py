"""Parts lists written by hand, for tests that want no design file."""

import math

import numpy as np

from benchlog.practice.board import PracticeBoard
from benchlog.practice.parts import Part, PartsList
from benchlog.practice.wiring import StageKind


def parts_list(
    *stages: tuple[str, dict[str, float]],
    tolerance_rel: float = 0.01,
    amplifier: dict[str, float] | None = None,
) -> PartsList:
    """Return a parts list of stages that share one amplifier kind, ``main``.

    Args:
        stages: Topology and values by their key in a design file.
        tolerance_rel: Of every part.
        amplifier: Values by key; 1 MHz of GBW when left out.
    """
    parts = {
        f"stage[{number}].{key}": Part.within(value, tolerance_rel)
        for number, (_, values) in enumerate(stages, start=1)
        for key, value in values.items()
    }
    parts |= {
        f"amplifier.main.{key}": Part.within(value, tolerance_rel)
        for key, value in (amplifier or {"gbw": 1e6}).items()
    }
    kinds = tuple(StageKind(topology=topology, amplifier="main") for topology, _ in stages)
    return PartsList(kinds=kinds, parts=parts)


def corner_hz(board: PracticeBoard) -> float:
    """Return where gain has fallen to half power of its value at 1 mHz, by bisection."""
    plateau = abs(board.gain(np.array([1e-3]))[0])
    low, high = 1e-3, 1e9
    for _ in range(60):
        middle = math.sqrt(low * high)
        above = abs(board.gain(np.array([middle]))[0]) > plateau / math.sqrt(2)
        low, high = (middle, high) if above else (low, middle)
    return low


PREAMP = parts_list(
    ("non-inverting", {"feedback": 47e3, "ground": 1e3}),
    amplifier={"gbw": 3e6, "slew_rate": 13e6, "output_swing": 10.5},
)
