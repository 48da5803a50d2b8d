"""Data elements become values, or the standard's errors."""

import pytest

from benchlog.practice.error_table import ScpiError
from benchlog.practice.message import parse_unit
from benchlog.practice.parameters import (
    Boolean,
    Choice,
    Limits,
    Number,
    Parameter,
    Quantity,
    Text,
    Value,
    as_float,
    nr1,
    nr3,
    read_parameters,
)

HERTZ = Number(units=("HZ",))
VOLT = Number(units=("V", "VRMS", "VPP"))
OHM = Number(units=("OHM",), words=("MINimum", "INFinity"))
PLAIN = Number(words=())
UNIT = Choice(words=("VRMS", "VPP"))
ONCE = Boolean(words=("ON", "OFF", "ONCE"))
FUNCTION = Text(allowed=("VOLT:AC",))


def read(parameter: Parameter, written: str) -> Value:
    """Read one element as one parameter."""
    unit = parse_unit(f"X {written}")
    assert unit is not None
    (value,) = read_parameters((parameter,), unit.elements, required=1)
    return value


@pytest.mark.parametrize(
    ("parameter", "written", "value"),
    [
        (HERTZ, "1000", 1e3),
        (HERTZ, "1e3", 1e3),
        (HERTZ, "1kHz", 1e3),
        (HERTZ, "1 khz", 1e3),
        (HERTZ, "1 MHz", 1e6),
        (HERTZ, "1 MAHZ", 1e6),
        (HERTZ, "1 GHZ", 1e9),
        (HERTZ, "5 UHZ", 5e-6),
        (HERTZ, "MAX", "MAX"),
        (HERTZ, "minimum", "MIN"),
        (HERTZ, "DEF", "DEF"),
        (VOLT, "20 mV", 0.02),
        (VOLT, "2 MAV", 2e6),
        (VOLT, "20 MVPP", Quantity(0.02, "VPP")),
        (VOLT, "1VRMS", Quantity(1.0, "VRMS")),
        (OHM, "50", 50.0),
        (OHM, "1 MOHM", 1e6),
        (OHM, "1 KOHM", 1e3),
        (OHM, "INF", "INF"),
        (OHM, "INFINITY", "INF"),
        (PLAIN, "#HFF", 255.0),
        (UNIT, "vpp", "VPP"),
        (ONCE, "ON", 1.0),
        (ONCE, "off", 0.0),
        (ONCE, "ONCE", "ONCE"),
        (ONCE, "1", 1.0),
        (ONCE, "0", 0.0),
        (ONCE, "0.4", 0.0),
        (ONCE, "-7", 1.0),
        (FUNCTION, "'volt:ac'", "VOLT:AC"),
    ],
)
def test_values(parameter: Parameter, written: str, value: Value) -> None:
    """M is milli but for HZ and OHM, where it is mega (IEEE 488.2, 7.7.3, from memory)."""
    found = read(parameter, written)
    assert found == (value if isinstance(value, (str, Quantity)) else pytest.approx(value))


@pytest.mark.parametrize(
    ("parameter", "written", "number"),
    [
        (HERTZ, "1 V", -131),
        (HERTZ, "1 XHZ", -131),
        (HERTZ, "1 K", -131),
        (HERTZ, "INF", -141),
        (HERTZ, "MAXI", -141),
        (HERTZ, "'1'", -158),
        (HERTZ, "#11a", -168),
        (HERTZ, "(1)", -178),
        (PLAIN, "1 HZ", -138),
        (PLAIN, "MAX", -148),
        (UNIT, "1", -128),
        (UNIT, "DBM", -141),
        (ONCE, "YES", -141),
        (ONCE, "1 V", -138),
        (ONCE, "'ON'", -158),
        (FUNCTION, "VOLT", -148),
        (FUNCTION, "'CURR:AC'", -224),
    ],
)
def test_wrong_values(parameter: Parameter, written: str, number: int) -> None:
    """Every element of a wrong kind has its own number."""
    with pytest.raises(ScpiError) as caught:
        read(parameter, written)
    assert caught.value.number == number


@pytest.mark.parametrize(("written", "number"), [("X", -109), ("X 1,2,3", -108)])
def test_number_of_elements(written: str, number: int) -> None:
    """Too few and too many are told apart."""
    unit = parse_unit(written)
    assert unit is not None
    with pytest.raises(ScpiError) as caught:
        read_parameters((HERTZ, HERTZ), unit.elements, required=1)
    assert caught.value.number == number


def test_optional_elements_may_be_left_out() -> None:
    """What is not required is simply not there."""
    unit = parse_unit("X 1")
    assert unit is not None
    assert read_parameters((HERTZ, HERTZ), unit.elements, required=1) == (1.0,)


LIMITS = Limits(minimum=1.0, maximum=10.0, default=5.0)


@pytest.mark.parametrize(
    ("value", "number"),
    [("MIN", 1.0), ("MAX", 10.0), ("DEF", 5.0), (7.0, 7.0), (10 * (1 + 1e-12), 10.0)],
)
def test_limits_resolve(value: Value, number: float) -> None:
    """Words stand for the limits; a rounding error outside is inside."""
    assert LIMITS.resolve(value) == number


@pytest.mark.parametrize("value", [0.999, 10.001, float("inf"), -5.0])
def test_limits_refuse(value: float) -> None:
    """Out of range is -222, and infinity is out of every range."""
    with pytest.raises(ScpiError) as caught:
        LIMITS.resolve(value)
    assert caught.value.number == -222


def test_numbers_as_they_are_answered() -> None:
    """Integers without a point, readings with seven digits, sign and exponent."""
    assert nr1(1.0) == "1"
    assert nr3(0.01414214) == "+1.414214E-02"
    assert nr3(9.9e37) == "+9.900000E+37"
    assert nr3(1234.5678901, 12) == "+1.23456789010E+03"
    assert as_float(Quantity(2.0, "VPP")) == 2.0
