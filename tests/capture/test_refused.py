"""Captures that cannot be read: one error each, with file, line, what was expected, what to do."""

from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from benchlog.capture.read import inspect_captures, read_capture
from benchlog.design.example import EXAMPLE_DESIGN
from benchlog.design.read import parse_design
from benchlog.errors import CaptureError

ROWS = "100,48\n1000,47.9\n10000,47\n100000,25\n"

CASES: dict[str, tuple[bytes, str, str]] = {
    "empty": (b"", "the file is empty", ""),
    "only blanks": (b"\r\n \t\n", "the file is empty", ""),
    "binary": (bytes(range(256)) * 20, "the file is not text", ""),
    "words": (b"hello,world\nfoo,bar\n", "no table of numbers was found", ""),
    "one column": (b"gain\n1\n2\n3\n4\n", "no table of numbers was found", ""),
    "two rows": (b"frequency_hz,gain\n1,2\n2,3\n", "no table of numbers was found", ""),
    "no header": (ROWS.encode(), "the columns have no names", "above the first row"),
    "no frequency": (
        f"gain_db,phase_deg\n{ROWS}".encode(),
        "there is no frequency column",
        "header",
    ),
    "no gain": (
        f"frequency_hz,temperature\n{ROWS}".encode(),
        "there is neither a gain column nor both an input and an output column",
        "header",
    ),
    "no unit of frequency": (
        f"frequency,gain_db\n{ROWS}".encode(),
        "the column 'frequency' has no unit",
        "column 'frequency'",
    ),
    "no unit of gain": (
        f"frequency (Hz),gain\n{ROWS}".encode(),
        "the column 'gain' has no unit",
        "column 'gain'",
    ),
    "unknown unit": (
        f"frequency (furlong),gain_db\n{ROWS}".encode(),
        "the column 'frequency' has the unit 'furlong', which is not known here",
        "column 'frequency'",
    ),
    "millihertz": (
        f"frequency (mHz),gain_db\n{ROWS}".encode(),
        "the column 'frequency' has the unit 'mHz', which is not known here",
        "column 'frequency'",
    ),
    "two frequencies": (
        b"frequency_hz,freq_hz,gain\n1,1,2\n2,2,3\n3,3,4\n",
        "two columns look like frequency: 'frequency_hz' and 'freq_hz'",
        "column 2",
    ),
    "gain and levels": (
        b"frequency_hz,gain,input_vrms,output_vrms\n1,1,2,2\n2,2,3,3\n3,3,4,4\n",
        "there is a gain column and also input and output columns",
        "header",
    ),
    "volts beside peak to peak": (
        b"frequency_hz,input (Vpp),output (V)\n1,1,2\n2,2,3\n3,3,4\n",
        "the unit of column 'output' does not say peak or RMS",
        "column 3",
    ),
    "power beside voltage": (
        b"frequency_hz,input (dBm),output (dBV)\n1,1,2\n2,2,3\n3,3,4\n",
        "the unit of column 'input' is a power: into which load?",
        "column 2",
    ),
    "negative frequency": (
        b"frequency_hz,gain\n1,2\n-2,3\n3,4\n",
        "frequency_hz is -2 Hz",
        "line 3, column 1",
    ),
    "zero gain": (b"frequency_hz,gain\n1,2\n2,0\n3,4\n", "gain is 0 V/V", "line 3, column 2"),
    "nothing but overloads": (
        b"frequency_hz,gain\n1,OVLD\n2,OVLD\n3,OVLD\n",
        "no row holds numbers in all columns that are needed",
        "",
    ),
    "words in the middle": (
        f"frequency_hz,gain\n{ROWS}paused here\n200000,14\n300000,10\n".encode(),
        "the table is broken by 'paused here'",
        "line 6",
    ),
    "words in the middle, no header": (
        f"{ROWS}paused here\n200000,14\n300000,10\n".encode(),
        "the table is broken by 'paused here'",
        "line 5",
    ),
    "misspelt number": (
        f"frequency_hz,gain\n{ROWS}200000,1x4\n300000,10\n".encode(),
        "the table is broken by '1x4'",
        "line 6, column 2",
    ),
    "misspelt number above the longer part": (
        f"frequency_hz,gain\n10,48\n20,4x8\n{ROWS}".encode(),
        "the table is broken by '4x8'",
        "line 3, column 2",
    ),
    "a cell too many": (
        f"frequency_hz,gain\n10,48\n20,47,9\n{ROWS}".encode(),
        "the table is broken by '20,47,9'",
        "line 3",
    ),
    "a cell too few": (
        f"frequency_hz,gain\n10,48\n20\n{ROWS}".encode(),
        "the table is broken by '20'",
        "line 3",
    ),
    "two tables": (
        f"frequency_hz,gain\n{ROWS}\nfrequency_hz,gain\n{ROWS}1e6,3\n".encode(),
        "the table is broken by 'frequency_hz,gain'",
        "line 7",
    ),
    "two tables, the first is longer": (
        f"frequency_hz,gain\n{ROWS}1e6,3\n\nfrequency_hz,gain\n{ROWS}".encode(),
        "the table is broken by 'frequency_hz,gain'",
        "line 8",
    ),
    "several cut rows": (
        f"frequency_hz,gain\n{ROWS}200000\n300000\n".encode(),
        "2 lines below the table begin like rows and are none",
        "line 6 to line 7",
    ),
    "units in cells": (
        b"Frequency,Gain\n100 Hz,33.6 dB\n1 kHz,33.5 dB\n10 kHz,33.1 dB\n",
        "the cells carry units: '100 Hz'",
        "line 2",
    ),
    "thousands blanks": (
        b"frequency_hz;gain\n1 000;48\n10 000;47\n100 000;25\n",
        "'1 000' may hold a thousands mark, which is never guessed",
        "line 2",
    ),
    "thousands marks of two kinds": (
        b"frequency_hz;gain\n1.000,5;48\n10.000,5;47\n100.000,5;25\n",
        "'1.000,5' may hold a thousands mark, which is never guessed",
        "line 2",
    ),
    "thousands commas in quotes": (
        b'frequency_hz,gain\n"1,000",48.5\n"10,000",47.5\n"100,000",25.5\n',
        "'1,000' may hold a thousands mark, which is never guessed",
        "line 2",
    ),
    "thousands commas in quotes, whole gains": (
        b'frequency_hz,gain\n"1,000","48"\n"10,000","47"\n"100,000","25"\n',
        "'1,000' may hold a thousands mark, which is never guessed",
        "line 2",
    ),
    "decimal commas between commas": (
        b"frequency_hz,gain\n100,5,48,1\n1000,5,47,9\n10000,5,46,2\n",
        "the line above the numbers has 2 cells, and they have 4 columns",
        "line 1",
    ),
    "wrong sep line": (
        f"sep=;\nfrequency_hz,gain\n{ROWS}".encode(),
        "no table of numbers was found between the delimiters that line 1 names: ';'",
        "line 1",
    ),
    "two ways to read": (
        b"frequency_hz ,gain\n100 ,48\n1000 ,47\n10000 ,46\n",
        "the numbers can be read in two ways: comma with decimal '.', or blanks with decimal ','",
        "line 2",
    ),
    "logarithm of another unit": (
        b"log10(f/kHz),gain_db\n2,48\n3,47\n4,46\n",
        "there is no frequency column",
        "header",
    ),
}


