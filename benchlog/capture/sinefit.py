"""Least-squares fits of sines to sampled records, one frequency for all channels.

Source:
    IEEE Std 1057, three- and four-parameter sine fits (equations from memory); the bounds on
    variance follow from the Fisher matrix of white noise.
"""

import math
from dataclasses import dataclass

import numpy as np

from benchlog.curve import FloatArray
from benchlog.errors import Misuse

_MOST_PASSES = 30
_SETTLED_REL = 1e-13
# A spectrum of more points says no more about where the one line is.
_LONGEST_SPECTRUM = 1 << 16


@dataclass(frozen=True, slots=True, kw_only=True)
class Sines:
    """Sines of one frequency, fitted to the channels of one record.

    Attributes:
        frequency_hz: The common frequency.
        u_frequency_hz: Its standard uncertainty; 0 where it was given.
        amplitude: Peak, in the unit of the samples, shape (channels,).
        u_amplitude: Standard uncertainty from the residual, shape (channels,).
        phase_rad: Of ``A cos(2 pi f t + phase)`` at time zero, shape (channels,).
        u_phase_rad: Standard uncertainty from the residual, shape (channels,).
        offset: Mean level, shape (channels,).
        residual_rms: What is left, noise and distortion together, shape (channels,).
        residuals: Samples minus fit, shape (channels, n).
        converged: Whether the frequency settled.
    """

    frequency_hz: float
    u_frequency_hz: float
    amplitude: FloatArray
    u_amplitude: FloatArray
    phase_rad: FloatArray
    u_phase_rad: FloatArray
    offset: FloatArray
    residual_rms: FloatArray
    residuals: FloatArray
    converged: bool = True


def fit_known(time_s: FloatArray, samples: FloatArray, frequency_hz: float) -> Sines:
    """Fit amplitude, phase and offset at a known frequency (three parameters a channel).

    Args:
        time_s: Shape (n,).
        samples: Shape (channels, n), n of at least 4.
        frequency_hz: Above zero.
    """
    _check(time_s, samples)
    basis = _basis(time_s, frequency_hz)
    inverse = _inverse(basis)
    parameters = samples @ basis @ inverse
    return _sines(samples, basis, parameters, inverse=inverse, frequency_hz=frequency_hz)


def fit_common(time_s: FloatArray, samples: FloatArray, start_hz: float | None = None) -> Sines:
    """Fit all channels with one unknown frequency (three parameters a channel, and one).

    Gauss-Newton on the frequency, each pass a linear fit, as the standard's four-parameter fit
    does for one channel.

    Args:
        time_s: Shape (n,).
        samples: Shape (channels, n), n of at least 5.
        start_hz: A first guess; from the spectrum by default.
    """
    _check(time_s, samples)
    centre_s = 0.5 * (float(time_s[0]) + float(time_s[-1]))
    moved_s = time_s - centre_s
    frequency_hz = guess_hz(time_s, samples) if start_hz is None else start_hz
    span_s = float(moved_s[-1] - moved_s[0])
    converged = False
    for _ in range(_MOST_PASSES):
        step_hz = _frequency_step(moved_s, samples, frequency_hz)
        # The sum of squares has other valleys a line width away: never jump into one.
        step_hz = max(-0.5 / span_s, min(0.5 / span_s, step_hz))
        frequency_hz = max(frequency_hz + step_hz, 1e-3 / span_s)
        if abs(step_hz) <= _SETTLED_REL * frequency_hz:
            converged = True
            break
    return _with_frequency(time_s, samples, frequency_hz, converged=converged)


def guess_hz(time_s: FloatArray, samples: FloatArray) -> float:
    """Return the frequency of the highest line in the spectrum of evenly spaced samples."""
    length = min(time_s.size, _LONGEST_SPECTRUM)
    step_s = float(time_s[-1] - time_s[0]) / (time_s.size - 1)
    windowed = (samples[:, :length] - samples[:, :length].mean(axis=1, keepdims=True)) * np.hanning(
        length
    )
    power = (np.abs(np.fft.rfft(windowed, axis=1)) ** 2).sum(axis=0)
    place = 1 + int(np.argmax(power[1:]))
    if place + 1 < power.size and power[place - 1] > 0 and power[place + 1] > 0:
        left, top, right = np.log(power[place - 1 : place + 2])
        place_between = 0.5 * (left - right) / (left - 2 * top + right)
        return float((place + place_between) / (length * step_s))
    return place / (length * step_s)


def _frequency_step(time_s: FloatArray, samples: FloatArray, frequency_hz: float) -> float:
    """Return the Gauss-Newton step of the frequency, the other parameters fitted along."""
    basis = _basis(time_s, frequency_hz)
    inverse = _inverse(basis)
    parameters = samples @ basis @ inverse
    slope = _slope(time_s, basis, parameters)
    residuals = samples - parameters @ basis.T
    free = slope - (slope @ basis @ inverse) @ basis.T
    weight = _weights(residuals)
    top = float((weight * (free * residuals).sum(axis=1)).sum())
    bottom = float((weight * (free**2).sum(axis=1)).sum())
    return top / bottom if bottom > 0 else 0.0


