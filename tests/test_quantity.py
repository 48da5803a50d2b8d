"""Quantities as people write them, and what is refused with which words."""

import math
from collections.abc import Callable

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from benchlog import quantity
from benchlog.errors import QuantityError

Parser = Callable[..., float]


def _id(value: object) -> str:
    return getattr(value, "__name__", None) or repr(value)[:30]


@pytest.mark.parametrize(
    ("parser", "entry", "expected"),
    [
        (quantity.hertz, "1e3", 1e3),
        (quantity.hertz, 250, 250.0),
        (quantity.hertz, 0.5, 0.5),
        (quantity.hertz, "10 kHz", 10e3),
        (quantity.hertz, "10k", 10e3),
        (quantity.hertz, "10K", 10e3),
        (quantity.hertz, "4k7", 4.7e3),
        (quantity.hertz, "1M5Hz", 1.5e6),
        (quantity.hertz, "1 MHz", 1e6),
        (quantity.hertz, "1MHZ", 1e6),
        (quantity.hertz, "10\u00a0kHz", 10e3),
        (quantity.hertz, "+2.5 GHz", 2.5e9),
        (quantity.ohm, "4k7", 4.7e3),
        (quantity.ohm, "2R2", 2.2),
        (quantity.ohm, "R47", 0.47),
        (quantity.ohm, "47R", 47.0),
        (quantity.ohm, "47 kohm", 47e3),
        (quantity.ohm, "47 k\u2126", 47e3),
        (quantity.ohm, "47 kΩ", 47e3),
        (quantity.ohm, "4.7 k ohms", 4.7e3),
        (quantity.ohm, "1M", 1e6),
        (quantity.farad, "22p", 22e-12),
        (quantity.farad, "4n7", 4.7e-9),
        (quantity.farad, "1µ", 1e-6),
        (quantity.farad, "1μ", 1e-6),
        (quantity.farad, "1u", 1e-6),
        (quantity.farad, "100 nF", 100e-9),
        (quantity.volt, "10.5 V", 10.5),
        (quantity.volt, "-12 V", -12.0),
        (quantity.volt, "−12", -12.0),
        (quantity.volt, "500 mV", 0.5),
        (quantity.second, "20 ms", 0.02),
        (quantity.second, 0, 0.0),
        (quantity.volt_per_second, "13 V/us", 13e6),
        (quantity.volt_per_second, "0.5 V/µs", 0.5e6),
        (quantity.volt_per_second, "2000 V/ms", 2e6),
        (quantity.volt_per_second, "13 MV/s", 13e6),
        (quantity.decibel, "1 dB", 1.0),
        (quantity.decibel, "-0.5dB", -0.5),
        (quantity.decibel, 3, 3.0),
        (quantity.percent, "1%", 0.01),
        (quantity.percent, "0.5 %", 0.005),
        (quantity.percent, "0%", 0.0),
        (quantity.percent, "500 ppm", 500e-6),
        (quantity.gain_ratio, "46.2", 46.2),
        (quantity.gain_ratio, 46.2, 46.2),
        (quantity.gain_ratio, "46.2 V/V", 46.2),
        (quantity.gain_ratio, "200k", 200e3),
        (quantity.gain_ratio, "200 V/mV", 200e3),
        (quantity.gain_ratio, "40 dB", 100.0),
        (quantity.gain_ratio, "-20 dB", 0.1),
    ],
    ids=_id,
)
def test_reads(parser: Parser, entry: str | float, expected: float) -> None:
    """Each way of writing a quantity gives the value in the inner unit."""
    assert parser(entry, field="x") == pytest.approx(expected, rel=1e-14, abs=0)


def test_nothing_at_all_is_a_resistance_only_where_it_may_be() -> None:
    """A source may have no impedance; a resistor must have some."""
    assert quantity.ohm("0 ohm", field="impedance", zero_ok=True) == 0.0
    assert quantity.ohm(0, field="impedance", zero_ok=True) == 0.0
    with pytest.raises(QuantityError, match="'0' is zero"):
        quantity.ohm("0", field="feedback")


