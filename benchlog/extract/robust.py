"""Find single wild points: relay clicks, missed ranges.

A point is wild when it lies far from the fit of all the others, measured by their scatter
(studentised deletion residuals).
"""

import numpy as np
import numpy.typing as npt
from scipy.special import stdtrit

from benchlog.curve import FloatArray
from benchlog.extract.solve import Fit

# Five standard deviations: one false alarm in some two thousand curves.
_WILD = 5.0
_PROBABILITY = 1e-5
# More wild points than this share are no accident, but a curve of another shape.
_MOST_SHARE = 0.08


def worst_point(
    fit: Fit, weight: FloatArray, *, stated: bool
) -> tuple[npt.NDArray[np.int64], npt.NDArray[np.bool_]]:
    """Return the place of each sweep's most outlying point, and whether it is wild.

    Args:
        fit: Of the sweeps.
        weight: As fitted, shape (sweeps, points).
        stated: Whether the weights are inverse variances.
    """
    with np.errstate(all="ignore"):
        spread = fit.derivatives @ fit.inverse_normal
        leverage = weight * (spread * fit.derivatives).sum(axis=2)
        left = np.maximum(1.0 - leverage, 1e-9)
        squares = weight * fit.residuals**2 / left
        dof = fit.count - fit.parameters.shape[1] - 1
        others = (fit.chi2[:, None] - squares) / np.maximum(dof, 1)[:, None]
        # Rounding must not make a perfect curve's last digits wild.
        least = 1.0 if stated else 1e-20
        distance = np.sqrt(squares / np.maximum(others, least))
    distance = np.where((weight > 0) & (leverage < 0.99) & np.isfinite(distance), distance, 0.0)
    place = distance.argmax(axis=1)
    farthest = np.take_along_axis(distance, place[:, None], axis=1)[:, 0]
    limit = np.maximum(_WILD, stdtrit(np.maximum(dof, 1), 1.0 - _PROBABILITY))
    wild: npt.NDArray[np.bool_] = (farthest > limit) & (dof >= 3)
    return place, wild


def most_wild_points(count: npt.NDArray[np.int64]) -> npt.NDArray[np.int64]:
    """Return how many points of each sweep may be left out as wild."""
    return np.maximum(1, (count * _MOST_SHARE).astype(np.int64))
