"""Time records too large to hold as text: the head is understood, the rest is read in chunks."""

import hashlib
import io
from collections.abc import Callable, Mapping
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt

from benchlog.capture.block import Block, find_block
from benchlog.capture.cells import number
from benchlog.capture.channels import Channel, Side, find_channels, is_record
from benchlog.capture.longfit import fit_long
from benchlog.capture.preamble import Told, read_preamble
from benchlog.capture.text import decode
from benchlog.capture.waveform import SIDES, RecordPoint, quality, sampled_point
from benchlog.curve import FloatArray
from benchlog.errors import CaptureError

# Below this a file is read whole, with every trap looked for in every row.
STREAM_FROM_BYTES = 16_000_000
_HEAD_BYTES = 1 << 15
_TAIL_BYTES = 1 << 16
_ROWS_AT_ONCE = 500_000
_PREFIX = 1 << 16


@dataclass(frozen=True, slots=True, kw_only=True)
class Streamed:
    """A large record, fitted."""

    sha256: str
    encoding: str
    block: Block
    rows: int
    point: RecordPoint


def stream_record(
    path: Path,
    *,
    asked: Mapping[str, str],
    progress: Callable[[float], None] | None = None,
) -> Streamed:
    """Read and fit one large time record.

    Args:
        path: A file of at least ``STREAM_FROM_BYTES``.
        asked: Which column is what, and units, as a person said.
        progress: Told the part of the file that was read, 0 to 1.

    Raises:
        CaptureError: It is no time record, or a row is not numbers.
    """
    with path.open("rb") as file, ThreadPoolExecutor(1) as beside:
        # Hashing leaves the interpreter to others: it costs no time beside the parsing.
        sha256 = beside.submit(_sha256, path)
        head = file.read(_HEAD_BYTES)
        text = decode(head[: head.rfind(b"\n") + 1])
        if text.encoding not in {"utf-8", "latin-1"}:
            raise _too_large("it is in neither UTF-8 nor Latin-1")
        block = find_block(text)
        if block.beside:
            raise _too_large("words stand beside its numbers")
        told = read_preamble(block.preamble, block.decimal)
        if not is_record(block.header, has_step=told.step_s is not None, asked=asked):
            raise _too_large("it is no time record")
        sides = find_channels(block.header, len(block.rows[0]), asked=asked)
        start = _start_of_row(head, block.first_line)
        body = _Body(file, start, block, progress=progress)
        samples = _Samples(sides, told, likely_rows=_likely_rows(head, block, body.size))
        _read_rows(body, block, samples)
        return Streamed(
            sha256=sha256.result(),
            encoding=text.encoding,
            block=block,
            rows=samples.count,
            point=samples.point(),
        )


def _sha256(path: Path) -> str:
    with path.open("rb") as file:
        return hashlib.file_digest(file, "sha256").hexdigest()


def _likely_rows(head: bytes, block: Block, size: int) -> int:
    """Guess how many rows a file holds from the length of its first ones, a little too many."""
    begin = _start_of_row(head, block.first_line)
    end = head.rfind(b"\n") + 1
    rows = max(head.count(b"\n", begin, end), 1)
    return int(1.02 * size * rows / max(end - begin, 1))


def _too_large(why: str) -> CaptureError:
    return CaptureError(
        f"the file is too large to be read whole, and {why}",
        expected=f"at most {STREAM_FROM_BYTES // 1_000_000} MB, or a time record as plain CSV",
    )


def _start_of_row(head: bytes, line: int) -> int:
    place = 0
    for _ in range(line - 1):
        place = head.index(b"\n", place) + 1
    return place


class _Body(io.RawIOBase):
    """The rows of a file as a stream; what stands above and below them is left out."""

    def __init__(
        self,
        file: io.BufferedReader,
        start: int,
        block: Block,
        *,
        progress: Callable[[float], None] | None,
    ) -> None:
        super().__init__()
        self._file, self._progress = file, progress
        self.size = file.seek(0, io.SEEK_END)
        self._end = _end_of_rows(file, self.size, block)
        self._at = file.seek(start)

    def readable(self) -> bool:
        return True

    def readinto(self, buffer: Any) -> int:  # noqa: ANN401 - a writable buffer
        count = self._file.readinto(memoryview(buffer)[: max(self._end - self._at, 0)])
        self._at += count
        if self._progress is not None:
            self._progress(self._at / self.size)
        return count


