"""From arrays of sweeps to fitted parameters and what they can carry; shared by one and many."""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from benchlog.curve import FloatArray
from benchlog.design.model import Design
from benchlog.extract.implied import DesignGbw, Implied, signal_gain_gbw
from benchlog.extract.models.one_pole import OnePole
from benchlog.extract.solve import Fit, solve
from benchlog.extract.validity import FEWEST_POINTS, Fault, faults_of

SHAPE = OnePole()


@dataclass(frozen=True, slots=True, kw_only=True)
class Reduced:
    """Fits of many sweeps and their faults.

    Attributes:
        fit: Parameters ln gain and ln corner.
        ln_frequency, weight: As fitted, shape (sweeps, points).
        variance: Of a point with weight 1: 1 where the noise is stated, else of the residuals.
        faults: Bits of ``Fault``, shape (sweeps,).
    """

    fit: Fit
    ln_frequency: FloatArray
    weight: FloatArray
    variance: FloatArray
    faults: npt.NDArray[np.int64]

    @property
    def covariance(self) -> FloatArray:
        """Type A covariance of ln gain and ln corner, shape (sweeps, 2, 2)."""
        scaled: FloatArray = self.fit.inverse_normal * self.variance[:, None, None]
        return scaled


def reduce_sweeps(
    frequency_hz: FloatArray,
    gain: FloatArray,
    *,
    u_gain_rel: FloatArray | None,
    usable: npt.NDArray[np.bool_],
) -> Reduced:
    """Fit one pole to many sweeps.

    Args:
        frequency_hz: Shape (sweeps, points); anything where not usable.
        gain: Same shape.
        u_gain_rel: Stated noise, same shape; None takes it from the residuals.
        usable: Which points count, same shape.
    """
    with np.errstate(invalid="ignore", divide="ignore"):
        ln_frequency = np.where(usable, np.log(frequency_hz), 0.0)
        ln_gain = np.where(usable, np.log(gain), 0.0)
        weight = np.where(usable, 1.0 if u_gain_rel is None else u_gain_rel**-2.0, 0.0)
    stated = u_gain_rel is not None
    fit = solve(SHAPE, ln_frequency, ln_gain, weight=weight)
    dof = np.maximum(fit.count - len(SHAPE.parameters), 1)
    return Reduced(
        fit=fit,
        ln_frequency=ln_frequency,
        weight=weight,
        variance=np.ones_like(fit.chi2) if stated else fit.chi2 / dof,
        faults=faults_of(fit, ln_frequency, weight, stated=stated),
    )


def implied_gbw(
    reduced: Reduced, design: Design | None, *, u_ln_gain: FloatArray, source_ohm: float = 0.0
) -> Implied:
    """Return the GBW that gains and corners imply, with the design or without."""
    ln_gain, ln_corner = reduced.fit.parameters[:, 0], reduced.fit.parameters[:, 1]
    if design is None or not design.chain().figure_stages:
        return signal_gain_gbw(ln_gain, ln_corner)
    return DesignGbw(design.chain(), source_ohm).of(ln_gain, ln_corner, u_ln_gain)


def gbw_faults(implied: Implied) -> npt.NDArray[np.int64]:
    """Return what is to be said of the GBW although there is a corner, shape (sweeps,)."""
    unknown = implied.contradicted & ~implied.gain_tells
    measured = implied.contradicted & implied.gain_tells
    hidden = ~unknown & ~np.isfinite(implied.ln_gbw)
    faults: npt.NDArray[np.int64] = (
        unknown * int(Fault.NOISE_GAIN_UNKNOWN)
        | measured * int(Fault.NOISE_GAIN_MEASURED)
        | hidden * int(Fault.GBW_HIDDEN)
    )
    return faults


def too_few(reduced: Reduced) -> npt.NDArray[np.bool_]:
    """Tell the sweeps that have no fit at all, shape (sweeps,)."""
    return np.less(reduced.fit.count, FEWEST_POINTS)
