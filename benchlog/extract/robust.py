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

    Only sweeps where the largest residual leaves room for a wild point are looked at closely.

    Args:
        fit: Of the sweeps.
        weight: As fitted, shape (sweeps, points).
        stated: Whether the weights are inverse variances.
    """
    place = np.zeros(len(weight), np.int64)
    wild = np.zeros(len(weight), np.bool_)
    rows = np.flatnonzero(_room_for_wild(fit, weight, stated=stated))
    if rows.size:
        place[rows], wild[rows] = _worst(fit.rows(rows), weight[rows], stated=stated)
    return place, wild


def _room_for_wild(fit: Fit, weight: FloatArray, *, stated: bool) -> npt.NDArray[np.bool_]:
    """Tell sweeps that can have a wild point, by bounds that need no leverage of each point."""
    by_all, size = fit.derivatives, fit.derivatives.shape[2]
    with np.errstate(all="ignore"):
        # Derivatives of all sweeps together have one bound, which is quick to find.
        steepest = np.array(
            [max(by.max(initial=0.0), -by.min(initial=0.0)) for by in np.moveaxis(by_all, 2, 0)]
        )
        heaviest = weight.max(axis=1, initial=0.0) if stated else weight.max(initial=0.0)
        leverage = heaviest * np.einsum(
            "spq,pq->s", np.abs(fit.inverse_normal), np.outer(steepest, steepest)
        )
        largest = (weight * fit.residuals**2).max(axis=1, initial=0.0) / (1.0 - leverage)
        dof = np.maximum(fit.count - size - 1, 1)
        # For stated noise the scatter of the others counts as 1 at least: fewer are wild.
        low = largest <= _WILD**2 * np.maximum(fit.chi2 - largest, 0.0) / dof
        room: npt.NDArray[np.bool_] = ~(low & (leverage < 1.0))
    return room


def _worst(
    fit: Fit, weight: FloatArray, *, stated: bool
) -> tuple[npt.NDArray[np.int64], npt.NDArray[np.bool_]]:
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
