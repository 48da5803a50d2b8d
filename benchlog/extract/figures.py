"""From one curve to its figures."""

import math
from typing import Literal

import numpy as np

from benchlog.curve import FloatArray, GainCurve
from benchlog.design.model import Design
from benchlog.errors import Misuse
from benchlog.extract.bound import lowest_corner_hz
from benchlog.extract.implied import Implied
from benchlog.extract.reduce import (
    SHAPE,
    Reduced,
    gbw_faults,
    implied_gbw,
    reduce_sweeps,
    too_few,
)
from benchlog.extract.uncertainty import (
    Cause,
    figure,
    scatter_cause,
    shares_of,
    term_causes,
)
from benchlog.extract.validity import Fault, Seen, reasons_of
from benchlog.notation import decibels
from benchlog.records import Figure, Figures, TermShare

METHOD = "1"
_DB_PER_NEPER = 20.0 / math.log(10.0)
_GAIN: FloatArray = np.array([1.0, 0.0])
_CORNER: FloatArray = np.array([0.0, 1.0])

ShapeName = Literal["auto", "one-pole"]


def extract(curve: GainCurve, design: Design | None = None, *, shape: str = "auto") -> Figures:
    """Draw figures from a curve.

    Args:
        curve: What was measured; flagged points are left out of the fit.
        design: What the board is built to: gives GBW its noise gain.
        shape: ``"auto"`` or ``"one-pole"``.

    Returns:
        Figures with their uncertainties and term tables.  What the curve cannot carry is None,
        or a bound, with a reason in ``validity``; this function does not raise for it.

    Raises:
        Misuse: There is no such shape.
    """
    if shape not in {"auto", SHAPE.name}:
        raise Misuse(f"there is no shape {shape!r}")
    reduced = reduce_sweeps(
        curve.frequency_hz[None, :],
        curve.gain[None, :],
        u_gain_rel=None if curve.u_gain_rel is None else curve.u_gain_rel[None, :],
        usable=curve.usable[None, :],
    )
    left_out = tuple(int(place) for place in np.flatnonzero(~curve.usable))
    if too_few(reduced)[0]:
        return Figures(
            shape=SHAPE.name,
            validity=reasons_of(int(reduced.faults[0]), _seen(curve, reduced)),
            method=METHOD,
            left_out=left_out,
        )
    return _Drawing(curve, design, reduced).figures(left_out)


class _Drawing:
    """The steps from one fit to its figures."""

    def __init__(self, curve: GainCurve, design: Design | None, reduced: Reduced) -> None:
        self.curve, self.reduced = curve, reduced
        self.stated = curve.u_gain_rel is not None
        self.causes: list[Cause] = [
            scatter_cause(reduced.fit, stated=self.stated),
            *term_causes(
                curve.terms,
                reduced.fit,
                frequency_hz=curve.frequency_hz,
                weight=reduced.weight[0],
            ),
        ]
        u_ln_gain = math.sqrt(sum(cause.share(_GAIN) ** 2 for cause in self.causes))
        source_ohm = 0.0 if curve.reference == "input" else (curve.source_ohm or 0.0)
        self.implied = implied_gbw(
            reduced, design, u_ln_gain=np.array([u_ln_gain]), source_ohm=source_ohm
        )
        self.basis: Literal["design", "signal gain"] = (
            "design" if design is not None and design.chain().figure_stages else "signal gain"
        )
        self.faults = int(reduced.faults[0])
        if not self.faults:
            self.faults |= int(gbw_faults(self.implied)[0])

    def figures(self, left_out: tuple[int, ...]) -> Figures:
        ln_gain, ln_corner = (float(value) for value in self.reduced.fit.parameters[0])
        seen = _seen(self.curve, self.reduced)
        reasons = reasons_of(self.faults, seen)
        taken = {name for reason in reasons for name in reason.figures}
        gain, corner_hz = math.exp(ln_gain), math.exp(min(ln_corner, 700.0))
        corner = self._figure(corner_hz, "Hz", _CORNER)
        drawn: dict[str, Figure | None] = {
            "gain": self._figure(gain, "V/V", _GAIN),
            "gain_db": self._figure(decibels(gain), "dB", _GAIN, scale=_DB_PER_NEPER),
            "corner_hz": corner,
            "bandwidth_hz": corner,
            "gbw_hz": self._gbw(self.implied),
            "peaking_db": figure(0.0, "dB", ()),
        }
        drawn = {name: None if name in taken else value for name, value in drawn.items()}
        if self.faults & (Fault.CORNER_ABOVE_SWEEP | Fault.FEW_PAST_CORNER) and drawn["gain"]:
            drawn["corner_hz"] = drawn["bandwidth_hz"] = self._at_least()
        return Figures(
            gain=drawn["gain"],
            gain_db=drawn["gain_db"],
            corner_hz=drawn["corner_hz"],
            bandwidth_hz=drawn["bandwidth_hz"],
            gbw_hz=drawn["gbw_hz"],
            peaking_db=drawn["peaking_db"],
            shape=SHAPE.name,
            validity=reasons,
            gbw_basis=self.basis if drawn["gbw_hz"] else None,
            chosen_because="It is the only shape that was asked for.",
            method=METHOD,
            left_out=left_out,
        )

    def _figure(
        self, value: float, unit: str, sensitivity: FloatArray, *, scale: float | None = None
    ) -> Figure:
        return figure(
            value,
            unit,
            shares_of(self.causes, sensitivity, scale=value if scale is None else scale),
        )

    def _gbw(self, implied: Implied) -> Figure | None:
        if not np.isfinite(implied.ln_gbw[0]):
            return None
        value = math.exp(min(float(implied.ln_gbw[0]), 700.0))
        sensitivity = np.array([implied.by_gain[0], implied.by_corner[0]])
        shares = shares_of(self.causes, sensitivity, scale=value)
        parts = TermShare(
            name="tolerance of the parts",
            u=value * float(implied.u_parts[0]),
            dof=math.inf,
            kind="B",
        )
        return figure(value, "Hz", (*shares, parts))

    def _at_least(self) -> Figure:
        usable = self.curve.usable
        bound_hz = lowest_corner_hz(
            SHAPE,
            self.curve.frequency_hz[usable],
            np.log(self.curve.gain[usable]),
            weight=self.reduced.weight[0][usable],
            stated=self.stated,
            ln_corner=float(self.reduced.fit.parameters[0, 1]),
        )
        return Figure(value=bound_hz, unit="Hz", bound="at least")


def _seen(curve: GainCurve, reduced: Reduced) -> Seen:
    usable_hz = curve.frequency_hz[curve.usable]
    if usable_hz.size == 0:
        usable_hz = curve.frequency_hz
    corner_hz = math.exp(min(float(reduced.fit.parameters[0, 1]), 700.0))
    return Seen(
        count=int(reduced.fit.count[0]),
        lowest_hz=float(usable_hz.min()),
        highest_hz=float(usable_hz.max()),
        corner_hz=corner_hz,
        past_corner=int((usable_hz >= corner_hz).sum()),
    )