@pytest.mark.parametrize("case", CASES)
def test_one_error_with_place_and_expectation(tmp_path: Path, case: str) -> None:
    """Word for word."""
    content, what, where = CASES[case]
    file = tmp_path / "capture.csv"
    file.write_bytes(content)

    with pytest.raises(CaptureError) as refused:
        inspect_captures([file])

    assert refused.value.what == what
    assert str(refused.value.where).startswith(str(file))
    assert where in str(refused.value.where)
    assert refused.value.expected


def test_missing_file_and_empty_folder(tmp_path: Path) -> None:
    """The system's own reason."""
    with pytest.raises(CaptureError, match="cannot be read: No such file"):
        read_capture(tmp_path / "none.csv")
    with pytest.raises(CaptureError, match="the folder holds no captures"):
        read_capture(tmp_path)


def test_thousands_marks_are_never_guessed(tmp_path: Path) -> None:
    """``1,000`` is two cells, or a decimal comma; never a thousand."""
    file = tmp_path / "capture.csv"
    file.write_text("frequency_hz;gain\n1.000;2\n2.000;3\n3.000;4\n")

    assert read_capture(file).frequency_hz.tolist() == [1.0, 2.0, 3.0]


def test_what_was_done_to_the_rows_is_told(tmp_path: Path) -> None:
    """Sorted, averaged, left out, cut off, passed over."""
    file = tmp_path / "capture.csv"
    file.write_text("frequency_hz,gain\n3,2\n1,4\n1,6\n2,OVLD\n5,1\n6,\nbye\n")

    (capture,) = inspect_captures([file])

    assert capture.curve.frequency_hz.tolist() == [1.0, 3.0, 5.0]
    assert capture.curve.gain.tolist() == [5.0, 2.0, 1.0]
    told = " | ".join(capture.notes)
    for words in ("cut off", "passed over", "no number", "not in rising", "averaged"):
        assert words in told


@pytest.mark.parametrize(
    ("factor", "words"),
    [(2.0, "higher"), (0.5, "lower"), (10.0, "a probe"), (1.4142, "peak taken for RMS"),
     (2.8284, "peak to peak taken for RMS"), (1.2, ""), (1.0, "")],
)  # fmt: skip
def test_slips_of_probe_and_unit_are_noted(tmp_path: Path, factor: float, words: str) -> None:
    """Against the design's gain of 48; noted, never corrected."""
    file = tmp_path / "capture.csv"
    rows = "".join(f"{f},{48 * factor}\n" for f in (100, 200, 500, 1000))
    file.write_text(f"frequency_hz,gain\n{rows}")
    design = parse_design(EXAMPLE_DESIGN, where="example")

    (capture,) = inspect_captures([file], design=design)

    assert capture.curve.gain[0] == pytest.approx(48 * factor)
    assert bool(capture.notes) == bool(words)
    assert words in " ".join(capture.notes)


@settings(max_examples=150, deadline=2000)
@given(
    st.binary(max_size=400)
    | st.text(alphabet='0123456789.,;:\t\n\r-+eEfgHzdB() "#', max_size=400).map(str.encode)
)
def test_any_bytes_are_a_capture_or_one_error(
    tmp_path_factory: pytest.TempPathFactory, content: bytes
) -> None:
    """Never another exception, never a hang."""
    file = tmp_path_factory.getbasetemp() / "any.csv"
    file.write_bytes(content)

    try:
        captures = inspect_captures([file])
    except CaptureError:
        return
    assert all(len(capture.curve) > 0 for capture in captures)
