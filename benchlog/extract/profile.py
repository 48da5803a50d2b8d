"""GBW from the whole curve through the design's own response: a number, or a bound.

How well each GBW explains the curve, with all parts free within their tolerances, is its profile.
A number is given only where the profile rises on both sides; where a faster amplifier would give
the same curve, the result is the lowest GBW that the curve allows.
"""

from dataclasses import dataclass

import numpy as np
from scipy.special import chdtrc

from benchlog.curve import FloatArray
from benchlog.extract.models.designed import Designed
from benchlog.extract.solve import Fit, Prior, solve

# Rise of chi squared: two-sided 95 %, and one-sided 95 %.
_RISE_TWO_SIDED, _RISE_ONE_SIDED = 3.84, 2.71
# Both sides must rise within this factor of the best GBW.
_WITHIN = 2.0
_LEAST_NOISE_REL = 1e-4
_UNEXPLAINED = 1e-5
# Reach and fineness of the first look, as factors of the nominal GBW.
_GRID: FloatArray = np.concatenate([np.linspace(-4.5, 4.5, 28), [6.0, 9.0]])
_HALVINGS = 14


@dataclass(frozen=True, slots=True, kw_only=True)
class Profile:
    """What a curve says about the GBW through a design.

    Attributes:
        ln_gbw: Best value, or the lower bound where ``bounded_below`` only.
        number: Whether the profile rises on both sides.
        explained: Whether the design explains the curve at any GBW.
        fit: At the best value.
        noise_rel: What a point's noise was taken to be where it was not stated, else 0.
        hidden_by: Name of the part that sets the corner in place of the amplifier; or "".
    """

    ln_gbw: float
    number: bool
    explained: bool
    fit: Fit
    noise_rel: float
    hidden_by: str


class GbwProfile:
    """One sweep held against a design.

    Args:
        shape: The design's response.
        ln_frequency: Of the points that count, shape (points,).
        ln_gain: Same shape.
        weight: Inverse variances where stated, else 1, same shape.
        scatter_rel: Relative scatter of the points where the noise is not stated; None if it is.
    """

    def __init__(
        self,
        shape: Designed,
        ln_frequency: FloatArray,
        ln_gain: FloatArray,
        *,
        weight: FloatArray,
        scatter_rel: float | None,
    ) -> None:
        self._shape = shape
        self._x, self._y = ln_frequency[None, :], ln_gain[None, :]
        self._noise = 0.0 if scatter_rel is None else max(scatter_rel, _LEAST_NOISE_REL)
        self._weight = (weight if scatter_rel is None else weight / self._noise**2)[None, :]
        self._nominal = float(np.log(shape.chain.gbw_hz))
        self._prior = shape.prior_weight

    def measured(self) -> Profile:
        """Find the best GBW and how far the curve bounds it."""
        grid = self._nominal + _GRID
        chi2, parameters = self._at(grid)
        fit = self._best(chi2, parameters)
        lowest = min(float(fit.chi2[0]), float(chi2.min()))
        ln_best = float(np.clip(fit.parameters[0, 0], grid[0], grid[-1]))
        beside, _ = self._at(ln_best + np.log([1.0 / _WITHIN, _WITHIN]))
        beyond = chi2[grid >= ln_best + np.log(_WITHIN)].min(initial=np.inf)
        number = bool(
            fit.converged[0]
            and np.isfinite(fit.inverse_normal).all()
            and beside[0] > lowest + _RISE_TWO_SIDED
            and min(beside[1], beyond) > lowest + _RISE_TWO_SIDED
        )
        explained = float(chdtrc(max(self._x.size - 1, 1), lowest)) > _UNEXPLAINED
        return Profile(
            ln_gbw=ln_best if number else self._lower_bound(grid, chi2, lowest),
            number=number,
            explained=explained,
            fit=fit,
            noise_rel=self._noise,
            hidden_by="" if number else self._hidden_by(),
        )

    def _best(self, chi2: FloatArray, parameters: FloatArray) -> Fit:
        """Return the best of the fits that start in each valley of the profile.

        Poles that change their roles make a valley each.
        """
        walled = np.concatenate([[np.inf], chi2, [np.inf]])
        valley = (chi2 <= walled[:-2]) & (chi2 <= walled[2:])
        # The grid is coarse: of two valleys close together it shows one, so its sides start too.
        valley[:-1] |= valley[1:]
        valley[1:] |= valley[:-1]
        start = parameters[valley]
        rows = len(start)
        fits = solve(
            self._shape,
            np.repeat(self._x, rows, axis=0),
            np.repeat(self._y, rows, axis=0),
            weight=np.repeat(self._weight, rows, axis=0),
            start=start,
            prior=Prior(centre=np.zeros_like(start), weight=self._prior),
        )
        return fits.row(int(np.argmin(fits.chi2)))

    def _at(self, ln_gbw: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Return chi squared with the GBW held at each value, and the parameters there."""
        rows = len(ln_gbw)
        centre = np.zeros((rows, len(self._prior)))
        centre[:, 0] = ln_gbw
        fit = solve(
            self._shape.holding_gbw(),
            np.repeat(self._x, rows, axis=0),
            np.repeat(self._y, rows, axis=0),
            weight=np.repeat(self._weight, rows, axis=0),
            start=centre,
            prior=Prior(centre=centre, weight=self._prior),
        )
        return fit.chi2, fit.parameters

    def _lower_bound(self, grid: FloatArray, chi2: FloatArray, lowest: float) -> float:
        """Return where, from below, the profile first comes within the one-sided rise."""
        inside = np.flatnonzero(chi2 <= lowest + _RISE_ONE_SIDED)
        first = int(inside[0]) if inside.size else int(np.argmin(chi2))
        if first == 0:
            return float(grid[0])
        low, high = float(grid[first - 1]), float(grid[first])
        for _ in range(_HALVINGS):
            middle = 0.5 * (low + high)
            at, _ = self._at(np.array([middle]))
            low, high = (low, middle) if at[0] <= lowest + _RISE_ONE_SIDED else (middle, high)
        return low

    def _hidden_by(self) -> str:
        """Name the capacitor or pole that bends a fast amplifier's response most."""
        start = np.zeros((1, len(self._shape.parameters)))
        start[0, 0] = self._nominal + float(_GRID[-1])
        _, by = self._shape.evaluate(start, self._x)
        units = {part.name: part.unit for part in self._shape.chain.parts()}
        steep = {
            name: float(np.abs(by[0, :, place]).max())
            for place, name in enumerate(self._shape.parts, start=1)
            if units[name] != "ohm"
        }
        return max(steep, key=lambda name: steep[name]) if steep else ""
