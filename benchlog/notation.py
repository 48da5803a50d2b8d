"""Write numbers for people: rounded to their uncertainty, with prefixes, in plain ASCII."""

import math
from typing import SupportsFloat

# Units that a prefix would make unreadable: nobody says millidecibel.
_UNPREFIXED = frozenset({"", "dB", "V/V", "%", "deg"})
_PREFIXES = {-12: "p", -9: "n", -6: "u", -3: "m", 0: "", 3: "k", 6: "M", 9: "G", 12: "T"}


def with_uncertainty(value: SupportsFloat, u: SupportsFloat | None, unit: str) -> str:
    """Write a value rounded to two significant digits of its standard uncertainty.

    Args:
        value: The value, in ``unit``.
        u: Its standard uncertainty, in ``unit``; 0 means exact, None that none is stated.
        unit: ``"Hz"``, ``"V"``, ``"dB"``, ``"V/V"`` ...

    Returns:
        ``"9.982(41) kHz"``: the digits in brackets belong to the last digits of the value; they
        carry a point of their own where they reach past the point of the value: ``"10.0(4.1)"``.

    Source:
        JCGM 100:2008, 7.2.2 (form) and 7.2.6 (at most two significant digits of u).
    """
    value = float(value)
    u = 0.0 if u is None else abs(float(u))
    if u == 0 or not math.isfinite(value):
        return si(value, unit)
    if not math.isfinite(u):
        return f"{si(value, unit)} (uncertainty not known)"
    place = _place_of_second_digit(u)
    exponent = _exponent(max(abs(_to_place(value, place)), _to_place(u, place)), unit)
    decimals = max(0, exponent - place)
    rounded = _to_place(value, place) / 10.0**exponent
    spread = _to_place(u, place) / 10.0**exponent
    if place >= exponent or spread >= 1:
        bracket = f"{spread:.{decimals}f}"
    else:
        bracket = f"{round(spread * 10**decimals)}"
    return _joined(f"{_no_minus_zero(rounded, decimals)}({bracket})", exponent, unit)


def si(value: SupportsFloat, unit: str, digits: int = 4) -> str:
    """Write a value with a prefix and at most ``digits`` significant digits: ``"47 kohm"``."""
    value = float(value)
    if math.isnan(value):
        return "no value"
    if math.isinf(value):
        return _joined(f"{value}", 0, unit)
    exponent = _exponent(abs(_to_digits(value, digits)), unit)
    return _joined(plain(value / 10.0**exponent, digits), exponent, unit)


def plain(value: SupportsFloat, digits: int = 4) -> str:
    """Write a number without prefix, with at most ``digits`` significant digits: ``"46.2"``.

    1234567 becomes ``"1235000"``; powers of ten are used only past 15 places.
    """
    value = float(value)
    if math.isnan(value):
        return "no value"
    if value == 0 or math.isinf(value):
        return "0" if value == 0 else f"{value}"
    size = math.floor(math.log10(abs(_to_digits(value, digits))))
    if abs(size) > 15:
        return f"{value:.{digits - 1}e}"
    decimals = max(0, digits - 1 - size)
    text = _no_minus_zero(_to_digits(value, digits), decimals)
    return text.rstrip("0").rstrip(".") if "." in text else text


def decibels(ratio: float) -> float:
    """Turn a voltage ratio into decibels; 0 gives minus infinity.

    Raises:
        ValueError: The ratio is negative or not a number.
    """
    if ratio == 0:
        return -math.inf
    return 20.0 * math.log10(ratio)


def ratio_from_decibels(decibels_: float) -> float:
    """Turn decibels into a voltage ratio."""
    return float(10.0 ** (decibels_ / 20.0))


def _place_of_second_digit(u: float) -> int:
    """Return the power of ten of the second significant digit of u, after rounding to it."""
    place = math.floor(math.log10(u)) - 1
    return place + 1 if round(u / 10.0**place) >= 100 else place


def _to_place(value: float, place: int) -> float:
    return round(value, -place)


def _to_digits(value: float, digits: int) -> float:
    """Round to a number of significant digits."""
    return float(f"{value:.{digits - 1}e}")


def _exponent(size: float, unit: str) -> int:
    """Choose the power of ten, a multiple of three, whose prefix suits a size."""
    if unit in _UNPREFIXED or size == 0:
        return 0
    exponent = 3 * math.floor(math.log10(size) / 3)
    return min(max(exponent, min(_PREFIXES)), max(_PREFIXES))


def _no_minus_zero(value: float, decimals: int) -> str:
    text = f"{value:.{decimals}f}"
    return text.removeprefix("-") if float(text) == 0 else text


def _joined(number: str, exponent: int, unit: str) -> str:
    return f"{number} {_PREFIXES[exponent]}{unit}".rstrip()
