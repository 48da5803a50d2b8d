"""Drivers as frozen data: what is sent, how long it takes, how far a reading is trusted."""

import math
from pathlib import Path

import pytest

from benchlog.bench.driver import Accuracy, Driver
from benchlog.bench.driver_check import check_driver
from benchlog.bench.driver_read import list_drivers, parse_driver, read_driver
from benchlog.errors import DriverFileError, Misuse
from benchlog.folders import data_folder

SOURCE = (data_folder("drivers") / "source_generic.toml").read_text(encoding="utf-8")
METER = (data_folder("drivers") / "meter_generic.toml").read_text(encoding="utf-8")


def changed(text: str, *changes: tuple[str, str]) -> Driver:
    """Return a shipped driver with some of its text replaced."""
    for old, new in changes:
        assert text.count(old) == 1, old
        text = text.replace(old, new)
    return parse_driver(text.encode(), "here")[0]


def test_shipped_drivers_are_listed_and_read() -> None:
    """By name, sorted; each says its role."""
    assert list_drivers() == ("meter_generic", "source_generic")
    assert [read_driver(name).role for name in list_drivers()] == ["meter", "source"]


def test_driver_file_beside_the_bench_file(tmp_path: Path) -> None:
    """A relative path counts from the folder; the hash is that of the file's bytes."""
    (tmp_path / "mine.toml").write_text(SOURCE, encoding="utf-8")

    assert read_driver("mine.toml", folder=tmp_path) == read_driver("source_generic")
    with pytest.raises(DriverFileError) as missing:
        read_driver("other.toml", folder=tmp_path)
    assert missing.value.where == str(tmp_path / "other.toml")


@pytest.mark.parametrize("name", list_drivers())
def test_worked_examples_of_shipped_drivers(name: str) -> None:
    """Every message has one, and all of them hold."""
    results = check_driver(name)

    assert {result.message for result in results} == set(read_driver(name).messages)
    assert [result for result in results if not result.passed] == []


def test_point_is_one_message() -> None:
    """Frequency, level and the proof that both were taken travel together."""
    text = read_driver("source_generic").text("set_point", frequency_hz=1e6, level_vrms=0.01)

    assert text == "SOURce:FREQuency 1000000\nSOURce:VOLTage 0.01\n*WAI\nSYSTem:ERRor?"


@pytest.mark.parametrize(
    ("unit", "written"), [("Vrms", "1"), ("Vpk", "1.41421356"), ("Vpp", "2.82842712")]
)
def test_level_is_converted_once(unit: str, written: str) -> None:
    """To what the instrument counts in, and back."""
    driver = changed(SOURCE, ('level_unit = "Vrms"', f'level_unit = "{unit}"'))

    assert f"SOURce:VOLTage {written}\n" in driver.text(
        "set_point", frequency_hz=1e3, level_vrms=1.0
    )
    assert driver.to_vrms(float(written)) == pytest.approx(1.0, rel=1e-8)


def test_numbers_as_the_driver_wants_them() -> None:
    """Scientific, with fewer digits."""
    driver = changed(SOURCE, ('style = "plain"\ndigits = 9', 'style = "scientific"\ndigits = 6'))

    text = driver.text("set_point", frequency_hz=62500.0, level_vrms=0.00707106781)

    assert text.startswith("SOURce:FREQuency 6.25000E+04\nSOURce:VOLTage 7.07107E-03\n")


def test_field_without_value_is_a_bug_of_the_caller() -> None:
    """Nothing is sent with a hole in it."""
    with pytest.raises(Misuse, match=r"\{level\}"):
        read_driver("source_generic").text("set_point", frequency_hz=1e3)


def test_settling_is_looked_up_by_frequency() -> None:
    """The row that holds from there up: a fixed time and some cycles."""
    rows = (
        'above = "10 Hz"\ntime = "2 s"\ncycles = 5\n[[settling]]\nabove = "1 kHz"\ntime = "20 ms"'
    )
    driver = changed(METER, ('time = "20 ms"\ncycles = 3', rows))

    assert driver.settle_s(100.0) == 2.05
    assert driver.settle_s(999.0) == pytest.approx(2.0 + 5 / 999)
    assert driver.settle_s(1e3) == 0.02
    assert driver.settle_s(1.0) == 7.0  # below the first row, the first row
    assert changed(METER, ('time = "5 ms"', 'time = "5 ms"\ncycles = 5')).reading_s(10.0) == 0.505


