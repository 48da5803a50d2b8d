"""From one curve to its figures."""

import math
from dataclasses import replace
from typing import Literal

import numpy as np

from benchlog.curve import GainCurve
from benchlog.design.model import Design
from benchlog.errors import Misuse
from benchlog.extract.bound import lowest_corner_hz
from benchlog.extract.by_design import SHAPE as BY_DESIGN
from benchlog.extract.by_design import figures_by_design
from benchlog.extract.choose import Choice, choose, shape_named
from benchlog.extract.draw import drawn
from benchlog.extract.implied import Implied
from benchlog.extract.landmarks import Landmark
from benchlog.extract.reduce import (
    Reduced,
    gbw_faults,
    implied_gbw,
    prepare,
    too_few,
)
from benchlog.extract.sentences import reasons_of
from benchlog.extract.through_design import (
    ThroughDesign,
    at_least,
    corner_is_the_amplifiers,
    gbw_through_design,
    has_noise_gain,
)
from benchlog.extract.told import seen_of, tried, why
from benchlog.extract.uncertainty import PARTS, Cause, figure, scatter_cause, shares_of, term_causes
from benchlog.extract.validity import FIGURES_TAKEN, Fault
from benchlog.notation import decibels
from benchlog.records import Figure, Figures, TermShare

METHOD = "2"
_DB_PER_NEPER = 20.0 / math.log(10.0)
_UNITS = {"gain": "V/V", "gain_db": "dB", "peaking_db": "dB"}
CHOICE = "choice of shape"
_UNEXPLAINED = Fault.POOR_FIT | Fault.NOT_CONVERGED
_EXPLAINS = "No simpler shape explains the curve, and the design's own response does."
_UNREACHED = Fault.CORNER_ABOVE_SWEEP | Fault.FEW_PAST_CORNER
_USELESS = Fault.TOO_FEW_POINTS | Fault.NOT_CONVERGED | Fault.POOR_FIT | Fault.PLATEAU_NOT_REACHED


def extract(curve: GainCurve, design: Design | None = None, *, shape: str = "auto") -> Figures:
    """Draw figures from a curve.

    Args:
        curve: What was measured; flagged points are left out of the fit.
        design: What the board is built to: gives GBW its noise gain.
        shape: ``"auto"``, ``"design"`` (the design's own response), or a name that
            ``choose.shape_named`` knows: ``"two-pole"``.

    Returns:
        Figures with their uncertainties and term tables.  What the curve cannot carry is None,
        or a bound, with a reason in ``validity``; this function does not raise for it.

    Raises:
        Misuse: There is no such shape, or no design to take it from.
    """
    data = prepare(
        curve.frequency_hz[None, :],
        curve.gain[None, :],
        u_gain_rel=None if curve.u_gain_rel is None else curve.u_gain_rel[None, :],
        usable=curve.usable[None, :],
        phase_deg=None if curve.phase_deg is None else curve.phase_deg[None, :],
        u_phase_deg=None if curve.u_phase_deg is None else curve.u_phase_deg[None, :],
    )
    choice = choose(data, design, shape="auto" if shape == BY_DESIGN else shape)
    left_out = tuple(int(place) for place in np.flatnonzero(~curve.usable | choice.wild[0]))
    reduced = choice.tried[choice.chosen[0]]
    if too_few(reduced)[0]:
        return Figures(
            shape=reduced.shape.name,
            validity=reasons_of(int(reduced.faults[0]), seen_of(curve, choice, reduced)),
            method=METHOD,
            left_out=left_out,
        )
    if shape == BY_DESIGN:
        if not has_noise_gain(design):
            raise Misuse("the shape design needs a design with an amplifier in a loop")
        return figures_by_design(
            curve, design, choice, because="It is the shape that was asked for.", method=METHOD
        )
    if shape == "auto" and has_noise_gain(design) and reduced.faults[0] & int(_UNEXPLAINED):
        through = figures_by_design(curve, design, choice, because=_EXPLAINS, method=METHOD)
        if not any("gain" in reason.figures for reason in through.validity):
            return through
    runner_up = None
    if choice.runner_up[0] >= 0:
        runner_up = _Drawing(curve, design, choice.tried[choice.runner_up[0]])
    return _Drawing(curve, design, reduced).figures(choice, runner_up, left_out=left_out)


