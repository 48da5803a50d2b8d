"""The three instruments of the practice bench around one table."""

from typing import Literal, NamedTuple, TypeAlias, get_args

from benchlog.practice.meter import make_meter
from benchlog.practice.scpi import Instrument
from benchlog.practice.source import make_source
from benchlog.practice.world import World

Role: TypeAlias = Literal["source", "output meter", "input meter"]
ROLES: tuple[Role, ...] = get_args(Role)


class Addresses(NamedTuple):
    """Where the instruments of one bench are reached, in the order of ``ROLES``."""

    source: str
    output_meter: str
    input_meter: str


def make_instruments(world: World) -> dict[Role, Instrument]:
    """Return the instruments of a bench that has just been switched on."""
    return {
        "source": make_source(world),
        "output meter": make_meter(world, "output"),
        "input meter": make_meter(world, "input"),
    }
