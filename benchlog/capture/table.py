"""From a block of numbers to a swept curve in hertz and V/V."""

import math
from collections.abc import Mapping
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from benchlog.capture.block import Block
from benchlog.capture.columns import Column, Kind
from benchlog.curve import FloatArray, GainCurve
from benchlog.errors import CaptureError

_HERTZ = {"Hz": 1.0, "kHz": 1e3, "MHz": 1e6, "GHz": 1e9}
_VRMS = {
    "Vrms": 1.0,
    "Vpk": math.sqrt(0.5),
    "Vpp": math.sqrt(0.125),
    # Peak, RMS or peak to peak is not said; in a ratio of two such columns it cancels.
    "V": 1.0,
}
_DB_REFERENCE_VRMS = {"dBV": 1.0, "dBu": math.sqrt(0.6), "dBm": math.sqrt(0.05)}

_WIDEST_RAD = 7.0


class Swept(NamedTuple):
    """A curve, and what was done to the rows to get it."""

    curve: GainCurve
    notes: tuple[str, ...]


def swept_curve(block: Block, columns: tuple[Column, ...]) -> Swept:
    """Convert, sort, and average repeated frequencies.

    Raises:
        CaptureError: A frequency or a gain that no sweep can have, or no row with numbers.
    """
    by_kind = {column.kind: column for column in columns}
    _refuse_mixed_levels(by_kind)
    table = np.array(block.rows, dtype=float)
    values = {kind: table[:, column.place] for kind, column in by_kind.items()}
    whole = np.all(np.isfinite(np.stack(list(values.values()))), axis=0)
    notes = []
    if not whole.all():
        notes.append(_left_out(int((~whole).sum())))
    lines = np.asarray(block.lines, dtype=np.int64)[whole]
    if not whole.any():
        raise CaptureError(
            "no row holds numbers in all columns that are needed",
            where=f"line {block.lines[0]} to line {block.lines[-1]}",
            expected="numbers, not overloads, for " + ", ".join(column.name for column in columns),
        )
    picked = {kind: column[whole] for kind, column in values.items()}
    frequency_hz = _frequencies(picked["frequency"], by_kind["frequency"], lines)
    gain = _gains(picked, by_kind, lines)
    phase_deg = _phase(picked, by_kind)
    u_gain_rel = _noise(picked, by_kind, lines)
    notes += _degrees_for_radians(phase_deg, by_kind)
    order = np.argsort(frequency_hz, kind="stable")
    if np.any(np.diff(order) < 0):
        notes.append("the rows were not in rising frequency and were sorted")
    arrays = _averaged(
        frequency_hz[order],
        [None if a is None else a[order] for a in (gain, phase_deg, u_gain_rel)],
    )
    if arrays[0].size < frequency_hz.size:
        repeats = frequency_hz.size - arrays[0].size
        notes.append(f"{repeats} rows repeat a frequency and were averaged")
    frequencies, (gains, phases, noises) = arrays
    assert gains is not None
    curve = GainCurve(frequencies, gains, phases, noises)
    return Swept(curve, tuple(notes))


def _left_out(count: int) -> str:
    rows = "1 row holds no number" if count == 1 else f"{count} rows hold no number"
    return f"{rows} (overload, empty) and {'is' if count == 1 else 'are'} left out"


def _frequencies(values: FloatArray, column: Column, lines: npt.NDArray[np.int64]) -> FloatArray:
    with np.errstate(over="ignore"):
        hertz = 10.0**values if column.unit == "log10(Hz)" else values * _HERTZ[column.unit]
    _refuse(
        ~np.isfinite(hertz) | (hertz <= 0),
        values,
        lines=lines,
        column=column,
        expected="a frequency above zero",
    )
    return hertz


