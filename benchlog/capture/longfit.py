"""Sine fits to records of many millions of samples, from sums over short blocks.

At even times the sine of a whole record is, block by block, the same short sine turned by an
angle.  So one multiplication of the samples by five short vectors gives every sum that the
least-squares fit of ``sinefit.fit_common`` needs, exactly, and no array as long as the record.
"""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from benchlog.capture.sinefit import Sines, fit_common
from benchlog.curve import FloatArray

_BLOCK = 4096
_BLOCKS_AT_ONCE = 64
_PREFIX = 1 << 16
_GROWTH = 8
_PASSES = 5
# Cycles over the whole record that the frequency may still be off: nothing, or well inside the
# valley that the next, longer stretch has.
_SETTLED_CYCLES = 1e-9
_INSIDE_CYCLES = 1e-3


@dataclass(frozen=True, slots=True, kw_only=True)
class _Moments:
    """Sums over a record for one frequency.

    The five columns are cos, sin, 1, n cos and n sin of a record whose n runs evenly from -1/2 to
    1/2.

    Attributes:
        normal: Sums of products of columns, shape (5, 5).
        with_samples: Sums of columns times samples, shape (channels, 5).
        squares: Sums of squared samples, shape (channels,).
    """

    normal: FloatArray
    with_samples: FloatArray
    squares: FloatArray


def fit_long(step_s: float, samples: npt.NDArray[np.float32]) -> Sines:
    """Fit all channels with one unknown frequency.

    Args:
        step_s: Sample interval.
        samples: Shape (channels, n), n of at least 65536; phases are those at the first sample.

    Returns:
        The fit; its residuals are those of the first 65536 samples.
    """
    prefix = samples[:, :_PREFIX].astype(np.float64)
    first = fit_common(np.asarray(step_s * np.arange(_PREFIX), dtype=np.float64), prefix)
    cycles_per_sample = first.frequency_hz * step_s
    count, total = _PREFIX, samples.shape[1]
    while True:
        # The longer the record, the narrower the valley: grow in steps that stay inside it.
        count = min(count * _GROWTH, total)
        settled = _SETTLED_CYCLES if count == total else _INSIDE_CYCLES
        for _ in range(_PASSES):
            moments = _moments(samples[:, :count], cycles_per_sample)
            step = _frequency_step(moments, count)
            if abs(step) * count < settled:
                break
            cycles_per_sample += step
        if count == total:
            return _sines(moments, first, cycles_per_sample, count=total, step_s=step_s)


def _moments(samples: npt.NDArray[np.float32], cycles_per_sample: float) -> _Moments:
    channels, count = samples.shape
    blocks = count // _BLOCK
    whole = blocks * _BLOCK
    places: FloatArray = np.arange(_BLOCK, dtype=np.float64)
    local = _columns(places / count, 2 * np.pi * cycles_per_sample * places)
    starts = np.arange(blocks) * float(_BLOCK)
    turns = _turns(2 * np.pi * ((cycles_per_sample * starts) % 1.0), starts / count - 0.5)
    normal = np.einsum("bij,jk,blk->il", turns, local.T @ local, turns)
    with_samples = np.zeros((channels, 5))
    squares = np.zeros(channels)
    for at in range(0, blocks, _BLOCKS_AT_ONCE):
        after = min(at + _BLOCKS_AT_ONCE, blocks)
        part = samples[:, at * _BLOCK : after * _BLOCK].astype(np.float64)
        sums = (part.reshape(-1, _BLOCK) @ local).reshape(channels, after - at, 5)
        with_samples += np.einsum("bij,cbj->ci", turns[at:after], sums)
        squares += np.einsum("cn,cn->c", part, part)
    rest_n: FloatArray = np.arange(whole, count, dtype=np.float64)
    rest = _columns(rest_n / count - 0.5, 2 * np.pi * ((cycles_per_sample * rest_n) % 1.0))
    tail = samples[:, whole:].astype(np.float64)
    return _Moments(
        normal=normal + rest.T @ rest,
        with_samples=with_samples + tail @ rest,
        squares=squares + (tail**2).sum(axis=1),
    )


def _columns(place: FloatArray, angle: FloatArray) -> FloatArray:
    cosine, sine = np.cos(angle), np.sin(angle)
    return np.stack([cosine, sine, np.ones_like(cosine), place * cosine, place * sine], axis=1)


