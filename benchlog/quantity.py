"""Read what people write for a quantity: ``"4k7"``, ``"20 mVpp"``, ``"34 dB"``.

QuantiPhy reads the number, its prefix and its unit.  Four things are settled before it, because it
would quietly take them for something else: part codes (``4k7``), percent, millihertz, and the
decimal comma.  Every parser refuses with the field's name and an example.
"""

import math
import re
import sys
from collections.abc import Mapping
from dataclasses import dataclass
from typing import TypeAlias

from quantiphy import QuantiPhyError, Quantity

from benchlog.errors import QuantityError
from benchlog.notation import ratio_from_decibels

Entry: TypeAlias = str | int | float

_LONGEST = 40
_LARGEST = sys.float_info.max
_NUMBER = re.compile(r"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?")
_PART_CODE = re.compile(r"([+-]?[0-9]*)([RrFkKMGTmuµnp])([0-9]+)([A-Za-z/]*)")
_UNIT = re.compile(r"[A-Za-zµ%/]*")
_COMMA = re.compile(r"[0-9],[0-9]")
_ALIKE = str.maketrans(
    {"\u00a0": " ", "\u202f": " ", "−": "-", "\u2126": "ohm", "Ω": "ohm", "μ": "µ"}
)


class _Scaled(Quantity):
    """QuantiPhy with the prefixes of electronics only; its preferences belong to a class."""


_Scaled.set_prefs(input_sf="TGMKkmuµnp")


@dataclass(frozen=True, slots=True, kw_only=True)
class Kind:
    """A kind of quantity.

    Attributes:
        noun: ``"a frequency"``.
        example: What a good entry looks like.
        units: Accepted unit (lower case) to the factor that makes it the inner unit.
        low, high: What is possible, both included, in the inner unit.
        bare: Whether a number without a unit is taken to be in the inner unit.
        small: Whether prefixes below one make sense.
    """

    noun: str
    example: str
    units: Mapping[str, float]
    low: float
    high: float
    bare: bool = True
    small: bool = True


_OHM = {"ohm": 1.0, "ohms": 1.0, "r": 1.0}
_PER_SECOND = {"v/s": 1.0, "v/ms": 1e3, "v/us": 1e6, "v/µs": 1e6, "v/ns": 1e9}

FREQUENCY = Kind(
    noun="a frequency", example="10 kHz", units={"hz": 1.0}, low=1e-4, high=1e12, small=False
)
RESISTANCE = Kind(noun="a resistance", example="4k7", units=_OHM, low=1e-3, high=1e13, small=False)
CAPACITANCE = Kind(noun="a capacitance", example="22p", units={"f": 1.0}, low=1e-18, high=1.0)
VOLTAGE = Kind(noun="a voltage", example="10.5 V", units={"v": 1.0}, low=-1e6, high=1e6)
SLEW_RATE = Kind(
    noun="a slew rate", example="13 V/us", units=_PER_SECOND, low=1.0, high=1e15, bare=False
)
TIME = Kind(noun="a time", example="20 ms", units={"s": 1.0}, low=0.0, high=1e7)
LEVEL = Kind(
    noun="a level",
    example="20 mVpp",
    units={
        "vrms": 1.0,
        "vp": math.sqrt(0.5),
        "vpk": math.sqrt(0.5),
        "vpeak": math.sqrt(0.5),
        "vpp": math.sqrt(0.125),
    },
    low=1e-9,
    high=1e6,
    bare=False,
)
# dBu counts from 1 mW in 600 ohm, which is the root of 0.6 V.
DECIBEL_LEVEL = Kind(
    noun="a level",
    example="-10 dBV",
    units={"dbv": 1.0, "dbu": 1.0, "dbm": 1.0},
    low=-180.0,
    high=120.0,
    bare=False,
)
GAIN = Kind(
    noun="a gain",
    example="34 dB",
    units={"v/v": 1.0, "v/mv": 1e3, "v/uv": 1e6},
    low=1e-9,
    high=1e12,
)
DECIBEL = Kind(noun="a level in decibels", example="1 dB", units={"db": 1.0}, low=-300, high=300)
PERCENT = Kind(
    noun="a percentage", example="1%", units={"%": 0.01, "ppm": 1e-6}, low=0.0, high=1.0, bare=False
)

# What a unit tells, for the message when it is the wrong one.
_TOLD = {
    "hz": "in hertz",
    "f": "in farads",
    "v": "in volts",
    "s": "in seconds",
    "db": "in decibels",
    "dbm": "in decibels above 1 mW",
    "%": "a percentage",
    **dict.fromkeys(_OHM, "in ohms"),
    **dict.fromkeys(_PER_SECOND, "in volts per time"),
    **dict.fromkeys(LEVEL.units, "the level of a sine"),
    **dict.fromkeys(("dbv", "dbu"), "the level of a sine"),
}


