"""Time records: from a block of samples to a gain and a phase at one frequency.

Source:
    Sine fits as in ``sinefit.py``.  Limits on samples, cycles and distortion are common practice.
"""

from collections.abc import Mapping
from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from benchlog.capture.block import Block
from benchlog.capture.channels import Channel, Side, find_channels
from benchlog.capture.preamble import Told, read_preamble
from benchlog.capture.sinefit import Sines, fit_common, fit_known
from benchlog.curve import FloatArray
from benchlog.errors import CaptureError
from benchlog.notation import plain, si
from benchlog.records import PointFlag

SIDES: tuple[Side, Side] = ("input", "output")
FEWEST_CYCLES = 1.0
GOOD_CYCLES = 5.0
# Below two samples a cycle the frequency is another one; close to it, nothing shows which.
FEWEST_PER_CYCLE = 2.5
GOOD_PER_CYCLE = 10.0
MOST_DISTORTION = 0.01
_HARMONICS = (2, 3, 4, 5)
_FEWEST_SAMPLES = 16
_INTEGER_CODES = 16.0
# Time stamps that wander by more than this part of a sample interval are not a time base.
_JITTER = 0.05


@dataclass(frozen=True, slots=True, kw_only=True)
class Record:
    """Two channels sampled at even times.

    Attributes:
        time_s: Shape (n,).
        volts: Input and output, shape (2, n).
        notes: What was done to the times and samples.
    """

    time_s: FloatArray
    volts: FloatArray
    notes: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class RecordPoint:
    """What one record says: a point of a curve.

    Attributes:
        frequency_hz: Common to both channels.
        gain, u_gain_rel: Output over input.
        phase_deg, u_phase_deg: Output minus input, between -180 and 180.
        input_v, output_v: Peak amplitudes.
        samples_per_s: Sample rate.
        cycles: How many cycles the record holds.
        distortion: Harmonics 2 to 5 of the output over its fundamental.
        residual: Rest of the output after the sine, over the sine, both RMS.
        flags: Why the point needs care.
        notes: The same in words, and what was done to the record.
    """

    frequency_hz: float
    gain: float
    u_gain_rel: float
    phase_deg: float
    u_phase_deg: float
    input_v: float
    output_v: float
    samples_per_s: float
    cycles: float
    distortion: float
    residual: float
    flags: PointFlag
    notes: tuple[str, ...]


def read_records(block: Block, *, asked: Mapping[str, str]) -> list[Record]:
    """Return the records of a block: one, or one for each segment where time starts anew.

    Args:
        block: Samples with their header and preamble.
        asked: Which column is input and output, units, as a person said.

    Raises:
        CaptureError: Channels or times are not clear.
    """
    told = read_preamble(block.preamble, block.decimal)
    sides = find_channels(block.header, len(block.rows[0]), asked=asked)
    table = np.array(block.rows, dtype=float)
    used = {place for side in SIDES for place in sides[side].places}
    used |= {place for side in SIDES if (place := sides[side].time_place) is not None}
    whole = np.all(np.isfinite(table[:, sorted(used)]), axis=1)
    notes = []
    if not whole.any():
        raise CaptureError(
            "no row holds numbers for the times and both channels",
            where=f"line {block.lines[0]} to line {block.lines[-1]}",
            expected="samples, not overloads",
        )
    if not whole.all():
        first, last = np.flatnonzero(whole)[[0, -1]]
        if not whole[first : last + 1].all():
            raise CaptureError(
                "samples are missing in the middle of the record",
                where=f"line {block.lines[first + int(np.argmin(whole[first:]))]}",
                expected="a number in every row",
            )
        table = table[first : last + 1]
        notes.append(f"{int((~whole).sum())} rows without numbers at the ends are left out")
    time_s = _times(table, sides, told, where=f"lines above line {block.first_line}")
    volts = np.stack([_volts(table, sides, told, side=side) for side in SIDES])
    return [_evened(time_s[part], volts[:, part], tuple(notes)) for part in _segments(time_s)]


def point_of(record: Record, frequency_hz: float | None = None) -> RecordPoint:
    """Fit both channels with one frequency and return gain and phase.

    Args:
        record: Two channels.
        frequency_hz: The frequency, where it is known better than the record tells.

    Raises:
        CaptureError: Too few samples or cycles, or no sine is there.
    """
    count = record.time_s.size
    if count < _FEWEST_SAMPLES:
        raise CaptureError(
            f"the record has {count} samples", expected=f"at least {_FEWEST_SAMPLES}"
        )
    fit = (
        fit_common(record.time_s, record.volts)
        if frequency_hz is None
        else fit_known(record.time_s, record.volts, frequency_hz)
    )
    step_s = float(record.time_s[-1] - record.time_s[0]) / (count - 1)
    seen = quality(record.volts, fit, step_s)
    return sampled_point(fit, seen, step_s=step_s, count=count, notes=record.notes)


