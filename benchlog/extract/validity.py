"""What a curve cannot carry, each with a name for scripts and a sentence for people."""

import enum
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy.special import chdtrc

from benchlog.curve import FloatArray
from benchlog.extract.solve import Fit
from benchlog.notation import si
from benchlog.records import Reason

# A fit needs more points than parameters, and enough left over to see its own scatter.
FEWEST_POINTS = 5
FEWEST_PAST_CORNER = 3
# At a third of the corner the gain has drooped by 0.46 dB: below that there is a plateau to see.
PLATEAU_BELOW_CORNER = 3.0
# Residuals smaller than this carry no meaning for a gain, whatever pattern they show.
_MEANINGLESS_REL = 3e-4
_POOR_PROBABILITY = 1e-5
_POOR_SIGMAS = 4.5

_OF_CORNER = ("corner_hz", "bandwidth_hz", "gbw_hz")
_ALL = ("gain", "gain_db", "peaking_db", "peaking_hz", *_OF_CORNER)


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


FIGURES_TAKEN: dict[Fault, tuple[str, ...]] = {
    Fault.TOO_FEW_POINTS: _ALL,
    Fault.NOT_CONVERGED: _ALL,
    Fault.POOR_FIT: _ALL,
    Fault.PLATEAU_NOT_REACHED: _ALL,
    Fault.CORNER_ABOVE_SWEEP: (*_OF_CORNER, "peaking_db", "peaking_hz"),
    Fault.FEW_PAST_CORNER: _OF_CORNER,
    Fault.NOISE_GAIN_UNKNOWN: ("gbw_hz",),
    Fault.GBW_HIDDEN: ("gbw_hz",),
    Fault.NOISE_GAIN_MEASURED: (),
}


@dataclass(frozen=True, slots=True, kw_only=True)
class Seen:
    """What the sentences about one curve quote."""

    count: int
    lowest_hz: float
    highest_hz: float
    corner_hz: float
    past_corner: int


def faults_of(
    fit: Fit, ln_frequency: FloatArray, weight: FloatArray, *, stated: bool
) -> npt.NDArray[np.int64]:
    """Return the faults of many fits of a one-pole shape, shape (sweeps,).

    Args:
        fit: Of the sweeps; parameter 1 is the logarithm of the corner.
        ln_frequency: As fitted, shape (sweeps, points).
        weight: Same shape.
        stated: Whether the weights are inverse variances.
    """
    counts = weight > 0
    lowest = np.where(counts, ln_frequency, np.inf).min(axis=1, initial=np.inf)
    highest = np.where(counts, ln_frequency, -np.inf).max(axis=1, initial=-np.inf)
    corner = fit.parameters[:, 1]
    past = (counts & (ln_frequency >= corner[:, None])).sum(axis=1)
    few = fit.count < FEWEST_POINTS
    above = corner > highest
    rows = (
        (Fault.TOO_FEW_POINTS, few),
        (Fault.NOT_CONVERGED, ~few & ~above & ~fit.converged),
        (Fault.POOR_FIT, ~few & _poor(fit, ln_frequency, weight, stated=stated)),
        (Fault.PLATEAU_NOT_REACHED, ~few & (corner - lowest < np.log(PLATEAU_BELOW_CORNER))),
        (Fault.CORNER_ABOVE_SWEEP, ~few & above),
        (Fault.FEW_PAST_CORNER, ~few & ~above & (past < FEWEST_PAST_CORNER)),
    )
    faults = np.zeros(len(corner), np.int64)
    for fault, where in rows:
        faults |= np.where(where, int(fault), 0)
    return faults


def _poor(
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
    order = np.argsort(np.where(weight > 0, ln_frequency, np.inf), axis=1)
    in_order = np.take_along_axis(fit.residuals, order, axis=1)
    counts = np.take_along_axis(weight > 0, order, axis=1)
    steps = np.where(counts[:, 1:], np.diff(in_order, axis=1), 0.0)
    size = (fit.residuals**2).sum(axis=1)
    ratio = (steps**2).sum(axis=1) / np.maximum(size, 1e-300)
    sigma = 2.0 / np.sqrt(np.maximum(fit.count, 1))
    meaningful = np.sqrt(size / dof) > _MEANINGLESS_REL
    patterned: npt.NDArray[np.bool_] = (ratio < 2.0 - _POOR_SIGMAS * sigma) & meaningful
    return patterned


def reasons_of(faults: int, seen: Seen) -> tuple[Reason, ...]:
    """Return the reasons behind a set of faults, worst first."""
    return tuple(
        Reason(code=code, text=text, figures=FIGURES_TAKEN[fault])
        for fault, (code, text) in _sentences(seen).items()
        if faults & fault
    )


def _sentences(seen: Seen) -> dict[Fault, tuple[str, str]]:
    highest, corner = si(seen.highest_hz, "Hz"), si(seen.corner_hz, "Hz")
    return {
        Fault.TOO_FEW_POINTS: (
            "too few points",
            f"The curve has {seen.count} usable points; a fit needs at least {FEWEST_POINTS}.",
        ),
        Fault.NOT_CONVERGED: (
            "fit did not converge",
            "The fit found no best curve; look at the points.",
        ),
        Fault.POOR_FIT: (
            "poor fit",
            "The points leave the fitted curve by more than their scatter, or in a pattern: the"
            " board does not have this shape, or something on the bench bends the curve.",
        ),
        Fault.PLATEAU_NOT_REACHED: (
            "plateau not reached",
            f"The gain already falls at the lowest frequency, {si(seen.lowest_hz, 'Hz')}: start"
            f" the sweep at {si(seen.corner_hz / 10.0, 'Hz')} or lower.",
        ),
        Fault.CORNER_ABOVE_SWEEP: (
            "corner above the sweep",
            f"The gain has not fallen by 3 dB at {highest}, where the sweep ends: sweep further.",
        ),
        Fault.FEW_PAST_CORNER: (
            "too few points past the corner",
            f"Only {seen.past_corner} points lie above the corner at about {corner}: sweep beyond"
            f" {highest}.",
        ),
        Fault.NOISE_GAIN_UNKNOWN: (
            "noise gain unknown",
            "The measured gain is not what the design's parts give within their tolerances, so"
            " the noise gain is not known: find the wrong part first.",
        ),
        Fault.GBW_HIDDEN: (
            "GBW hidden",
            "No gain-bandwidth product gives the design this corner: another element sets it.",
        ),
        Fault.NOISE_GAIN_MEASURED: (
            "noise gain from the measured gain",
            "The measured gain is not what the design's parts give within their tolerances; the"
            " noise gain is taken from the measured gain instead.",
        ),
    }
