"""Driver files that are wrong: one error each, with place, what, and what was expected."""

from pathlib import Path

import pytest

from benchlog.bench.driver_check import check_driver
from benchlog.bench.driver_read import parse_driver, read_driver
from benchlog.errors import DriverFileError
from benchlog.folders import data_folder

SOURCE, METER = (
    (data_folder("drivers") / f"{name}_generic.toml").read_text(encoding="utf-8")
    for name in ("source", "meter")
)
POINT = 'lines = ["SOURce:FREQuency {frequency_hz}", "SOURce:VOLTage {level}", "*WAI", '
READ = 'lines = ["READ?"]\nreply = "number"'

# What of a shipped driver is replaced, by what, and the error's place and parts.
CASES: dict[str, tuple[str, str, str, str, str, str]] = {
    "unknown key": (
        METER,
        'timeout = "3 s"',
        'time_out = "3 s"',
        "link.time_out",
        "link.time_out is not a key that a driver file has",
        "one of: after_open, gap, read_terminator, timeout, write_terminator",
    ),
    "unknown role": (
        METER,
        'role = "meter"',
        'role = "metre"',
        "role",
        "role: 'metre' is not a word for it",
        "one of: source, meter",
    ),
    "no role": (METER, 'role = "meter"', "", "role", "role is missing", "one of: source, meter"),
    "unknown level unit": (
        METER,
        'level_unit = "Vrms"',
        'level_unit = "dBm"',
        "level_unit",
        "level_unit: 'dBm' is not a word for it",
        "one of: Vrms, Vpp, Vpk",
    ),
    "unknown terminator": (
        METER,
        'read_terminator = "\\n"',
        'read_terminator = ";"',
        "link.read_terminator",
        "link.read_terminator: ';' is not a word for it",
        "one of: \\n, \\r\\n, \\r",
    ),
    "no timeout at all": (
        METER,
        'timeout = "3 s"',
        'timeout = "0 s"',
        "link.timeout",
        "link.timeout is zero",
        'a time, like "2 s"',
    ),
    "timeout for ever": (
        METER,
        'timeout = "5 s"',
        'timeout = "inf s"',
        "message.read.timeout",
        "message.read.timeout: 'inf s' does not begin with a number",
        'a time, for example "20 ms"',
    ),
    "negative pause": (
        METER,
        'timeout = "3 s"',
        'gap = "-1 ms"',
        "link.gap",
        "link.gap: '-1 ms' is negative",
        'a time, for example "20 ms"',
    ),
    "action of another role": (
        METER,
        "[message.error]",
        "[message.switch_on]",
        "message.switch_on",
        "message.switch_on is nothing that a meter is asked for",
        "one of: prepare, read, error",
    ),
    "no message to read": (
        METER,
        f'[message.read]\n{READ}\ntimeout = "5 s"',
        "",
        "message.read",
        "message.read is missing",
        "what to send so that a meter does it",
    ),
    "message without lines": (
        METER,
        'lines = ["READ?"]',
        "lines = []",
        "message.read.lines",
        "message.read.lines is an empty list",
        'lines to send, for example ["READ?"]',
    ),
    "reading that is no number": (
        METER,
        READ,
        'lines = ["READ?"]\nreply = "error"',
        "message.read.reply",
        "message.read.reply is 'error'",
        "'number'",
    ),
    "number where nobody wants one": (
        SOURCE,
        'lines = ["OUTPut ON", "*OPC?"]\nreply = "done"',
        'lines = ["OUTPut ON", "*OPC?"]\nreply = "number"',
        "message.switch_on.reply",
        "message.switch_on.reply is 'number'",
        '"none", "done" or "error"',
    ),
    "two questions in one message": (
        SOURCE,
        POINT + '"SYSTem:ERRor?"]',
        POINT + '"*OPC?", "SYSTem:ERRor?"]',
        "message.set_point.lines",
        "the message asks more than one question",
        "one query, on the last line: two answers would be mistaken for each other",
    ),
    "question without an answer": (
        METER,
        READ,
        'lines = ["READ"]\nreply = "number"',
        "message.read.lines",
        "the message asks nothing but its reply is 'number'",
        'a query with a reply, or no query with reply = "none"',
    ),
    "field of another message": (
        METER,
        'lines = ["READ?"]',
        'lines = ["READ? {level}"]',
        "message.read.lines",
        "the line 'READ? {level}' has a field that is not known here",
        "plain text with {frequency_hz}",
    ),
    "field that computes": (
        SOURCE,
        "{frequency_hz}",
        "{frequency_hz.__class__}",
        "message.set_point.lines",
        "the line 'SOURce:FREQuency {frequency_hz.__class__}' has a field that is not known here",
        "plain text with {frequency_hz}, {level}",
    ),
    "format of Python": (
        SOURCE,
        "{level}",
        "{level:>9999999}",
        "message.set_point.lines",
        "the line 'SOURce:VOLTage {level:>9999999}' has a field that is not known here",
        "plain text with {frequency_hz}, {level}",
    ),
    "source without a level range": (
        SOURCE,
        'level = ["0.1 mVrms", "7 Vrms"]',
        "",
        "range.level",
        "range.level is missing",
        'the lowest and highest level of the source, like ["1 mVrms", "7 Vrms"]',
    ),
    "range of one end": (
        METER,
        '["10 Hz", "10 MHz"]\n\n[[settling',
        '["10 Hz"]\n\n[[settling',
        "range.frequency",
        "range.frequency is a list",
        'the lowest and the highest frequency, for example ["10 Hz", "10 MHz"]',
    ),
    "range upside down": (
        METER,
        'frequency = ["10 Hz", "10 MHz"]',
        'frequency = ["10 MHz", "10 Hz"]',
        "range.frequency",
        "range.frequency does not rise: 10 MHz, 10 Hz",
        "the lower end first",
    ),
    "range in volts": (
        METER,
        'frequency = ["10 Hz", "10 MHz"]',
        'frequency = ["10 V", "10 MHz"]',
        "range.frequency[1]",
        "range.frequency[1]: '10 V' is in volts, not a frequency",
        'a frequency, for example "10 kHz"',
    ),
    "no settling": (
        METER,
        '[[settling]]\ntime = "20 ms"\ncycles = 3',
        "",
        "settling",
        "settling is missing",
        "a table with the keys above, time, cycles",
    ),
    "settling rows out of order": (
        METER,
        "[[settling]]",
        '[[settling]]\nabove = "1 kHz"\ntime = "1 s"\n[[settling]]\nabove = "100 Hz"',
        "settling[2].above",
        "settling[2].above does not rise",
        "rows by rising frequency",
    ),
    "accuracy in volts": (
        METER,
        'reading = "0.2%"',
        'reading = "0.2 V"',
        "accuracy[2].reading",
        "accuracy[2].reading: '0.2 V' is in volts, not a percentage",
        'a percentage, for example "1%"',
    ),
    "misspelt key of an example": (
        METER,
        'sends = "READ?"',
        'send = "READ?"',
        "example[2].send",
        "example[2].send is not a key that a driver file has",
        "one of: frequency_hz, level_vrms, load_ohm, means, message, reply, sends",
    ),
    "cycles below none": (
        METER,
        "cycles = 3",
        "cycles = -3",
        "settling[1].cycles",
        "settling[1].cycles is a whole number: -3",
        "periods, from 0 to 1000, for example 3",
    ),
    "too few digits": (
        SOURCE,
        "digits = 9",
        "digits = 3",
        "numbers.digits",
        "numbers.digits is a whole number: 3",
        "significant digits, from 4 to 15, for example 9",
    ),
    "not TOML": (
        METER,
        'role = "meter"',
        "role meter",
        "",
        "the file is not TOML: Expected '=' after a key in a key/value pair (at line 6, column 6)",
        'keys and values such as role = "source"',
    ),
}


