"""Swept tables in many layouts, each read back to the same curve.

The layouts differ pairwise in at least two of: columns, units, header, delimiter and decimal
mark, encoding and line ends, what stands above and below.
"""

import math
from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np
import pytest

from benchlog.capture.read import Told, inspect_captures
from benchlog.curve import FloatArray

FREQUENCY_HZ = np.round(np.logspace(2, 6, 25), 2)
PHASE_RAD = -np.arctan(FREQUENCY_HZ / 62.5e3)
GAIN = 48.0 / np.hypot(1.0, FREQUENCY_HZ / 62.5e3)
INPUT_VRMS = 7.07e-3


@dataclass(frozen=True)
class Layout:
    """One way to write the curve."""

    columns: tuple[str, ...]
    values: tuple[Callable[[], FloatArray], ...]
    delimiter: str = ","
    decimal: str = "."
    encoding: str = "utf-8"
    end: str = "\n"
    above: str = ""
    below: str = ""
    second: tuple[str, ...] = ()
    form: str = ".8g"
    trailing: bool = False
    order: int = 1
    units: dict[str, str] = field(default_factory=dict)
    tail: str = ""


def hz(scale: float = 1.0) -> Callable[[], FloatArray]:
    """Return the frequencies, scaled."""
    return lambda: FREQUENCY_HZ / scale


def log_hz() -> FloatArray:
    """Return log10 of hertz."""
    return np.asarray(np.log10(FREQUENCY_HZ))


def ratio() -> FloatArray:
    """Return V/V."""
    return GAIN


def db() -> FloatArray:
    """Return decibels."""
    return np.asarray(20 * np.log10(GAIN))


def level(side: str, unit: str) -> Callable[[], FloatArray]:
    """Return input or output in a unit of level."""
    vrms = np.full(GAIN.shape, INPUT_VRMS) if side == "in" else INPUT_VRMS * GAIN
    scales = {"Vrms": 1.0, "mVrms": 1e3, "Vpp": math.sqrt(8), "mVpp": 1e3 * math.sqrt(8),
              "Vpk": math.sqrt(2), "V": 1.0, "mV": 1e3}  # fmt: skip
    if unit in scales:
        return lambda: vrms * scales[unit]
    reference = {"dBV": 1.0, "dBu": math.sqrt(0.6), "dBm": math.sqrt(0.05)}[unit]
    return lambda: np.asarray(20 * np.log10(vrms / reference))


def degrees() -> FloatArray:
    """Return the phase."""
    return np.asarray(np.degrees(PHASE_RAD))


def radians() -> FloatArray:
    """Return the phase."""
    return np.asarray(PHASE_RAD)


def percent() -> FloatArray:
    """Return an uncertainty of gain."""
    return np.full(GAIN.shape, 0.1)


