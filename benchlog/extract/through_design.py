"""GBW of designs whose corner is not the amplifier's alone: capacitors, poles, several stages."""

import math
from dataclasses import dataclass
from typing import TypeGuard

import numpy as np
from scipy.special import stdtrit

from benchlog.circuit.chain import Chain
from benchlog.circuit.topologies import OpenLoop
from benchlog.curve import GainCurve
from benchlog.design.model import Design
from benchlog.extract.models.designed import Designed
from benchlog.extract.profile import GbwProfile, Profile
from benchlog.extract.reduce import Reduced
from benchlog.extract.uncertainty import Cause, design_causes, figure, shares_of
from benchlog.extract.validity import Fault
from benchlog.records import Figure


@dataclass(frozen=True, slots=True, kw_only=True)
class ThroughDesign:
    """GBW of one sweep.

    Attributes:
        figure: A number, a bound, or None.
        faults: Bits of ``Fault``.
        hidden_by: Name of the part that hides the amplifier; or "".
    """

    figure: Figure | None
    faults: int
    hidden_by: str


def has_noise_gain(design: Design | None) -> TypeGuard[Design]:
    """Tell a design with a feedback loop; open-loop gain times corner is the GBW as it stands."""
    if design is None:
        return False
    chain = design.chain()
    loops = [stage for stage, amplifier in chain.stages if amplifier is not None]
    return bool(loops) and not any(isinstance(stage, OpenLoop) for stage in loops)


def corner_is_the_amplifiers(chain: Chain) -> bool:
    """Tell a chain whose corner alone tells the GBW: one stage, no capacitor, no other pole."""
    return len(chain.stages) == 1 and all(part.unit == "ohm" for part in chain.parts())


def gbw_through_design(curve: GainCurve, design: Design, reduced: Reduced) -> ThroughDesign:
    """Hold the whole curve against the design's response.

    Args:
        curve: As measured, with its terms.
        design: Has an amplifier whose GBW is the figure.
        reduced: The shape chosen for the curve: its residuals are the noise where none is stated.
    """
    shape = designed(curve, design)
    weight = reduced.data.weight[0]
    counts = weight > 0
    stated = reduced.data.stated
    profile = GbwProfile(
        shape,
        reduced.data.ln_frequency[0][counts],
        reduced.data.ln_gain[0][counts],
        weight=weight[counts],
        scatter_rel=None if stated else math.sqrt(float(reduced.variance[0])),
    ).measured()
    if not profile.explained:
        return ThroughDesign(figure=None, faults=int(Fault.NOISE_GAIN_UNKNOWN), hidden_by="")
    if not profile.number:
        bound = Figure(value=math.exp(profile.ln_gbw), unit="Hz", bound="at least")
        return ThroughDesign(
            figure=bound, faults=int(Fault.GBW_HIDDEN), hidden_by=profile.hidden_by
        )
    causes = _causes(curve, shape, profile=profile, reduced=reduced)
    by_gbw = np.zeros(len(shape.parameters))
    by_gbw[0] = 1.0
    value = math.exp(profile.ln_gbw)
    number = figure(value, "Hz", shares_of(causes, by_gbw, scale=value))
    return ThroughDesign(figure=number, faults=0, hidden_by="")


def designed(curve: GainCurve, design: Design) -> Designed:
    """Return the design's response as this curve sees it."""
    u_scale = math.hypot(*(term.u_rel for term in curve.terms if term.kind == "scale"))
    source_ohm = 0.0 if curve.reference == "input" else (curve.source_ohm or 0.0)
    return Designed(design.chain(), source_ohm=source_ohm, u_scale=u_scale)


def at_least(found: Figure | None) -> Figure | None:
    """Return a number as its lower bound (95 %, one side); a bound stays as it is."""
    if found is None or found.u is None:
        return found
    lower = found.value - float(stdtrit(found.dof, 0.95)) * found.u
    return Figure(value=lower, unit=found.unit, bound="at least") if lower > 0 else None


def _causes(
    curve: GainCurve, shape: Designed, *, profile: Profile, reduced: Reduced
) -> list[Cause]:
    counts = reduced.data.weight[0] > 0
    weight = reduced.data.weight[0][counts]
    stated = reduced.data.stated
    return design_causes(
        curve.terms,
        profile.fit,
        parameters=shape.parameters,
        prior_weight=shape.prior_weight,
        frequency_hz=curve.frequency_hz[counts],
        weight=weight if stated else weight / profile.noise_rel**2,
        dof=math.inf if stated else float(reduced.dof[0]),
    )
