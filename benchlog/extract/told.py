"""What a record tells about a fit in words."""

import math

import numpy as np

from benchlog.curve import GainCurve
from benchlog.extract.choose import MARGIN, Choice
from benchlog.extract.reduce import Reduced
from benchlog.extract.sentences import Seen


def seen_of(curve: GainCurve, choice: Choice, reduced: Reduced) -> Seen:
    """Return what the sentences about one curve quote."""
    usable_hz = curve.frequency_hz[curve.usable & ~choice.wild[0]]
    if usable_hz.size == 0:
        usable_hz = curve.frequency_hz
    ln_corner = float(reduced.upper.ln_value[0])
    corner_hz = math.exp(min(ln_corner, 700.0)) if math.isfinite(ln_corner) else float("inf")
    return Seen(
        count=int(reduced.fit.count[0]),
        lowest_hz=float(usable_hz.min()),
        highest_hz=float(usable_hz.max()),
        corner_hz=corner_hz if math.isfinite(corner_hz) else float(usable_hz.max()),
        past_corner=int((usable_hz >= corner_hz).sum()),
        wild_hz=tuple(float(hz) for hz in curve.frequency_hz[choice.wild[0]]),
        shape=reduced.shape.name,
    )


def tried(choice: Choice) -> tuple[tuple[str, float], ...]:
    """Return name and AICc of every shape that was fitted to the first sweep, best first."""
    pairs = [(one.shape.name, float(one.aicc[0])) for one in choice.comparable()]
    return tuple(sorted((pair for pair in pairs if np.isfinite(pair[1])), key=lambda pair: pair[1]))


def why(choice: Choice) -> str:
    """Return one sentence: why the first sweep got its shape."""
    if len(choice.comparable()) == 1:
        return "It is the only shape that was asked for."
    ranked = tried(choice)
    name = choice.tried[int(choice.chosen[0])].shape.name
    if not ranked:
        return "No shape could be fitted; the simplest is shown."
    if ranked[0][0] != name:
        return (
            f"It is the simplest shape within {MARGIN:g} of the lowest AICc, which is that of"
            f" {ranked[0][0]}."
        )
    if len(ranked) == 1:
        return "No other shape could be fitted."
    lead = ranked[1][1] - ranked[0][1]
    return f"Its AICc is the lowest, by {lead:.1f} before {ranked[1][0]}."