LAYOUTS: dict[str, Layout] = {
    "house names": Layout(("frequency_hz", "gain"), (hz(), ratio)),
    "house names in dB, semicolons": Layout(("frequency_hz", "gain_db"), (hz(), db), delimiter=";"),
    "house levels, tabs": Layout(
        ("frequency_hz", "input_vrms", "output_vrms"),
        (hz(), level("in", "Vrms"), level("out", "Vrms")),
        delimiter="\t",
    ),
    "brackets, kHz and dB": Layout(("Frequency (kHz)", "Gain (dB)"), (hz(1e3), db), above="x\n"),
    "square brackets, MHz": Layout(
        ("Freq [MHz]", "Gain [V/V]"), (hz(1e6), ratio), delimiter=";", form=".9g"
    ),
    "slash units": Layout(("f / Hz", "gain / dB"), (hz(), db), delimiter="\t", end="\r\n"),
    "decimal comma": Layout(("Frequenz (Hz)", "Gain (dB)"), (hz(), db), delimiter=";", decimal=","),
    "decimal comma after sep line": Layout(
        ("Freq (kHz)", "Mag (dB)"), (hz(1e3), db), delimiter=";", decimal=",", above="sep=;\n"
    ),
    "decimal comma and tabs": Layout(
        ("f (Hz)", "Ratio (V/V)"), (hz(), ratio), delimiter="\t", decimal=",", encoding="latin-1"
    ),
    "decimal comma and blanks": Layout(
        ("freq_hz", "gain_db"), (hz(), db), delimiter="  ", decimal=",", above="# one\n"
    ),
    "units in a second row": Layout(
        ("Frequency", "Gain"), (hz(), db), second=("Hz", "dB"), above="a,b,c,d\n"
    ),
    "units in brackets in a second row": Layout(
        ("Freq", "Magnitude"),
        (hz(1e3), ratio),
        second=("(kHz)", "(V/V)"),
        delimiter=";",
        above="x\n",
    ),
    "byte order mark": Layout(
        ("Frequency (Hz)", "Gain (dB)"), (hz(), db), encoding="utf-8-sig", end="\r\n"
    ),
    "UTF-16 with mark": Layout(
        ("Frequency (Hz)", "Vin (Vpp)", "Vout (Vpp)"),
        (hz(), level("in", "Vpp"), level("out", "Vpp")),
        encoding="utf-16",
    ),
    "UTF-16 without mark": Layout(
        ("f (kHz)", "in (mVrms)", "out (mVrms)"),
        (hz(1e3), level("in", "mVrms"), level("out", "mVrms")),
        encoding="utf-16-le",
        delimiter=";",
    ),
    "old line ends": Layout(("freq_hz", "gain_db", "phase_deg"), (hz(), db, degrees), end="\r"),
    "trailing delimiter": Layout(
        ("Frequency (Hz)", "Gain (dB)"), (hz(), db), trailing=True, below="end\n"
    ),
    "preamble of keys": Layout(
        ("Frequency (Hz)", "Gain (V/V)"),
        (hz(), ratio),
        above="Operator,nobody\nDate,2026-01-01\nPoints,25\n\n",
    ),
    "footer": Layout(
        ("Frequency (Hz)", "Gain (dB)", "Phase (deg)"), (hz(), db, degrees), below="\nend of data\n"
    ),
    "comment marks": Layout(
        ("# Frequency (Hz)", "Gain (dB)"), (hz(), db), above="# invented\n", delimiter="\t"
    ),
    "descending": Layout(("Frequency (Hz)", "Gain (V/V)"), (hz(), ratio), order=-1, end="\r\n"),
    "log10 frequency": Layout(("log10 f (Hz)", "Gain (dB)"), (log_hz, db), form=".12g"),
    "peak volts": Layout(
        ("Frequency (Hz)", "Input (Vpk)", "Output (Vpk)"),
        (hz(), level("in", "Vpk"), level("out", "Vpk")),
        delimiter=";",
    ),
    "peak to peak against RMS": Layout(
        ("Frequency (Hz)", "Input (mVpp)", "Output (Vrms)"),
        (hz(), level("in", "mVpp"), level("out", "Vrms")),
        above="levels of two instruments\n",
    ),
    "plain volts on both sides": Layout(
        ("Frequency (kHz)", "Vin (mV)", "Vout (V)"),
        (hz(1e3), level("in", "mV"), level("out", "V")),
        delimiter="\t",
        end="\r\n",
    ),
    "dBV": Layout(
        ("Frequency (Hz)", "In (dBV)", "Out (dBV)"),
        (hz(), level("in", "dBV"), level("out", "dBV")),
        delimiter="|",
    ),
    "dBu and dBV": Layout(
        ("freq (Hz)", "input (dBu)", "output (dBV)"),
        (hz(), level("in", "dBu"), level("out", "dBV")),
        delimiter=";",
        decimal=",",
    ),
    "dBm on both sides": Layout(
        ("freq (MHz)", "input (dBm)", "output (dBm)"),
        (hz(1e6), level("in", "dBm"), level("out", "dBm")),
        form=".10g",
    ),
    "phase in radians": Layout(
        ("frequency_hz", "gain_db", "phase_rad"), (hz(), db, radians), delimiter=";", end="\r\n"
    ),
    "degrees sign": Layout(
        ("Frequency (Hz)", "Gain (dB)", "Phase (°)"), (hz(), db, degrees), encoding="latin-1"
    ),
    "uncertainty column": Layout(
        ("frequency_hz", "gain", "u_gain (%)"), (hz(), ratio, percent), above="with u\n"
    ),
    "exponents with plus": Layout(
        ("Frequency (Hz)", "Gain (V/V)"), (hz(), ratio), form="+.9E", delimiter="\t"
    ),
    "exponents with D": Layout(
        ("Frequency (Hz)", "Gain (dB)"), (hz(), db), form="D", above="fixed form\n"
    ),
    "no header, units told": Layout(
        (), (hz(), db), units={"frequency": "Hz", "gain": "dB"}, delimiter=";", end="\r\n"
    ),
    "no header, amplitudes told": Layout(
        (),
        (hz(1e3), level("in", "Vpp"), level("out", "Vpp")),
        units={"frequency": "kHz", "input": "Vpp", "output": "Vpp"},
    ),
    "unit told for one column": Layout(
        ("Frequency (Hz)", "Gain"), (hz(), db), units={"gain": "dB"}, delimiter="\t", decimal=","
    ),
    "mixed line ends": Layout(
        ("Frequency (Hz)", "Magnitude (dB)"), (hz(), db), end="\r\n", above="first\nsecond\r"
    ),
    "quoted header and cells": Layout(
        ('"Frequency (Hz)"', '"Gain (dB)"'), (hz(), db), form='"', delimiter=";"
    ),
    "cut last line": Layout(
        ("Frequency (Hz)", "Gain (V/V)"), (hz(), ratio), tail="1.2E-", delimiter=";"
    ),
    "overloads at the end": Layout(
        ("Frequency (Hz)", "Gain (dB)"),
        (hz(), db),
        tail="2e6,OVLD\n3e6,9.9E37\n4e6,---\n",
        end="\r\n",
    ),
    "extra columns": Layout(
        ("n", "Frequency (Hz)", "Gain (dB)", "Remark no"),
        (lambda: np.arange(25.0), hz(), db, lambda: np.zeros(25)),
        end="\r\n",
    ),
    "preamble longer than the table": Layout(
        ("freq_hz", "ratio (V/V)"),
        (hz(), ratio),
        above="".join(f"key {n}: words\n" for n in range(60)),
    ),
}


