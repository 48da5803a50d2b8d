"""The grammar of one cell: a number, a state, or a word."""

import math
import re
from typing import Literal, TypeAlias

Decimal: TypeAlias = Literal[".", ","]

_SUFFIXES = {
    "p": 1e-12,
    "n": 1e-9,
    "u": 1e-6,
    "µ": 1e-6,
    "μ": 1e-6,
    "m": 1e-3,
    "k": 1e3,
    "K": 1e3,
    "M": 1e6,
    "G": 1e9,
}
_NUMBERS = {
    mark: re.compile(
        rf"([+-]?(?:[0-9]+(?:{re.escape(mark)}[0-9]*)?|{re.escape(mark)}[0-9]+))"
        r"(?:[eEdD]([+-]?[0-9]{1,4}))?([pnuµμmkKMG]?)"
    )
    for mark in (".", ",")
}
# What instruments and programs write where there is no number; NaN stands for all of them.
_STATES = frozenset(
    {"ovld", "overload", "over", "ol", "o.l", "---", "----", "****", "***", "nan", "inf", "+inf",
     "-inf", "infinity", "-infinity", "n/a", "na", "#n/a", "null", "none", "9.9e37", "9.91e37"}
)  # fmt: skip
_STATE_FLOOR = 9.9e36


def number(cell: str, decimal: Decimal) -> float | None:
    """Read a cell.

    Args:
        cell: Without delimiter and quotes.
        decimal: The decimal mark of this file; the other mark is never a thousands separator.

    Returns:
        The number; NaN for a state that stands in a number's place; None where it is neither.
    """
    text = cell.strip().replace("\u2212", "-")
    if text.lower() in _STATES or (text and not text.strip("-*")):
        return math.nan
    found = _NUMBERS[decimal].fullmatch(text)
    if found is None:
        return None
    mantissa, exponent, suffix = found.groups()
    value = float(f"{mantissa.replace(decimal, '.')}e{exponent or 0}")
    value *= _SUFFIXES.get(suffix, 1.0)
    return value if abs(value) < _STATE_FLOOR else math.nan