def hertz(text: Entry, *, field: str) -> float:
    """Read a frequency above zero: ``"10 kHz"``, ``"1e3"``, ``"4k7"`` -> hertz.

    Args:
        text: The entry; a number, or text without a unit, is in hertz.
        field: Name of what is being read, for the message.

    Raises:
        QuantityError: It is not a frequency, or one in millihertz (most likely a slip for MHz).
    """
    return _read(text, field, FREQUENCY)


def ohm(text: Entry, *, field: str, zero_ok: bool = False) -> float:
    """Read a resistance: ``"4k7"``, ``"2R2"``, ``"47 kohm"`` -> ohm; see ``hertz`` for the rest.

    Args:
        text: The entry.
        field: Name of what is being read.
        zero_ok: Whether nothing at all is a possible value, as for a source's impedance.
    """
    if zero_ok and not isinstance(text, bool) and str(text).strip() in {"0", "0.0", "0 ohm"}:
        return 0.0
    return _read(text, field, RESISTANCE)


def farad(text: Entry, *, field: str) -> float:
    """Read a capacitance above zero: ``"22p"``, ``"4n7"``, ``"1 uF"`` -> farad."""
    return _read(text, field, CAPACITANCE)


def volt(text: Entry, *, field: str) -> float:
    """Read a peak or direct voltage, of either sign: ``"10.5 V"`` -> volt."""
    return _read(text, field, VOLTAGE)


def second(text: Entry, *, field: str) -> float:
    """Read a time, zero or longer: ``"20 ms"`` -> second."""
    return _read(text, field, TIME)


def volt_per_second(text: Entry, *, field: str) -> float:
    """Read a slew rate above zero with its unit: ``"13 V/us"`` -> volt per second."""
    return _read(text, field, SLEW_RATE)


def decibel(text: Entry, *, field: str) -> float:
    """Read decibels, of either sign: ``"1 dB"`` -> dB; a number without a unit is in dB."""
    return _read(text, field, DECIBEL)


def percent(text: Entry, *, field: str) -> float:
    """Read a percentage from 0 to 100 with its sign: ``"1%"`` -> 0.01."""
    return _read(text, field, PERCENT)


def gain_ratio(text: Entry, *, field: str) -> float:
    """Read a gain: ``"34 dB"``, ``"46.2"``, ``"200k"``, ``"200 V/mV"`` -> V/V.

    Raises:
        QuantityError: It is not a gain, or it is a negative ratio: only magnitudes are gains here.
    """
    if _unit_of(text) == "db":
        return ratio_from_decibels(_read(text, field, DECIBEL))
    return _read(text, field, GAIN)


def level_vrms(text: Entry, *, field: str) -> float:
    """Read the level of a sine -> V RMS.

    Args:
        text: ``"20 mVpp"``, ``"10 mVpk"``, ``"100 mVrms"``, ``"-10 dBV"``, ``"+4 dBu"``, or
            ``"0 dBm @ 50 ohm"``.
        field: Name of what is being read.

    Raises:
        QuantityError: It is not a level, or plain volts: peak, peak to peak and RMS differ by
            nearly three, so it must say which.

    Source:
        dBu: 1 mW in 600 ohm, 0.774597 V RMS; dBV: 1 V RMS; dBm: 1 mW in the resistance given.
    """
    level, _, load = _as_text(_Wanted(text, field, LEVEL)).partition("@")
    unit = _unit_of(level)
    wanted = _Wanted(text, field, LEVEL)
    if load and unit != "dbm":
        raise wanted.refusal("names a load, which only a level in dBm needs")
    if unit not in DECIBEL_LEVEL.units:
        return _read(text, field, LEVEL)
    if unit == "dbm" and not load.strip():
        hint = f'say into which load: "{level.strip()} @ 50 ohm"'
        raise wanted.refusal("is a power without its load", hint=hint)
    reference_vrms = {
        "dbv": lambda: 1.0,
        "dbu": lambda: math.sqrt(0.6),
        "dbm": lambda: math.sqrt(1e-3 * ohm(load.strip(), field=field)),
    }[unit]()
    return reference_vrms * ratio_from_decibels(_read(level, field, DECIBEL_LEVEL))


@dataclass(frozen=True, slots=True)
class _Wanted:
    """An entry beside what it must be, and the error to raise when it is not."""

    entry: object
    field: str
    kind: Kind

    def refusal(self, why: str, *, hint: str | None = None) -> QuantityError:
        return QuantityError(
            f"{self.field}: {shown(self.entry)} {why}",
            where=self.field,
            expected=f'{self.kind.noun}, for example "{self.kind.example}"',
            hint=hint,
        )