def _gains(
    picked: Mapping[Kind, FloatArray], by_kind: Mapping[Kind, Column], lines: npt.NDArray[np.int64]
) -> FloatArray:
    if "gain" in by_kind:
        column = by_kind["gain"]
        values = picked["gain"]
        with np.errstate(over="ignore", under="ignore"):
            gains = 10.0 ** (values / 20.0) if column.unit == "dB" else values
        _refuse(
            ~np.isfinite(gains) | (gains <= 0),
            values,
            lines=lines,
            column=column,
            expected="a gain above zero",
        )
        return np.asarray(gains)
    levels = {}
    for kind in ("input", "output"):
        column = by_kind[kind]
        levels[kind] = _level_vrms(picked[kind], column)
        wrong = ~np.isfinite(levels[kind]) | (levels[kind] <= 0)
        _refuse(wrong, picked[kind], lines=lines, column=column, expected="a level above zero")
    return levels["output"] / levels["input"]


def _level_vrms(values: FloatArray, column: Column) -> FloatArray:
    unit = column.unit
    if unit in _DB_REFERENCE_VRMS:
        with np.errstate(over="ignore", under="ignore"):
            return np.asarray(_DB_REFERENCE_VRMS[unit] * 10.0 ** (values / 20.0))
    scale = 1e-3 if unit.startswith("m") else 1.0
    return values * scale * _VRMS[unit.removeprefix("m")]


def _refuse_mixed_levels(by_kind: Mapping[Kind, Column]) -> None:
    """Refuse plain volts beside a unit that says peak or RMS, and a power beside a voltage."""
    if "gain" in by_kind or not {"input", "output"} <= set(by_kind):
        return
    units = [by_kind[kind].unit.removeprefix("m") for kind in ("input", "output")]
    for vague, why in (("V", "does not say peak or RMS"), ("dBm", "is a power: into which load?")):
        if (units[0] == vague) != (units[1] == vague):
            kind: Kind = "input" if units[0] == vague else "output"
            raise CaptureError(
                f"the unit of column {by_kind[kind].name!r} {why}",
                where=f"column {by_kind[kind].place + 1}",
                expected="the same kind of unit for input and output",
                hint=f"say it with --unit {kind}=Vrms (or Vpp, Vpk)",
            )


def _phase(picked: Mapping[Kind, FloatArray], by_kind: Mapping[Kind, Column]) -> FloatArray | None:
    if "phase" not in by_kind:
        return None
    values = picked["phase"]
    return np.degrees(values) if by_kind["phase"].unit == "rad" else values


def _degrees_for_radians(phase_deg: FloatArray | None, by_kind: Mapping[Kind, Column]) -> list[str]:
    """Note a phase in radians that turns further than a board can."""
    if phase_deg is None or by_kind["phase"].unit != "rad":
        return []
    span_rad = float(np.radians(np.ptp(phase_deg)))
    if span_rad <= _WIDEST_RAD:
        return []
    return [f"the phase spans {span_rad:.3g} rad: are these degrees? It was kept as read"]


def _noise(
    picked: Mapping[Kind, FloatArray], by_kind: Mapping[Kind, Column], lines: npt.NDArray[np.int64]
) -> FloatArray | None:
    if "u_gain" not in by_kind:
        return None
    column = by_kind["u_gain"]
    values = picked["u_gain"]
    scale = {"rel": 1.0, "%": 0.01, "dB": math.log(10.0) / 20.0}[column.unit]
    _refuse(values <= 0, values, lines=lines, column=column, expected="an uncertainty above zero")
    return values * scale


def _refuse(
    wrong: npt.NDArray[np.bool_],
    values: FloatArray,
    *,
    lines: npt.NDArray[np.int64],
    column: Column,
    expected: str,
) -> None:
    at = np.flatnonzero(wrong)
    if at.size:
        raise CaptureError(
            f"{column.name} is {values[at[0]]:g} {column.unit}",
            where=f"line {lines[at[0]]}, column {column.place + 1}",
            expected=expected,
            hint="is the unit right? --unit says another",
        )


def _averaged(
    frequency_hz: FloatArray, columns: list[FloatArray | None]
) -> tuple[FloatArray, list[FloatArray | None]]:
    """Average rows of the same frequency; the frequencies rise."""
    unique, place, count = np.unique(frequency_hz, return_inverse=True, return_counts=True)
    if unique.size == frequency_hz.size:
        return frequency_hz, columns
    averaged = [
        None if column is None else np.bincount(place, column) / count for column in columns
    ]
    return unique, averaged
