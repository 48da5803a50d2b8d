"""Lines, bounds and the worst of them."""

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from benchlog.design.model import Budget, Line
from benchlog.judge.rule import Limits, conformance_probability, decide
from benchlog.judge.verdict import judge, worst
from benchlog.records import VERDICT_ORDER, Bound, Figure, Figures, Reason, RuleName, VerdictWord

RULES: tuple[RuleName, ...] = ("simple", "guarded", "four-state", "guarded-rejection")


def _budget(
    *lines: tuple[str, float | None, float | None], rule: RuleName = "four-state"
) -> Budget:
    return Budget(
        rule=rule,
        guard=1.0,
        lines=tuple(
            Line(figure=figure, key=figure, minimum=low, maximum=high, unit="dB")
            for figure, low, high in lines
        ),
    )


def _gain(value: float, *, u: float | None = 0.1, bound: Bound | None = None) -> Figures:
    figure = Figure(value=value, unit="dB", u=u, bound=bound)
    return Figures(shape="one-pole", gain_db=figure)


@pytest.mark.parametrize(
    ("value", "words"),
    [
        pytest.param(10.5, "pass pass pass pass", id="far inside"),
        pytest.param(10.1, "pass fail conditional_pass pass", id="inside the guard band"),
        pytest.param(10.0, "pass fail conditional_pass pass", id="equal to the limit"),
        pytest.param(9.9, "fail fail conditional_fail pass", id="just outside"),
        pytest.param(9.7, "fail fail fail fail", id="far outside"),
    ],
)
def test_rules(value: float, words: str) -> None:
    """Each rule says its own word for the same value; a value equal to the limit is inside."""
    got = [
        judge(_gain(value), _budget(("gain_db", 10.0, 11.0), rule=rule)).overall for rule in RULES
    ]
    assert got == [word.replace("_", " ") for word in words.split()]


@pytest.mark.parametrize(
    ("bound", "low", "high", "word", "basis"),
    [
        ("at least", 4.0, None, "pass", "bound"),
        ("at least", 5.0, None, "pass", "bound"),
        ("at least", 6.0, None, "invalid", "bound"),
        ("at least", None, 6.0, "invalid", "bound"),
        ("at least", None, 4.0, "fail", "bound"),
        ("at least", 4.0, 6.0, "invalid", "bound"),
        ("at most", None, 6.0, "pass", "bound"),
        ("at most", None, 4.0, "invalid", "bound"),
        ("at most", 6.0, None, "fail", "bound"),
    ],
)
def test_bounds(
    bound: Bound, low: float | None, high: float | None, word: VerdictWord, basis: str
) -> None:
    """A bound decides the line that it is enough for, and no other."""
    line = judge(_gain(5.0, u=None, bound=bound), _budget(("gain_db", low, high))).lines[0]
    assert (line.verdict, line.basis) == (word, basis)
    assert line.conformance_probability is None


def test_missing_figure_is_invalid_with_its_reason() -> None:
    """A figure that the curve cannot carry is never a fail, and its sentence is on the line."""
    reason = Reason(code="poor fit", text="It does not fit.", figures=("gain_db",))
    figures = Figures(shape="one-pole", validity=(reason,))
    line = judge(figures, _budget(("gain_db", 1.0, None))).lines[0]
    assert (line.verdict, line.reason, line.value) == ("invalid", "It does not fit.", None)


def test_fail_is_worse_than_invalid() -> None:
    """A board that fails one line and cannot be measured on another has failed."""
    verdict = judge(_gain(5.0), _budget(("gain_db", 9.0, None), ("corner_hz", 1.0, None)))
    assert [line.verdict for line in verdict.lines] == ["fail", "invalid"]
    assert verdict.overall == "fail"


def test_a_line_may_have_its_own_rule() -> None:
    """A line's rule and guard stand above the budget's."""
    line = Line(
        figure="gain_db",
        key="gain",
        minimum=10.0,
        maximum=None,
        unit="dB",
        rule="guarded",
        guard=0.4,
    )
    budget = Budget(rule="simple", guard=1.0, lines=(line,))
    got = judge(_gain(10.1), budget).lines[0]
    assert (got.verdict, got.rule, got.guard) == ("pass", "guarded", 0.4)


def test_few_degrees_of_freedom_widen_the_tails() -> None:
    """Below 30 degrees of freedom Student's t is used: t(4) at 2.776 leaves 2.5 % (any table)."""
    limits = Limits(minimum=0.0, maximum=None)
    assert conformance_probability(2.776, 1.0, limits, dof=4) == pytest.approx(0.975, abs=1e-4)
    assert conformance_probability(2.776, 1.0, limits, dof=30) == pytest.approx(0.99725, abs=1e-5)


def test_no_uncertainty_is_certain() -> None:
    """With u zero a value is inside or it is not."""
    limits = Limits(minimum=0.0, maximum=None)
    assert conformance_probability(0.0, 0.0, limits, dof=math.inf) == 1.0
    assert conformance_probability(-1e-9, 0.0, limits, dof=math.inf) == 0.0


@given(
    value=st.floats(-10, 10),
    wide=st.floats(0, 5),
    narrow=st.floats(0, 1),
    rule=st.sampled_from(RULES),
)
def test_less_uncertainty_never_harms_a_value_inside(
    value: float, wide: float, narrow: float, rule: RuleName
) -> None:
    """Shrinking the guard band makes no word worse inside the limits, nor better outside."""
    limits = Limits(minimum=-5.0, maximum=5.0)
    before = VERDICT_ORDER.index(decide(rule, value, limits, guard_band=wide))
    after = VERDICT_ORDER.index(decide(rule, value, limits, guard_band=wide * narrow))
    assert after <= before if limits.distance(value) >= 0 else after >= before


@given(words=st.lists(st.sampled_from(VERDICT_ORDER), min_size=1))
def test_the_worst_word_is_overall(words: list[VerdictWord]) -> None:
    """No line is worse than the whole, and the whole is the word of some line."""
    got = worst(words)
    assert got in words
    assert all(VERDICT_ORDER.index(word) <= VERDICT_ORDER.index(got) for word in words)


@given(
    value=st.floats(-20, 20), u=st.floats(0.01, 3), dof=st.sampled_from([3.0, 29.0, 30.0, math.inf])
)
def test_probabilities_are_probabilities(value: float, u: float, dof: float) -> None:
    """Between zero and one, and the two sides of one limit make one."""
    above = conformance_probability(value, u, Limits(minimum=1.0, maximum=None), dof=dof)
    below = conformance_probability(value, u, Limits(minimum=None, maximum=1.0), dof=dof)
    assert 0.0 <= above <= 1.0
    assert above + below == pytest.approx(1.0, abs=1e-12)