def shown(entry: object) -> str:
    """Return an entry as a message shows it, cut where it is long."""
    if isinstance(entry, int) and abs(entry) > 10**_LONGEST:
        return "a number too large to write"
    text = repr(entry)
    return text if len(text) <= _LONGEST + 2 else f"{text[:_LONGEST]}..."


def _read(entry: Entry, field: str, kind: Kind) -> float:
    """Read one entry as a kind of quantity, in the inner unit."""
    wanted = _Wanted(entry, field, kind)
    number, prefix_unit = _split(_as_text(wanted), wanted)
    if prefix_unit in {"%", "ppm"}:
        value, unit = float(number), prefix_unit
    else:
        value, unit = _scaled(number, prefix_unit, wanted)
    value *= _factor(unit, wanted)
    if not kind.small and prefix_unit.lower() != unit and prefix_unit[0] in "mµunp":
        slip = f"did you mean {number} M{prefix_unit[1:]}?" if prefix_unit[0] == "m" else None
        raise wanted.refusal("is far too small", hint=slip)
    if not kind.low <= value <= kind.high:
        raise wanted.refusal(_why_impossible(value, kind))
    return value


def _as_text(wanted: _Wanted) -> str:
    """Return the entry as one line of text with plain characters."""
    entry = wanted.entry
    if isinstance(entry, bool) or not isinstance(entry, str | int | float):
        raise wanted.refusal("is no quantity")
    if not isinstance(entry, str):
        if not abs(entry) <= _LARGEST:
            raise wanted.refusal("is not a finite number")
        return f"{float(entry)!r}"
    text = " ".join(entry.translate(_ALIKE).split())
    if not text:
        raise wanted.refusal("is empty")
    if len(text) > _LONGEST:
        raise wanted.refusal("is too long for a quantity")
    if _COMMA.search(text):
        hint = f'write a decimal point and no thousands separator: "{text.replace(",", ".")}"'
        raise wanted.refusal("has a comma in its number", hint=hint)
    return text


def _split(text: str, wanted: _Wanted) -> tuple[str, str]:
    """Split a text into its number and what follows, prefix and unit in one word."""
    packed = text.replace(" ", "")
    code = _PART_CODE.fullmatch(packed)
    if code:
        whole, letter, fraction, unit = code.groups()
        told = {"R": "ohm", "r": "ohm", "F": "F"}.get(letter)
        sign, digits = ("-", whole[1:]) if whole.startswith("-") else ("", whole.lstrip("+"))
        return f"{sign}{digits or 0}.{fraction}", (told or letter) + unit
    found = _NUMBER.match(packed)
    if not found:
        raise wanted.refusal("does not begin with a number")
    if not _UNIT.fullmatch(packed, found.end()):
        raise wanted.refusal("has an unknown unit")
    return found.group(), packed[found.end() :]


def _scaled(number: str, prefix_unit: str, wanted: _Wanted) -> tuple[float, str]:
    """Apply the prefix; return the value and its unit in lower case."""
    try:
        quantity = _Scaled(f"{number} {prefix_unit}".strip())
    except QuantiPhyError as error:
        raise wanted.refusal("has an unknown unit") from error
    return float(quantity), str(quantity.units).lower()


def _unit_of(entry: Entry) -> str:
    """Return what follows the number, in lower case; empty where nothing does."""
    packed = str(entry).translate(_ALIKE).replace(" ", "")
    found = _NUMBER.match(packed)
    return packed[found.end() :].lower() if found else ""


def _factor(unit: str, wanted: _Wanted) -> float:
    """Return what makes a value in this unit one in the inner unit."""
    kind = wanted.kind
    if unit in kind.units:
        return kind.units[unit]
    if not unit and kind.bare:
        return 1.0
    if not unit:
        raise wanted.refusal("has no unit")
    if kind is LEVEL and unit == "v":
        hint = 'say which: "mVrms", "mVpp" or "mVpk"'
        raise wanted.refusal("does not say whether it is RMS, peak or peak to peak", hint=hint)
    if unit in _TOLD:
        raise wanted.refusal(f"is {_TOLD[unit]}, not {kind.noun}")
    raise wanted.refusal("has an unknown unit")


def _why_impossible(value: float, kind: Kind) -> str:
    if value < 0 <= kind.low:
        return "is negative"
    if value == 0:
        return "is zero"
    return f"is too {'small' if abs(value) < kind.high else 'large'} to be {kind.noun}"