def _with_frequency(
    time_s: FloatArray, samples: FloatArray, frequency_hz: float, *, converged: bool
) -> Sines:
    """Fit at the frequency found, and add what its own uncertainty does to the others."""
    basis = _basis(time_s, frequency_hz)
    inverse = _inverse(basis)
    parameters = samples @ basis @ inverse
    slope = _slope(time_s, basis, parameters)
    onto = slope @ basis @ inverse
    residuals = samples - parameters @ basis.T
    free = slope - onto @ basis.T
    channels, count = samples.shape
    dof = channels * (count - 3) - 1
    variance = (residuals**2).sum(axis=1) / max(count - 3 - 1 / channels, 1.0)
    weight = _weights(residuals)
    information = float((weight * (free**2).sum(axis=1)).sum())
    u_hz = 0.0
    if information > 0 and dof > 0:
        u_hz = math.sqrt(float((weight**2 * variance * (free**2).sum(axis=1)).sum())) / information
    return _sines(
        samples,
        basis,
        parameters,
        inverse=inverse,
        frequency_hz=frequency_hz,
        u_frequency_hz=u_hz,
        by_frequency=-onto,
        converged=converged,
    )


def _sines(  # noqa: PLR0913 - the parts of one fit
    samples: FloatArray,
    basis: FloatArray,
    parameters: FloatArray,
    *,
    inverse: FloatArray,
    frequency_hz: float,
    u_frequency_hz: float = 0.0,
    by_frequency: FloatArray | None = None,
    converged: bool = True,
) -> Sines:
    residuals = samples - parameters @ basis.T
    count = samples.shape[1]
    free = count - 3 - (1 / samples.shape[0] if u_frequency_hz else 0)
    variance = (residuals**2).sum(axis=1) / max(free, 1.0)
    cosine, sine, offset = parameters.T
    amplitude = np.hypot(cosine, sine)
    safe = np.where(amplitude > 0, amplitude, np.inf)
    to_amplitude = np.stack([cosine / safe, sine / safe], axis=1)
    to_phase = np.stack([sine / safe**2, -cosine / safe**2], axis=1)
    covariance = variance[:, None, None] * inverse[:2, :2]
    if by_frequency is not None:
        moved = by_frequency[:, :2]
        covariance = covariance + u_frequency_hz**2 * moved[:, :, None] * moved[:, None, :]
    return Sines(
        frequency_hz=frequency_hz,
        u_frequency_hz=u_frequency_hz,
        amplitude=amplitude,
        u_amplitude=_spread(to_amplitude, covariance),
        phase_rad=np.arctan2(-sine, cosine),
        u_phase_rad=_spread(to_phase, covariance),
        offset=offset,
        residual_rms=np.sqrt((residuals**2).mean(axis=1)),
        residuals=residuals,
        converged=converged,
    )


def _spread(sensitivity: FloatArray, covariance: FloatArray) -> FloatArray:
    variance: FloatArray = np.einsum("ci,cij,cj->c", sensitivity, covariance, sensitivity)
    return np.sqrt(np.maximum(variance, 0.0))


def _inverse(basis: FloatArray) -> FloatArray:
    """Return the inverse of the normal matrix."""
    return np.asarray(np.linalg.inv(basis.T @ basis), dtype=np.float64)


def _basis(time_s: FloatArray, frequency_hz: float) -> FloatArray:
    angle = 2 * np.pi * frequency_hz * time_s
    return np.stack([np.cos(angle), np.sin(angle), np.ones_like(angle)], axis=1)


def _slope(time_s: FloatArray, basis: FloatArray, parameters: FloatArray) -> FloatArray:
    """Return the derivative of each channel's sine by the frequency, shape (channels, n)."""
    turned: FloatArray = parameters[:, 1:2] * basis[:, 0] - parameters[:, 0:1] * basis[:, 1]
    return 2 * np.pi * time_s * turned


def _weights(residuals: FloatArray) -> FloatArray:
    """Weigh channels by their own noise, so that a noisy one does not blur a clean one."""
    mean_square = (residuals**2).mean(axis=1)
    floor = 1e-20 * max(float(mean_square.max()), 1e-300)
    weight: FloatArray = 1.0 / np.maximum(mean_square, floor)
    return weight


def _check(time_s: FloatArray, samples: FloatArray) -> None:
    if samples.ndim != 2 or samples.shape[1:] != time_s.shape or time_s.size < 5:
        raise Misuse(f"samples of shape {samples.shape} do not fit times of {time_s.shape}")