REFUSED: list[tuple[Parser, object, str, str | None]] = [
    (quantity.hertz, "2 mHz", "'2 mHz' is far too small", "did you mean 2 MHz?"),
    (quantity.hertz, "2m", "'2m' is far too small", "did you mean 2 M?"),
    (quantity.hertz, "3 uHz", "'3 uHz' is far too small", None),
    (
        quantity.hertz,
        "10,5k",
        "'10,5k' has a comma in its number",
        'write a decimal point and no thousands separator: "10.5k"',
    ),
    (quantity.hertz, "1 V", "'1 V' is in volts, not a frequency", None),
    (quantity.hertz, "20 mV", "'20 mV' is in volts, not a frequency", None),
    (quantity.hertz, "1 s", "'1 s' is in seconds, not a frequency", None),
    (quantity.hertz, "5 parsec", "'5 parsec' has an unknown unit", None),
    (quantity.hertz, "1e3k", "'1e3k' has an unknown unit", None),
    (quantity.hertz, "1 kHz 2", "'1 kHz 2' has an unknown unit", None),
    (quantity.hertz, "5/", "'5/' has an unknown unit", None),
    (quantity.hertz, "", "'' is empty", None),
    (quantity.hertz, "  ", "'  ' is empty", None),
    (quantity.hertz, "Hz", "'Hz' does not begin with a number", None),
    (quantity.hertz, "inf", "'inf' does not begin with a number", None),
    (quantity.hertz, "nan Hz", "'nan Hz' does not begin with a number", None),
    (quantity.hertz, "0x10", "'0x10' has an unknown unit", None),
    (quantity.hertz, "1_000", "'1_000' has an unknown unit", None),
    (quantity.hertz, "١٢", "'١٢' does not begin with a number", None),
    (quantity.hertz, True, "True is no quantity", None),
    (quantity.hertz, None, "None is no quantity", None),
    (quantity.hertz, ["1"], "['1'] is no quantity", None),
    (quantity.hertz, math.nan, "nan is not a finite number", None),
    (quantity.hertz, math.inf, "inf is not a finite number", None),
    (quantity.hertz, 10**400, "a number too large to write is not a finite number", None),
    (quantity.hertz, "0", "'0' is zero", None),
    (quantity.hertz, -5, "-5 is negative", None),
    (quantity.hertz, "-1 kHz", "'-1 kHz' is negative", None),
    (quantity.hertz, "1e400", "'1e400' is too large to be a frequency", None),
    (quantity.hertz, "1e-9", "'1e-9' is too small to be a frequency", None),
    (quantity.hertz, "9" * 41, "... is too long for a quantity", None),
    (quantity.ohm, "47m", "'47m' is far too small", "did you mean 47 M?"),
    (quantity.ohm, "22p", "'22p' is far too small", None),
    (quantity.ohm, "22 pF", "'22 pF' is in farads, not a resistance", None),
    (quantity.ohm, "4R7V", "'4R7V' has an unknown unit", None),
    (quantity.farad, "4k7", "'4k7' is too large to be a capacitance", None),
    (quantity.farad, "-1n", "'-1n' is negative", None),
    (quantity.volt, "20 mVpp", "'20 mVpp' is the level of a sine, not a voltage", None),
    (quantity.second, "-1 ms", "'-1 ms' is negative", None),
    (quantity.volt_per_second, "13", "'13' has no unit", None),
    (quantity.volt_per_second, "13 V", "'13 V' is in volts, not a slew rate", None),
    (quantity.percent, "1", "'1' has no unit", None),
    (quantity.percent, 0.01, "0.01 has no unit", None),
    (quantity.percent, "150%", "'150%' is too large to be a percentage", None),
    (quantity.percent, "-1%", "'-1%' is negative", None),
    (quantity.gain_ratio, "-47", "'-47' is negative", None),
    (quantity.gain_ratio, "1 kHz", "'1 kHz' is in hertz, not a gain", None),
    (quantity.decibel, "1%", "'1%' is a percentage, not a level in decibels", None),
    (
        quantity.level_vrms,
        "20 mV",
        "'20 mV' does not say whether it is RMS, peak or peak to peak",
        'say which: "mVrms", "mVpp" or "mVpk"',
    ),
    (quantity.level_vrms, 0.02, "0.02 has no unit", None),
    (quantity.level_vrms, "0 mVpp", "'0 mVpp' is zero", None),
    (quantity.level_vrms, "-1 Vrms", "'-1 Vrms' is negative", None),
    (quantity.level_vrms, "3 dB", "'3 dB' is in decibels, not a level", None),
    (
        quantity.level_vrms,
        "0 dBm",
        "'0 dBm' is a power without its load",
        'say into which load: "0 dBm @ 50 ohm"',
    ),
    (
        quantity.level_vrms,
        "1 Vrms @ 50 ohm",
        "'1 Vrms @ 50 ohm' names a load, which only a level in dBm needs",
        None,
    ),
    (quantity.level_vrms, "0 dBm @ 50 V", "'50 V' is in volts, not a resistance", None),
    (quantity.level_vrms, "500 dBV", "'500 dBV' is too large to be a level", None),
]


