"""A response of a plateau, an upper edge and perhaps a lower one."""

import numpy as np

from benchlog.curve import FloatArray
from benchlog.extract.models.edge import Edge
from benchlog.extract.models.polynomial import shared_row, weighted_polynomial
from benchlog.extract.models.rolloff import Rolloff

_FARTHEST = 300.0
_LN_ROOT_TWO = 0.5 * np.log(2.0)


class Composed:
    """Parameters: ln gain of the plateau, those of the upper edge, the lower edge's pole.

    Args:
        rolloff: The upper edge.
        edge: The lower edge; None for a response that is flat down to zero frequency.
    """

    def __init__(self, rolloff: Rolloff, edge: Edge | None = None) -> None:
        self.rolloff, self.edge = rolloff, edge
        self.name = rolloff.name if edge is None else f"{rolloff.name}+{edge.name}"
        lower = () if edge is None else ("ln_lower",)
        self.parameters = ("ln_gain", *rolloff.parameters, *lower)
        self._upper = slice(1, 1 + len(rolloff.parameters))

    def upper(self, parameters: FloatArray) -> FloatArray:
        """Return the upper edge's own parameters, shape (sweeps, own parameters)."""
        return parameters[:, self._upper]

    def start(self, ln_frequency: FloatArray, ln_gain: FloatArray, used: FloatArray) -> FloatArray:
        """Take the plateau from the lowest points, or the highest gains where it has a lower edge.

        The corners are where the gain is last and first within 3 dB of it.
        """
        if self.edge is None:
            order = np.argsort(np.where(used > 0, ln_frequency, np.inf), axis=1)
        else:
            order = np.argsort(np.where(used > 0, -ln_gain, np.inf), axis=1)
        first = order[:, : max(2, ln_frequency.shape[1] // 5)]
        counted = np.take_along_axis(used, first, axis=1)
        gains = np.take_along_axis(ln_gain, first, axis=1) * counted
        plateau = gains.sum(axis=1) / np.maximum(counted.sum(axis=1), 1.0)
        within = (used > 0) & (ln_gain >= (plateau - _LN_ROOT_TWO)[:, None])
        last = np.where(within, ln_frequency, -np.inf).max(axis=1)
        upper = self.rolloff.start(np.where(np.isfinite(last), last, 0.0))
        columns = [plateau[:, None], upper]
        if self.edge is not None:
            lowest = np.where(within, ln_frequency, np.inf).min(axis=1)
            columns.append(np.where(np.isfinite(lowest), lowest, 0.0)[:, None])
        return np.concatenate(columns, axis=1)

    def near(
        self, ln_frequency: FloatArray, ln_gain: FloatArray, weight: FloatArray
    ) -> FloatArray | None:
        """Solve ``|H|^(-2/n) = c0 + c1 f^2 + ...``, linear in c; see ``ClosedForm``.

        Relative residuals are the same on both sides but for their scale: what is left over is of
        the square of the noise.
        """
        if self.edge is not None:
            return None
        root = self.rolloff.root
        top = float(ln_gain.max(initial=-_FARTHEST))
        row = shared_row(ln_frequency)
        middle = 0.5 * float(row.max() + row.min()) if row.size else 0.0
        powers = np.exp(2.0 * (row - middle))
        size = ln_gain - top
        size *= 2.0 / root
        np.exp(size, out=size)
        solution = weighted_polynomial(size, powers, weight, degree=self.rolloff.degree)
        with np.errstate(all="ignore"):
            plateau = top - 0.5 * root * np.log(solution[:, 0])
            ratio = solution[:, 1:] / solution[:, :1]
            found = np.column_stack([plateau, self.rolloff.of_polynomial(ratio, middle)])
        lost = ~np.isfinite(found).all(axis=1)
        if lost.any():
            x = np.broadcast_to(ln_frequency, ln_gain.shape)
            found[lost] = self.start(x[lost], ln_gain[lost], weight[lost])
        return found

    def evaluate(
        self, parameters: FloatArray, ln_frequency: FloatArray
    ) -> tuple[FloatArray, FloatArray]:
        """Return ln gain and its derivatives; see ``Shape``."""
        values, by_upper = self.rolloff.evaluate(self.upper(parameters), ln_frequency)
        ln_gain = parameters[:, :1]
        # One parameter after the other in memory: the solver sums over points.
        by = np.empty((len(self.parameters), *values.shape))
        by[0] = 1.0
        by[self._upper] = np.moveaxis(by_upper, 2, 0)
        values += ln_gain
        if self.edge is not None:
            lower, by[-1], by_gain = self.edge.evaluate(parameters[:, -1:], ln_gain, ln_frequency)
            values = values + lower
            by[0] += by_gain
        return values, np.moveaxis(by, 0, 2)

    def phase(
        self, parameters: FloatArray, ln_frequency: FloatArray
    ) -> tuple[FloatArray, FloatArray]:
        """Return the phase in radians and its derivatives, shapes as ``evaluate``."""
        values, by_upper = self.rolloff.phase(self.upper(parameters), ln_frequency)
        by = np.zeros((len(self.parameters), *values.shape))
        by[self._upper] = np.moveaxis(by_upper, 2, 0)
        if self.edge is not None:
            ln_gain = parameters[:, :1]
            lower, by[-1], by[0] = self.edge.phase(parameters[:, -1:], ln_gain, ln_frequency)
            values = values + lower
        return values, np.moveaxis(by, 0, 2)
