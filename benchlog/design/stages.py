"""Read the stages of a design: from the tables of the file to topologies with part values."""

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from msgspec import UNSET, Struct

from benchlog import quantity
from benchlog.circuit.stage import Stage
from benchlog.circuit.topologies import (
    Difference,
    Divider,
    Follower,
    Inverting,
    NonInverting,
    OpenLoop,
    Summing,
)
from benchlog.design.entries import Reader, read_part
from benchlog.design.file import StageFile
from benchlog.design.model import PlacedStage
from benchlog.errors import DesignFileError
from benchlog.table_types import hints, metas

_TOPOLOGIES: Mapping[str, type[Any]] = {
    "follower": Follower,
    "non-inverting": NonInverting,
    "inverting": Inverting,
    "summing": Summing,
    "difference": Difference,
    "open-loop": OpenLoop,
    "divider": Divider,
}


@dataclass(frozen=True, slots=True, kw_only=True)
class _PartKind:
    """How a kind of part is read, the ending of its field in a topology, and its default."""

    read: Reader
    suffix: str
    tolerance: str


_PART_KINDS: Mapping[str, _PartKind] = {
    "ohm": _PartKind(read=quantity.ohm, suffix="_ohm", tolerance="resistor"),
    "farad": _PartKind(read=quantity.farad, suffix="_f", tolerance="capacitor"),
}


@dataclass(frozen=True, slots=True, kw_only=True)
class ReadStage:
    """A stage, and the tolerances of its parts by name."""

    placed: PlacedStage
    tolerances: Mapping[str, float]


def read_stage(file: StageFile, place: int, *, defaults: Mapping[str, float]) -> ReadStage:
    """Make a stage from its table.

    Args:
        file: The table.
        place: Of the stage, counted from 1.
        defaults: Relative tolerance of a ``"resistor"`` and of a ``"capacitor"``.

    Raises:
        DesignFileError: Parts that cannot be together, or one that must be there and is not.
        QuantityError: A part's value is not one.
    """
    where = f"stage[{place}]"
    topology = str(type(file).__struct_config__.tag)
    fields: dict[str, Any] = {}
    tolerances: dict[str, float] = {}
    for key, entry in _entries(file):
        kind = _part_kind(type(file), key)
        if kind is None:
            fields[key] = entry
        elif isinstance(entry, list):
            read = [
                read_part(one, kind.read, field=f"{where}.{key}[{count}]")
                for count, one in enumerate(entry, start=1)
            ]
            fields[key + kind.suffix] = tuple(part.value for part in read)
            for count, part in enumerate(read, start=1):
                tolerances[f"{where}.{key}[{count}]"] = (
                    defaults[kind.tolerance] if part.tolerance is None else part.tolerance
                )
        else:
            part = read_part(entry, kind.read, field=f"{where}.{key}")
            fields[key + kind.suffix] = part.value
            tolerances[f"{where}.{key}"] = (
                defaults[kind.tolerance] if part.tolerance is None else part.tolerance
            )
    amplifier = fields.pop("amplifier", None)
    stage: Stage = _TOPOLOGIES[topology](**fields)
    _check(stage, where)
    return ReadStage(
        placed=PlacedStage(topology=topology, stage=stage, amplifier=amplifier),
        tolerances=tolerances,
    )


def _entries(file: Struct) -> list[tuple[str, Any]]:
    """Return the keys that are there, with their entries."""
    found = [(key, getattr(file, key)) for key in file.__struct_fields__]
    return [(key, entry) for key, entry in found if entry is not UNSET]


def _part_kind(struct: type[Struct], key: str) -> _PartKind | None:
    """Tell by the key's description in the file whether it is a part, and of which kind."""
    for meta in metas(hints(struct)[key]):
        if meta.extra and "quantity" in meta.extra:
            return _PART_KINDS[meta.extra["quantity"]]
    return None


def _check(stage: Stage, where: str) -> None:
    """Refuse parts that make no circuit together."""
    if isinstance(stage, Follower | NonInverting):
        if stage.coupling_f is not None and stage.bias_ohm is None:
            raise DesignFileError(
                f"{where} has a coupling capacitor and nothing that biases the input behind it",
                where=f"{where}.bias",
                expected='a resistor from the plus input to ground, for example bias = "47k"',
            )
    elif isinstance(stage, Summing):
        _check_summing(stage, where)
    elif isinstance(stage, Divider) and stage.shunt_ohm is None and stage.capacitor_f is None:
        raise DesignFileError(
            f"{where} divides nothing: it has neither shunt nor capacitor",
            where=where,
            expected='at least one of them, for example shunt = "1k"',
        )


def _check_summing(stage: Summing, where: str) -> None:
    if len(stage.inputs_ohm) < 2:
        raise DesignFileError(
            f"{where}.inputs has {len(stage.inputs_ohm)} value(s)",
            where=f"{where}.inputs",
            expected='two resistors or more, for example ["22k", "33k"]',
            hint='with one input the topology is "inverting"',
        )
    if not 1 <= stage.driven <= len(stage.inputs_ohm):
        raise DesignFileError(
            f"{where}.driven is {stage.driven}, and there are {len(stage.inputs_ohm)} inputs",
            where=f"{where}.driven",
            expected="the number of an input, counted from 1",
        )
