"""What a curve cannot carry, each with a name for scripts and a sentence for people."""

import enum

import numpy as np
import numpy.typing as npt
from scipy.special import chdtrc

from benchlog.curve import FloatArray
from benchlog.extract.models.polynomial import shared_row
from benchlog.extract.solve import Fit

# A fit needs more points than parameters, and enough left over to see its own scatter.
FEWEST_POINTS = 5
FEWEST_PAST_CORNER = 3
# At a third of the corner the gain has drooped by 0.46 dB: below that there is a plateau to see.
PLATEAU_BELOW_CORNER = 3.0
# Residuals smaller than this carry no meaning for a gain, whatever pattern they show.
_MEANINGLESS_REL = 3e-4
_POOR_PROBABILITY = 1e-5
_POOR_SIGMAS = 4.5

# GBW is defined where the gain falls by 20 dB a decade; 2 dB of that may be missing (common
# practice), which is a tenth of the slope in logarithms.
SLOPE_BAND = (2.0, 5.0)
_SLOPE_ROOM = 0.1
_CERTAIN_SIGMAS = 2.0
_ONE_CORNER = 2
# The last points lie above the fitted curve, more and more: by a fifth at the end.
_FLOOR_POINTS = 4
_FLOOR_RISE = 0.2
# A parameter that is uncertain by a factor e is not known.
_MOST_U = 1.0

# Corners closer together than this leave no gain within 3 dB of the asymptotic plateau, for two
# first-order edges: (1 + sqrt 2)^2 is needed between the poles, 2.41 between the crossings.
NO_BAND_RATIO = 2.41
NARROW_RATIO = 30.0

_OF_CORNER = ("corner_hz", "bandwidth_hz", "gbw_hz")
_ALL = (
    "gain",
    "gain_db",
    "peaking_db",
    "peaking_hz",
    "unity_hz",
    "lower_corner_hz",
    *_OF_CORNER,
)


class Fault(enum.IntFlag):
    """Why figures are missing; the bits of ``extract_many``'s validity."""

    NONE = 0
    TOO_FEW_POINTS = 1
    NOT_CONVERGED = 2
    POOR_FIT = 4
    PLATEAU_NOT_REACHED = 8
    CORNER_ABOVE_SWEEP = 16
    FEW_PAST_CORNER = 32
    NOISE_GAIN_UNKNOWN = 64
    GBW_HIDDEN = 128
    NOISE_GAIN_MEASURED = 256
    WILD_POINT = 512
    LOWER_BELOW_SWEEP = 1024
    NARROW_BAND = 2048
    NO_BAND = 4096
    GBW_NEEDS_DESIGN = 8192
    PHASE_DISAGREES = 16384
    SLOPE_NOT_FIRST_ORDER = 32768
    NOISE_FLOOR = 65536
    NOT_DETERMINED = 131072


FIGURES_TAKEN: dict[Fault, tuple[str, ...]] = {
    Fault.TOO_FEW_POINTS: _ALL,
    Fault.NOT_CONVERGED: _ALL,
    Fault.POOR_FIT: _ALL,
    Fault.PLATEAU_NOT_REACHED: _ALL,
    Fault.CORNER_ABOVE_SWEEP: (*_OF_CORNER, "peaking_db", "peaking_hz", "unity_hz"),
    Fault.FEW_PAST_CORNER: _OF_CORNER,
    Fault.NOISE_GAIN_UNKNOWN: ("gbw_hz",),
    Fault.GBW_HIDDEN: ("gbw_hz",),
    Fault.NOISE_GAIN_MEASURED: (),
    Fault.WILD_POINT: (),
    Fault.LOWER_BELOW_SWEEP: ("lower_corner_hz", "bandwidth_hz"),
    Fault.NARROW_BAND: (),
    Fault.NO_BAND: _ALL,
    Fault.GBW_NEEDS_DESIGN: ("gbw_hz",),
    Fault.PHASE_DISAGREES: (),
    Fault.SLOPE_NOT_FIRST_ORDER: ("gbw_hz",),
    Fault.NOISE_FLOOR: _OF_CORNER,
    Fault.NOT_DETERMINED: _ALL,
}


