"""Any curve, written in any dialect, comes back as it was written."""

import math
import time
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from benchlog.capture.read import read_capture

LEVELS = st.floats(min_value=1e-6, max_value=1e6)
ROWS = st.dictionaries(st.floats(min_value=0.1, max_value=1e9), LEVELS, min_size=3, max_size=30)


@settings(max_examples=80, deadline=2000)
@given(
    rows=ROWS,
    dialect=st.sampled_from(
        [(",", "."), (";", "."), (";", ","), ("\t", "."), ("\t", ","), ("|", "."), ("  ", ".")]
    ),
    end=st.sampled_from(["\n", "\r\n", "\r"]),
    encoding=st.sampled_from(["utf-8", "utf-8-sig", "utf-16", "utf-16-le", "latin-1"]),
    scale=st.sampled_from([("Hz", 1.0), ("kHz", 1e3), ("MHz", 1e6)]),
    decibels=st.booleans(),
    form=st.sampled_from([".17g", ".16e", ".17G"]),
    above=st.sampled_from(["", "words\n", "key,1\nother,2\n\n"]),
    behind=st.sampled_from(["", "one", "two"]),
    below=st.sampled_from(["", "\n\n", "end of data\n", "\x1a"]),
    between=st.booleans(),
)
def test_curve_comes_back(
    tmp_path_factory: pytest.TempPathFactory,
    rows: dict[float, float],
    dialect: tuple[str, str],
    end: str,
    encoding: str,
    scale: tuple[str, float],
    form: str,
    above: str,
    behind: str,
    below: str,
    *,
    between: bool,
    decibels: bool,
) -> None:
    """To the last digit but the rounding of decibels and prefixes."""
    delimiter, decimal = dialect
    unit, factor = scale
    tail = {"": "", "one": delimiter, "two": 2 * delimiter}[behind]
    head = f"Frequency ({unit}){delimiter}Gain ({'dB' if decibels else 'V/V'})"
    lines = [head + tail, *[""] * between]
    for frequency_hz, gain in rows.items():
        written = 20 * math.log10(gain) if decibels else gain
        pair = [format(frequency_hz / factor, form), format(written, form)]
        lines.append(delimiter.join(pair).replace(".", decimal) + tail)
    file = tmp_path_factory.getbasetemp() / "dialect.csv"
    file.write_bytes((above + end.join(lines) + end + below).encode(encoding))

    curve = read_capture(file)

    frequencies = sorted({float(format(f / factor, form)) * factor for f in rows})
    assert np.allclose(curve.frequency_hz, frequencies, rtol=1e-12, atol=0)
    by_frequency = [rows[f] for f in sorted(rows)]
    if len(frequencies) == len(rows):
        assert np.allclose(curve.gain, by_frequency, rtol=1e-11, atol=0)


def test_a_long_table_takes_little_time(tmp_path: Path) -> None:
    """Twenty thousand rows well within a second on any machine; two are allowed."""
    rows = "".join(f"{100 + n / 7:.6f};{48 - n / 1e6:.6f}\n" for n in range(20_000))
    file = tmp_path / "long.csv"
    file.write_text("frequency_hz;gain\n" + rows.replace(".", ","))
    begun = time.perf_counter()

    assert len(read_capture(file)) == 20_000
    assert time.perf_counter() - begun < 2.0
