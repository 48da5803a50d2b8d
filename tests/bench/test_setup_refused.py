"""Bench files that are wrong: one error each, with place, what, and what was expected."""

from pathlib import Path

import pytest

from benchlog.bench.setup import read_bench
from benchlog.errors import BenchFileError, DriverFileError
from benchlog.folders import data_folder

GOOD = """\
name = "bench 2"
mains = "50 Hz"
max_level = "2 Vpp"

[source]
driver = "source_generic"
address = "TCPIP::192.0.2.1::5025::SOCKET"
impedance = "50 ohm"
load = "high impedance"
attenuator = { loss = "20 dB", u = "0.05 dB" }
calibration_due = 2027-03-31

[output_meter]
driver = "meter_generic"
address = "TCPIP::192.0.2.2::5025::SOCKET"
"""
METER = '[output_meter]\ndriver = "meter_generic"\naddress = "TCPIP::192.0.2.2::5025::SOCKET"\n'
ATTENUATOR = 'attenuator = { loss = "20 dB", u = "0.05 dB" }'

# What of a good file is replaced, by what, and the error's place and parts.
CASES: dict[str, tuple[str, str, str, str, str | None]] = {
    "misspelt key": (
        "max_level",
        "maxlevel",
        "maxlevel",
        "maxlevel is not a key that a bench file has",
        "one of: input_meter, logbook, mains, max_level, name, output_meter, source",
    ),
    "misspelt instrument": (
        "[output_meter]",
        "[outputmeter]",
        "outputmeter",
        "outputmeter is not a key that a bench file has",
        "one of: input_meter, logbook, mains, max_level, name, output_meter, source",
    ),
    "no output meter": (
        METER,
        "",
        "output_meter",
        "output_meter is missing",
        "a table with the keys driver, address, identity, calibration_due",
    ),
    "no address": (
        'address = "TCPIP::192.0.2.1::5025::SOCKET"\n',
        "",
        "source.address",
        "source.address is missing",
        'a VISA resource name, for example "TCPIP::192.0.2.7::5025::SOCKET"',
    ),
    "address is a port": (
        '"TCPIP::192.0.2.1::5025::SOCKET"',
        "5025",
        "source.address",
        "source.address is a whole number: 5025",
        'a VISA resource name, for example "TCPIP::192.0.2.7::5025::SOCKET"',
    ),
    "two instruments at one address": (
        "TCPIP::192.0.2.2::5025::SOCKET",
        "tcpip::192.0.2.1::5025::socket",
        "output_meter.address",
        "output_meter and source have the same address",
        "one address for each instrument",
    ),
    "another mains": (
        '"50 Hz"',
        '"400 Hz"',
        "mains",
        "mains: '400 Hz' is not a word for it",
        "one of: 50 Hz, 60 Hz",
    ),
    "ceiling of unknown kind": (
        '"2 Vpp"',
        '"2 V"',
        "max_level",
        "max_level: '2 V' does not say whether it is RMS, peak or peak to peak",
        'a level, for example "20 mVpp"',
    ),
    "ceiling of nothing": (
        '"2 Vpp"',
        '"0 Vpp"',
        "max_level",
        "max_level: '0 Vpp' is zero",
        'a level, for example "20 mVpp"',
    ),
    "impedance in hertz": (
        '"50 ohm"',
        '"50 Hz"',
        "source.impedance",
        "source.impedance: '50 Hz' is in hertz, not a resistance",
        'a resistance, for example "4k7"',
    ),
    "load is a word": (
        '"high impedance"',
        '"high-z"',
        "source.load",
        "source.load: 'high-z' does not begin with a number",
        'a resistance, for example "4k7"',
    ),
    "load is a short": (
        '"high impedance"',
        '"0 ohm"',
        "source.load",
        "source.load: '0 ohm' is zero",
        'a resistance, for example "4k7"',
    ),
    "attenuator that amplifies": (
        '"20 dB"',
        '"-20 dB"',
        "source.attenuator",
        "source.attenuator has a negative loss or uncertainty",
        'a loss in decibels above zero, like "20 dB"',
    ),
    "attenuator without a loss": (
        ATTENUATOR,
        'attenuator = { u = "0.05 dB" }',
        "source.attenuator.loss",
        "source.attenuator.loss is missing",
        'a loss in decibels, for example "20 dB"',
    ),
    "attenuator in the wrong place": (
        'u = "0.05 dB"',
        'place = "before"',
        "source.attenuator.place",
        "source.attenuator.place: 'before' is not a word for it",
        "one of: before input meter, after input meter",
    ),
    "attenuator as a number": (
        ATTENUATOR,
        "attenuator = 10",
        "source.attenuator",
        "source.attenuator is a whole number: 10",
        'a loss in decibels, for example "20 dB"',
    ),
    "date in quotes": (
        "2027-03-31",
        '"31.3.2027"',
        "source.calibration_due",
        "source.calibration_due is a text: '31.3.2027'",
        "a date without quotes, such as 2027-03-31",
    ),
    "meter as a source": (
        '"source_generic"',
        '"meter_generic"',
        "source.driver",
        "the driver 'meter_generic' is for a meter",
        "a driver for a source",
    ),
    "name is missing": ('name = "bench 2"\n', "", "name", "name is missing", None),
}


