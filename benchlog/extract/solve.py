"""Weighted least squares for many sweeps at once.

Damped Gauss-Newton steps (Levenberg-Marquardt) on arrays of shape (sweeps, points); every sweep
has its own damping and stops on its own.  A weight of zero pads sweeps of unequal length.
"""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from benchlog.curve import FloatArray
from benchlog.extract.models.shape import Shape

_MOST_STEPS = 60
# Parameters are logarithms: this is a relative change far below any uncertainty.
_STEP_TOLERANCE = 1e-11
# Such a fall is a step of less than a millionth of the uncertainty; the next is far smaller.
_FALL_TOLERANCE = 1e-13
# Sums of squares of logarithms below this are rounding.
_NOTHING = 1e-26
# A parameter moves by no more than a factor e in one step.
_LONGEST_STEP = 1.0
_FIRST_DAMPING = 1e-3
_LEAST_DAMPING = 1e-12
# Of the normal matrix with a diagonal of one; below it an inverse has no digits left.
_LEAST_EIGENVALUE = 1e-13


@dataclass(frozen=True, slots=True, kw_only=True)
class Prior:
    """What is known of the parameters before the sweep.

    Attributes:
        centre: Shape (sweeps, parameters).
        weight: Inverse variance, 0 where nothing is known, shape (parameters,).
    """

    centre: FloatArray
    weight: FloatArray


@dataclass(frozen=True, slots=True, kw_only=True)
class Fit:
    """Fitted parameters of many sweeps.

    Attributes:
        parameters: Shape (sweeps, parameters).
        inverse_normal: Inverse of the normal matrix: the covariance where the weights are inverse
            variances, shape (sweeps, parameters, parameters).
        derivatives: Of ln gain by the parameters at the fit, shape (sweeps, points, parameters).
        residuals: Measured minus fitted ln gain, zero where the weight is zero.
        chi2: Weighted sum of squares, the prior's included, shape (sweeps,).
        count: Points that count, shape (sweeps,).
        converged: Whether the last step was negligible, shape (sweeps,).
    """

    parameters: FloatArray
    inverse_normal: FloatArray
    derivatives: FloatArray
    residuals: FloatArray
    chi2: FloatArray
    count: npt.NDArray[np.int64]
    converged: npt.NDArray[np.bool_]

    def row(self, place: int) -> "Fit":
        """Return the fit of one sweep."""
        one = slice(place, place + 1)
        return Fit(
            parameters=self.parameters[one],
            inverse_normal=self.inverse_normal[one],
            derivatives=self.derivatives[one],
            residuals=self.residuals[one],
            chi2=self.chi2[one],
            count=self.count[one],
            converged=self.converged[one],
        )


def solve(
    shape: Shape,
    ln_frequency: FloatArray,
    ln_gain: FloatArray,
    *,
    weight: FloatArray,
    start: FloatArray | None = None,
    prior: Prior | None = None,
) -> Fit:
    """Fit one shape to many sweeps.

    Args:
        shape: What to fit.
        ln_frequency: Shape (sweeps, points); finite where the weight is above zero.
        ln_gain: Same shape.
        weight: Inverse variance of ln gain, or 1 where it is not known, shape (sweeps, points).
        start: First guess, shape (sweeps, parameters); the shape's own by default.
        prior: Counts like one more point for each parameter that it knows.

    Returns:
        The fits; where one did not converge the flag says so.
    """
    used = (weight > 0).astype(float)
    x = np.where(weight > 0, ln_frequency, 0.0)
    y = np.where(weight > 0, ln_gain, 0.0)
    first = shape.start(x, y, used) if start is None else start
    state = _State(shape, x, y, weight=weight, start=first, prior=prior)
    for _ in range(_MOST_STEPS):
        if not state.step():
            break
    return state.fit()


