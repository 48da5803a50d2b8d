"""Read a capture: from a file to a curve, and what was understood on the way."""

import hashlib
import math
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path

from benchlog.capture.block import Block, find_block
from benchlog.capture.columns import Column, find_columns
from benchlog.capture.table import swept_curve
from benchlog.capture.text import decode
from benchlog.circuit.nominal import nominal_figures
from benchlog.curve import GainCurve
from benchlog.design.model import Design
from benchlog.errors import CaptureError
from benchlog.notation import plain

# A gain that is off by one of these is more likely a slip of probe or unit than a board.
_SLIPS = (
    (2.0, "2: a 50 ohm setting, or one level in peak to peak and one in peak"),
    (10.0, "10: a probe"),
    (math.sqrt(2.0), "root 2: peak taken for RMS"),
    (2.0 * math.sqrt(2.0), "2 root 2: peak to peak taken for RMS"),
)
_SLIP_REL = 0.04
_LARGEST_BYTES = 200_000_000


@dataclass(frozen=True, slots=True, kw_only=True)
class Capture:
    """A capture and how it was understood.

    Attributes:
        curve: Gain against rising frequency.
        sha256: Of the file's bytes.
        encoding: Of the text.
        block: The table of numbers and what stands around it.
        columns: Which columns were used, and their units.
        notes: What a person should know.
    """

    curve: GainCurve
    sha256: str
    encoding: str
    block: Block
    columns: tuple[Column, ...]
    notes: tuple[str, ...]

    def understood(self) -> dict[str, str]:
        """Return what was found, by name, for people and scripts."""
        rows = self.block.rows
        return {
            "encoding": self.encoding,
            "delimiter": self.block.delimiter_name,
            "decimal": self.block.decimal,
            "columns": ", ".join(f"{column.name} ({column.unit})" for column in self.columns),
            "rows": f"{len(rows)}, from line {self.block.first_line}",
            "first row": ", ".join(plain(value, 6) for value in rows[0]),
            "last row": ", ".join(plain(value, 6) for value in rows[-1]),
            "preamble": f"{len(self.block.preamble)} lines",
        }


def read_capture(
    path: str | Path, *, design: Design | None = None, units: Mapping[str, str] | None = None
) -> GainCurve:
    """Read a swept table from a CSV file; see ``inspect_capture``."""
    return inspect_capture(path, design=design, units=units).curve


def inspect_capture(
    path: str | Path, *, design: Design | None = None, units: Mapping[str, str] | None = None
) -> Capture:
    """Read a swept table from a CSV file, and keep how it was understood.

    Args:
        path: A table with a frequency column and either gain, gain in dB, or input and output
            amplitude; phase and uncertainty of gain where it has them.
        design: Lets notes say where a gain looks like a slip of probe or unit.
        units: Units that the file does not give, by kind: ``{"gain": "dB"}``.

    Raises:
        CaptureError: What is wrong, with file, line and column, and what to do.
    """
    data = _bytes(path)
    try:
        text = decode(data)
        block = find_block(text)
        columns = find_columns(block.header, len(block.rows[0]), asked=dict(units or {}))
        curve, notes = swept_curve(block, columns)
    except CaptureError as error:
        raise error.at(str(path)) from error
    slip = _slip(curve, design)
    return Capture(
        curve=curve,
        sha256=hashlib.sha256(data).hexdigest(),
        encoding=text.encoding,
        block=block,
        columns=columns,
        notes=(*block.notes, *notes, *slip),
    )


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
