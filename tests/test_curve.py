"""A curve refuses what no curve can hold, and cannot be changed afterwards."""

import numpy as np
import pytest

from benchlog.curve import GainCurve, curve_from_points
from benchlog.errors import CurveError
from benchlog.records import Point, PointFlag


def a_point(position: int, **changes: object) -> Point:
    """Make a plain point, with changes."""
    fields: dict[str, object] = {
        "position": position,
        "frequency_hz": 100.0 * (position + 1),
        "level_vrms": 0.01,
        "input_vrms": 0.01,
        "output_vrms": 0.48,
        "gain": 48.0,
    }
    return Point(**(fields | changes))  # type: ignore[arg-type]


def test_arrays_are_copied_and_frozen() -> None:
    """Changing the caller's array later does not change the curve."""
    gain = np.array([2.0, 1.0])
    curve = GainCurve([1.0, 10.0], gain)  # type: ignore[arg-type]
    gain[0] = 99.0

    assert curve.gain[0] == 2.0
    with pytest.raises(ValueError, match="read-only"):
        curve.gain[0] = 3.0


@pytest.mark.parametrize(
    ("frequency_hz", "gain", "what"),
    [
        ([], [], "a curve needs at least one point"),
        ([1.0, 2.0], [1.0], "gain has shape (1,) beside 2 frequencies"),
        ([1.0, -2.0], [1.0, 1.0], "frequency_hz has -2.0 at position 1"),
        ([1.0, 2.0], [1.0, float("nan")], "gain has nan at position 1"),
        ([1.0, float("inf")], [1.0, 1.0], "frequency_hz has inf at position 1"),
        ([[1.0]], [1.0], "frequency_hz has 2 dimensions"),
        (["ten"], [1.0], "frequency_hz is not an array of numbers"),
    ],
    ids=["empty", "shapes", "negative", "nan", "infinite", "two dimensions", "text"],
)
def test_malformed_arrays_are_refused(frequency_hz: list, gain: list, what: str) -> None:  # type: ignore[type-arg]
    """Each malformed argument has its own sentence."""
    with pytest.raises(CurveError) as caught:
        GainCurve(frequency_hz, gain)  # type: ignore[arg-type]

    assert caught.value.what == what


def test_flagged_points_stay_but_are_not_usable() -> None:
    """A flag takes a point out of the fit, not out of the curve."""
    curve = GainCurve(
        np.array([1.0, 2.0]), np.array([1.0, 9.0]), flags=np.array([0, int(PointFlag.WILD)])
    )

    assert len(curve) == 2
    assert curve.usable.tolist() == [True, False]


def test_curve_of_a_sweep_leaves_out_checks_and_missing_gains() -> None:
    """A repeated point is never in the curve twice; an overload is no gain."""
    points = [
        a_point(0),
        a_point(1, gain=None, output_vrms=None, flags=PointFlag.OVERLOAD),
        a_point(0, kind="check", gain=47.0),
        a_point(2, gain=46.0, flags=PointFlag.UNSETTLED),
    ]

    curve = curve_from_points(points)

    assert curve.gain.tolist() == [48.0, 46.0]
    assert curve.usable.tolist() == [True, False]


def test_sweep_without_any_gain_has_no_curve() -> None:
    """All overloaded: an error that says where to look."""
    with pytest.raises(CurveError, match="no point of this sweep has a gain"):
        curve_from_points([a_point(0, gain=None)])


def test_scatter_is_used_only_when_every_point_has_it() -> None:
    """Weights for some points only would be a guess for the others."""
    known = [a_point(0, u_gain_rel=1e-3), a_point(1, u_gain_rel=2e-3)]

    assert curve_from_points(known).u_gain_rel is not None
    assert curve_from_points([*known, a_point(2)]).u_gain_rel is None