def refusal(folder: Path, text: str) -> BenchFileError:
    """Return the error that a bench file with this text is refused with."""
    path = folder / "bench.toml"
    path.write_text(text, encoding="utf-8")
    with pytest.raises(BenchFileError) as refused:
        read_bench(path)
    assert refused.value.where is not None
    assert refused.value.where.startswith(str(path))
    return refused.value


@pytest.mark.parametrize("case", CASES)
def test_wrong_bench_files(tmp_path: Path, case: str) -> None:
    """Each says where, what, and what would have been right."""
    old, new, where, what, expected = CASES[case]
    assert GOOD.count(old) == 1, case

    error = refusal(tmp_path, GOOD.replace(old, new))

    assert error.where == f"{tmp_path / 'bench.toml'}: {where}"
    assert (error.what, error.expected) == (what, expected)


def test_the_good_one_is_good(tmp_path: Path) -> None:
    """What the cases change is the only thing that is wrong with them."""
    (tmp_path / "bench.toml").write_text(GOOD, encoding="utf-8")
    assert read_bench(tmp_path / "bench.toml").name == "bench 2"


def test_load_that_the_driver_cannot_set(tmp_path: Path) -> None:
    """Said where the load is asked for."""
    text = (data_folder("drivers") / "source_generic.toml").read_text(encoding="utf-8")
    head, tail = text.split("[message.set_load]")
    (tmp_path / "plain.toml").write_text(
        head + tail[tail.index("[message.set_point]") :], encoding="utf-8"
    )

    for load, wants in (("high impedance", "set_high_impedance"), ("50 ohm", "set_load")):
        error = refusal(
            tmp_path,
            GOOD.replace("source_generic", "plain.toml").replace("high impedance", load),
        )
        assert error.what == "the driver 'plain.toml' cannot set this load"
        assert error.expected == f"no load, or a driver with a {wants} message"


def test_driver_that_does_not_exist(tmp_path: Path) -> None:
    """The driver is at fault, and the known ones are named."""
    path = tmp_path / "bench.toml"
    path.write_text(GOOD.replace("meter_generic", "meter_special"), encoding="utf-8")

    with pytest.raises(DriverFileError, match="there is no driver 'meter_special'"):
        read_bench(path)


@pytest.mark.parametrize("content", [b"", b"\xff\xfe", b"a" * 2_000_000, b"[" * 5000])
def test_files_that_are_no_bench_file(tmp_path: Path, content: bytes) -> None:
    """Empty, binary, huge, or nested without end: one error, no traceback."""
    path = tmp_path / "bench.toml"
    path.write_bytes(content)
    with pytest.raises(BenchFileError):
        read_bench(path)


def test_no_bench_file(tmp_path: Path) -> None:
    """With the command that makes one."""
    with pytest.raises(BenchFileError) as missing:
        read_bench(tmp_path / "bench.toml")

    assert missing.value.hint == "`benchlog new DIR` makes one to start from"
