"""Where a fitted response has its corners and its peak, and how each hangs on the parameters."""

from dataclasses import dataclass

import numpy as np

from benchlog.curve import FloatArray
from benchlog.extract.models.composed import Composed
from benchlog.extract.models.edge import Shelf
from benchlog.extract.models.rolloff import OnePole, TwoPole

_LN_ROOT_TWO = 0.5 * np.log(2.0)
_STEP = 1e-5
_MOST_STEPS = 40


@dataclass(frozen=True, slots=True, kw_only=True)
class Landmark:
    """The logarithm of a quantity and its derivatives by the parameters.

    Attributes:
        ln_value: Shape (sweeps,); NaN where there is none.
        by: Shape (sweeps, parameters).
    """

    ln_value: FloatArray
    by: FloatArray


def upper_corner(shape: Composed, parameters: FloatArray) -> Landmark:
    """Return the last downward crossing of plateau/sqrt(2)."""
    ln_corner = shape.rolloff.ln_fallen(shape.upper(parameters), _LN_ROOT_TWO)
    if shape.edge is not None:
        ln_corner = _settled(shape, parameters, ln_corner)
    return _implicit(shape, parameters, ln_corner)


def lower_corner(shape: Composed, parameters: FloatArray) -> Landmark | None:
    """Return the first upward crossing of plateau/sqrt(2); None for a shape without one."""
    if shape.edge is None:
        return None
    ln_pole = parameters[:, -1]
    if isinstance(shape.edge, Shelf):
        # Closed form of the shelf alone: fp sqrt(1 - 2/G^2), none below G = sqrt(2).
        inside = 1.0 - 2.0 * np.exp(-2.0 * parameters[:, 0])
        ln_pole = ln_pole + 0.5 * np.log(np.where(inside > 0, inside, np.nan))
    return _implicit(shape, parameters, _settled(shape, parameters, ln_pole))


def peak(shape: Composed, parameters: FloatArray) -> tuple[Landmark, Landmark]:
    """Return how far the response rises above the plateau, and where; NaN where it does not."""
    nothing = np.full(len(parameters), np.nan)
    by_height, by_place = np.zeros((2, *parameters.shape))
    if not isinstance(shape.rolloff, TwoPole):
        return Landmark(ln_value=nothing, by=by_height), Landmark(ln_value=nothing, by=by_place)
    ln_f0, ln_q = shape.upper(parameters).T
    half = 0.5 * np.exp(-2.0 * np.clip(ln_q, -50.0, 50.0))
    rises = half < 1.0
    half = np.where(rises, half, np.nan)
    place = ln_f0 + 0.5 * np.log(1.0 - half)
    height = ln_q - 0.5 * np.log(1.0 - 0.5 * half)
    by_height[:, 2] = 1.0 - 0.5 * half / (1.0 - 0.5 * half)
    by_place[:, 1], by_place[:, 2] = 1.0, half / (1.0 - half)
    return Landmark(ln_value=height, by=by_height), Landmark(ln_value=place, by=by_place)


def crossover(shape: Composed, parameters: FloatArray) -> Landmark:
    """Return where gain times frequency is the GBW over the noise gain: of two poles Q f0.

    The corner of two poles is up to 1.6 times as high, and no measure of the amplifier.
    """
    if not isinstance(shape.rolloff, TwoPole):
        return upper_corner(shape, parameters)
    by = np.zeros_like(parameters)
    by[:, 1:3] = 1.0
    return Landmark(ln_value=parameters[:, 1] + parameters[:, 2], by=by)


def signal_gbw(shape: Composed, parameters: FloatArray) -> Landmark:
    """Return what stands for the GBW without a design; NaN for a shape that has no such thing.

    One pole: gain times corner.  Two poles: gain times Q f0, which is exact for a loop of two
    poles with a constant noise gain.
    """
    by = np.zeros_like(parameters)
    if isinstance(shape.rolloff, OnePole):
        by[:, :2] = 1.0
    elif isinstance(shape.rolloff, TwoPole):
        by[:, :3] = 1.0
    else:
        return Landmark(ln_value=np.full(len(parameters), np.nan), by=by)
    return Landmark(ln_value=(parameters * by).sum(axis=1), by=by)


