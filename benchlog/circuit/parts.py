"""Name the parts of stages and amplifiers, and scale them by factors."""

import math
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, fields, replace
from typing import Any, TypeAlias

from benchlog.circuit.amplifier import Amplifier, Scalars
from benchlog.circuit.stage import Stage

Factors: TypeAlias = Mapping[str, Scalars]

_UNITS = {"_ohm": "ohm", "_f": "F"}


@dataclass(frozen=True, slots=True, kw_only=True)
class Part:
    """One part whose real value differs from what is written on it.

    Attributes:
        name: Its key path in the design file: ``"stage[1].feedback"``.
        value: Nominal value, in ``unit``.
        unit: ``"ohm"``, ``"F"`` or ``"Hz"``.
        tolerance: Relative half width of what it may be; 0 when nothing is stated.
    """

    name: str
    value: float
    unit: str
    tolerance: float = 0.0

    @property
    def u_rel(self) -> float:
        """Relative standard uncertainty of an even spread over the tolerance (JCGM 100, 4.3.7)."""
        return self.tolerance / math.sqrt(3.0)


def stage_parts(stage: Stage, place: int) -> Iterator[tuple[str, float, str]]:
    """Yield name, value and unit of each part of the stage at a place counted from 1."""
    for key, unit, value in _part_fields(stage):
        name = f"stage[{place}].{key}"
        if isinstance(value, tuple):
            yield from (
                (f"{name}[{count}]", float(one), unit) for count, one in enumerate(value, start=1)
            )
        elif value is not None and _has_value(value):
            yield name, float(value), unit


def scaled_stage(stage: Stage, place: int, factors: Factors) -> Stage:
    """Return the stage with the named parts multiplied; other names are left to other stages."""
    changed: dict[str, Any] = {}
    for key, unit, value in _part_fields(stage):
        name = f"stage[{place}].{key}"
        field = key + ("_ohm" if unit == "ohm" else "_f")
        if isinstance(value, tuple):
            changed[field] = tuple(
                one * factors.get(f"{name}[{count}]", 1.0)
                for count, one in enumerate(value, start=1)
            )
        elif name in factors:
            changed[field] = value * factors[name]
    return replace(stage, **changed) if changed else stage  # type: ignore[type-var]


def without_capacitors(stage: Stage) -> Stage:
    """Return the stage as it is in mid-band: series capacitors short, all others absent."""
    absent = {f"{key}_f": None for key, unit, _ in _part_fields(stage) if unit == "F"}
    return replace(stage, **absent) if absent else stage  # type: ignore[type-var]


def scaled_amplifier(amplifier: Amplifier, factors: Factors) -> Amplifier:
    """Return the amplifier with its GBW and second pole multiplied by the factors that name it."""
    pole_hz = amplifier.second_pole_hz
    return replace(
        amplifier,
        gbw_hz=amplifier.gbw_hz * factors.get(f"amplifier.{amplifier.name}.gbw", 1.0),
        second_pole_hz=None
        if pole_hz is None
        else pole_hz * factors.get(f"amplifier.{amplifier.name}.second_pole", 1.0),
    )


def _part_fields(stage: Stage) -> Iterator[tuple[str, str, Any]]:
    """Yield key, unit and value of each field of a topology that is a part."""
    for field in fields(stage):  # type: ignore[arg-type]
        for suffix, unit in _UNITS.items():
            if field.name.endswith(suffix):
                yield field.name.removesuffix(suffix), unit, getattr(stage, field.name)


def _has_value(value: Any) -> bool:  # noqa: ANN401 - a number or an array
    """Tell a part from a plain connection, which has no tolerance."""
    return bool(value != 0)