def cell(value: float, layout: Layout) -> str:
    """Write one number."""
    if layout.form == "D":
        text = f"{value:.9E}".replace("E", "D")
    elif layout.form == '"':
        text = f'"{value:.9g}"'
    else:
        text = format(value, layout.form)
    return text.replace(".", layout.decimal)


def written(layout: Layout) -> bytes:
    """Write the curve in a layout."""
    columns = [values()[:: layout.order] for values in layout.values]
    lines = [layout.delimiter.join(layout.columns)] if layout.columns else []
    lines += [layout.delimiter.join(layout.second)] if layout.second else []
    for row in zip(*columns, strict=True):
        line = layout.delimiter.join(cell(value, layout) for value in row)
        lines.append(line + layout.delimiter * layout.trailing)
    body = layout.end.join([*lines, layout.tail])
    return (layout.above + body + layout.below).encode(layout.encoding)


@pytest.mark.parametrize("name", LAYOUTS)
def test_layout_is_the_curve(tmp_path: Path, name: str) -> None:
    """Frequencies, gains, and phases where they are, to the digits written."""
    layout = LAYOUTS[name]
    file = tmp_path / "table.csv"
    file.write_bytes(written(layout))

    (capture,) = inspect_captures([file], told=Told(units=layout.units))

    curve = capture.curve
    assert curve.frequency_hz == pytest.approx(FREQUENCY_HZ, rel=1e-6)
    assert curve.gain == pytest.approx(GAIN, rel=1e-5)
    if any("ph" in column.lower() for column in layout.columns):
        assert curve.phase_deg == pytest.approx(np.degrees(PHASE_RAD), abs=1e-4)
    if "u_gain (%)" in layout.columns:
        assert curve.u_gain_rel == pytest.approx(np.full(25, 1e-3))


def aspects(layout: Layout) -> tuple[object, ...]:
    """Return what a layout is made of: the things in which two of them may differ."""
    return (
        len(layout.values),
        layout.columns + layout.second + tuple(layout.units.items()),
        (layout.delimiter, layout.decimal),
        (layout.encoding, layout.end),
        (layout.above, layout.below, layout.tail, layout.trailing),
        (layout.form, layout.order),
    )


def test_layouts_are_many_and_differ() -> None:
    """Forty or more, pairwise different in two aspects."""
    assert len(LAYOUTS) >= 40
    known = list(LAYOUTS.items())
    for place, (name, layout) in enumerate(known):
        for other_name, other in known[:place]:
            pairs = zip(aspects(layout), aspects(other), strict=True)
            assert sum(a != b for a, b in pairs) >= 2, f"{name} and {other_name}"
