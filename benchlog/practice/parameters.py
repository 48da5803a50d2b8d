"""What the data elements of a command may be, and numbers as instruments answer them."""

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TypeAlias

from benchlog.practice.error_table import ScpiError
from benchlog.practice.message import Element
from benchlog.practice.tree import short_form, spellings


@dataclass(frozen=True, slots=True)
class Quantity:
    """A number whose unit matters to the instrument: ``20 mVpp`` is ``Quantity(0.02, "VPP")``."""

    value: float
    unit: str


Value: TypeAlias = float | str | Quantity

INFINITY = 9.9e37
"""What infinity is on the wire (SCPI-99, volume 1, 7.2.1)."""

# IEEE 488.2, 7.7.3 (from memory): multipliers of a unit.  MHZ and MOHM are the two exceptions in
# which a single M is mega.
MULTIPLIERS = {
    "EX": 1e18,
    "PE": 1e15,
    "T": 1e12,
    "G": 1e9,
    "MA": 1e6,
    "K": 1e3,
    "": 1.0,
    "M": 1e-3,
    "U": 1e-6,
    "N": 1e-9,
    "P": 1e-12,
    "F": 1e-15,
    "A": 1e-18,
}
_MEGA_UNITS = ("HZ", "OHM")

_NOT_ALLOWED = {"number": -128, "word": -148, "string": -158, "block": -168, "expression": -178}


@dataclass(frozen=True, slots=True, kw_only=True)
class Number:
    """A number, possibly with a unit, or one of a few words.

    Attributes:
        units: Units that may follow; the first is meant when none does.  Empty: none may.
        words: Words that may stand instead, as manuals write them.
    """

    units: tuple[str, ...] = ()
    words: tuple[str, ...] = ("MINimum", "MAXimum", "DEFault")

    def read(self, element: Element) -> Value:
        """Return a float, a quantity in another unit than the first, or a word's short form."""
        if element.kind == "word" and self.words:
            return _one_of(self.words, element)
        if element.kind != "number":
            raise ScpiError(_NOT_ALLOWED[element.kind])
        factor, unit = self._unit(element.suffix)
        value = float(element.text) * factor
        return value if unit in ("", *self.units[:1]) else Quantity(value, unit)

    def _unit(self, suffix: str) -> tuple[float, str]:
        if not suffix:
            return 1.0, ""
        if not self.units:
            raise ScpiError(-138)
        for unit in self.units:
            if suffix == "M" + unit and unit in _MEGA_UNITS:
                return 1e6, unit
            multiplier = suffix.removesuffix(unit)
            if suffix.endswith(unit) and multiplier in MULTIPLIERS:
                return MULTIPLIERS[multiplier], unit
        raise ScpiError(-131)


@dataclass(frozen=True, slots=True, kw_only=True)
class Choice:
    """One word out of several."""

    words: tuple[str, ...]

    def read(self, element: Element) -> Value:
        """Return the word's short form, in capitals."""
        if element.kind != "word":
            raise ScpiError(_NOT_ALLOWED[element.kind])
        return _one_of(self.words, element)


@dataclass(frozen=True, slots=True, kw_only=True)
class Boolean:
    """ON, OFF or a number, which is true unless it rounds to zero (SCPI-99, volume 1, 7.3)."""

    words: tuple[str, ...] = ("ON", "OFF")

    def read(self, element: Element) -> Value:
        """Return 1.0 or 0.0, or one of the words beyond ON and OFF."""
        if element.kind == "number":
            if element.suffix:
                raise ScpiError(-138)
            return float(abs(float(element.text)) >= 0.5)
        if element.kind != "word":
            raise ScpiError(_NOT_ALLOWED[element.kind])
        word = _one_of(self.words, element)
        return {"ON": 1.0, "OFF": 0.0}.get(word, word)


@dataclass(frozen=True, slots=True, kw_only=True)
class Text:
    """A quoted string out of several; letter case does not matter."""

    allowed: tuple[str, ...]

    def read(self, element: Element) -> Value:
        """Return the string in capitals."""
        if element.kind != "string":
            raise ScpiError(_NOT_ALLOWED[element.kind])
        if element.text.upper() not in self.allowed:
            raise ScpiError(-224)
        return element.text.upper()


Parameter: TypeAlias = Number | Choice | Boolean | Text


def read_parameters(
    parameters: Sequence[Parameter], elements: Sequence[Element], *, required: int
) -> tuple[Value, ...]:
    """Return the values of the elements that a command was given.

    Raises:
        ScpiError: Too few (-109), too many (-108), or one of the wrong kind.
    """
    if len(elements) > len(parameters):
        raise ScpiError(-108)
    if len(elements) < required:
        raise ScpiError(-109)
    return tuple(
        parameter.read(element) for parameter, element in zip(parameters, elements, strict=False)
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class Limits:
    """The range of a setting and where it starts."""

    minimum: float
    maximum: float
    default: float

    def resolve(self, value: Value) -> float:
        """Return a number inside the range for a number or one of the three words.

        Raises:
            ScpiError: The number is out of range (-222).
        """
        named = {"MIN": self.minimum, "MAX": self.maximum, "DEF": self.default}
        number = named[value] if isinstance(value, str) else as_float(value)
        # A relative rounding error is no reason to refuse a limit computed elsewhere.
        slack = 1e-9 * abs(number) if math.isfinite(number) else 0.0
        if not self.minimum - slack <= number <= self.maximum + slack:
            raise ScpiError(-222)
        return min(max(number, self.minimum), self.maximum)


def as_float(value: Value) -> float:
    """Return the number behind a value; only words have none."""
    if isinstance(value, Quantity):
        return value.value
    return float(value)


def nr1(value: float) -> str:
    """Return an integer as instruments answer it."""
    return f"{int(value):d}"


def nr3(value: float, digits: int = 7) -> str:
    """Return a number with an exponent: ``+1.414214E-02``."""
    return f"{value:+.{digits - 1}E}"


def _one_of(words: Sequence[str], element: Element) -> str:
    for word in words:
        if element.text in spellings(word):
            return short_form(word)
    raise ScpiError(-141)
