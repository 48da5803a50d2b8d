"""Decision rules: from a value, its uncertainty and its limits to a word.

Source:
    JCGM 106:2012, clauses 7 (conformance probability) and 8 (guard bands); ILAC-G8:09/2019, 4.2
    for the binary and the four-state statements.  Clause numbers from memory.
"""

import math
from dataclasses import dataclass

from scipy.special import ndtr, stdtr

from benchlog.records import RuleName, VerdictWord

# Below this many degrees of freedom the tails of Student's t differ from the normal ones.
_NORMAL_FROM_DOF = 30.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Limits:
    """Lowest and highest permitted value; at least one is there."""

    minimum: float | None
    maximum: float | None

    def distance(self, value: float) -> float:
        """Return how far a value lies inside the nearer limit; below zero outside."""
        below = math.inf if self.minimum is None else value - self.minimum
        above = math.inf if self.maximum is None else self.maximum - value
        return min(below, above)


def decide(rule: RuleName, value: float, limits: Limits, *, guard_band: float) -> VerdictWord:
    """Decide one line.

    Args:
        rule: ``"simple"`` compares with the limits; ``"guarded"`` passes only inside the limits
            moved in by the guard band; ``"guarded-rejection"`` fails only outside the limits
            moved out by it; ``"four-state"`` says in addition when a value lies in a guard band.
        value: The figure.
        limits: Its limits; a value equal to a limit is inside.
        guard_band: Width, in the figure's unit.
    """
    inside = limits.distance(value)
    match rule:
        case "simple":
            return "pass" if inside >= 0 else "fail"
        case "guarded":
            return "pass" if inside >= guard_band else "fail"
        case "guarded-rejection":
            return "pass" if inside >= -guard_band else "fail"
    if inside >= guard_band:
        return "pass"
    if inside >= 0:
        return "conditional pass"
    return "conditional fail" if inside >= -guard_band else "fail"


def conformance_probability(value: float, u: float, limits: Limits, *, dof: float) -> float:
    """Return the probability that the true value lies inside the limits.

    Args:
        value: The figure.
        u: Its standard uncertainty.
        limits: Its limits.
        dof: Degrees of freedom of ``u``; below 30 Student's t takes the place of the normal
            distribution.
    """
    if u == 0:
        return 1.0 if limits.distance(value) >= 0 else 0.0

    def below(limit: float) -> float:
        z = (limit - value) / u
        return float(stdtr(dof, z)) if dof < _NORMAL_FROM_DOF else float(ndtr(z))

    at_most = 1.0 if limits.maximum is None else below(limits.maximum)
    too_low = 0.0 if limits.minimum is None else below(limits.minimum)
    return max(0.0, at_most - too_low)
