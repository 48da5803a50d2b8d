"""From arrays of sweeps to fitted parameters and what they can carry; shared by one and many."""

from dataclasses import dataclass, fields, replace
from typing import Any, TypeVar

import numpy as np
import numpy.typing as npt

from benchlog.curve import FloatArray
from benchlog.design.model import Design
from benchlog.extract.implied import DesignGbw, Implied
from benchlog.extract.landmarks import Landmark, crossover, lower_corner, upper_corner
from benchlog.extract.models.composed import Composed
from benchlog.extract.models.polynomial import shared_row
from benchlog.extract.phase import Phase, solve_with_phase
from benchlog.extract.robust import most_wild_points, worst_point
from benchlog.extract.solve import Fit, solve
from benchlog.extract.validity import FEWEST_POINTS, Fault, faults_of, phase_disagrees

T = TypeVar("T")


@dataclass(frozen=True, slots=True, kw_only=True)
class Data:
    """Sweeps as the solver takes them, arrays of shape (sweeps, points).

    Attributes:
        ln_frequency: Finite everywhere; the rows may share one memory.
        ln_gain: Zero where a point does not count.
        weight: Inverse variance of ln gain where ``stated``, else 1; 0 where it does not count.
        stated: Whether the noise is stated.
        phase: Of the same points, where it was measured and is to be fitted.
    """

    ln_frequency: FloatArray
    ln_gain: FloatArray
    weight: FloatArray
    stated: bool
    phase: Phase | None = None

    def without(self, wild: npt.NDArray[np.bool_]) -> "Data":
        """Return the same sweeps without some points."""
        return replace(self, weight=np.where(wild, 0.0, self.weight))

    def rows(self, some: npt.NDArray[np.int64]) -> "Data":
        """Return some of the sweeps, without phase."""
        return Data(
            ln_frequency=self.ln_frequency[some],
            ln_gain=self.ln_gain[some],
            weight=self.weight[some],
            stated=self.stated,
        )


@dataclass(frozen=True, slots=True, kw_only=True)
class Reduced:
    """Fits of one shape to many sweeps, and their faults.

    Attributes:
        shape: What was fitted.
        data: What it was fitted to.
        fit: Its parameters are those of ``shape``.
        variance: Of a point with weight 1: 1 where the noise is stated, else of the residuals.
        upper: The upper corner.
        lower: The lower corner; None where the shape has none.
        faults: Bits of ``Fault``, shape (sweeps,).
    """

    shape: Composed
    data: Data
    fit: Fit
    variance: FloatArray
    upper: Landmark
    lower: Landmark | None
    faults: npt.NDArray[np.int64]

    @property
    def covariance(self) -> FloatArray:
        """Type A covariance of the parameters, shape (sweeps, parameters, parameters)."""
        scaled: FloatArray = self.fit.inverse_normal * self.variance[:, None, None]
        return scaled

    @property
    def dof(self) -> FloatArray:
        """Degrees of freedom left, at least 1, shape (sweeps,)."""
        return np.maximum(self.fit.count - len(self.shape.parameters), 1).astype(float)

    @property
    def aicc(self) -> FloatArray:
        """Akaike's criterion, corrected for few points, shape (sweeps,); infinity without a fit.

        Source:
            Burnham and Anderson, Model Selection and Multimodel Inference, 2.4 (from memory).
        """
        count = self.fit.count.astype(float)
        chi2, free = self.fit.chi2, len(self.shape.parameters)
        if not self.data.stated:
            chi2 = count * np.log(np.maximum(chi2 / np.maximum(count, 1.0), 1e-24))
            free += 1
        room = count - free - 1
        penalty = 2.0 * free + 2.0 * free * (free + 1) / np.where(room > 0, room, np.nan)
        known = np.isfinite(self.fit.inverse_normal).all(axis=(1, 2)) & self.fit.converged
        return np.where(known & (room > 0), chi2 + penalty, np.inf)


def prepare(
    frequency_hz: FloatArray,
    gain: FloatArray,
    *,
    u_gain_rel: FloatArray | None,
    usable: npt.NDArray[np.bool_],
    phase_deg: FloatArray | None = None,
    u_phase_deg: FloatArray | None = None,
) -> Data:
    """Take logarithms; every argument has shape (sweeps, points), and unusable points may be NaN.

    Args:
        frequency_hz: Hertz.
        gain: V/V.
        u_gain_rel: Stated noise; None takes it from the residuals.
        usable: Which points count.
        phase_deg: Degrees, where it was measured.
        u_phase_deg: Of it; ``u_gain_rel`` in radians by default.
    """
    phase = None
    if phase_deg is not None:
        u_phase = u_gain_rel if u_phase_deg is None else np.radians(u_phase_deg)
        phase = Phase(
            radians=np.where(usable, np.radians(phase_deg), 0.0),
            weight=None if u_phase is None or u_gain_rel is None else u_phase**-2.0,
        )
    row = shared_row(frequency_hz)
    with np.errstate(invalid="ignore", divide="ignore"):
        ln_frequency = np.log(row)
        ln_gain = np.log(gain)
        weight = np.ones(gain.shape) if u_gain_rel is None else u_gain_rel**-2.0
    if not usable.all():
        ln_frequency = np.where(np.isfinite(ln_frequency), ln_frequency, 0.0)
        ln_gain, weight = np.where(usable, ln_gain, 0.0), np.where(usable, weight, 0.0)
    return Data(
        ln_frequency=np.broadcast_to(ln_frequency, gain.shape),
        ln_gain=ln_gain,
        weight=weight,
        stated=u_gain_rel is not None,
        phase=phase,
    )