def _turns(angle: FloatArray, start: FloatArray) -> FloatArray:
    """Return, for each block, what makes its own five columns those of the record."""
    c, s = np.cos(angle), np.sin(angle)
    turn = np.zeros((angle.size, 5, 5))
    turn[:, 0, 0], turn[:, 0, 1] = c, -s
    turn[:, 1, 0], turn[:, 1, 1] = s, c
    turn[:, 2, 2] = 1.0
    turn[:, 3, 3], turn[:, 3, 4] = c, -s
    turn[:, 4, 3], turn[:, 4, 4] = s, c
    turn[:, 3, 0], turn[:, 3, 1] = start * c, -start * s
    turn[:, 4, 0], turn[:, 4, 1] = start * s, start * c
    return turn


def _linear(moments: _Moments) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return amplitudes, inverse normal matrix and residual sums of the fit at one frequency."""
    inverse = np.asarray(np.linalg.inv(moments.normal[:3, :3]), dtype=np.float64)
    parameters = moments.with_samples[:, :3] @ inverse
    left = moments.squares - np.einsum("cp,cp->c", parameters, moments.with_samples[:, :3])
    return parameters, inverse, np.maximum(left, 0.0)


def _slopes(moments: _Moments) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
    """Return what the frequency does to each channel.

    Returns:
        Slope times residual, squared slope that the other parameters leave free, slope onto the
        three parameters, and the residual sums; per radian of angle over the whole record.
    """
    parameters, inverse, left = _linear(moments)
    cosine, sine = parameters[:, 0], parameters[:, 1]
    slope = np.zeros((len(parameters), 5))
    slope[:, 3], slope[:, 4] = sine, -cosine
    residual_with = moments.with_samples - parameters @ moments.normal[:3]
    top = np.einsum("cp,cp->c", slope, residual_with)
    onto = slope @ moments.normal[:, :3] @ inverse
    whole = np.einsum("cp,pq,cq->c", slope, moments.normal, slope)
    free = whole - np.einsum("cp,pq,cq->c", onto, moments.normal[:3, :3], onto)
    return top, free, onto, left


def _weights(left: FloatArray) -> FloatArray:
    floor = 1e-20 * max(float(left.max()), 1e-300)
    return np.asarray(1.0 / np.maximum(left, floor), dtype=np.float64)


def _frequency_step(moments: _Moments, count: int) -> float:
    """Return the Gauss-Newton step in cycles per sample."""
    top, free, _, left = _slopes(moments)
    weight = _weights(left)
    radians = float((weight * top).sum() / (weight * free).sum())
    return max(-0.3, min(0.3, radians / (2 * np.pi))) / count


def _sines(
    moments: _Moments, first: Sines, cycles_per_sample: float, *, count: int, step_s: float
) -> Sines:
    parameters, inverse, left = _linear(moments)
    _, free, onto, _ = _slopes(moments)
    # The slopes turn about the middle of the record; phases are told for its first sample.
    onto = onto + 0.5 * np.stack(
        [parameters[:, 1], -parameters[:, 0], np.zeros(len(parameters))], axis=1
    )
    variance = left / (count - 4)
    weight = _weights(left)
    information = float((weight * free).sum())
    u_radians = float(np.sqrt((weight**2 * variance * free).sum())) / information
    covariance = variance[:, None, None] * inverse[:2, :2]
    covariance = covariance + u_radians**2 * onto[:, :2, None] * onto[:, None, :2]
    cosine, sine = parameters[:, 0], parameters[:, 1]
    amplitude = np.hypot(cosine, sine)
    along = np.stack([cosine, sine], axis=1) / amplitude[:, None]
    across = np.stack([sine, -cosine], axis=1) / amplitude[:, None] ** 2
    return Sines(
        frequency_hz=cycles_per_sample / step_s,
        u_frequency_hz=u_radians / (2 * np.pi * count * step_s),
        amplitude=amplitude,
        u_amplitude=np.sqrt(np.einsum("ci,cij,cj->c", along, covariance, along)),
        phase_rad=np.arctan2(-sine, cosine),
        u_phase_rad=np.sqrt(np.einsum("ci,cij,cj->c", across, covariance, across)),
        offset=parameters[:, 2],
        residual_rms=np.sqrt(left / count),
        residuals=first.residuals,
        converged=first.converged,
    )