class _State:
    """Where each sweep's search stands."""

    def __init__(
        self,
        shape: Shape,
        x: FloatArray,
        y: FloatArray,
        *,
        weight: FloatArray,
        start: FloatArray,
        prior: Prior | None,
    ) -> None:
        self.shape, self.x, self.y, self.weight, self.prior = shape, x, y, weight, prior
        self.parameters = start.copy()
        self.floor = _NOTHING * weight.sum(axis=1)
        self.damping = np.full(len(start), _FIRST_DAMPING)
        self.moving = np.ones(len(start), np.bool_)
        self.residuals, self.derivatives, self.chi2 = self._at(np.arange(len(start)), start)

    def step(self) -> bool:
        """Try one step of every sweep that still moves; False once none does."""
        rows = np.flatnonzero(self.moving)
        if rows.size == 0:
            return False
        every = rows.size == len(self.parameters)
        which: slice | npt.NDArray[np.int64] = slice(None) if every else rows
        normal, slope = _normal(
            self.derivatives[:, which], self.weight[which], residuals=self.residuals[which]
        )
        if self.prior is not None:
            np.einsum("spp->sp", normal)[:] += self.prior.weight
            slope += self.prior.weight * (self.prior.centre[rows] - self.parameters[rows])
        # Scaled to a diagonal of one, no parameter's size or lack of effect spoils the solution.
        scale = np.sqrt(np.einsum("spp->sp", normal))
        scale = np.where(scale > 0, scale, 1.0)
        damped = normal / scale[:, :, None] / scale[:, None, :]
        np.einsum("spp->sp", damped)[:] = 1.0 + self.damping[rows, None]
        move = np.linalg.solve(damped, (slope / scale)[:, :, None])[:, :, 0] / scale
        longest = np.abs(move).max(axis=1, keepdims=True)
        move *= np.minimum(1.0, _LONGEST_STEP / np.maximum(longest, 1e-300))
        self._judge(rows, move)
        return True

    def _judge(self, rows: npt.NDArray[np.int64], move: FloatArray) -> None:
        """Take the steps that go down, damp the others more."""
        tried = self.parameters[rows] + move
        residuals, derivatives, chi2 = self._at(rows, tried)
        before = self.chi2[rows]
        better = chi2 <= before
        taken = rows[better]
        self.parameters[taken] = tried[better]
        self.residuals[taken] = residuals[better]
        self.derivatives[:, taken] = derivatives[:, better]
        self.chi2[taken] = chi2[better]
        self.damping[rows] = np.where(
            better,
            np.maximum(self.damping[rows] * 0.01, _LEAST_DAMPING),
            np.maximum(self.damping[rows], 1e-9) * 10.0,
        )
        small = np.abs(move).max(axis=1) < _STEP_TOLERANCE
        # A step that neither falls nor rises is rounding at the bottom.
        flat = np.abs(before - chi2) <= _FALL_TOLERANCE * before + self.floor[rows]
        stuck = self.damping[rows] > 1e12
        self.moving[rows[small | flat | stuck]] = False

    def _at(
        self, rows: npt.NDArray[np.int64], parameters: FloatArray
    ) -> tuple[FloatArray, FloatArray, FloatArray]:
        values, derivatives = self.shape.evaluate(parameters, self.x[rows])
        residuals = np.where(self.weight[rows] > 0, self.y[rows] - values, 0.0)
        chi2 = np.einsum("sn,sn,sn->s", self.weight[rows], residuals, residuals)
        if self.prior is not None:
            away = parameters - self.prior.centre[rows]
            chi2 += (self.prior.weight * away**2).sum(axis=1)
        return residuals, np.moveaxis(derivatives, 2, 0), chi2

    def fit(self) -> Fit:
        normal, _ = _normal(self.derivatives, self.weight, residuals=self.residuals)
        if self.prior is not None:
            np.einsum("spp->sp", normal)[:] += self.prior.weight
        return Fit(
            parameters=self.parameters,
            inverse_normal=_inverse(normal),
            derivatives=np.moveaxis(self.derivatives, 0, 2),
            residuals=self.residuals,
            chi2=self.chi2,
            count=(self.weight > 0).sum(axis=1),
            converged=~self.moving,
        )


def _normal(
    derivatives: FloatArray, weight: FloatArray, *, residuals: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Return normal matrices and slopes; derivatives have shape (parameters, sweeps, points)."""
    size, rows = derivatives.shape[:2]
    normal, slope = np.empty((rows, size, size)), np.empty((rows, size))
    for one in range(size):
        weighted = derivatives[one] * weight
        slope[:, one] = np.einsum("sn,sn->s", weighted, residuals)
        for other in range(one, size):
            total = np.einsum("sn,sn->s", weighted, derivatives[other])
            normal[:, one, other] = normal[:, other, one] = total
    return normal, slope


def _inverse(normal: FloatArray) -> FloatArray:
    """Invert, after scaling the diagonal to one; what has no information gets infinity."""
    scale = np.sqrt(np.einsum("spp->sp", normal))
    known = (scale > 0).all(axis=1)
    safe = np.where(scale > 0, scale, 1.0)
    scaled = normal / safe[:, :, None] / safe[:, None, :]
    scaled[~known] = np.eye(normal.shape[1])
    known &= np.linalg.eigvalsh(scaled)[:, 0] > _LEAST_EIGENVALUE
    scaled[~known] = np.eye(normal.shape[1])
    inverse: FloatArray = np.linalg.inv(scaled) / safe[:, :, None] / safe[:, None, :]
    inverse[~known] = np.inf
    return inverse
