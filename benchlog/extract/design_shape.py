"""Figures of a curve through the design's own response: the shape called ``design``."""

import math
from dataclasses import dataclass

import numpy as np

from benchlog.curve import FloatArray, GainCurve
from benchlog.extract.models.designed import Designed
from benchlog.extract.profile import GbwProfile, Profile
from benchlog.extract.reduce import Data
from benchlog.extract.solve import Fit, Prior, solve
from benchlog.extract.uncertainty import Cause, design_causes

_LN_ROOT_TWO = 0.5 * np.log(2.0)
_STEP = 1e-4
_PER_NEPER = 24
_BEYOND = 2.0
_HALVINGS = 40
# What the GBW is taken to be uncertain by, in nepers, where the curve only bounds it.
_UNBOUNDED = 2.0


@dataclass(frozen=True, slots=True, kw_only=True)
class DesignFit:
    """One curve fitted by its design's response.

    Attributes:
        profile: What it says about the GBW.
        causes: What makes the parameters uncertain.
        ln_values: Logarithm of each figure, NaN where there is none.
        by: Derivatives of each by the parameters.
    """

    profile: Profile
    causes: list[Cause]
    ln_values: dict[str, float]
    by: dict[str, FloatArray]


def fit_design(curve: GainCurve, shape: Designed, data: Data, *, scatter_rel: float) -> DesignFit:
    """Fit one curve.

    Args:
        curve: As measured, with its terms.
        shape: The design's response.
        data: The same curve, shape (1, points).
        scatter_rel: First guess of the noise where it is not stated.
    """
    counts = data.weight[0] > 0
    x, y, weight = data.ln_frequency[0][counts], data.ln_gain[0][counts], data.weight[0][counts]
    profile = _profile(shape, x, y, weight=weight, scatter_rel=None if data.stated else scatter_rel)
    if not data.stated:
        left = profile.fit.residuals[0]
        own = math.sqrt(float(left @ left) / max(left.size - 2, 1))
        profile = _profile(shape, x, y, weight=weight, scatter_rel=own)
        weight = weight / profile.noise_rel**2
    fit = profile.fit if profile.number else _held(shape, x, y, weight=weight, near=profile.fit)
    dof = math.inf if data.stated else float(max(x.size - 2, 1))
    causes = design_causes(
        curve.terms,
        fit,
        parameters=shape.parameters,
        prior_weight=shape.prior_weight,
        frequency_hz=np.exp(x),
        weight=weight,
        dof=dof,
    )
    ln_values, by = _landmarks(shape, fit.parameters[0], x)
    return DesignFit(profile=profile, causes=causes, ln_values=ln_values, by=by)


def _profile(
    shape: Designed, x: FloatArray, y: FloatArray, *, weight: FloatArray, scatter_rel: float | None
) -> Profile:
    return GbwProfile(shape, x, y, weight=weight, scatter_rel=scatter_rel).measured()


def _held(shape: Designed, x: FloatArray, y: FloatArray, *, weight: FloatArray, near: Fit) -> Fit:
    """Fit with the GBW held loosely where it is best, as the curve does not hold it."""
    centre = np.zeros_like(near.parameters)
    centre[:, 0] = np.clip(near.parameters[:, 0], 0.0, np.log(shape.chain.gbw_hz) + 9.0)
    known = shape.prior_weight.copy()
    known[0] = _UNBOUNDED**-2
    start = near.parameters.copy()
    start[:, 0] = centre[:, 0]
    prior = Prior(centre=centre, weight=known)
    return solve(shape, x[None, :], y[None, :], weight=weight[None, :], start=start, prior=prior)


def _landmarks(
    shape: Designed, centre: FloatArray, x: FloatArray
) -> tuple[dict[str, float], dict[str, FloatArray]]:
    """Return figures of the response and their derivatives, from neighbours in one go."""
    size = centre.size
    moves = np.concatenate([np.zeros((1, size)), _STEP * np.eye(size), -_STEP * np.eye(size)])
    rows = centre + moves
    grid = np.arange(x.min() - _BEYOND, x.max() + _BEYOND, 1.0 / _PER_NEPER)
    plateau = shape.ln_plateau(rows)
    heights = shape.ln_gain(rows, np.tile(grid, (len(rows), 1))) - plateau[:, None]
    found = {
        "gain": plateau,
        "corner_hz": _crossing(shape, rows, grid, heights=heights, last=True),
        "lower_corner_hz": _crossing(shape, rows, grid, heights=heights, last=False),
        "gbw_hz": rows[:, 0],
        "peaking_db": np.where(heights.max(axis=1) > 1e-9, heights.max(axis=1), np.nan),
    }
    with np.errstate(invalid="ignore"):
        upper, lower = np.exp(found["corner_hz"]), np.exp(found["lower_corner_hz"])
        found["bandwidth_hz"] = np.log(upper - np.where(np.isfinite(lower), lower, 0.0))
    values = {name: float(ln[0]) for name, ln in found.items()}
    by = {name: (ln[1 : size + 1] - ln[size + 1 :]) / (2.0 * _STEP) for name, ln in found.items()}
    return values, by


def _crossing(
    shape: Designed, rows: FloatArray, grid: FloatArray, *, heights: FloatArray, last: bool
) -> FloatArray:
    """Bisect half power of every row; NaN where the response does not cross it."""
    above = heights >= -_LN_ROOT_TWO
    order = above[:, ::-1] if last else above
    place = order.argmax(axis=1)
    exists = above.any(axis=1) & (place > 0)
    inner = np.where(last, grid.size - 1 - place, place)
    outer = np.clip(inner + (1 if last else -1), 0, grid.size - 1)
    inside, outside = grid[inner], grid[outer]
    plateau = shape.ln_plateau(rows)
    for _ in range(_HALVINGS):
        middle = 0.5 * (inside + outside)
        height = shape.ln_gain(rows, middle[:, None])[:, 0] - plateau
        within = height >= -_LN_ROOT_TWO
        inside, outside = np.where(within, middle, inside), np.where(within, outside, middle)
    return np.where(exists, 0.5 * (inside + outside), np.nan)