def _end_of_rows(file: io.BufferedReader, size: int, block: Block) -> int:
    """Return where the last whole row ends: a cut row and a footer are left out."""
    begin = max(size - _TAIL_BYTES, 0)
    file.seek(begin)
    tail = file.read()
    end = len(tail)
    while end > 0:
        start = tail.rfind(b"\n", 0, end - 1) + 1
        cells = tail[start:end].decode("latin-1").strip().split(block.delimiter)
        values = [number(cell, block.decimal) for cell in cells[: len(block.rows[0])]]
        if len(values) == len(block.rows[0]) and None not in values and tail[start:end].strip():
            return begin + end
        end = start
    raise CaptureError(
        "the file does not end with the rows it begins with",
        expected="one table of numbers, perhaps with a few lines below it",
    )


class _Samples:
    """The two channels, kept as single precision, and what their times say."""

    def __init__(self, sides: Mapping[Side, Channel], told: Told, *, likely_rows: int) -> None:
        self._sides, self._told = sides, told
        self._kept: npt.NDArray[np.float32] = np.empty((2, likely_rows), np.float32)
        self._first_s = self._last_s = 0.0
        self.count = 0

    @property
    def columns(self) -> list[int]:
        """Which columns of the file are needed."""
        places = {place for side in SIDES for place in self._sides[side].places}
        time_place = self._sides["input"].time_place
        return sorted(places if time_place is None else {*places, time_place})

    def take(self, table: Mapping[int, FloatArray]) -> None:
        """Add rows, by column."""
        rows = next(iter(table.values())).size
        self._room(rows)
        for place, side in enumerate(SIDES):
            channel = self._sides[side]
            values = sum(table[column] for column in channel.places)
            self._kept[place, self.count : self.count + rows] = values
        time_place = self._sides["input"].time_place
        if time_place is not None:
            self._take_times(table[time_place] * self._sides["input"].seconds)
        self.count += rows

    def point(self) -> RecordPoint:
        """Fit, and return the point."""
        if self.count < _PREFIX:
            raise _too_large(f"it holds only {self.count} rows of samples")
        step_s = self._told.step_s or (self._last_s - self._first_s) / (self.count - 1)
        samples = self._kept[:, : self.count]
        for place, side in enumerate(SIDES):
            self._scale(samples[place], side)
        fit = fit_long(step_s, samples)
        prefix = samples[:, :_PREFIX].astype(np.float64)
        return sampled_point(
            fit, quality(prefix, fit, step_s), step_s=step_s, count=self.count, notes=()
        )

    def _scale(self, samples: npt.NDArray[np.float32], side: Side) -> None:
        """Bring a channel to volts, in place; only the ratio of both matters."""
        channel = self._sides[side]
        place = sorted(SIDES, key=lambda one: self._sides[one].places).index(side)
        scale = channel.volts / len(channel.places)
        if len(self._told.scales) == 2 and len(self._told.offsets) == 2:
            scale *= self._told.scales[place]
        samples *= np.float32(scale)

    def _take_times(self, time_s: FloatArray) -> None:
        if np.any(np.diff(time_s) < 0) or (self.count and time_s[0] < self._last_s):
            raise CaptureError(
                "time runs backwards: the file holds several segments",
                where=f"sample {self.count + 1} or later",
                expected="one segment in a file of this size",
            )
        if self.count == 0:
            self._first_s = float(time_s[0])
        self._last_s = float(time_s[-1])

    def _room(self, rows: int) -> None:
        needed = self.count + rows
        if needed > self._kept.shape[1]:
            larger = np.empty((2, max(needed, int(1.5 * self._kept.shape[1]))), np.float32)
            larger[:, : self.count] = self._kept[:, : self.count]
            self._kept = larger


def _read_rows(body: _Body, block: Block, samples: _Samples) -> None:
    import pandas as pd

    columns = samples.columns
    try:
        chunks = pd.read_csv(
            io.BufferedReader(body, 1 << 20),
            sep=r"\s+" if block.delimiter == " " else block.delimiter,
            decimal=block.decimal,
            header=None,
            usecols=columns,
            dtype=dict.fromkeys(columns, np.float64),
            chunksize=_ROWS_AT_ONCE,
            engine="c",
            encoding="utf-8",
            encoding_errors="replace",
        )
        for chunk in chunks:
            samples.take({column: _finite(chunk[column].to_numpy()) for column in columns})
    except ValueError as error:
        first = block.first_line + samples.count
        raise CaptureError(
            f"a row is not numbers: {str(error).splitlines()[0]}",
            where=f"between line {first} and line {first + _ROWS_AT_ONCE}",
            expected=f"{len(block.rows[0])} numbers in every row",
        ) from error


def _finite(values: FloatArray) -> FloatArray:
    if not np.isfinite(values).all():
        raise ValueError("a cell is empty or holds no finite number")
    return values
