"""How long a sweep takes."""

import pytest

from benchlog.sweep.schedule import spaced_schedule
from benchlog.sweep.time_model import TimeModel, longest, together


def settle_s(frequency_hz: float) -> float:
    """Return five periods, at least 0.1 s."""
    return max(0.1, 5 / frequency_hz)


MODEL = TimeModel(settle_s=settle_s, reading_s=lambda _: 0.05, overhead_s=0.01)


def test_low_frequencies_dominate() -> None:
    """The time left is that of the steps left, not their share of the count."""
    schedule = spaced_schedule([10.0, 100.0, 1000.0], 0.1)

    assert MODEL.seconds_left(schedule.steps) == pytest.approx(0.56 + 0.16 + 0.16)
    assert MODEL.seconds_left(schedule.steps[1:]) == pytest.approx(0.32)
    assert MODEL.seconds_left(()) == 0


def test_the_overhead_is_learned() -> None:
    """After some points the model predicts what points really take on this bench."""
    model = MODEL
    for _ in range(20):
        model = model.learned(100.0, settle_s(100.0) + 0.05 + 0.2)

    assert model.seconds(100.0) == pytest.approx(0.35, rel=0.01)
    assert MODEL.seconds(100.0) == pytest.approx(0.16)


def test_the_overhead_is_never_negative() -> None:
    """A clock that does not advance teaches nothing below zero."""
    model = MODEL
    for _ in range(50):
        model = model.learned(100.0, 0.0)

    assert 0 <= model.overhead_s < 1e-6


def test_settling_together_and_reading_in_turn() -> None:
    """Source and meters settle at the same time; meters are read one after the other."""
    parts = [lambda _: 0.3, settle_s]

    assert longest(parts)(100.0) == 0.3
    assert longest(parts)(10.0) == 0.5
    assert together(parts)(10.0) == pytest.approx(0.8)
