"""The sentence for people behind each fault."""

from dataclasses import dataclass

from benchlog.extract.validity import FEWEST_POINTS, FIGURES_TAKEN, Fault
from benchlog.notation import si
from benchlog.records import Reason

# Name for scripts, and a sentence with the words of ``Seen.words``.
_SENTENCES: dict[Fault, tuple[str, str]] = {
    Fault.TOO_FEW_POINTS: (
        "too few points",
        "The curve has {count} usable points; a fit needs at least {fewest}.",
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
        "The gain already falls at the lowest frequency, {lowest}: start"
        " the sweep at {tenth} or lower.",
    ),
    Fault.CORNER_ABOVE_SWEEP: (
        "corner above the sweep",
        "The gain has not fallen by 3 dB at {highest}, where the sweep ends: sweep further.",
    ),
    Fault.FEW_PAST_CORNER: (
        "too few points past the corner",
        "Only {past} points lie above the corner at about {corner}: sweep beyond {highest}.",
    ),
    Fault.NOISE_GAIN_UNKNOWN: (
        "noise gain unknown",
        "The measured gain is not what the design's parts give within their tolerances, so"
        " the noise gain is not known: find the wrong part first.",
    ),
    Fault.GBW_HIDDEN: (
        "GBW hidden",
        "{hidden} sets the corner: the curve would look the same with a faster amplifier, so that"
        " at best a lower bound can be given.",
    ),
    Fault.NOISE_GAIN_MEASURED: (
        "noise gain from the measured gain",
        "The measured gain is not what the design's parts give within their tolerances; the"
        " noise gain is taken from the measured gain instead.",
    ),
    Fault.WILD_POINT: (
        "wild point",
        "Left out as wild, far from all the others: {wild}.",
    ),
    Fault.LOWER_BELOW_SWEEP: (
        "lower corner below the sweep",
        "The gain has not fallen by 3 dB at {lowest}, where the sweep begins: start lower.",
    ),
    Fault.NARROW_BAND: (
        "narrow band",
        "The corners are less than a factor 30 apart: nowhere is the gain quite that of the"
        " plateau, which is where the two edges would leave it.",
    ),
    Fault.NO_BAND: (
        "no band",
        "The edges are so close together that there is no plateau and there are no corners.",
    ),
    Fault.PHASE_DISAGREES: (
        "phase disagrees with magnitude",
        "No delay makes the phase that of a board with this magnitude, so the phase was left out:"
        " look at the probes, the channels and the meter's settling.",
    ),
    Fault.SLOPE_NOT_FIRST_ORDER: (
        "slope not first order",
        "Between 2 and 5 corners the gain does not fall by 20 dB a decade, where GBW is defined:"
        " something beside the amplifier's one pole shapes the curve.",
    ),
    Fault.NOISE_FLOOR: (
        "noise floor reached",
        "Towards {highest} the gain stops falling: what is read there is noise or crosstalk."
        " End the sweep earlier, or raise the level.",
    ),
    Fault.NOT_DETERMINED: (
        "parameter not determined",
        "The points say nothing about one of the parameters of the shape {shape}: it could be"
        " anywhere.",
    ),
    Fault.GBW_NEEDS_DESIGN: (
        "GBW needs a design",
        "Without a design a response of the shape {shape} has no gain-bandwidth product.",
    ),
}


@dataclass(frozen=True, slots=True, kw_only=True)
class Seen:
    """What the sentences about one curve quote."""

    count: int
    lowest_hz: float
    highest_hz: float
    corner_hz: float
    past_corner: int
    wild_hz: tuple[float, ...] = ()
    shape: str = "one-pole"
    hidden_by: str = ""

    def words(self) -> dict[str, str]:
        """Return what the sentences' fields stand for."""
        return {
            "count": str(self.count),
            "fewest": str(FEWEST_POINTS),
            "past": str(self.past_corner),
            "lowest": si(self.lowest_hz, "Hz"),
            "highest": si(self.highest_hz, "Hz"),
            "corner": si(self.corner_hz, "Hz"),
            "tenth": si(self.corner_hz / 10.0, "Hz"),
            "wild": ", ".join(si(hz, "Hz") for hz in self.wild_hz),
            "shape": self.shape,
            "hidden": self.hidden_by or "Another element",
        }


def reasons_of(faults: int, seen: Seen) -> tuple[Reason, ...]:
    """Return the reasons behind a set of faults, worst first."""
    words = seen.words()
    return tuple(
        Reason(code=code, text=text.format_map(words), figures=FIGURES_TAKEN[fault])
        for fault, (code, text) in _SENTENCES.items()
        if faults & fault
    )


def faults_behind(reasons: tuple[Reason, ...]) -> int:
    """Return the bits of the faults that gave these reasons."""
    codes = {reason.code for reason in reasons}
    return sum(int(fault) for fault, (code, _) in _SENTENCES.items() if code in codes)
