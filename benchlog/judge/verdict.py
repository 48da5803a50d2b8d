"""Figures held against a budget: line by line, then the worst of them."""

from benchlog.design.model import Budget, Line
from benchlog.judge.rule import Limits, conformance_probability, decide
from benchlog.notation import si
from benchlog.records import (
    VERDICT_ORDER,
    Figure,
    Figures,
    LineVerdict,
    RuleName,
    Verdict,
    VerdictWord,
)

_WHY = {
    "pass": "",
    "conditional pass": "inside the limits, but closer than the guard band",
    "conditional fail": "outside the limits, but by less than the guard band",
    "fail": "outside the limits",
}


def judge(figures: Figures, budget: Budget) -> Verdict:
    """Hold figures against a budget.

    A figure that the curve cannot carry makes its line ``invalid``, never a fail; a bound decides
    a line where it is enough, and leaves it invalid where it is not.

    Args:
        figures: What the curve says.
        budget: What the board must meet; at least one line.

    Returns:
        Every line in the order of the budget, and the worst of them (fail is worse than invalid).
    """
    lines = tuple(_line(figures, budget, line) for line in budget.lines)
    return Verdict(overall=worst([line.verdict for line in lines]), lines=lines)


def worst(words: list[VerdictWord]) -> VerdictWord:
    """Return the worst word."""
    return max(words, key=VERDICT_ORDER.index)


def _line(figures: Figures, budget: Budget, line: Line) -> LineVerdict:
    figure = figures.figure(line.figure)
    rule = line.rule or budget.rule
    guard = budget.guard if line.guard is None else line.guard
    limits = Limits(minimum=line.minimum, maximum=line.maximum)
    missing = figures.why_missing(line.figure)
    if figure is None:
        why = missing.text if missing else f"the curve carries no {line.figure}"
        return _verdict(line, figure, "invalid", rule=rule, guard=guard, reason=why)
    if figure.bound is not None or figure.u is None:
        word = _by_bound(figure, limits)
        told = missing.text if missing and word == "invalid" else ""
        why = "" if word == "pass" else _known(figure, told)
        return _verdict(line, figure, word, rule=rule, guard=guard, reason=why)
    band = guard * (figure.U or 0.0)
    word = decide(rule, figure.value, limits, guard_band=band)
    why = _WHY[word]
    if word == "fail" and limits.distance(figure.value) >= 0:
        why = "inside the limits, but closer than the guard band that this rule asks for"
    return _verdict(line, figure, word, rule=rule, guard=guard, reason=why)


def _by_bound(figure: Figure, limits: Limits) -> VerdictWord:
    """Decide a line where everything beyond the bound is inside, or everything is outside."""
    at_least = figure.bound == "at least"
    needed, passed = (
        (limits.minimum, limits.maximum) if at_least else (limits.maximum, limits.minimum)
    )
    sign = 1.0 if at_least else -1.0
    if passed is not None:
        return "fail" if sign * (figure.value - passed) > 0 else "invalid"
    enough = needed is not None and sign * (figure.value - needed) >= 0
    return "pass" if enough else "invalid"


def _known(figure: Figure, why: str) -> str:
    told = f"known only to be {figure.bound} {si(figure.value, figure.unit)}"
    return f"{told}: {why}" if why else told


def _verdict(
    line: Line,
    figure: Figure | None,
    word: VerdictWord,
    *,
    rule: RuleName,
    guard: float,
    reason: str,
) -> LineVerdict:
    number = figure is not None and figure.bound is None and figure.u is not None
    probability = None
    if figure is not None and figure.u is not None and number:
        limits = Limits(minimum=line.minimum, maximum=line.maximum)
        probability = conformance_probability(figure.value, figure.u, limits, dof=figure.dof)
    return LineVerdict(
        figure=line.figure,
        minimum=line.minimum,
        maximum=line.maximum,
        unit=line.unit,
        value=None if figure is None else figure.value,
        u=None if figure is None else figure.u,
        U=None if figure is None else figure.U,
        k=figure.k if figure is not None and number else None,
        dof=figure.dof if figure is not None and number else None,
        conformance_probability=probability,
        verdict=word,
        rule=rule,
        guard=guard,
        basis=None if figure is None else ("figure" if number else "bound"),
        reason=reason,
    )
