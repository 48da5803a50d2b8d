"""Fit magnitude and phase together: the complex residual, in logarithms.

The logarithm of a complex gain has ln magnitude and phase as its parts.  Delay and sign of what
lies between the meters are unknown unless stated: the sign is found beforehand, the delay is one
more parameter.
"""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from benchlog.curve import FloatArray
from benchlog.extract.models.composed import Composed
from benchlog.extract.solve import Fit, solve


@dataclass(frozen=True, slots=True, kw_only=True)
class Phase:
    """Measured phase of many sweeps.

    Attributes:
        radians: Shape (sweeps, points).
        weight: Inverse variance of it, or None where no noise is stated.
    """

    radians: FloatArray
    weight: FloatArray | None


class WithDelay:
    """A shape over points given twice, first for ln magnitude, then for phase with a delay.

    Args:
        shape: Of the magnitude.
        ln_reference: A frequency at which the delay's parameter is its phase in radians.
    """

    def __init__(self, shape: Composed, ln_reference: float) -> None:
        self._shape, self._ln_reference = shape, ln_reference
        self.name = shape.name
        self.parameters = (*shape.parameters, "delay")

    def start(self, ln_frequency: FloatArray, ln_gain: FloatArray, used: FloatArray) -> FloatArray:
        """Start from the magnitude alone."""
        half = ln_frequency.shape[1] // 2
        first = self._shape.start(ln_frequency[:, :half], ln_gain[:, :half], used[:, :half])
        return np.concatenate([first, np.zeros((len(first), 1))], axis=1)

    def evaluate(
        self, parameters: FloatArray, ln_frequency: FloatArray
    ) -> tuple[FloatArray, FloatArray]:
        """Return ln gain, then phase, and derivatives; see ``Shape``."""
        half = ln_frequency.shape[1] // 2
        x, own = ln_frequency[:, :half], parameters[:, :-1]
        gain, by_gain = self._shape.evaluate(own, x)
        phase, by_phase = self._shape.phase(own, x)
        turned = np.exp(x - self._ln_reference)
        by = np.zeros((len(self.parameters), *ln_frequency.shape))
        by[:-1, :, :half] = np.moveaxis(by_gain, 2, 0)
        by[:-1, :, half:] = np.moveaxis(by_phase, 2, 0)
        by[-1, :, half:] = -turned
        values = np.concatenate([gain, phase - parameters[:, -1:] * turned], axis=1)
        return values, np.moveaxis(by, 0, 2)


def solve_with_phase(
    shape: Composed,
    ln_frequency: FloatArray,
    ln_gain: FloatArray,
    *,
    weight: FloatArray,
    phase: Phase,
) -> tuple[Fit, FloatArray]:
    """Fit magnitude and phase.

    Args:
        shape: What to fit.
        ln_frequency: Shape (sweeps, points).
        ln_gain: Same shape.
        weight: Of ln gain, same shape.
        phase: Of the same points.

    Returns:
        The fit, with parameters of the shape alone, derivatives and residuals of ln gain; and the
        residuals of phase over their own noise, shape (sweeps, points).
    """
    alone = solve(shape, ln_frequency, ln_gain, weight=weight)
    counts = weight > 0
    ln_reference = float(np.where(counts, ln_frequency, -np.inf).max(initial=0.0))
    radians = _unwrapped(shape, alone, ln_frequency, phase=phase, counts=counts)
    both = WithDelay(shape, ln_reference)
    heavy = _phase_weight(both, alone, ln_frequency, radians=radians, phase=phase, counts=counts)
    start = np.concatenate([alone.parameters, np.zeros((len(radians), 1))], axis=1)
    fit = solve(
        both,
        np.concatenate([ln_frequency, ln_frequency], axis=1),
        np.concatenate([ln_gain, radians], axis=1),
        weight=np.concatenate([weight, heavy], axis=1),
        start=start,
    )
    half = ln_frequency.shape[1]
    own = Fit(
        parameters=fit.parameters[:, :-1],
        inverse_normal=fit.inverse_normal[:, :-1, :-1],
        derivatives=fit.derivatives[:, :half, :-1],
        residuals=fit.residuals[:, :half],
        chi2=fit.chi2,
        count=fit.count - 1,
        converged=fit.converged,
    )
    return own, fit.residuals[:, half:] * np.sqrt(heavy)


def _unwrapped(
    shape: Composed,
    alone: Fit,
    ln_frequency: FloatArray,
    *,
    phase: Phase,
    counts: npt.NDArray[np.bool_],
) -> FloatArray:
    """Return the phase without sign and whole turns, near that of the magnitude's fit.

    The sign is told by the phase in the middle of the plateau, where a delay does little.
    """
    model, _ = shape.phase(alone.parameters, ln_frequency)
    away = phase.radians - model
    # From the lowest frequency up, neighbours differ by less than half a turn.
    order = np.argsort(np.where(counts, ln_frequency, np.inf), axis=1)
    sorted_away = np.unwrap(np.take_along_axis(away, order, axis=1), axis=1)
    offset = np.round(sorted_away[:, :1] / np.pi) * np.pi
    back = np.empty_like(away)
    np.put_along_axis(back, order, sorted_away - offset, axis=1)
    return np.where(counts, model + back, 0.0)


def _phase_weight(
    both: WithDelay,
    alone: Fit,
    ln_frequency: FloatArray,
    *,
    radians: FloatArray,
    phase: Phase,
    counts: npt.NDArray[np.bool_],
) -> FloatArray:
    """Return the stated weight, or that which the scatters of gain and phase say."""
    if phase.weight is not None:
        return np.where(counts, phase.weight, 0.0)
    half = ln_frequency.shape[1]
    start = np.concatenate([alone.parameters, np.zeros((len(radians), 1))], axis=1)
    values, by = both.evaluate(start, np.concatenate([ln_frequency] * 2, axis=1))
    away = np.where(counts, radians - values[:, half:], 0.0)
    turned = np.where(counts, by[:, half:, -1], 0.0)
    delay = (turned * away).sum(axis=1) / np.maximum((turned**2).sum(axis=1), 1e-300)
    left = ((away - delay[:, None] * turned) ** 2).sum(axis=1)
    dof = np.maximum(alone.count - alone.parameters.shape[1], 1)
    ratio = (alone.chi2 / dof + 1e-24) / (left / np.maximum(alone.count - 1, 1) + 1e-24)
    return np.where(counts, np.clip(ratio, 1e-6, 1.0)[:, None], 0.0)
