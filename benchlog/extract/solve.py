"""Weighted least squares for many sweeps at once.

Damped Gauss-Newton steps (Levenberg-Marquardt) on arrays of shape (sweeps, points); every sweep
has its own damping and stops on its own.  A weight of zero pads sweeps of unequal length.
"""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from benchlog.curve import FloatArray
from benchlog.extract.models.polynomial import shared_row
from benchlog.extract.models.shape import ClosedForm, Shape

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
# What a last step may leave over, in standard deviations, and its length.
_LEFT_OVER = 1e-4
_SHORT_STEP = 1e-2
_LEAST_DETERMINANT = 1e-6
# Of the normal matrix with a diagonal of one; below it an inverse has no digits left.
_LEAST_EIGENVALUE = 1e-13

_Bools = npt.NDArray[np.bool_]
_Rows = slice | npt.NDArray[np.int64]


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
        return self.rows(slice(place, place + 1))

    def rows(self, some: _Rows) -> "Fit":
        """Return the fits of some sweeps."""
        return Fit(
            parameters=self.parameters[some],
            inverse_normal=self.inverse_normal[some],
            derivatives=self.derivatives[some],
            residuals=self.residuals[some],
            chi2=self.chi2[some],
            count=self.count[some],
            converged=self.converged[some],
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
    x, y, counts = ln_frequency, ln_gain, weight > 0
    if not counts.all():
        y = np.where(counts, y, 0.0)
        # A frequency row that all sweeps share stays one row, in memory too.
        if not np.isfinite(shared_row(x)).all():
            x = np.where(counts, x, 0.0)
    near = None
    if start is None:
        near = shape.near(x, y, weight) if isinstance(shape, ClosedForm) else None
        start = near if near is not None else shape.start(x, y, weight)
    state = _State(shape, x, y, weight=weight, start=start, prior=prior)
    state.near = near is not None
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
        counts = weight > 0
        self.count, self.padding = counts.sum(axis=1), None if counts.all() else ~counts
        self.total = weight.sum(axis=1)
        self.dof = np.maximum(self.count - start.shape[1], 1)
        self.damping = np.full(len(start), _FIRST_DAMPING)
        self.moving = np.ones(len(start), np.bool_)
        self.near = False
        self.normal = np.zeros((len(start), start.shape[1], start.shape[1]))
        self.residuals, self.derivatives, self.chi2 = self._at(slice(None), start)

    def step(self) -> bool:
        """Try one step of every sweep that still moves; False once none does."""
        every = bool(self.moving.all())
        rows: _Rows = slice(None) if every else np.flatnonzero(self.moving)
        if not self.moving.any():
            return False
        normal, slope = _normal(
            self.derivatives[:, rows], self.weight[rows], residuals=self.residuals[rows]
        )
        if self.prior is not None:
            np.einsum("spp->sp", normal)[:] += self.prior.weight
            slope += self.prior.weight * (self.prior.centre[rows] - self.parameters[rows])
        self.normal[rows] = normal
        move = _damped(normal, slope, self.damping[rows])
        last = self._is_last(rows, move, fall=(move * slope).sum(axis=1))
        if last.all():
            self._finish(rows, move)
            return False
        which = np.arange(len(self.parameters))[rows]
        if last.any():
            self._finish(which[last], move[last])
        self._judge(which[~last], move[~last])
        return True

    def _is_last(self, rows: _Rows, move: FloatArray, *, fall: FloatArray) -> _Bools:
        """Tell steps after which nothing is left to do.

        Near the answer a step leaves over about itself times the residuals' size and its own.
        """
        chi2, total = self.chi2[rows], self.total[rows]
        low = fall <= _FALL_TOLERANCE * chi2 + _NOTHING * total
        if self.near:
            length = np.abs(move).max(axis=1)
            left = np.sqrt(chi2 / np.maximum(total, 1e-300)) + length
            variance = np.minimum(chi2 / self.dof[rows], 1.0)
            low |= (fall * left**2 <= _LEFT_OVER**2 * variance) & (length < _SHORT_STEP)
        return np.asarray(low & (self.damping[rows] <= _FIRST_DAMPING), dtype=np.bool_)

    def _finish(self, rows: _Rows, move: FloatArray) -> None:
        """Take a step so short that the residuals follow by their derivatives."""
        self.parameters[rows] += move
        residuals = self.residuals[rows]
        for place, by in enumerate(self.derivatives):
            residuals -= by[rows] * move[:, place : place + 1]
        if self.padding is not None:
            residuals[self.padding[rows]] = 0.0
        self.residuals[rows] = residuals
        self.chi2[rows] = self._size(rows, residuals)
        self.moving[rows] = False

    def _judge(self, rows: npt.NDArray[np.int64], move: FloatArray) -> None:
        """Take the steps that go down, damp the others more."""
        longest = np.abs(move).max(axis=1, keepdims=True)
        move = move * np.minimum(1.0, _LONGEST_STEP / np.maximum(longest, 1e-300))
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
        flat = np.abs(before - chi2) <= _FALL_TOLERANCE * before + _NOTHING * self.total[rows]
        stuck = self.damping[rows] > 1e12
        self.moving[rows[small | flat | stuck]] = False

    def _at(self, rows: _Rows, parameters: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
        values, derivatives = self.shape.evaluate(parameters, self.x[rows])
        residuals = self.y[rows] - values
        if self.padding is not None:
            residuals[self.padding[rows]] = 0.0
        return residuals, np.moveaxis(derivatives, 2, 0), self._size(rows, residuals, parameters)

    def _size(
        self, rows: _Rows, residuals: FloatArray, parameters: FloatArray | None = None
    ) -> FloatArray:
        """Return the weighted sum of squares, the prior's included."""
        chi2: FloatArray = np.einsum("sn,sn->s", self.weight[rows] * residuals, residuals)
        if self.prior is not None:
            at = self.parameters[rows] if parameters is None else parameters
            chi2 += (self.prior.weight * (at - self.prior.centre[rows]) ** 2).sum(axis=1)
        return chi2

    def fit(self) -> Fit:
        return Fit(
            parameters=self.parameters,
            inverse_normal=_inverse(self.normal),
            derivatives=np.moveaxis(self.derivatives, 0, 2),
            residuals=self.residuals,
            chi2=self.chi2,
            count=self.count,
            converged=~self.moving,
        )


def _damped(normal: FloatArray, slope: FloatArray, damping: FloatArray) -> FloatArray:
    """Return the step that a damped normal matrix gives, shape (sweeps, parameters)."""
    # Scaled to a diagonal of one, no parameter's size or lack of effect spoils the solution.
    scale = np.sqrt(np.einsum("spp->sp", normal))
    scale = np.where(scale > 0, scale, 1.0)
    damped = normal / scale[:, :, None] / scale[:, None, :]
    np.einsum("spp->sp", damped)[:] = 1.0 + damping[:, None]
    inverse = _adjugate(damped)
    if inverse is None:
        move = np.linalg.solve(damped, (slope / scale)[:, :, None])[:, :, 0]
    else:
        matrix, determinant = inverse
        move = np.einsum("spq,sq->sp", matrix, slope / scale) / determinant[:, None]
    return np.asarray(move / scale)


def _adjugate(matrix: FloatArray) -> tuple[FloatArray, FloatArray] | None:
    """Return adjugates and determinants of symmetric matrices with a diagonal of about one.

    None for matrices larger than 3 x 3, and where one of 3 x 3 is so close to singular that a
    product of two small eigenvalues would take the digits of its determinant.
    """
    size = matrix.shape[1]
    if size == 2:
        adjugate = matrix[:, ::-1, ::-1].copy()
        adjugate[:, 0, 1] *= -1.0
        adjugate[:, 1, 0] *= -1.0
    elif size == 3:
        (a, b, c), (_, d, e), (_, _, f) = matrix.transpose(1, 2, 0).copy()
        adjugate = np.empty_like(matrix)
        adjugate[:, 0, 0], adjugate[:, 1, 1] = d * f - e * e, a * f - c * c
        adjugate[:, 2, 2] = a * d - b * b
        adjugate[:, 0, 1] = adjugate[:, 1, 0] = c * e - b * f
        adjugate[:, 0, 2] = adjugate[:, 2, 0] = b * e - c * d
        adjugate[:, 1, 2] = adjugate[:, 2, 1] = b * c - a * e
    else:
        return None
    determinant = np.einsum("sp,sp->s", matrix[:, 0], adjugate[:, 0])
    if size > 2 and determinant.min(initial=1.0) < _LEAST_DETERMINANT:
        return None
    return adjugate, determinant


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
    closed = _adjugate(scaled)
    if closed is None:
        known &= np.linalg.eigvalsh(scaled)[:, 0] > _LEAST_EIGENVALUE
        scaled[~known] = np.eye(normal.shape[1])
        inverse = np.asarray(np.linalg.inv(scaled))
    else:
        # The trace of the inverse is the sum of the reciprocals of the eigenvalues.
        known &= closed[1] > _LEAST_EIGENVALUE * np.einsum("spp->s", closed[0])
        inverse = closed[0] / np.where(known, closed[1], 1.0)[:, None, None]
    unscaled: FloatArray = inverse / safe[:, :, None] / safe[:, None, :]
    unscaled[~known] = np.inf
    return unscaled
