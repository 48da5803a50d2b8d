"""Read the amplifiers of a design."""

import math
from collections.abc import Mapping
from dataclasses import dataclass

from msgspec import UnsetType

from benchlog import quantity
from benchlog.circuit.amplifier import Amplifier
from benchlog.design.entries import optional, read_part
from benchlog.design.file import AmplifierFile, GbwFile
from benchlog.errors import DesignFileError
from benchlog.quantity import Entry

# Common practice where a data sheet gives a typical value only: a fifth to both sides.
TYPICAL_SPREAD = 0.2


@dataclass(frozen=True, slots=True, kw_only=True)
class ReadAmplifier:
    """An amplifier, and the tolerances that belong to it by part name."""

    amplifier: Amplifier
    tolerances: Mapping[str, float]


def read_amplifier(
    name: str, file: AmplifierFile, *, rails_v: tuple[float, float] | None, pole_tolerance: float
) -> ReadAmplifier:
    """Make an amplifier from its table.

    The typical GBW may be left out: it is then the geometric mean of min and max, or the only one
    of them that is there.  Without an output swing the rails bound the output.

    Raises:
        DesignFileError: GBW values out of order or missing, a swing that is none.
        QuantityError: An entry is not a quantity of the wanted kind.
    """
    where = f"amplifier.{name}"
    low_hz, typical_hz, high_hz = _gbw(file.gbw, f"{where}.gbw")
    above_v, below_v = _swing(file, f"{where}.output_swing", rails_v)
    tolerances = {f"{where}.gbw": _gbw_tolerance(low_hz, typical_hz, high_hz)}
    pole_hz = None
    if not isinstance(file.second_pole, UnsetType):
        pole = read_part(file.second_pole, quantity.hertz, field=f"{where}.second_pole")
        pole_hz = pole.value
        own = pole.tolerance
        tolerances[f"{where}.second_pole"] = pole_tolerance if own is None else own
    gain = optional(file.open_loop_gain, quantity.gain_ratio, f"{where}.open_loop_gain")
    amplifier = Amplifier(
        name=name,
        gbw_hz=typical_hz,
        gbw_min_hz=low_hz,
        gbw_max_hz=high_hz,
        open_loop_gain=math.inf if gain is None else gain,
        second_pole_hz=pole_hz,
        slew_rate_v_per_s=optional(file.slew_rate, quantity.volt_per_second, f"{where}.slew_rate"),
        output_swing_v=above_v,
        output_swing_negative_v=below_v,
    )
    return ReadAmplifier(amplifier=amplifier, tolerances=tolerances)


def _gbw(entry: Entry | GbwFile, where: str) -> tuple[float | None, float, float | None]:
    """Return lowest, typical and highest GBW."""
    if not isinstance(entry, GbwFile):
        return None, quantity.hertz(entry, field=where), None
    low = optional(entry.minimum, quantity.hertz, f"{where}.min")
    typical = optional(entry.typical, quantity.hertz, f"{where}.typical")
    high = optional(entry.maximum, quantity.hertz, f"{where}.max")
    known = [value for value in (low, typical, high) if value is not None]
    if not known or known != sorted(known):
        raise DesignFileError(
            f"{where} has {'no value' if not known else 'its values out of order'}",
            where=where,
            expected='min <= typical <= max, for example { min = "2 MHz", typical = "3 MHz" }',
        )
    ends = [value for value in (low, high) if value is not None]
    return low, math.prod(ends) ** (1 / len(ends)) if typical is None else typical, high


def _gbw_tolerance(low_hz: float | None, typical_hz: float, high_hz: float | None) -> float:
    """Return the larger relative distance from the typical GBW to what is guaranteed."""
    ends = [abs(end / typical_hz - 1) for end in (low_hz, high_hz) if end is not None]
    return max(ends, default=0.0) or TYPICAL_SPREAD


def _swing(
    file: AmplifierFile, where: str, rails_v: tuple[float, float] | None
) -> tuple[float | None, float | None]:
    """Return the output's peak above and below rest, both positive, or None where not known.

    The rails bound it; a supply that does not straddle zero is taken to rest at its middle.
    """
    sides_v = None if isinstance(file.output_swing, UnsetType) else _sides(file.output_swing, where)
    if rails_v is None:
        return sides_v or (None, None)
    low_v, high_v = rails_v
    half_v = (high_v - low_v) / 2
    bound_v = (high_v, -low_v) if low_v < 0 < high_v else (half_v, half_v)
    if sides_v is None:
        return bound_v
    return min(sides_v[0], bound_v[0]), min(sides_v[1], bound_v[1])


def _sides(entry: Entry | list[Entry], where: str) -> tuple[float, float]:
    """Read a peak for both sides, or the lowest and the highest output voltage."""
    if not isinstance(entry, list):
        peak_v = quantity.volt(entry, field=where)
        ends_v = [-peak_v, peak_v]
    else:
        ends_v = [
            quantity.volt(one, field=f"{where}[{place}]") for place, one in enumerate(entry, 1)
        ]
    if len(ends_v) != 2 or not ends_v[0] < 0 < ends_v[1]:
        raise DesignFileError(
            f"{where} leaves no room for a sine around zero volts",
            where=where,
            expected='a peak above zero such as "10.5 V", or both ends: ["-9 V", "10.5 V"]',
        )
    return ends_v[1], -ends_v[0]