def sampled_point(
    fit: Sines, seen: "Quality", *, step_s: float, count: int, notes: tuple[str, ...]
) -> RecordPoint:
    """Return the point of a fit.

    Args:
        fit: Of both channels, input first.
        seen: What the samples say beside the sine.
        step_s: Sample interval.
        count: Samples in each channel.
        notes: What was done to the record.

    Raises:
        CaptureError: Too few samples or cycles, or no sine is there.
    """
    cycles = fit.frequency_hz * step_s * count
    _check(fit, cycles, per_cycle=count / cycles)
    flags, care = _care(fit, seen, cycles=cycles, per_cycle=count / cycles)
    u_rel = fit.u_amplitude / fit.amplitude
    phase = float(np.degrees(fit.phase_rad[1] - fit.phase_rad[0]))
    return RecordPoint(
        frequency_hz=fit.frequency_hz,
        gain=float(fit.amplitude[1] / fit.amplitude[0]),
        u_gain_rel=float(np.hypot(*u_rel)),
        phase_deg=(phase + 180.0) % 360.0 - 180.0,
        # The frequency is common: what it does to both phases cancels in their difference.
        u_phase_deg=float(np.degrees(np.hypot(*u_rel))),
        input_v=float(fit.amplitude[0]),
        output_v=float(fit.amplitude[1]),
        samples_per_s=1.0 / step_s,
        cycles=cycles,
        distortion=seen.distortion,
        residual=float(fit.residual_rms[1] / (fit.amplitude[1] / np.sqrt(2.0))),
        flags=flags,
        notes=(*notes, *care),
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class Quality:
    """What samples say beside the sine: which channels are clipped, harmonics of the output."""

    clipped: tuple[Side, ...]
    distortion: float


def quality(volts: FloatArray, fit: Sines, step_s: float) -> Quality:
    """Look at samples, shape (2, n), and the residuals of their fit."""
    per_cycle = 1.0 / (fit.frequency_hz * step_s)
    clipped = tuple(
        side
        for place, side in enumerate(SIDES)
        if _is_clipped(volts[place], float(fit.amplitude[place]), per_cycle)
    )
    return Quality(clipped=clipped, distortion=_distortion(fit, step_s))


def _times(
    table: FloatArray, sides: Mapping[Side, Channel], told: Told, *, where: str
) -> FloatArray:
    own = [sides[side].time_place for side in SIDES]
    if own[0] is None:
        if told.step_s is None or told.step_s <= 0:
            raise CaptureError(
                "the record has no times and no sample interval",
                where=where,
                expected='a time column, or a line such as "Sample interval,1e-6"',
            )
        return np.asarray(told.start_s + told.step_s * np.arange(len(table)), dtype=np.float64)
    times = [
        table[:, place] * sides[side].seconds
        for side, place in zip(SIDES, own, strict=True)
        if place is not None
    ]
    if len(times) == 2 and not np.allclose(times[0], times[1], rtol=0, atol=_step(times[0]) / 2):
        raise CaptureError(
            "the two channels were not sampled at the same times",
            where=where,
            expected="channels of one capture",
        )
    return times[0]


def _step(time_s: FloatArray) -> float:
    return abs(float(time_s[-1] - time_s[0])) / max(time_s.size - 1, 1)


def _volts(
    table: FloatArray, sides: Mapping[Side, Channel], told: Told, *, side: Side
) -> FloatArray:
    """Return a channel in volts: codes are scaled where the preamble says how."""
    channel = sides[side]
    values = np.asarray(table[:, list(channel.places)].mean(axis=1) * channel.volts)
    # Scales stand in the order of the columns, whichever channel is the input.
    place = sorted(SIDES, key=lambda one: sides[one].places).index(side)
    codes = bool(np.all(values == np.round(values))) and float(np.ptp(values)) >= _INTEGER_CODES
    if not codes:
        return values
    if len(told.scales) == 2 and len(told.offsets) == 2:
        return values * told.scales[place] + told.offsets[place]
    if told.scales or told.offsets:
        raise CaptureError(
            f"the channel {channel.name!r} holds integer codes and its scale is not clear",
            expected="a scale and an offset for each channel in the lines above",
        )
    return values


def _segments(time_s: FloatArray) -> list[slice]:
    """Return the stretches in which time runs forward."""
    starts = [0, *(np.flatnonzero(np.diff(time_s) < 0) + 1).tolist(), time_s.size]
    return [slice(first, after) for first, after in pairwise(starts)]


def _evened(time_s: FloatArray, volts: FloatArray, notes: tuple[str, ...]) -> Record:
    """Return a record with even times; rounded or repeated stamps are rebuilt from their ends."""
    if time_s.size < _FEWEST_SAMPLES:
        return Record(time_s=time_s, volts=volts, notes=notes)
    steps = np.diff(time_s)
    if np.all(steps[0::2] == 0) and np.all(steps[1::2] > 0) and time_s.size % 2 == 0:
        # Two rows for each time are the lowest and highest of what was acquired in it.
        time_s = time_s[0::2]
        volts = 0.5 * (volts[:, 0::2] + volts[:, 1::2])
        notes = (*notes, "each time stands twice: lowest and highest values were averaged")
    step_s = _step(time_s)
    even = time_s[0] + step_s * np.arange(time_s.size)
    wander = float(np.max(np.abs(time_s - even)))
    if step_s <= 0:
        raise CaptureError("all time stamps are the same", expected="times that rise")
    if wander > _JITTER * step_s:
        notes = (*notes, f"time stamps are rounded: rebuilt with {si(step_s, 's')} a sample")
    return Record(time_s=even, volts=volts, notes=notes)


def _check(fit: Sines, cycles: float, *, per_cycle: float) -> None:
    if not np.all(fit.amplitude > 0) or not fit.converged:
        raise CaptureError("no sine was found in the record", expected="one sine in both channels")
    if cycles < FEWEST_CYCLES:
        raise CaptureError(
            f"the record holds {plain(cycles, 2)} cycles",
            expected=f"at least {FEWEST_CYCLES:g}, better {GOOD_CYCLES:g}",
            hint="capture a longer time",
        )
    if per_cycle < FEWEST_PER_CYCLE:
        raise CaptureError(
            f"the record has {plain(per_cycle, 2)} samples for each cycle: it may be aliased",
            expected=f"at least {FEWEST_PER_CYCLE:g}, better {GOOD_PER_CYCLE:g}",
            hint="set a faster time base",
        )


def _care(
    fit: Sines, seen: Quality, *, cycles: float, per_cycle: float
) -> tuple[PointFlag, tuple[str, ...]]:
    """Return flags and notes on what makes a record less than good."""
    flags, notes = PointFlag.NONE, []
    at = f"at {si(fit.frequency_hz, 'Hz')}"
    for side in seen.clipped:
        flags |= PointFlag.CLIPPED
        notes.append(f"the {side} is clipped {at}: flat tops at its extremes")
    if seen.distortion > MOST_DISTORTION:
        flags |= PointFlag.DISTORTED
        notes.append(f"the output is distorted {at}: harmonics are {100 * seen.distortion:.1f} %")
    if per_cycle < GOOD_PER_CYCLE:
        notes.append(f"only {plain(per_cycle, 2)} samples for each cycle {at}")
    if cycles < GOOD_CYCLES:
        notes.append(f"only {plain(cycles, 2)} cycles {at}")
    return flags, tuple(notes)


def _is_clipped(volts: FloatArray, amplitude: float, per_cycle: float) -> bool:
    """Tell flat tops from the few equal codes that any sine has where it turns."""
    steps = np.abs(np.diff(volts))
    quantum = float(steps[steps > 0].min(initial=np.inf))
    if not np.isfinite(quantum):
        return False
    near_top = np.arccos(max(1.0 - quantum / amplitude, -1.0)) / np.pi * per_cycle
    allowed = 2.0 * near_top + 3.0
    return any(_longest_run(volts == extreme) > allowed for extreme in (volts.max(), volts.min()))


def _longest_run(where: np.ndarray[tuple[int, ...], np.dtype[np.bool_]]) -> int:
    edges = np.flatnonzero(np.diff(np.concatenate([[False], where, [False]]).astype(np.int8)))
    return int((edges[1::2] - edges[0::2]).max(initial=0))


def _distortion(fit: Sines, step_s: float) -> float:
    """Return the harmonics of the output over its fundamental, from what the sine leaves."""
    left = fit.residuals[1]
    total = 0.0
    for order in _HARMONICS:
        cycles_per_sample = order * fit.frequency_hz * step_s
        if cycles_per_sample < 0.5:
            turned = np.exp(-2j * np.pi * cycles_per_sample * np.arange(left.size))
            total += abs(2.0 * (left * turned).mean()) ** 2
    return float(np.sqrt(total) / fit.amplitude[1]) if fit.amplitude[1] > 0 else 0.0