def faults_of(
    fit: Fit,
    ln_frequency: FloatArray,
    weight: FloatArray,
    *,
    stated: bool,
    ln_upper: FloatArray,
    ln_lower: FloatArray | None,
) -> npt.NDArray[np.int64]:
    """Return the faults of many fits, shape (sweeps,).

    Args:
        fit: Of the sweeps.
        ln_frequency: As fitted, shape (sweeps, points).
        weight: Same shape.
        stated: Whether the weights are inverse variances.
        ln_upper: Upper corner, shape (sweeps,).
        ln_lower: Lower corner; None for a shape that is flat down to zero frequency.
    """
    counts = weight > 0
    lowest, highest = _ends(ln_frequency, counts)
    past = np.count_nonzero(counts & (ln_frequency >= ln_upper[:, None]), axis=1)
    few = fit.count < FEWEST_POINTS
    above = ln_upper > highest
    variance = np.ones_like(fit.chi2) if stated else fit.chi2 / np.maximum(fit.count - 2, 1)
    x = ln_frequency - ln_upper[:, None]
    rows = [
        (Fault.TOO_FEW_POINTS, few),
        (Fault.NOT_CONVERGED, ~few & ~above & ~fit.converged),
        (Fault.POOR_FIT, ~few & poor(fit, ln_frequency, weight, stated=stated)),
        (Fault.CORNER_ABOVE_SWEEP, ~few & above),
        (Fault.FEW_PAST_CORNER, ~few & ~above & (past < FEWEST_PAST_CORNER)),
        (Fault.SLOPE_NOT_FIRST_ORDER, ~few & ~above & _bent(fit, x, weight, stated=stated)),
        (Fault.NOISE_FLOOR, ~few & ~above & _flattens(fit, x, weight)),
        (Fault.NOT_DETERMINED, ~few & ~above & ~_determined(fit, variance)),
    ]
    if ln_lower is None:
        falling = ln_upper - lowest < np.log(PLATEAU_BELOW_CORNER)
        rows.append((Fault.PLATEAU_NOT_REACHED, ~few & falling))
    else:
        rows += _of_band(few, lowest, ln_upper=ln_upper, ln_lower=ln_lower)
    faults = np.zeros(len(ln_upper), np.int64)
    for fault, where in rows:
        faults |= np.where(where, int(fault), 0)
    return faults


def _bent(
    fit: Fit, ln_over_corner: FloatArray, weight: FloatArray, *, stated: bool
) -> npt.NDArray[np.bool_]:
    """Tell a slope between 2 and 5 corners that is not the one a single corner gives.

    The slope of the residuals there is the measured slope less the fitted one; how certain it is,
    the scatter about it tells.
    """
    if fit.parameters.shape[1] != _ONE_CORNER:
        return np.zeros(len(weight), np.bool_)
    low, high = np.log(SLOPE_BAND)
    w = weight * ((ln_over_corner >= low) & (ln_over_corner <= high))
    wx = w * ln_over_corner
    total = np.maximum(np.einsum("sn->s", w), 1e-300)
    middle = np.einsum("sn->s", wx) / total
    spread = np.einsum("sn,sn->s", wx, ln_over_corner) - middle**2 * total
    spread = np.maximum(spread, 1e-300)
    # No slope is steeper than all the residuals allow.
    bent = fit.chi2 > _SLOPE_ROOM**2 * spread
    rows = np.flatnonzero(bent)
    if rows.size:
        w, x, residuals = w[rows], ln_over_corner[rows] - middle[rows, None], fit.residuals[rows]
        count, total, spread = (w > 0).sum(axis=1), total[rows], spread[rows]
        y = residuals - ((w * residuals).sum(axis=1) / total)[:, None]
        slope = (w * x * y).sum(axis=1) / spread
        about = (w * (y - slope[:, None] * x) ** 2).sum(axis=1)
        variance = np.ones_like(about) if stated else about / np.maximum(count - 2, 1)
        certain = np.abs(slope) - _CERTAIN_SIGMAS * np.sqrt(variance / spread) > _SLOPE_ROOM
        bent[rows] = certain & (count > FEWEST_PAST_CORNER)
    return np.asarray(bent, dtype=np.bool_)


def _ends(ln_frequency: FloatArray, counts: npt.NDArray[np.bool_]) -> tuple[FloatArray, FloatArray]:
    """Return the lowest and the highest frequency that counts, shape (sweeps,)."""
    if counts.all():
        row = shared_row(ln_frequency)
        lowest, highest = row.min(axis=1, initial=np.inf), row.max(axis=1, initial=-np.inf)
        return (
            np.broadcast_to(lowest, len(counts)),
            np.broadcast_to(highest, len(counts)),
        )
    return (
        np.where(counts, ln_frequency, np.inf).min(axis=1, initial=np.inf),
        np.where(counts, ln_frequency, -np.inf).max(axis=1, initial=-np.inf),
    )


def _steps(values: FloatArray, ln_frequency: FloatArray, weight: FloatArray) -> FloatArray:
    """Return differences of neighbours in frequency, 0 where one does not count."""
    counts = weight > 0
    if counts.all():
        row = shared_row(ln_frequency)
        if (row[:, 1:] >= row[:, :-1]).all():
            return values[:, 1:] - values[:, :-1]
    order = np.argsort(np.where(counts, ln_frequency, np.inf), axis=1)
    in_order = np.take_along_axis(values, order, axis=1)
    together = np.take_along_axis(counts, order, axis=1)[:, 1:]
    return np.where(together, in_order[:, 1:] - in_order[:, :-1], 0.0)


