"""The record of a curve whose shape is the design's own response."""

import math
from dataclasses import replace

import numpy as np
import numpy.typing as npt

from benchlog.curve import GainCurve
from benchlog.design.model import Design
from benchlog.extract.choose import Choice
from benchlog.extract.design_shape import DesignFit, fit_design
from benchlog.extract.reduce import Data
from benchlog.extract.robust import most_wild_points, worst_point
from benchlog.extract.sentences import Seen, reasons_of
from benchlog.extract.through_design import at_least, designed
from benchlog.extract.told import seen_of, tried
from benchlog.extract.uncertainty import figure, shares_of
from benchlog.extract.validity import (
    FEWEST_PAST_CORNER,
    FIGURES_TAKEN,
    PLATEAU_BELOW_CORNER,
    Fault,
    poor,
)
from benchlog.notation import decibels
from benchlog.records import Figure, Figures

SHAPE = "design"
_DB_PER_NEPER = 20.0 / math.log(10.0)
_UNREACHED = Fault.CORNER_ABOVE_SWEEP | Fault.FEW_PAST_CORNER


def figures_by_design(
    curve: GainCurve, design: Design, choice: Choice, *, because: str, method: str
) -> Figures:
    """Draw figures through the design's response.

    Args:
        curve: As measured.
        design: Has an amplifier in a loop.
        choice: Free shapes fitted to the same curve: tells wild points and a first guess of noise.
        because: One sentence: why this shape.
        method: Version of the extraction method.
    """
    found, data, wild = _fitted(curve, design, choice)
    choice = replace(choice, wild=wild, phase_left_out=None)
    faults = int(choice.remarks()[0]) | _faults(found, data)
    hidden_by = "" if found.profile.number else found.profile.hidden_by
    reasons = reasons_of(faults, _seen(curve, choice, found, hidden_by=hidden_by))
    taken = {name for fault, names in FIGURES_TAKEN.items() if faults & fault for name in names}
    made = {name: None if name in taken else _figure(found, name) for name in _NAMES}
    if "peaking_db" not in taken and made["peaking_db"] is None:
        made["peaking_db"] = figure(0.0, "dB", ())
    if not faults & int(Fault.POOR_FIT):
        made["gbw_hz"] = _gbw(found, unreached=bool(faults & _UNREACHED))
    return replace(
        Figures(
            shape=SHAPE,
            validity=reasons,
            gbw_basis="design" if made["gbw_hz"] else None,
            limited_by=hidden_by or None,
            shapes_tried=tried(choice),
            chosen_because=because,
            method=method,
            left_out=tuple(int(place) for place in np.flatnonzero(~curve.usable | choice.wild[0])),
        ),
        **made,  # type: ignore[arg-type]
    )


def _fitted(
    curve: GainCurve, design: Design, choice: Choice
) -> tuple[DesignFit, Data, npt.NDArray[np.bool_]]:
    """Fit, leave out what lies far from this fit, and fit again.

    What a free shape that does not explain the curve finds wild is not taken over.
    """
    reduced = choice.tried[int(choice.chosen[0])]
    shape, scatter_rel = designed(curve, design), math.sqrt(float(reduced.variance[0]))
    whole = replace(reduced.data, weight=choice.weight, phase=None)
    wild = np.zeros(whole.weight.shape, np.bool_)
    most = int(most_wild_points((whole.weight > 0).sum(axis=1))[0])
    while True:
        data = whole.without(wild)
        found = fit_design(curve, shape, data, scatter_rel=scatter_rel)
        counts = np.flatnonzero(data.weight[0] > 0)
        weight = data.weight[:, counts]
        if not data.stated:
            weight = weight / found.profile.noise_rel**2
        place, is_wild = worst_point(found.profile.fit, weight, stated=data.stated)
        if not is_wild[0] or wild.sum() >= most:
            return found, data, wild
        wild[0, counts[place[0]]] = True


_NAMES = ("gain", "gain_db", "corner_hz", "lower_corner_hz", "bandwidth_hz", "gbw_hz", "peaking_db")


def _figure(found: DesignFit, name: str) -> Figure | None:
    key = "gain" if name == "gain_db" else name
    ln_value = found.ln_values[key]
    if not math.isfinite(ln_value):
        return None
    value = math.exp(ln_value)
    if name in {"gain_db", "peaking_db"}:
        shares = shares_of(found.causes, found.by[key], scale=_DB_PER_NEPER)
        return figure(decibels(value), "dB", shares)
    shares = shares_of(found.causes, found.by[key], scale=value)
    return figure(value, "V/V" if name == "gain" else "Hz", shares)


def _gbw(found: DesignFit, *, unreached: bool) -> Figure | None:
    if not found.profile.number:
        return Figure(value=math.exp(found.profile.ln_gbw), unit="Hz", bound="at least")
    number = _figure(found, "gbw_hz")
    return at_least(number) if unreached else number


def _faults(found: DesignFit, data: Data) -> int:
    fit = found.profile.fit
    counts = data.weight[0] > 0
    x, weight = data.ln_frequency[:, counts], data.weight[:, counts]
    if not found.profile.explained or poor(fit, x, weight, stated=data.stated)[0]:
        return int(Fault.POOR_FIT)
    faults = 0
    ln_corner = found.ln_values["corner_hz"]
    if not math.isfinite(ln_corner) or ln_corner > float(x.max()):
        faults |= int(Fault.CORNER_ABOVE_SWEEP)
    elif int((x >= ln_corner).sum()) < FEWEST_PAST_CORNER:
        faults |= int(Fault.FEW_PAST_CORNER)
    has_lower = math.isfinite(found.ln_values["lower_corner_hz"])
    if has_lower and found.ln_values["lower_corner_hz"] < float(x.min()):
        faults |= int(Fault.LOWER_BELOW_SWEEP)
    if not has_lower and ln_corner - float(x.min()) < math.log(PLATEAU_BELOW_CORNER):
        faults |= int(Fault.PLATEAU_NOT_REACHED)
    if not found.profile.number and not faults:
        faults |= int(Fault.GBW_HIDDEN)
    return faults


def _seen(curve: GainCurve, choice: Choice, found: DesignFit, *, hidden_by: str) -> Seen:
    seen = seen_of(curve, choice, choice.tried[int(choice.chosen[0])])
    ln_corner = found.ln_values["corner_hz"]
    corner_hz = math.exp(ln_corner) if math.isfinite(ln_corner) else seen.highest_hz
    return replace(seen, corner_hz=corner_hz, shape=SHAPE, hidden_by=hidden_by)
