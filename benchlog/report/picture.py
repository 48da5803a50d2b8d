"""A gain curve drawn in characters: dB upwards, the logarithm of frequency to the right."""

import math
from collections.abc import Sequence

from benchlog.notation import decibels, si
from benchlog.records import Figures, Point

_WIDTH, _HEIGHT = 64, 12
_POINT, _FLAGGED, _CORNER = "o", "x", "|"
_LEAST_SPAN_DB = 6.0


def curve_picture(points: Sequence[Point], figures: Figures | None = None) -> str:
    """Draw the points of a sweep, and its corner where there is one.

    Args:
        points: Points without a gain are left out; flagged ones are drawn as ``x``.
        figures: Gives the corner.

    Returns:
        Lines of at most 78 plain characters; empty where no point has a gain.
    """
    drawn = [point for point in points if point.gain]
    if not drawn:
        return ""
    frame = _Frame(drawn)
    corner = figures.corner_hz if figures is not None else None
    if corner is not None and corner.bound is None:
        frame.upright(corner.value)
    for point in drawn:
        frame.put(point)
    mark = "" if corner is None or corner.bound else f"   {_CORNER} -3 dB point"
    return "\n".join([*frame.lines(), f"{'':9}{_POINT} gain   {_FLAGGED} flagged{mark}"])


class _Frame:
    """Characters on a grid, with its scales."""

    def __init__(self, points: Sequence[Point]) -> None:
        logs = [math.log10(point.frequency_hz) for point in points]
        gains_db = [decibels(point.gain or 1.0) for point in points]
        self.left, self.right = min(logs), max(logs)
        self.top = math.ceil(max(gains_db) / 2.0) * 2.0
        self.bottom = min(math.floor(min(gains_db)), self.top - _LEAST_SPAN_DB)
        self.rows = [[" "] * _WIDTH for _ in range(_HEIGHT)]

    def column(self, frequency_hz: float) -> int:
        span = max(self.right - self.left, 1e-9)
        place = round((math.log10(frequency_hz) - self.left) / span * (_WIDTH - 1))
        return min(max(place, 0), _WIDTH - 1)

    def upright(self, frequency_hz: float) -> None:
        if self.left <= math.log10(frequency_hz) <= self.right:
            for row in self.rows:
                row[self.column(frequency_hz)] = _CORNER

    def put(self, point: Point) -> None:
        height = (self.top - decibels(point.gain or 1.0)) / (self.top - self.bottom)
        row = min(max(round(height * (_HEIGHT - 1)), 0), _HEIGHT - 1)
        self.rows[row][self.column(point.frequency_hz)] = _FLAGGED if point.flags else _POINT

    def lines(self) -> list[str]:
        step = (self.top - self.bottom) / (_HEIGHT - 1)
        lines = []
        for place, row in enumerate(self.rows):
            label = f"{self.top - place * step:5.1f} dB" if place % 3 == 2 or place == 0 else ""
            lines.append(f"{label:>8} |{''.join(row)}".rstrip())
        lines.append(f"{'':8} +{'-' * _WIDTH}")
        left, right = si(10.0**self.left, "Hz", 3), si(10.0**self.right, "Hz", 3)
        lines.append(f"{'':9} {left}{right:>{_WIDTH - len(left)}}")
        return lines