@pytest.mark.parametrize(("parser", "entry", "what", "hint"), REFUSED, ids=_id)
def test_refuses(parser: Parser, entry: object, what: str, hint: str | None) -> None:
    """What is no such quantity is refused with the field's name, an example, and a hint."""
    with pytest.raises(QuantityError) as refused:
        parser(entry, field="sweep.start")

    assert refused.value.what.startswith("sweep.start: ")
    assert refused.value.what.endswith(what)
    assert refused.value.where == "sweep.start"
    assert refused.value.expected is not None
    assert ", for example " in refused.value.expected
    assert refused.value.hint == hint


def test_a_refusal_reads_as_a_person_would_say_it() -> None:
    """The whole message, word for word."""
    with pytest.raises(QuantityError) as refused:
        quantity.hertz("1 V", field="budget.corner.min")

    assert str(refused.value) == (
        "budget.corner.min: '1 V' is in volts, not a frequency\n"
        "  where:    budget.corner.min\n"
        '  expected: a frequency, for example "10 kHz"'
    )


ALL_PARSERS: list[Parser] = [
    quantity.hertz,
    quantity.ohm,
    quantity.farad,
    quantity.volt,
    quantity.second,
    quantity.volt_per_second,
    quantity.decibel,
    quantity.percent,
    quantity.gain_ratio,
    quantity.level_vrms,
]


@settings(max_examples=100, deadline=None)
@given(text=st.text(max_size=45) | st.from_regex(r"[+-]?[0-9]{1,3}[., ]?[0-9a-zA-Zµ%/@ ]{0,9}"))
def test_any_text_is_read_or_refused(text: str) -> None:
    """No text makes a parser raise anything else, or return what is not finite."""
    for parser in ALL_PARSERS:
        try:
            value = parser(text, field="x")
        except QuantityError:
            continue
        assert math.isfinite(value)


@settings(max_examples=50, deadline=None)
@given(
    value=st.floats(min_value=1.0, max_value=999.0),
    prefix=st.sampled_from([("", 1.0), ("k", 1e3), ("M", 1e6), ("G", 1e9)]),
)
def test_prefix_and_unit_scale_as_they_say(value: float, prefix: tuple[str, float]) -> None:
    """A number with prefix and unit is the number times the prefix."""
    letter, factor = prefix
    read = quantity.hertz(f"{value!r} {letter}Hz", field="x")
    assert read == pytest.approx(value * factor, rel=1e-14)