def unity(shape: Composed, parameters: FloatArray) -> Landmark:
    """Return where the response last falls through a gain of one; NaN where it is never above."""
    ln_gain = parameters[:, 0]
    upper = shape.upper(parameters)
    if shape.edge is None:
        ln_f = shape.rolloff.ln_fallen(upper, np.where(ln_gain > 0, ln_gain, np.nan))
    else:
        # Far up the response is its asymptote, which is where Newton's steps come from.
        alone = shape.rolloff.ln_fallen(upper, _LN_ROOT_TWO)
        start = alone + np.maximum(ln_gain, 0.0) / shape.rolloff.poles + 1.0
        ln_f = _settled(shape, parameters, start, level=-ln_gain)
    return _implicit(shape, parameters, np.where(ln_gain > 0, ln_f, np.nan), absolute=True)


def bandwidth(upper: Landmark, lower: Landmark | None) -> Landmark:
    """Return upper minus lower corner."""
    if lower is None:
        return upper
    ratio = np.exp(np.minimum(lower.ln_value - upper.ln_value, 0.0))
    rest = np.where(ratio < 1.0, 1.0 - ratio, np.nan)
    by = (upper.by - ratio[:, None] * lower.by) / rest[:, None]
    return Landmark(ln_value=upper.ln_value + np.log(rest), by=by)


def _settled(
    shape: Composed,
    parameters: FloatArray,
    ln_start: FloatArray,
    *,
    level: FloatArray | float = -_LN_ROOT_TWO,
) -> FloatArray:
    """Move from an edge's own corner to the whole response's, by Newton's steps from outside.

    Outside the crossing the response is concave in these logarithms, so that the steps come from
    one side; where the edges leave no crossing they run away, and the answer is NaN.
    """
    ln_f = ln_start.copy()
    with np.errstate(all="ignore"):
        for _ in range(_MOST_STEPS):
            height, slope = _height(shape, parameters, ln_f, level=level)
            move = height / slope
            ln_f = ln_f - np.clip(move, -2.0, 2.0)
            if np.nanmax(np.abs(move), initial=0.0) < 1e-12:
                break
        height, slope = _height(shape, parameters, ln_f, level=level)
    away = ~(np.abs(height) < 1e-9) | ~(np.abs(slope) > 1e-3)
    return np.where(away, np.nan, ln_f)


def _height(
    shape: Composed,
    parameters: FloatArray,
    ln_f: FloatArray,
    *,
    level: FloatArray | float = -_LN_ROOT_TWO,
) -> tuple[FloatArray, FloatArray]:
    """Return ln of the response over a level beside the plateau, and its slope, (sweeps,)."""
    around = ln_f[:, None] + np.array([[-_STEP, 0.0, _STEP]])
    values, _ = shape.evaluate(parameters, around)
    slope = (values[:, 2] - values[:, 0]) / (2.0 * _STEP)
    return values[:, 1] - parameters[:, 0] - level, slope


def _implicit(
    shape: Composed, parameters: FloatArray, ln_f: FloatArray, *, absolute: bool = False
) -> Landmark:
    """Return a crossing with its derivatives, by the theorem of implicit functions.

    Args:
        shape: Of the fit.
        parameters: Shape (sweeps, parameters).
        ln_f: Where the crossing is.
        absolute: Whether it is of a fixed gain, not of one relative to the plateau.
    """
    with np.errstate(all="ignore"):
        _, by = shape.evaluate(parameters, ln_f[:, None])
        moved = by[:, 0, :].copy()
        if shape.edge is None:
            # Only the ratio of frequency to the first parameter of the upper edge matters.
            slope = -moved[:, 1]
        else:
            _, slope = _height(shape, parameters, ln_f)
        moved[:, 0] -= 0.0 if absolute else 1.0
        return Landmark(ln_value=ln_f, by=-moved / slope[:, None])
