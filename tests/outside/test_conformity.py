"""Published examples of conformity assessment."""

import math

import pytest

from benchlog.judge.rule import Limits, conformance_probability, decide


@pytest.mark.parametrize(
    ("value", "u", "minimum", "maximum", "probability"),
    [
        pytest.param(-5.47, 0.05, None, -5.40, 0.919243, id="zener"),
        pytest.param(509.7, 8.6, 490.0, None, 0.989010, id="burst strength"),
    ],
)
def test_worked_examples(
    value: float, u: float, minimum: float | None, maximum: float | None, probability: float
) -> None:
    """JCGM 106:2012, 7.3 (from memory): 92 % and 99 %, recomputed."""
    limits = Limits(minimum=minimum, maximum=maximum)
    got = conformance_probability(value, u, limits, dof=math.inf)
    assert got == pytest.approx(probability, abs=1e-6)


@pytest.mark.parametrize(
    ("capability", "centre"), [(0.5, 0.68269), (1.0, 0.95450), (2.0, 0.99994), (5.0, 1.0)]
)
def test_two_sided_limits(capability: float, centre: float) -> None:
    """JCGM 106:2012, 7.6: p = Phi(4 C (1 - y)) - Phi(-4 C y), in the middle of the interval."""
    u = 1.0 / (4.0 * capability)
    limits = Limits(minimum=0.0, maximum=1.0)
    got = conformance_probability(0.5, u, limits, dof=math.inf)
    assert got == pytest.approx(centre, abs=6e-6)


@pytest.mark.parametrize(
    ("capability", "lowest", "probability"),
    [(1, 0.2111, 0.80), (1, 0.4491, 0.95), (2, 0.1602, 0.90), (4, 0.1454, 0.99)],
)
def test_edge_of_the_acceptance_zone(capability: int, lowest: float, probability: float) -> None:
    """JCGM 106:2012, 7.6: table of lowest accepted values, computed from the formula."""
    limits = Limits(minimum=0.0, maximum=1.0)
    got = conformance_probability(lowest, 1 / (4 * capability), limits, dof=math.inf)
    assert got == pytest.approx(probability, abs=3e-4)


@pytest.mark.parametrize(
    ("band_in_U", "risk"), [(1.5, 0.0013499), (1.0, 0.0227501), (0.83, 0.0484573), (0.0, 0.5)]
)
def test_risk_at_the_acceptance_limit(band_in_U: float, risk: float) -> None:  # noqa: N803
    """ILAC-G8:09/2019, Table 1 (from memory; 1 U seen second-hand): worst risk of a false pass."""
    limits = Limits(minimum=None, maximum=1.0)
    u = 0.01
    value = 1.0 - band_in_U * 2 * u
    assert 1 - conformance_probability(value, u, limits, dof=math.inf) == pytest.approx(
        risk, abs=1e-7
    )


@pytest.mark.parametrize(
    ("value", "word"),
    [
        (0.0, "pass"),
        (0.875, "pass"),
        (0.95, "conditional pass"),
        (1.0, "conditional pass"),
        (1.05, "conditional fail"),
        (1.125, "conditional fail"),
        (1.13, "fail"),
    ],
)
def test_non_binary_statement(value: float, word: str) -> None:
    """ILAC-G8:09/2019, 4.2.3 (seen second-hand): four words, two guard bands of w."""
    limits = Limits(minimum=None, maximum=1.0)
    assert decide("four-state", value, limits, guard_band=0.125) == word


def test_guarded_rejection_of_a_speed() -> None:
    """JCGM 106:2012, 8.3 (from memory): 100 km/h, u 2 % of reading, 99.9 % sure above 107 km/h."""
    z = 3.0902
    at_most = Limits(minimum=None, maximum=100.0)
    assert decide("guarded-rejection", 106.5, at_most, guard_band=z * 0.02 * 106.5) == "pass"
    assert decide("guarded-rejection", 107.0, at_most, guard_band=z * 0.02 * 107.0) == "fail"
