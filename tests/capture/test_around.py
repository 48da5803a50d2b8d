"""What stands above, below, beside and between the rows of a table."""

from pathlib import Path

import pytest

from benchlog.capture.read import Capture, Told, inspect_captures
from benchlog.errors import CaptureError
from tests.fakes.records import board, plain, samples

ROWS = "100,48\n1000,47.9\n10000,47\n100000,25\n"
KEYED = "Operator,nobody,,100,48\nDate,2026-01-01,,1000,47.9\n,,,10000,47\n,,,100000,25\n"

TABLES: dict[str, str] = {
    "blank line below the names": f"frequency_hz,gain\n\n{ROWS}",
    "blank lines around the units": f"Frequency,Gain\n\n(Hz),(V/V)\n\n{ROWS}",
    "rule below the names": "f / Hz  gain / (V/V)\n------  ----\n" + ROWS.replace(",", "  "),
    "comment below the names": f"# frequency_hz,gain\n# invented\n{ROWS}",
    "names set with blanks": "  Frequency (Hz)    Gain (V/V)\n" + ROWS.replace(",", "     "),
    "names and units set with blanks": "Frequency Gain\n  Hz  V/V\n" + ROWS.replace(",", "  "),
    "preamble right above the names": f"Operator,nobody\nfrequency_hz,gain\n{ROWS}",
    "preamble filled up with delimiters": f"Operator,nobody,,\nfrequency_hz,gain,,\n{ROWS}",
    "delimiter behind the names only": f"frequency_hz,gain,\n{ROWS}",
    "delimiter behind the rows only": "frequency_hz,gain\n" + ROWS.replace("\n", ",\n"),
    "count of rows below the names": f"Frequency (Hz),Gain (V/V)\n4,4\n{ROWS}",
    "preamble beside the rows": f"Model,x,,Frequency (Hz),Gain (V/V)\n{KEYED}",
    "numbers in the preamble beside": "Points,4,f (Hz),Gain (V/V)\nAverages,3,100,48\n"
    ",,1000,47.9\n,,10000,47\n,,100000,25\n",
    "preamble to the right": "frequency_hz,gain,Operator,nobody\n100,48,Date,2026\n1000,47.9,,\n"
    "10000,47,,\n100000,25,,\n",
    "preamble to the right, rows of their own width": "frequency_hz,gain,Operator,nobody\n"
    f"100,48,Date,2026\n{ROWS[7:]}",
    "remarks on some rows": "frequency_hz,gain,remark\n100,48,\n1000,47.9,ok\n10000,47,\n"
    "100000,25,late\n",
    "time of day and board in front": "at,board,frequency_hz,gain\n12:00:01,a,100,48\n"
    "12:00:02,a,1000,47.9\n12:00:03,a,10000,47\n12:00:04,a,100000,25\n",
    "bars at both ends": "| frequency_hz | gain |\n|---|---|\n"
    + "".join(f"| {row.replace(',', ' | ')} |\n" for row in ROWS.split()),
    "blank line between all rows": "frequency_hz,gain\n" + ROWS.replace("\n", "\n\n"),
    "line of delimiters between rows": "frequency_hz,gain\n" + ROWS.replace("7.9\n", "7.9\n,\n"),
    "decimal commas in quotes between commas": 'frequency_hz,gain\n"100,0","48,0"\n'
    '"1000,0","47,9"\n"10000,0","47,0"\n"100000,0","25,0"\n',
    "suffixes": "frequency_hz,gain\n100,48\n1k,47900m\n10K,47\n0.1M,25\n",
    "blanks behind commas": "frequency_hz, gain\n" + ROWS.replace(",", ", "),
    "units behind the names": f"Frequency in Hz,Gain V/V\n{ROWS}",
    "logarithm of hertz": "log10(f/Hz),Gain (V/V)\n2,48\n3,47.9\n4,47\n5,25\n",
    "end mark and filling": f"frequency_hz,gain\n{ROWS}\x1a\x00\x00\x00",
    "filling": f"frequency_hz,gain\n{ROWS}" + 100 * "\x00",
    "cut exponent": f"frequency_hz,gain\n{ROWS}1.2E-",
    "cut cell": f"frequency_hz,gain\n{ROWS}200000,",
    "cut row": f"frequency_hz,gain\n{ROWS}2000",
}


def read(folder: Path, text: str) -> Capture:
    """Read a text as one swept table."""
    file = folder / "capture.csv"
    file.write_text(text, encoding="utf-8", newline="")
    (capture,) = inspect_captures([file])
    return capture


