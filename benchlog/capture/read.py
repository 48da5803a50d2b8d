"""Read a capture: from a file to a curve, and what was understood on the way."""

import hashlib
import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np

from benchlog.capture.block import Block, find_block
from benchlog.capture.channels import TIME_UNIT, is_record
from benchlog.capture.columns import find_columns
from benchlog.capture.preamble import read_preamble
from benchlog.capture.stream import STREAM_FROM_BYTES, stream_record
from benchlog.capture.table import swept_curve
from benchlog.capture.text import decode
from benchlog.capture.waveform import RecordPoint, point_of, read_records
from benchlog.circuit.nominal import nominal_figures
from benchlog.curve import GainCurve
from benchlog.design.model import Design
from benchlog.errors import CaptureError
from benchlog.notation import plain, si

# A gain that is off by one of these is more likely a slip of probe or unit than a board.
_SLIPS = (
    (2.0, "2: a 50 ohm setting, or one level in peak to peak and one in peak"),
    (10.0, "10: a probe"),
    (math.sqrt(2.0), "root 2: peak taken for RMS"),
    (2.0 * math.sqrt(2.0), "2 root 2: peak to peak taken for RMS"),
)
_SLIP_REL = 0.04
_LARGEST_BYTES = 200_000_000
_SUFFIXES = (".csv", ".txt", ".tsv", ".dat")
# Digits in a file end somewhere: no capture is better than this, whatever its residuals say.
_LEAST_U_REL = 1e-6


