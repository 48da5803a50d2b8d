"""Numbers written for people."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from benchlog import notation


@pytest.mark.parametrize(
    ("value", "u", "unit", "expected"),
    [
        (9982.4, 41.2, "Hz", "9.982(41) kHz"),
        (9982, 412, "Hz", "9.98(41) kHz"),
        (9982, 4120, "Hz", "10.0(4.1) kHz"),
        (150, 412, "Hz", "150(410) Hz"),
        (5, 1e6, "Hz", "0.0(1.0) MHz"),
        (2.7e6, 9e3, "Hz", "2.7000(90) MHz"),
        (999_999.9, 412, "Hz", "1.00000(41) MHz"),
        (1e3, 99.6, "Hz", "1.00(10) kHz"),
        (33.6234, 0.0123, "dB", "33.623(12) dB"),
        (-33.6234, 0.0123, "dB", "-33.623(12) dB"),
        (47.988, 0.02, "V/V", "47.988(20) V/V"),
        (1234.5, 150, "V/V", "1230(150) V/V"),
        (-0.0001, 0.02, "dB", "0.000(20) dB"),
        (0, 1.234, "Hz", "0.0(1.2) Hz"),
        (1e3, 0, "Hz", "1 kHz"),
        (1e3, None, "Hz", "1 kHz"),
        (1e3, math.inf, "Hz", "1 kHz (uncertainty not known)"),
        (1e3, math.nan, "Hz", "1 kHz (uncertainty not known)"),
        (math.nan, 1, "Hz", "no value"),
        (2.2e-11, 1e-12, "F", "22.0(1.0) pF"),
    ],
    ids=repr,
)
def test_value_is_rounded_to_two_digits_of_u(
    value: float, u: float | None, unit: str, expected: str
) -> None:
    """The value ends where the second significant digit of u ends."""
    assert notation.with_uncertainty(value, u, unit) == expected


def test_single_precision_is_written_like_double() -> None:
    """A numpy scalar of either width is a number like any other."""
    assert notation.with_uncertainty(np.float32(9982.4), np.float32(41.2), "Hz") == "9.982(41) kHz"
    assert notation.si(np.float32(4700.0), "ohm") == "4.7 kohm"


@pytest.mark.parametrize(
    ("value", "unit", "expected"),
    [
        (47000, "ohm", "47 kohm"),
        (22e-12, "F", "22 pF"),
        (4.7e-6, "F", "4.7 uF"),
        (9982.4, "Hz", "9.982 kHz"),
        (999.96, "Hz", "1 kHz"),
        (999.94, "Hz", "999.9 Hz"),
        (0, "Hz", "0 Hz"),
        (-12, "V", "-12 V"),
        (0.02, "V", "20 mV"),
        (33.6227, "dB", "33.62 dB"),
        (0.001, "V/V", "0.001 V/V"),
        (1e20, "Hz", "100000000 THz"),
        (math.inf, "Hz", "inf Hz"),
        (math.nan, "Hz", "no value"),
        (1000, "", "1000"),
    ],
    ids=repr,
)
def test_prefix_suits_the_size(value: float, unit: str, expected: str) -> None:
    """Prefixes in ASCII; none on decibels and ratios."""
    assert notation.si(value, unit) == expected


@pytest.mark.parametrize(
    ("value", "expected"),
    [
        (46.2, "46.2"),
        (46.23456, "46.23"),
        (1234567, "1235000"),
        (0, "0"),
        (1e-20, "1.000e-20"),
        (math.nan, "no value"),
    ],
)
def test_plain_keeps_significant_digits(value: float, expected: str) -> None:
    """No prefix, no trailing zeros."""
    assert notation.plain(value) == expected


def test_no_signal_is_minus_infinity_decibels_and_a_negative_ratio_is_none() -> None:
    """Only magnitudes have decibels."""
    assert notation.decibels(0.0) == -math.inf
    with pytest.raises(ValueError, match=r"math domain|positive"):
        notation.decibels(-1.0)


@settings(max_examples=100, deadline=None)
@given(
    value=st.floats(min_value=-1e12, max_value=1e12),
    u=st.floats(min_value=1e-6, max_value=1e9),
)
def test_what_is_written_lies_within_rounding_of_the_value(value: float, u: float) -> None:
    """Reading the text back gives the value within half a unit of the last digit of u."""
    written = notation.with_uncertainty(value, u, "Hz")
    number, _, rest = written.partition("(")
    bracket, _, unit = rest.partition(") ")
    factor = {"p": 1e-12, "n": 1e-9, "u": 1e-6, "m": 1e-3, "H": 1, "k": 1e3, "M": 1e6, "G": 1e9}
    scale = {**factor, "T": 1e12}[unit[0]]

    place = 10.0 ** (math.floor(math.log10(u)) - 1)
    assert float(number) * scale == pytest.approx(value, abs=5.1 * place, rel=1e-9)
    assert len(bracket.replace(".", "").strip("0")) <= 2


@settings(max_examples=50, deadline=None)
@given(gain_db=st.floats(min_value=-200, max_value=200))
def test_decibels_and_ratio_undo_each_other(gain_db: float) -> None:
    """There and back is the same number."""
    there = notation.ratio_from_decibels(gain_db)
    assert notation.decibels(there) == pytest.approx(gain_db, abs=1e-9)