def test_link_settings() -> None:
    """Terminators, timeouts and the pauses an instrument needs."""
    link = changed(
        METER, ('timeout = "3 s"', 'timeout = "3 s"\ngap = "10 ms"\nafter_open = "1 s"')
    ).link

    assert (link.timeout_s, link.gap_s, link.after_open_s) == (3.0, 0.01, 1.0)
    assert read_driver("meter_generic").messages["error"].timeout_s == 3.0
    assert read_driver("meter_generic").messages["read"].timeout_s == 5.0


def test_limit_of_error_is_a_rectangle() -> None:
    """Standard uncertainty a over root three (JCGM 100, 4.3.7)."""
    assert Accuracy(band_hz=(1.0, 2.0), limit_rel=0.003).u_rel == pytest.approx(0.0017320508)


def test_best_band_is_scale_and_the_rest_is_flatness() -> None:
    """Scale moves the gain, flatness the corner; in each band both together make its limit."""
    scale, flat = read_driver("meter_generic").terms("output meter")

    assert (scale.name, scale.kind, scale.band_hz) == ("output meter accuracy", "scale", None)
    assert scale.u_rel == pytest.approx(0.0006 / math.sqrt(3.0))
    assert (flat.name, flat.kind, flat.band_hz) == ("output meter flatness", "flatness", (1e5, 1e7))
    assert math.hypot(scale.u_rel, flat.u_rel) == pytest.approx(0.002 / math.sqrt(3.0))
    assert scale.source == "accuracy table of driver meter_generic"


def test_driver_without_accuracy_table_adds_no_terms() -> None:
    """It claims nothing."""
    head, _ = METER.split("[[accuracy]]", maxsplit=1)
    assert parse_driver(head.encode(), "here")[0].terms("output meter") == ()


EXAMPLE = '\n[[example]]\nmessage = "{}"\n{}\n'


@pytest.mark.parametrize(
    ("message", "lines", "expected", "got"),
    [
        ("read", 'sends = "READ"', "READ", "READ?"),
        ("read", 'reply = "1.5"\nmeans = 1.25', "1.25", "1.5"),
        ("read", 'reply = "OVLD"\nmeans = "overload"', "overload", "refused"),
        ("error", 'reply = \'0,"No error"\'\nmeans = "-113"', "-113", "no error"),
        ("error", "", "sends, or reply with means", "neither"),
    ],
)
def test_example_that_does_not_hold(
    tmp_path: Path, message: str, lines: str, expected: str, got: str
) -> None:
    """It is shown with what it says and what the driver does."""
    path = tmp_path / "mine.toml"
    path.write_text(METER + EXAMPLE.format(message, lines), encoding="utf-8")

    (failed,) = (result for result in check_driver(str(path)) if not result.passed)

    assert (failed.example, failed.message) == (7, message)
    assert (failed.expected, failed.got) == (expected, got)


def test_example_with_a_missing_field(tmp_path: Path) -> None:
    """What is missing is named."""
    path = tmp_path / "mine.toml"
    path.write_text(SOURCE.replace("frequency_hz = 62500\n", ""), encoding="utf-8")

    (failed,) = (result for result in check_driver(str(path)) if not result.passed)

    assert failed.got == "no value was given for {frequency_hz}"


def test_message_without_example_is_reported(tmp_path: Path) -> None:
    """A driver is as good as its examples."""
    path = tmp_path / "mine.toml"
    path.write_text(METER.split("[[example]]", maxsplit=1)[0], encoding="utf-8")

    results = check_driver(str(path))

    assert [(result.message, result.got) for result in results] == [
        ("prepare", "none"),
        ("read", "none"),
        ("error", "none"),
    ]
    assert not any(result.passed for result in results)


def test_converted_value_is_compared_as_a_number(tmp_path: Path) -> None:
    """A meter in V peak to peak, its example in V RMS."""
    path = tmp_path / "mine.toml"
    text = METER.replace('level_unit = "Vrms"', 'level_unit = "Vpp"').replace(
        "means = 0.339411255", "means = 0.12"
    )
    path.write_text(text, encoding="utf-8")

    assert all(result.passed for result in check_driver(str(path)))
