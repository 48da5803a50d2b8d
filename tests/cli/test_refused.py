"""Wrong input of every kind through the command line: one error, no traceback."""

from pathlib import Path

import pytest

from benchlog.design.example import EXAMPLE_DESIGN
from tests.cli.conftest import Run

BENCH = 'name = "b"\n[source]\ndriver = "source_generic"\naddress = "{address}"\n'
METER = '[output_meter]\ndriver = "meter_generic"\naddress = "TCPIP::127.0.0.1::11::SOCKET"\n'
GOOD = BENCH.format(address="TCPIP::127.0.0.1::9::SOCKET") + METER

# name of the case: files to write, arguments, exit code, words that must be in the message
CASES: dict[str, tuple[dict[str, str], tuple[str, ...], int, tuple[str, ...]]] = {
    "no design": ({}, ("design", "show"), 1, ("cannot be read", "design.toml", "benchlog new")),
    "design is not TOML": (
        {"design.toml": "stage = ["},
        ("design", "show"),
        1,
        ("is not TOML", "design.toml"),
    ),
    "misspelt key": (
        {"design.toml": EXAMPLE_DESIGN.replace("feedback", "feedbak")},
        ("design", "show"),
        1,
        ("stage[1].feedbak", "did you mean 'feedback'?"),
    ),
    "negative part": (
        {"design.toml": EXAMPLE_DESIGN.replace('"47k"', '"-47k"')},
        ("design", "show"),
        1,
        ("stage[1].feedback", "is negative"),
    ),
    "no bench": (
        {"design.toml": EXAMPLE_DESIGN},
        ("sweep", "0001"),
        1,
        ("bench file cannot be read", "bench.toml"),
    ),
    "unknown driver": (
        {
            "design.toml": EXAMPLE_DESIGN,
            "bench.toml": GOOD.replace("meter_generic", "meter_magic"),
        },
        ("sweep", "0001"),
        1,
        ("there is no driver 'meter_magic'", "meter_generic"),
    ),
    "driver of another role": (
        {
            "design.toml": EXAMPLE_DESIGN,
            "bench.toml": GOOD.replace("meter_generic", "source_generic"),
        },
        ("sweep", "0001"),
        1,
        ("is for a source", "output_meter.driver"),
    ),
    "address is no address": (
        {
            "design.toml": EXAMPLE_DESIGN,
            "bench.toml": BENCH.format(address="10.0.0.7") + METER,
        },
        ("sweep", "0001"),
        5,
        ("'10.0.0.7' is not the address of an instrument", "SOCKET"),
    ),
    "nobody answers": (
        {"design.toml": EXAMPLE_DESIGN, "bench.toml": GOOD},
        ("sweep", "0001"),
        5,
        ("did not identify itself", "TCPIP::127.0.0.1::9::SOCKET", "switched on"),
    ),
    "sweep without serials": (
        {"design.toml": EXAMPLE_DESIGN, "bench.toml": GOOD},
        ("sweep",),
        2,
        ("name the serials",),
    ),
    "frequency in millihertz": ({}, ("sweep", "1", "--start", "20 mHz"), 2, ("20 MHz",)),
    "level without its kind": ({}, ("sweep", "1", "--level", "1 V"), 2, ("mVrms",)),
    "empty serial": ({}, ("sweep", "  "), 2, ("a serial is needed",)),
    "serial with a bell": ({}, ("sweep", "00\a1"), 2, ("is no serial",)),
    "no logbook": ({}, ("history",), 1, ("there is no logbook here", "--logbook")),
    "logbook is something else": (
        {"logbook.db": "not SQLite at all, just words that are long enough to be read" * 20},
        ("history",),
        1,
        ("logbook.db",),
    ),
    "driver file is not there": ({}, ("driver", "check", "mine.toml"), 1, ("cannot be read",)),
    "driver file is wrong": (
        {"mine.toml": 'name = "x"\nrole = "sauce"\n'},
        ("driver", "check", "{folder}/mine.toml"),
        1,
        ("did you mean 'source'?",),
    ),
    "capture is not there": (
        {},
        ("import", "{folder}/none.csv", "--serial", "1"),
        1,
        ("cannot be read", "none.csv"),
    ),
    "capture without a frequency": (
        {"a.csv": "gain_db,phase_deg\n1,2\n1,2\n1,2\n1,2\n"},
        ("import", "{folder}/a.csv", "--serial", "1"),
        1,
        ("there is no frequency column",),
    ),
    "import without a serial": (
        {"a.csv": "frequency_hz,gain\n1,2\n2,2\n3,2\n4,2\n"},
        ("import", "{folder}/a.csv"),
        2,
        ("--serial",),
    ),
    "unit without a column": (
        {},
        ("import", "{folder}/a.csv", "--serial", "1", "--unit", "dB"),
        2,
        ("COLUMN=UNIT",),
    ),
}


@pytest.mark.parametrize("case", CASES)
def test_one_error_that_says_what_to_do(run: Run, tmp_path: Path, case: str) -> None:
    """The exit code is the one of the table, and stdout stays empty."""
    files, arguments, code, words = CASES[case]
    for name, text in files.items():
        (tmp_path / name).write_text(text)

    ran = run("-C", tmp_path, *(word.format(folder=tmp_path) for word in arguments))

    assert ran.code == code
    assert ran.out == ""
    for word in words:
        assert word in ran.err
