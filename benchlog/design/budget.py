"""Read the budget of a design: which key limits which figure, and in what unit."""

import math
from collections.abc import Mapping
from dataclasses import dataclass

from msgspec import UnsetType

from benchlog import quantity
from benchlog.design.entries import Reader, optional
from benchlog.design.file import BudgetFile, LineFile
from benchlog.design.model import Budget, Line
from benchlog.errors import DesignFileError
from benchlog.quantity import Entry, shown


@dataclass(frozen=True, slots=True, kw_only=True)
class LineKind:
    """What a budget key stands for: a figure's field name, its unit, and how limits are read."""

    figure: str
    unit: str
    read: Reader


_GAIN = LineKind(figure="gain", unit="V/V", read=quantity.gain_ratio)
_GAIN_DB = LineKind(figure="gain_db", unit="dB", read=quantity.decibel)

# A gain is judged in the unit its limits are written in.
LINE_KINDS: Mapping[str, LineKind] = {
    "gain": _GAIN,
    "corner": LineKind(figure="corner_hz", unit="Hz", read=quantity.hertz),
    "lower_corner": LineKind(figure="lower_corner_hz", unit="Hz", read=quantity.hertz),
    "bandwidth": LineKind(figure="bandwidth_hz", unit="Hz", read=quantity.hertz),
    "gbw": LineKind(figure="gbw_hz", unit="Hz", read=quantity.hertz),
    "peaking": LineKind(figure="peaking_db", unit="dB", read=quantity.decibel),
    "peaking_frequency": LineKind(figure="peaking_hz", unit="Hz", read=quantity.hertz),
    "unity": LineKind(figure="unity_hz", unit="Hz", read=quantity.hertz),
}


def read_budget(file: BudgetFile) -> Budget:
    """Make the budget of a design.

    Raises:
        DesignFileError: No line, a line without a limit, limits that no value can meet, or limits
            of different kinds.
        QuantityError: A limit is not a quantity of its figure's kind.
    """
    lines = tuple(
        _line(key, kind, entry)
        for key, kind in LINE_KINDS.items()
        if not isinstance(entry := getattr(file, key), UnsetType)
    )
    if not lines:
        raise DesignFileError(
            "the budget has no limits",
            where="budget",
            expected='at least one line, for example gain = { min = "33.3 dB" }',
        )
    return Budget(rule=file.rule, guard=_guard(file.guard, "budget.guard"), lines=lines)


def _line(key: str, kind: LineKind, entry: LineFile) -> Line:
    where = f"budget.{key}"
    if isinstance(entry.minimum, UnsetType) and isinstance(entry.maximum, UnsetType):
        raise DesignFileError(
            f"{where} has neither min nor max",
            where=where,
            expected='at least one of them, for example { min = "40 kHz" }',
        )
    if kind is _GAIN:
        kind = _gain_kind(entry)
    minimum = optional(entry.minimum, kind.read, f"{where}.min")
    maximum = optional(entry.maximum, kind.read, f"{where}.max")
    if minimum is not None and maximum is not None and minimum > maximum:
        raise DesignFileError(
            f"{where}: min {shown(entry.minimum)} is above max {shown(entry.maximum)}",
            where=where,
            expected="min not above max",
        )
    return Line(
        figure=kind.figure,
        key=key,
        minimum=minimum,
        maximum=maximum,
        unit=kind.unit,
        rule=None if isinstance(entry.rule, UnsetType) else entry.rule,
        guard=None if isinstance(entry.guard, UnsetType) else _guard(entry.guard, f"{where}.guard"),
    )


def _gain_kind(entry: LineFile) -> LineKind:
    """Choose dB or V/V by how the limits are written; one line cannot mix them."""
    limits = [limit for limit in (entry.minimum, entry.maximum) if not isinstance(limit, UnsetType)]
    in_decibels = [_is_in_decibels(limit) for limit in limits]
    if any(in_decibels) and not all(in_decibels):
        raise DesignFileError(
            "budget.gain has one limit in dB and one in V/V",
            where="budget.gain",
            expected='both of one kind, for example { min = "33.3 dB", max = "33.9 dB" }',
        )
    return _GAIN_DB if all(in_decibels) else _GAIN


def _is_in_decibels(limit: Entry) -> bool:
    return isinstance(limit, str) and limit.strip().lower().endswith("db")


def _guard(guard: float, where: str) -> float:
    if not (math.isfinite(guard) and 0 <= guard <= 100):
        raise DesignFileError(
            f"{where} is {guard!r}",
            where=where,
            expected="a multiple of the expanded uncertainty U from 0 up, for example 1.0",
        )
    return float(guard)