@pytest.mark.parametrize("case", CASES)
def test_wrong_driver_files(case: str) -> None:
    """Each says where, what, and what would have been right."""
    text, old, new, where, what, expected = CASES[case]
    assert text.count(old) == 1, case

    with pytest.raises(DriverFileError) as refused:
        parse_driver(text.replace(old, new).encode(), "mine.toml")

    error = refused.value
    assert error.where == (f"mine.toml: {where}" if where else "mine.toml")
    assert (error.what, error.expected) == (what, expected)


def test_unknown_driver_names_the_known_ones() -> None:
    """And that a path will do."""
    with pytest.raises(DriverFileError) as refused:
        read_driver("scope_generic")

    assert refused.value.what == "there is no driver 'scope_generic'"
    assert refused.value.expected == (
        "one of: meter_generic, source_generic, or the path of a driver file"
    )


def test_example_of_an_unknown_message(tmp_path: Path) -> None:
    """The file is wrong then, not the driver."""
    path = tmp_path / "mine.toml"
    path.write_text(METER + '[[example]]\nmessage = "raed"\nsends = "READ?"\n', encoding="utf-8")

    with pytest.raises(DriverFileError) as refused:
        check_driver(str(path))

    assert refused.value.where == f"{path}: example[7].message"
    assert refused.value.expected == "one of: prepare, read, error"
