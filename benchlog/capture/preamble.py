"""What the lines above the numbers say: sample interval, start, scale of integer codes."""

import re
from collections.abc import Sequence
from dataclasses import dataclass

from benchlog.capture.cells import Decimal, number

_SPLIT = re.compile(r"[,;:=\t|]+")
_PER_SECOND = {"hz": 1.0, "khz": 1e3, "mhz": 1e6, "ghz": 1e9, "sa/s": 1.0, "s/s": 1.0, "1/s": 1.0,
               "ksa/s": 1e3, "msa/s": 1e6, "gsa/s": 1e9}  # fmt: skip
_SECONDS = {"s": 1.0, "ms": 1e-3, "us": 1e-6, "µs": 1e-6, "ns": 1e-9, "ps": 1e-12}
_STEP = re.compile(r"(x|time|sampl\w*|horizontal)?[ _-]*(incr\w*|interval|step|dt|delta ?t)")
_RATE = re.compile(r"(sampl\w*)[ _-]*(rate|frequency)|fs|rate")
_START = re.compile(r"(x|time|horizontal)?[ _-]*(start|origin|t0|first)[ _-]*(time)?")
_SCALE = re.compile(r"(.*?)[ _-]*(y|vertical|volts?)?[ _-]*(scale|mult\w*|per code|gain)")
_OFFSET = re.compile(r"(.*?)[ _-]*(y|vertical|volts?)?[ _-]*(offset|zero)")


@dataclass(frozen=True, slots=True, kw_only=True)
class Told:
    """What a preamble says about a record; None or empty where it is silent.

    Attributes:
        step_s: Sample interval.
        start_s: Time of the first sample.
        scales, offsets: What makes a code a voltage, by channel order: code * scale + offset.
    """

    step_s: float | None
    start_s: float
    scales: tuple[float, ...]
    offsets: tuple[float, ...]


def read_preamble(lines: Sequence[str], decimal: Decimal) -> Told:
    """Read key-value lines; a line may hold a value for each channel."""
    step_s: float | None = None
    start_s = 0.0
    scales: tuple[float, ...] = ()
    offsets: tuple[float, ...] = ()
    for line in lines:
        key, values, unit = _parted(line, decimal)
        if not values:
            continue
        if _STEP.fullmatch(key):
            step_s = values[0] * _SECONDS.get(unit or "s", 1.0)
        elif _RATE.fullmatch(key) and values[0] > 0:
            step_s = step_s or 1.0 / (values[0] * _PER_SECOND.get(unit or "hz", 1.0))
        elif _START.fullmatch(key):
            start_s = values[0] * _SECONDS.get(unit or "s", 1.0)
        elif _SCALE.fullmatch(key):
            scales = (*scales, *values)
        elif _OFFSET.fullmatch(key):
            offsets = (*offsets, *values)
    return Told(step_s=step_s, start_s=start_s, scales=scales, offsets=offsets)


def _parted(line: str, decimal: Decimal) -> tuple[str, tuple[float, ...], str]:
    """Split a line into its key, its numbers, and the unit behind key or number."""
    cells = [cell.strip().strip('"') for cell in _SPLIT.split(line) if cell.strip()]
    if len(cells) < 2:
        return "", (), ""
    key, unit = cells[0].lower(), ""
    found = re.fullmatch(r"(.*?)\s*[\(\[]\s*(.*?)\s*[\)\]]", key)
    if found:
        key, unit = found[1], found[2]
    values: list[float] = []
    for cell in cells[1:]:
        word, _, behind = cell.partition(" ")
        value = number(word, decimal)
        if value is None:
            if values and not unit:
                unit = cell.lower()
            continue
        values.append(value)
        unit = unit or behind.strip().lower()
    return key, tuple(values), unit