def reduce_sweeps(shape: Composed, data: Data) -> Reduced:
    """Fit one shape to many sweeps."""
    disagrees = np.zeros(len(data.weight), np.bool_)
    if data.phase is None:
        fit = solve(shape, data.ln_frequency, data.ln_gain, weight=data.weight)
    else:
        fit, phase_residuals = solve_with_phase(
            shape, data.ln_frequency, data.ln_gain, weight=data.weight, phase=data.phase
        )
        disagrees = phase_disagrees(
            phase_residuals, data.ln_frequency, data.weight, stated=data.stated
        )
    dof = np.maximum(fit.count - len(shape.parameters), 1)
    upper = upper_corner(shape, fit.parameters)
    lower = lower_corner(shape, fit.parameters)
    return Reduced(
        shape=shape,
        data=data,
        fit=fit,
        variance=np.ones_like(fit.chi2) if data.stated else fit.chi2 / dof,
        upper=upper,
        lower=lower,
        faults=faults_of(
            fit,
            data.ln_frequency,
            data.weight,
            stated=data.stated,
            ln_upper=upper.ln_value,
            ln_lower=None if lower is None else lower.ln_value,
        )
        | np.where(disagrees, int(Fault.PHASE_DISAGREES), 0),
    )


def refitted(reduced: Reduced, data: Data, rows: npt.NDArray[np.int64]) -> Reduced:
    """Return fits to data that differ in some sweeps only: the others are kept as they are.

    Args:
        reduced: Fits to the data as it was.
        data: As it is now.
        rows: The sweeps that differ.
    """
    anew = reduce_sweeps(reduced.shape, data.rows(rows))
    return replace(_with_rows(reduced, anew, rows), data=data)


def _with_rows(old: T, anew: T, rows: npt.NDArray[np.int64]) -> T:
    """Return a record of arrays of shape (sweeps, ...) with some rows taken from another."""
    changed: dict[str, Any] = {}
    for field in fields(old):  # type: ignore[arg-type]  # records of arrays are dataclasses
        before, after = getattr(old, field.name), getattr(anew, field.name)
        if isinstance(before, np.ndarray):
            changed[field.name] = before.copy()
            changed[field.name][rows] = after
        elif isinstance(before, Fit | Landmark):
            changed[field.name] = _with_rows(before, after, rows)
    return replace(old, **changed)  # type: ignore[type-var]


def wild_points(reduced: Reduced) -> tuple[npt.NDArray[np.bool_], FloatArray]:
    """Tell which points this shape finds wild, one after the other.

    Returns:
        Whether a point is wild, shape (sweeps, points), and chi squared without those points,
        shape (sweeps,).
    """
    weight, stated = reduced.data.weight, reduced.data.stated
    wild = np.zeros(weight.shape, np.bool_)
    chi2 = reduced.fit.chi2.copy()
    most = most_wild_points(reduced.fit.count)
    place, found = worst_point(reduced.fit, weight, stated=stated)
    rows = np.flatnonzero(found & (reduced.fit.count >= FEWEST_POINTS))
    while rows.size:
        wild[rows, place[rows]] = True
        rest = np.where(wild[rows], 0.0, weight[rows])
        fit = solve(
            reduced.shape,
            reduced.data.ln_frequency[rows],
            reduced.data.ln_gain[rows],
            weight=rest,
            start=reduced.fit.parameters[rows],
        )
        chi2[rows] = fit.chi2
        place[rows], again = worst_point(fit, rest, stated=stated)
        rows = rows[again & (wild[rows].sum(axis=1) <= most[rows])]
    too_many = wild.sum(axis=1) > most
    wild[too_many] = False
    chi2[too_many] = reduced.fit.chi2[too_many]
    return wild, chi2


def implied_gbw(
    reduced: Reduced, design: Design, *, u_ln_gain: FloatArray, source_ohm: float = 0.0
) -> Implied:
    """Return the GBW that gains and corners imply through the design's noise gain."""
    ln_gain = reduced.fit.parameters[:, 0]
    crossing = crossover(reduced.shape, reduced.fit.parameters)
    return DesignGbw(design.chain(), source_ohm).of(ln_gain, crossing.ln_value, u_ln_gain)


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