def _flattens(fit: Fit, ln_over_corner: FloatArray, weight: FloatArray) -> npt.NDArray[np.bool_]:
    """Tell a high end where the gain stops falling while the fitted curve goes on."""
    if fit.residuals.max(initial=0.0) <= _FLOOR_RISE:
        return np.zeros(len(weight), np.bool_)
    order = np.argsort(np.where(weight > 0, ln_over_corner, -np.inf), axis=1)[:, -_FLOOR_POINTS:]
    last = np.take_along_axis(fit.residuals, order, axis=1)
    beyond = np.take_along_axis(ln_over_corner, order, axis=1)[:, 0] > np.log(SLOPE_BAND[0])
    rising = np.all(np.diff(last, axis=1) > 0, axis=1) & (last[:, -1] > _FLOOR_RISE)
    return np.asarray(beyond & rising & (last[:, 0] > 0), dtype=np.bool_)


def _determined(fit: Fit, variance: FloatArray) -> npt.NDArray[np.bool_]:
    """Tell fits whose points say something about every parameter."""
    with np.errstate(invalid="ignore"):
        u = np.sqrt(np.einsum("spp->sp", fit.inverse_normal) * variance[:, None])
    return np.asarray((u < _MOST_U).all(axis=1), dtype=np.bool_)


def _of_band(
    few: npt.NDArray[np.bool_], lowest: FloatArray, *, ln_upper: FloatArray, ln_lower: FloatArray
) -> list[tuple[Fault, npt.NDArray[np.bool_]]]:
    """Return the faults of a response with two corners."""
    width = ln_upper - ln_lower
    wide_enough = width > np.log(NO_BAND_RATIO)
    return [
        (Fault.NO_BAND, ~few & ~wide_enough),
        (Fault.NARROW_BAND, ~few & wide_enough & (width < np.log(NARROW_RATIO))),
        (Fault.LOWER_BELOW_SWEEP, ~few & (ln_lower < lowest)),
    ]


def poor(
    fit: Fit, ln_frequency: FloatArray, weight: FloatArray, *, stated: bool
) -> npt.NDArray[np.bool_]:
    """Tell residuals that this shape cannot explain.

    Against stated noise by their size (chi squared); without it by their pattern: neighbours that
    differ far less than their size are a shape that the fit does not have (von Neumann's ratio).
    """
    dof = np.maximum(fit.count - fit.parameters.shape[1], 1)
    if stated:
        improbable: npt.NDArray[np.bool_] = chdtrc(dof, fit.chi2) < _POOR_PROBABILITY
        return improbable
    steps = _steps(fit.residuals, ln_frequency, weight)
    size = np.einsum("sn,sn->s", fit.residuals, fit.residuals)
    ratio = np.einsum("sn,sn->s", steps, steps) / np.maximum(size, 1e-300)
    sigma = 2.0 / np.sqrt(np.maximum(fit.count, 1))
    meaningful = np.sqrt(size / dof) > _MEANINGLESS_REL
    patterned: npt.NDArray[np.bool_] = (ratio < 2.0 - _POOR_SIGMAS * sigma) & meaningful
    return patterned


def phase_disagrees(
    residuals: FloatArray, ln_frequency: FloatArray, weight: FloatArray, *, stated: bool
) -> npt.NDArray[np.bool_]:
    """Tell phases that magnitude and a delay do not explain, shape (sweeps,).

    Args:
        residuals: Of phase, over its noise where that is stated, shape (sweeps, points).
        ln_frequency: Same shape.
        weight: Of the points, same shape.
        stated: Whether the noise is stated.
    """
    counts = weight > 0
    count = counts.sum(axis=1)
    size = np.where(counts, residuals**2, 0.0).sum(axis=1)
    if stated:
        improbable: npt.NDArray[np.bool_] = chdtrc(np.maximum(count - 1, 1), size) < (
            _POOR_PROBABILITY
        )
        return improbable
    order = np.argsort(np.where(counts, ln_frequency, np.inf), axis=1)
    in_order = np.take_along_axis(np.where(counts, residuals, 0.0), order, axis=1)
    together = np.take_along_axis(counts, order, axis=1)[:, 1:]
    steps = (np.where(together, np.diff(in_order, axis=1), 0.0) ** 2).sum(axis=1)
    ratio = steps / np.maximum(size, 1e-300)
    meaningful = np.sqrt(size / np.maximum(count, 1)) > _MEANINGLESS_REL
    sigma = 2.0 / np.sqrt(np.maximum(count, 1))
    patterned: npt.NDArray[np.bool_] = (ratio < 2.0 - _POOR_SIGMAS * sigma) & meaningful
    return patterned
