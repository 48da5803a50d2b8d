"""Unkindness on the wire: what may happen to a reply between an instrument and its reader.

Pure: a fault turns the bytes of a reply into pieces with pauses before them.
"""

from collections.abc import Iterable
from dataclasses import dataclass
from typing import Literal, TypeAlias

from benchlog.practice.parameters import INFINITY, nr3

FaultKind: TypeAlias = Literal[
    "late", "split", "stale", "garbled", "dropped", "closed", "overloaded"
]


@dataclass(frozen=True, slots=True, kw_only=True)
class Fault:
    """One thing that goes wrong.

    Attributes:
        kind: ``"late"`` comes after ``delay_s``; ``"split"`` comes in two pieces with ``delay_s``
            between; ``"stale"`` brings the reply before it once more, first; ``"garbled"`` has
            wrong bytes; ``"dropped"`` never comes; ``"closed"`` loses the connection instead;
            ``"overloaded"`` is infinity.
        nth: At which reply, counted from 1 since the instrument was switched on.
        for_good: Whether it goes on happening after that.
        delay_s: How late.
    """

    kind: FaultKind
    nth: int = 1
    for_good: bool = False
    delay_s: float = 1.0

    def strikes(self, count: int) -> bool:
        """Tell whether the fault strikes the reply with this count."""
        return count == self.nth or (self.for_good and count > self.nth)


@dataclass(frozen=True, slots=True)
class Piece:
    """Bytes to be sent after a pause; None closes the connection."""

    pause_s: float
    data: bytes | None


class Unkindness:
    """The faults of one instrument, in the order of their happening.

    Args:
        faults: What goes wrong; the first that strikes a reply has it alone.
    """

    def __init__(self, faults: Iterable[Fault] = ()) -> None:
        self._faults = tuple(faults)
        self._count = 0
        self._before = b""

    def spoil(self, reply: bytes) -> tuple[Piece, ...]:
        """Return what is sent instead of a reply (terminator included)."""
        self._count += 1
        fault = next((fault for fault in self._faults if fault.strikes(self._count)), None)
        before, self._before = self._before, reply
        if fault is None:
            return (Piece(0.0, reply),)
        return _spoiled(fault, reply, before)


def _spoiled(fault: Fault, reply: bytes, before: bytes) -> tuple[Piece, ...]:
    half = max(len(reply) // 2, 1)
    spoiled: dict[FaultKind, tuple[Piece, ...]] = {
        "late": (Piece(fault.delay_s, reply),),
        "split": (Piece(0.0, reply[:half]), Piece(fault.delay_s, reply[half:])),
        "stale": (Piece(0.0, before + reply),),
        "garbled": (Piece(0.0, bytes(255 - byte for byte in reply[:-1]) + reply[-1:]),),
        "dropped": (),
        "closed": (Piece(0.0, None),),
        "overloaded": (Piece(0.0, f"{nr3(INFINITY)}\n".encode()),),
    }
    return spoiled[fault.kind]
