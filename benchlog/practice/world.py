"""The table on which the practice bench stands: what drives the board, and which board it is.

The instruments share one ``World``; it may be used from several threads.
"""

import hashlib
import math
from dataclasses import dataclass
from statistics import NormalDist
from threading import RLock
from typing import Literal, Protocol, TypeAlias

Place: TypeAlias = Literal["input", "output"]

BOARDS_REMEMBERED = 256
"""For how many boards the readings are counted; enough for any comparison, and bounded."""

DRIVES_REMEMBERED = 256

_NORMAL = NormalDist()


@dataclass(frozen=True, slots=True, kw_only=True)
class Levels:
    """What a board shows for one drive: fundamental and residue together, V RMS.

    Attributes:
        input_vrms: At the board's input, loaded by the board.
        output_vrms: At its output, clipped and slewing where it does.
        noise_vrms: The output's own noise.
    """

    input_vrms: float
    output_vrms: float
    noise_vrms: float = 0.0


class Board(Protocol):
    """Anything that can lie on the table between source and meters."""

    @property
    def label(self) -> str:
        """A name that tells this board's noise from another's."""

    def levels(self, frequency_hz: float, emf_vrms: float, *, source_ohm: float) -> Levels:
        """Return the steady levels for an open-circuit voltage behind a source resistance."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Bypass:
    """No board at all: a cable from the source to both meters, as for a through sweep."""

    label: str = "bypass"

    def levels(self, frequency_hz: float, emf_vrms: float, *, source_ohm: float) -> Levels:  # noqa: ARG002 - a cable treats all alike
        """Return the open-circuit level at both ends."""
        return Levels(input_vrms=emf_vrms, output_vrms=emf_vrms)


@dataclass(frozen=True, slots=True, kw_only=True)
class Drive:
    """What the source puts out, as an electromotive force behind its output resistance."""

    frequency_hz: float = 1e3
    emf_vrms: float = 0.0
    on: bool = False
    source_ohm: float = 50.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Look:
    """What a meter finds at its terminals when it begins to read.

    Attributes:
        drive: The drive at that time.
        level_vrms: The steady level, the board's noise included.
        since_change_s: How long ago the drive or the board last changed.
        draw: A standard normal number, the chance of this one reading.
    """

    drive: Drive
    level_vrms: float
    since_change_s: float
    draw: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Quality:
    """How good the instruments are; each one's own errors lie somewhere inside these limits.

    The defaults keep what the generic drivers promise of an instrument.

    Attributes:
        noise_rel: Standard deviation of one reading, relative; 0 for none.
        meter_error_rel: Largest error of a meter's gain.
        meter_pole_hz: The one pole of each meter's amplifier, within 2 %.
        source_error_rel: Largest error of the source's level.
    """

    noise_rel: float = 3e-4
    meter_error_rel: float = 4e-4
    meter_pole_hz: float = 250e6
    source_error_rel: float = 3e-3


PERFECT = Quality(noise_rel=0.0, meter_error_rel=0.0, meter_pole_hz=math.inf, source_error_rel=0.0)
"""Instruments without errors, for tests that look at something else."""


class World:
    """The source's drive, the board on the table, and the dice of the readings.

    Args:
        board: The first board; a cable when left out.
        seed: Chooses the instruments' own errors and the noise of every reading.
        quality: How good the instruments are.
    """

    def __init__(
        self, board: Board | None = None, *, seed: int = 0, quality: Quality | None = None
    ) -> None:
        self.seed = seed
        self.quality = quality or Quality()
        self._lock = RLock()
        self._board: Board = board or Bypass()
        self._drive = Drive()
        self._changed_s = float("-inf")
        self._counts: dict[str, dict[tuple[Place, Drive], int]] = {}
        self._known: dict[Drive, Levels] = {}
        error = self.quality.source_error_rel * uniform_draw(seed, "source", "level")
        self._source_gain = 1 + error

    @property
    def board_label(self) -> str:
        """The label of the board on the table."""
        with self._lock:
            return self._board.label

    @property
    def drive(self) -> Drive:
        """What the source puts out now."""
        with self._lock:
            return self._drive

    def put_board(self, board: Board | None, *, now_s: float | None = None) -> None:
        """Put a board on the table; None bypasses it with a cable.

        Args:
            board: The board.
            now_s: When, so that whoever reads too soon sees it settle; None is long ago.
        """
        with self._lock:
            self._board = board or Bypass()
            self._known.clear()
            if now_s is not None:
                self._changed_s = now_s

    def set_drive(self, drive: Drive, now_s: float) -> None:
        """Change what the source puts out; the same again is no change."""
        with self._lock:
            if drive != self._drive:
                self._drive = drive
                self._changed_s = now_s

    def look(self, place: Place, now_s: float) -> Look:
        """Begin one reading at a place; each call is one more reading at this set-point.

        The draw depends on the seed, the board, the place, the drive and how often this
        set-point was read before, and on nothing else, so that every bench with the same history
        shows the same digits.
        """
        with self._lock:
            drive, label = self._drive, self._board.label
            return Look(
                drive=drive,
                level_vrms=self._level(place),
                since_change_s=now_s - self._changed_s,
                draw=normal_draw(self.seed, label, place, drive, self._count(label, place)),
            )

    def _count(self, label: str, place: Place) -> int:
        counts = self._counts.setdefault(label, {})
        key = (place, self._drive)
        counts[key] = counts.get(key, 0) + 1
        while len(self._counts) > BOARDS_REMEMBERED:
            del self._counts[next(iter(self._counts))]
        return counts[key]

    def _level(self, place: Place) -> float:
        levels = self._levels()
        if place == "input":
            return levels.input_vrms
        return float((levels.output_vrms**2 + levels.noise_vrms**2) ** 0.5)

    def _levels(self) -> Levels:
        drive = self._drive
        if drive not in self._known:
            emf_vrms = drive.emf_vrms * self._source_gain if drive.on else 0.0
            if len(self._known) >= DRIVES_REMEMBERED:
                self._known.clear()
            self._known[drive] = self._board.levels(
                drive.frequency_hz, emf_vrms, source_ohm=drive.source_ohm
            )
        return self._known[drive]


def normal_draw(*key: object) -> float:
    """Return a standard normal number that is a pure function of its key."""
    digest = hashlib.blake2b(repr(key).encode(), digest_size=8).digest()
    uniform = (int.from_bytes(digest) >> 12) + 0.5
    return _NORMAL.inv_cdf(uniform / 2**52)


def uniform_draw(*key: object) -> float:
    """Return a number between -1 and 1 that is a pure function of its key."""
    digest = hashlib.blake2b(repr(key).encode(), digest_size=8).digest()
    return (int.from_bytes(digest) >> 12) / 2**51 - 1.0
