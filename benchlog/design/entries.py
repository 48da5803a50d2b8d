"""Read single entries of a design file: parts with their tolerance, and optional quantities."""

from dataclasses import dataclass
from typing import Protocol, TypeAlias

from msgspec import UNSET, UnsetType

from benchlog import quantity
from benchlog.circuit.preferred import nearest_preferred
from benchlog.design.file import PartFile
from benchlog.errors import DesignFileError
from benchlog.notation import si
from benchlog.quantity import Entry, shown

PartEntry: TypeAlias = Entry | PartFile


class Reader(Protocol):
    """A parser of ``benchlog.quantity``."""

    def __call__(self, text: Entry, *, field: str) -> float:
        """Return the entry in the inner unit."""


@dataclass(frozen=True, slots=True, kw_only=True)
class ReadPart:
    """A part as read: its value, and its own tolerance or None."""

    value: float
    tolerance: float | None


def read_part(entry: PartEntry, read: Reader, *, field: str) -> ReadPart:
    """Read a part: a quantity, or a table with value, tolerance and series.

    Raises:
        QuantityError: It is not a quantity of the wanted kind.
        DesignFileError: The value is not in the series it is said to be from.
    """
    if not isinstance(entry, PartFile):
        return ReadPart(value=read(entry, field=field), tolerance=None)
    value = read(entry.value, field=f"{field}.value")
    if entry.series is not UNSET:
        below, above = nearest_preferred(value, entry.series)
        if value not in {below, above}:
            raise DesignFileError(
                f"{field}: {shown(entry.value)} is not in the series {entry.series}",
                where=f"{field}.value",
                expected=f"a value of {entry.series}",
                hint=f"its neighbours there are {si(below, '')} and {si(above, '')}",
            )
    return ReadPart(
        value=value, tolerance=optional(entry.tolerance, quantity.percent, f"{field}.tolerance")
    )


def optional(entry: Entry | UnsetType, read: Reader, field: str) -> float | None:
    """Read a quantity that may be left out."""
    return None if isinstance(entry, UnsetType) else read(entry, field=field)
