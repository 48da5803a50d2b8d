"""Preferred values."""

import pytest

from benchlog.circuit.preferred import Series, nearest_preferred, preferred_numbers


@pytest.mark.parametrize(
    ("value", "series", "below", "above"),
    [
        (47e3, "E24", 47e3, 47e3),
        (48e3, "E24", 47e3, 51e3),
        (1.0, "E12", 1.0, 1.0),
        (0.99, "E12", 0.82, 1.0),
        (9.5, "E24", 9.1, 10.0),
        (22e-12, "E6", 22e-12, 22e-12),
        (3.3, "E96", 3.24, 3.32),
        (4.99e3, "E96", 4.99e3, 4.99e3),
        (9.9e6, "E192", 9.88e6, 10e6),
    ],
    ids=repr,
)
def test_neighbours(value: float, series: Series, below: float, above: float) -> None:
    """The neighbours of a value in its series; itself on both sides where it is in it."""
    assert nearest_preferred(value, series) == pytest.approx((below, above), rel=1e-12)


@pytest.mark.parametrize("series", ["E3", "E6", "E12", "E24", "E48", "E96", "E192"])
def test_every_member_is_its_own_neighbour(series: Series) -> None:
    """In any decade."""
    for number in preferred_numbers(series):
        for value in (number * 1e-12, float(number), number * 1e4):
            assert nearest_preferred(value, series) == (value, value)