class _Drawing:
    """The steps from one fit to its figures."""

    def __init__(self, curve: GainCurve, design: Design | None, reduced: Reduced) -> None:
        self.curve, self.reduced = curve, reduced
        self.causes: list[Cause] = [
            scatter_cause(reduced.fit, stated=reduced.data.stated),
            *term_causes(
                curve.terms,
                reduced.fit,
                frequency_hz=curve.frequency_hz,
                weight=reduced.data.weight[0],
            ),
        ]
        self.faults = int(reduced.faults[0])
        self.design = design if has_noise_gain(design) else None
        self.basis: Literal["design", "signal gain"] = "signal gain" if design is None else "design"
        self.implied = self._implied()
        self.landmarks = drawn(reduced, self.implied)
        if not self.faults and self.implied is not None:
            self.faults |= int(gbw_faults(self.implied)[0])
        if self.design is None and not np.isfinite(self.landmarks["gbw_hz"].ln_value[0]):
            self.faults |= int(Fault.GBW_NEEDS_DESIGN)

    def _implied(self) -> Implied | None:
        """Return the GBW that the corner alone tells, where it does."""
        if self.design is None or not corner_is_the_amplifiers(self.design.chain()):
            return None
        by_gain = np.zeros(len(self.reduced.shape.parameters))
        by_gain[0] = 1.0
        u_ln_gain = math.sqrt(sum(cause.share(by_gain) ** 2 for cause in self.causes))
        source_ohm = 0.0 if self.curve.reference == "input" else (self.curve.source_ohm or 0.0)
        return implied_gbw(
            self.reduced, self.design, u_ln_gain=np.array([u_ln_gain]), source_ohm=source_ohm
        )

    def _through(self) -> ThroughDesign:
        """Return the GBW that the whole curve tells, where the corner alone does not."""
        unreached = bool(self.faults & _UNREACHED)
        if self.design is None or (self.implied is not None and not unreached):
            return ThroughDesign(figure=None, faults=0, hidden_by="")
        if self.faults & _USELESS:
            return ThroughDesign(figure=None, faults=0, hidden_by="")
        through = gbw_through_design(self.curve, self.design, self.reduced)
        if not unreached:
            return through
        return replace(through, figure=at_least(through.figure), faults=0)

    def figures(
        self, choice: Choice, runner_up: "_Drawing | None", *, left_out: tuple[int, ...]
    ) -> Figures:
        """Make the record.

        Args:
            choice: What was tried.
            runner_up: The same for the next best shape, where that one is still likely.
            left_out: Places of the points that were not fitted.
        """
        through = self._through()
        faults = self.faults | through.faults
        faults |= int(choice.remarks()[0])
        reasons = reasons_of(
            faults, replace(seen_of(self.curve, choice, self.reduced), hidden_by=through.hidden_by)
        )
        taken = {name for reason in reasons for name in reason.figures}
        named = self._named()
        others = {} if runner_up is None else runner_up.ln_values()
        made: dict[str, Figure | None] = {
            name: None if name in taken else self._figure(name, one, others.get(name))
            for name, one in named.items()
        }
        if self.design is not None and self.implied is None:
            made["gbw_hz"] = None
        made["gbw_hz"] = through.figure or made["gbw_hz"]
        if "peaking_db" not in taken and made["peaking_db"] is None:
            made["peaking_db"] = figure(0.0, "dB", ())
        if faults & _UNREACHED and made["gain"]:
            made["corner_hz"] = self._at_least()
            made["bandwidth_hz"] = made["corner_hz"] if self.reduced.lower is None else None
        return replace(
            Figures(
                shape=self.reduced.shape.name,
                validity=reasons,
                gbw_basis=self.basis if made["gbw_hz"] else None,
                limited_by=through.hidden_by or None,
                shapes_tried=tried(choice),
                chosen_because=why(choice),
                method=METHOD,
                left_out=left_out,
            ),
            **made,  # type: ignore[arg-type]
        )

    def _named(self) -> dict[str, Landmark]:
        return {**self.landmarks, "gain_db": self.landmarks["gain"]}

    def ln_values(self) -> dict[str, float]:
        """Return the logarithm of each figure that this fit carries."""
        taken = {one for reason in self._reasons() for one in reason}
        return {
            name: float(one.ln_value[0])
            for name, one in self._named().items()
            if name not in taken and np.isfinite(one.ln_value[0])
        }

    def _reasons(self) -> list[tuple[str, ...]]:
        return [names for fault, names in FIGURES_TAKEN.items() if self.faults & fault]

    def _figure(self, name: str, one: Landmark, other_ln: float | None) -> Figure | None:
        """Make one figure; the distance to the next likely shape's value is one of its terms."""
        ln_value = float(one.ln_value[0])
        if not math.isfinite(ln_value):
            return None
        value, scale = math.exp(min(ln_value, 700.0)), _DB_PER_NEPER
        if name in {"gain_db", "peaking_db"}:
            value = decibels(value)
        else:
            scale = value
        shares = shares_of(self.causes, one.by[0], scale=scale)
        if name == "gbw_hz" and self.implied is not None:
            u_parts = scale * float(self.implied.u_parts[0])
            shares.append(TermShare(name=PARTS, u=u_parts, dof=math.inf, kind="B"))
        if other_ln is not None:
            apart = scale * abs(other_ln - ln_value)
            shares.append(TermShare(name=CHOICE, u=apart, dof=math.inf, kind="B"))
        return figure(value, _UNITS.get(name, "Hz"), shares)

    def _at_least(self) -> Figure:
        counts = self.reduced.data.weight[0] > 0
        bound_hz = lowest_corner_hz(
            shape_named("one-pole"),
            self.curve.frequency_hz[counts],
            np.log(self.curve.gain[counts]),
            weight=self.reduced.data.weight[0][counts],
            stated=self.reduced.data.stated,
            ln_corner=float(self.reduced.upper.ln_value[0]),
        )
        return Figure(value=bound_hz, unit="Hz", bound="at least")