@pytest.mark.parametrize("name", TABLES)
def test_the_rows_are_the_same(tmp_path: Path, name: str) -> None:
    """All four of them, and no other."""
    curve = read(tmp_path, TABLES[name]).curve

    assert curve.frequency_hz == pytest.approx([100, 1000, 10000, 100000], rel=1e-12)
    assert curve.gain == pytest.approx([48, 47.9, 47, 25], rel=1e-12)


@pytest.mark.parametrize(
    ("name", "note"),
    [
        ("cut exponent", "line 6 is cut off and was left out: '1.2E-'"),
        ("cut cell", "line 6 is cut off and was left out: '200000,'"),
        ("cut row", "line 6 is cut off and was left out: '2000'"),
        ("count of rows below the names", "line 2 counts the rows and was left out"),
        (
            "remarks on some rows",
            "words beside the numbers were taken for preamble or remarks",
        ),
    ],
)
def test_what_was_left_out_is_told(tmp_path: Path, name: str, note: str) -> None:
    """One note, word for word."""
    assert read(tmp_path, TABLES[name]).notes == (note,)


def test_words_beside_the_rows_are_preamble(tmp_path: Path) -> None:
    """Three lines of it: none is lost."""
    capture = read(tmp_path, TABLES["preamble beside the rows"])

    assert capture.understood["preamble"] == "3 lines"


@pytest.mark.parametrize(
    "token", ["OVLD", "---", "****", "9.9E37", "9.91e37", "Inf", "-inf", "NaN", "#N/A", ""]
)
@pytest.mark.parametrize("place", [0, 1, 3])
def test_states_are_counted_and_never_numbers(tmp_path: Path, token: str, place: int) -> None:
    """In the first, a middle, and the last row but one."""
    rows = ["100,48", "1000,47.9", "10000,47", "100000,25", "200000,14"]
    rows[place] = f"{rows[place].split(',')[0]},{token}"

    capture = read(tmp_path, "\n".join(["frequency_hz,gain", *rows, ""]))

    assert len(capture.curve) == 4
    assert capture.notes == ("1 row holds no number (overload, empty) and is left out",)


def test_errors_count_lines_of_the_file(tmp_path: Path) -> None:
    """Blank lines between rows count too."""
    with pytest.raises(CaptureError, match="line 7, column 2"):
        read(tmp_path, "frequency_hz,gain\n\n1,2\n\n2,2\n\n3,0\n4,2\n")


def test_phase_that_spans_too_many_radians_is_noted(tmp_path: Path) -> None:
    """Degrees under a header that says radians; kept as read."""
    text = "frequency_hz,gain_db,phase_rad\n100,30,-1\n1000,29,-80\n10000,20,-170\n"

    assert read(tmp_path, text).notes == (
        "the phase spans 169 rad: are these degrees? It was kept as read",
    )
    assert read(tmp_path, text.replace("-80", "-1").replace("-170", "-3")).notes == ()


def test_empty_cell_between_others_is_a_state(tmp_path: Path) -> None:
    """The row is left out, and the table goes on."""
    text = "frequency_hz,gain,phase_deg\n1,48,0\n2,,-1\n3,47,-2\n4,46,-3\n"

    capture = read(tmp_path, text)

    assert capture.curve.frequency_hz.tolist() == [1, 3, 4]
    assert capture.notes == ("1 row holds no number (overload, empty) and is left out",)


def test_preamble_above_a_blank_line_is_no_header(tmp_path: Path) -> None:
    """Two words a line, as many as columns: units that were told hold."""
    file = tmp_path / "capture.csv"
    file.write_text(f"Operator,nobody\nDate,today\n\n{ROWS}")

    (capture,) = inspect_captures([file], told=Told(units={"frequency": "kHz", "gain": "dB"}))

    assert capture.curve.frequency_hz[0] == pytest.approx(100e3)
    assert capture.understood["preamble"] == "2 lines"


def test_numbers_among_words_without_names_are_no_table(tmp_path: Path) -> None:
    """Which of the columns are meant is not guessed, whatever units were told."""
    file = tmp_path / "capture.csv"
    file.write_text("a,100,48\nb,1000,47\nc,10000,46\n")

    with pytest.raises(CaptureError, match="no table of numbers was found"):
        inspect_captures([file], told=Told(units={"frequency": "Hz", "gain": "dB"}))


def test_preamble_as_wide_as_a_record_is_not_its_names(tmp_path: Path) -> None:
    """The line right above the samples is."""
    file = tmp_path / "capture.csv"
    file.write_text("Operator,nobody,today\n" + plain(samples(1e3)))

    (capture,) = inspect_captures([file])

    assert capture.curve.gain[0] == pytest.approx(abs(board(1e3)), rel=1e-4)
