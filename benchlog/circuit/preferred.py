"""Preferred numbers for the values of resistors and capacitors (IEC 60063)."""

import math
from functools import cache
from typing import Literal, TypeAlias

Series: TypeAlias = Literal["E3", "E6", "E12", "E24", "E48", "E96", "E192"]

# The series up to E24 are rounded by hand, in eight places away from the rule.
_E24 = (
    10,
    11,
    12,
    13,
    15,
    16,
    18,
    20,
    22,
    24,
    27,
    30,
    33,
    36,
    39,
    43,
    47,
    51,
    56,
    62,
    68,
    75,
    82,
    91,
)
_COARSE = {"E3": 8, "E6": 4, "E12": 2, "E24": 1}


@cache
def preferred_numbers(series: Series) -> tuple[int, ...]:
    """Return the numbers of one decade: 10 to 91 up to E24, 100 to 988 from E48.

    Source:
        IEC 60063: round(100 * 10**(k/n)) from E48 on, but for one number of E192 (920, not 919).
    """
    if series in _COARSE:
        return _E24[:: _COARSE[series]]
    count = int(series.removeprefix("E"))
    numbers = [round(100 * 10 ** (step / count)) for step in range(count)]
    return tuple(920 if number == 919 else number for number in numbers)


def nearest_preferred(value: float, series: Series) -> tuple[float, float]:
    """Return the values of a series at or below, and at or above, a value.

    Both are the value itself where it is in the series.

    Args:
        value: Above zero, any unit.
        series: ``"E24"`` ...
    """
    numbers = preferred_numbers(series)
    decade = math.floor(math.log10(value))
    ladder = [
        float(f"{number}e{power - len(str(number)) + 1}")
        for power in (decade - 1, decade, decade + 1)
        for number in numbers
    ]
    same = [one for one in ladder if math.isclose(one, value, rel_tol=1e-9)]
    if same:
        return value, value
    return max(one for one in ladder if one < value), min(one for one in ladder if one > value)