@dataclass(frozen=True, slots=True, kw_only=True)
class Capture:
    """One board's capture and how it was understood.

    Attributes:
        curve: Gain against rising frequency.
        sha256: Of the file's bytes; of all hashes together where there are several files.
        files: What was read, in order.
        understood: What was found, by name, for people and scripts.
        notes: What a person should know.
    """

    curve: GainCurve
    sha256: str
    files: tuple[Path, ...]
    understood: Mapping[str, str]
    notes: tuple[str, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class Told:
    """What a person says about captures where the files are silent.

    Attributes:
        units: By kind or column name: ``{"gain": "dB"}``.
        columns: Which column is what: ``{"input": "CH1"}``.
        frequency_hz: Of time records, where it is known better than they tell.
        progress: Told the part of a large file that was read, 0 to 1.
    """

    units: Mapping[str, str] = field(default_factory=dict)
    columns: Mapping[str, str] = field(default_factory=dict)
    frequency_hz: float | None = None
    progress: Callable[[float], None] | None = None

    def about_channels(self) -> dict[str, str]:
        """Return what is said of a time record's columns."""
        said = dict(self.columns)
        if "time" in self.units:
            said[TIME_UNIT] = self.units["time"]
        return said


def read_capture(
    path: str | Path, *, design: Design | None = None, units: Mapping[str, str] | None = None
) -> GainCurve:
    """Read a capture; see ``inspect_captures``.

    Args:
        path: A swept table, a time record, or a folder of time records of one board.
        design: Lets notes say where a gain looks like a slip of probe or unit.
        units: Units that the file does not give, by kind: ``{"gain": "dB"}``.

    Raises:
        CaptureError: What is wrong, with file, line and column, and what to do.
    """
    return inspect_captures([path], design=design, told=Told(units=dict(units or {})))[0].curve


def inspect_captures(
    paths: Sequence[str | Path], *, design: Design | None = None, told: Told | None = None
) -> tuple[Capture, ...]:
    """Read captures of one board, and keep how they were understood.

    Args:
        paths: Swept tables (a frequency column and either gain, gain in dB, or input and output
            amplitude), time records of two channels, or folders of these.
        design: Lets notes say where a gain looks like a slip of probe or unit.
        told: What a person says where the files are silent.

    Returns:
        One capture for each swept table, and one for all time records together.

    Raises:
        CaptureError: What is wrong, with file, line and column, and what to do.
    """
    wanted = told or Told()
    tables: list[Capture] = []
    records: list[ReadRecord] = []
    for path in (file for given in paths for file in capture_files(Path(given))):
        found = _read(path, wanted, design)
        if isinstance(found, Capture):
            tables.append(found)
        else:
            records.append(found)
    return (*tables, *([_joined(records, design)] if records else []))


@dataclass(frozen=True, slots=True, kw_only=True)
class ReadRecord:
    """One file of time records, fitted."""

    path: Path
    sha256: str
    understood: Mapping[str, str]
    points: tuple[RecordPoint, ...]


def capture_files(path: Path) -> list[Path]:
    """Return a file, or the files of a folder by name.

    Raises:
        CaptureError: The folder holds none.
    """
    if not path.is_dir():
        return [path]
    files = sorted(file for file in path.iterdir() if file.suffix.lower() in _SUFFIXES)
    if not files:
        raise CaptureError(
            "the folder holds no captures",
            where=str(path),
            expected=f"files that end in {', '.join(_SUFFIXES)}",
        )
    return files


def _read(path: Path, told: Told, design: Design | None) -> "Capture | ReadRecord":
    """Read one file: a large one in chunks, any other whole."""
    if path.is_file() and path.stat().st_size >= STREAM_FROM_BYTES:
        return _read_large(path, told)
    data = _bytes(path)
    try:
        text = decode(data)
        block = find_block(text)
        has_step = read_preamble(block.preamble, block.decimal).step_s is not None
        understood = _understood(text.encoding, block)
        sha256 = hashlib.sha256(data).hexdigest()
        asked = told.about_channels()
        if is_record(block.header, has_step=has_step, asked=asked):
            records = read_records(block, asked=asked)
            points = tuple(point_of(record, told.frequency_hz) for record in records)
            return ReadRecord(path=path, sha256=sha256, understood=understood, points=points)
        columns = find_columns(block.header, len(block.rows[0]), asked=told.units)
        curve, notes = swept_curve(block, columns)
    except CaptureError as error:
        raise error.at(str(path)) from error
    named = ", ".join(f"{column.name} ({column.unit})" for column in columns)
    return Capture(
        curve=curve,
        sha256=sha256,
        files=(path,),
        understood={**understood, "columns": named},
        notes=(*block.notes, *notes, *_slip(curve, design)),
    )


def _read_large(path: Path, told: Told) -> ReadRecord:
    try:
        found = stream_record(path, asked=told.about_channels(), progress=told.progress)
    except CaptureError as error:
        raise error.at(str(path)) from error
    understood = _understood(found.encoding, found.block)
    understood["rows"] = f"{found.rows}, from line {found.block.first_line}"
    del understood["last row"]
    return ReadRecord(path=path, sha256=found.sha256, understood=understood, points=(found.point,))


def _joined(records: Sequence[ReadRecord], design: Design | None) -> Capture:
    """Make one curve of all records, by rising frequency."""
    points = sorted(
        (point for record in records for point in record.points),
        key=lambda point: point.frequency_hz,
    )
    curve = GainCurve(
        np.array([point.frequency_hz for point in points]),
        np.array([point.gain for point in points]),
        np.array([point.phase_deg for point in points]),
        np.array([max(point.u_gain_rel, _LEAST_U_REL) for point in points]),
        u_phase_deg=np.array([max(point.u_phase_deg, _LEAST_U_REL) for point in points]),
        flags=np.array([int(point.flags) for point in points]),
    )
    digest = hashlib.sha256("".join(sorted(record.sha256 for record in records)).encode())
    alone = len(records) == 1
    return Capture(
        curve=curve,
        sha256=records[0].sha256 if alone else digest.hexdigest(),
        files=tuple(record.path for record in records),
        understood={**records[0].understood, **_understood_points(points)},
        notes=(
            *dict.fromkeys(note for point in points for note in point.notes),
            *_slip(curve, design),
        ),
    )


def _understood(encoding: str, block: Block) -> dict[str, str]:
    rows = block.rows
    return {
        "encoding": encoding,
        "delimiter": block.delimiter_name,
        "decimal": block.decimal,
        "rows": f"{len(rows)}, from line {block.first_line}",
        "first row": ", ".join(plain(value, 6) for value in rows[0]),
        "last row": ", ".join(plain(value, 6) for value in rows[-1]),
        "preamble": f"{len(block.preamble)} lines",
    }


def _understood_points(points: Sequence[RecordPoint]) -> dict[str, str]:
    return {
        f"record {place}": f"{si(point.frequency_hz, 'Hz', 6)}: input {si(point.input_v, 'Vpk')},"
        f" output {si(point.output_v, 'Vpk')}, {si(point.samples_per_s, 'Sa/s')},"
        f" {plain(point.cycles)} cycles, distortion {100 * point.distortion:.2f} %,"
        f" rest {100 * point.residual:.2f} %"
        for place, point in enumerate(points, start=1)
    }


def _bytes(path: str | Path) -> bytes:
    try:
        with Path(path).open("rb") as file:
            data = file.read(_LARGEST_BYTES + 1)
    except (OSError, ValueError) as error:
        reason = error.strerror if isinstance(error, OSError) else str(error)
        raise CaptureError(
            f"the capture cannot be read: {reason}", where=str(path), expected="a CSV file"
        ) from error
    if len(data) > _LARGEST_BYTES:
        raise CaptureError(
            "the file is too large for a swept table",
            where=str(path),
            expected=f"at most {_LARGEST_BYTES // 1_000_000} MB",
        )
    return data


def _slip(curve: GainCurve, design: Design | None) -> tuple[str, ...]:
    """Note a plateau that differs from the design's by a factor that people slip by."""
    if design is None:
        return ()
    nominal = nominal_figures(design.chain())
    near = nominal.corner_hz or math.inf
    low = curve.gain[curve.frequency_hz <= near / 10.0]
    if low.size == 0:
        return ()
    ratio = float(low.mean()) / nominal.gain
    for factor, cause in _SLIPS:
        for off, words in ((factor, "higher"), (1.0 / factor, "lower")):
            if abs(ratio / off - 1.0) < _SLIP_REL:
                return (
                    f"the gain is {words} than the design's by about {cause}? It was kept as read",
                )
    return ()
