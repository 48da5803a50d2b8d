"""Every shape: derivatives, landmarks, coverage, choice, wild points."""

import math

import numpy as np
import pytest

from benchlog.curve import ComplexArray, FloatArray, GainCurve
from benchlog.extract.choose import shape_named
from benchlog.extract.figures import extract
from benchlog.extract.landmarks import lower_corner, peak, upper_corner
from benchlog.extract.many import FIGURES, extract_many
from benchlog.extract.validity import Fault
from benchlog.records import Figures

SWEPT: FloatArray = np.logspace(0, 6, 61)
# Parameters of each shape as a board may have them: gain 48, corners near 20 Hz and 60 kHz.
TRUTH: dict[str, list[float]] = {
    "one-pole": [48.0, 62.5e3],
    "two-pole": [48.0, 50e3, 1.2],
    "2-equal-poles": [48.0, 97e3],
    "3-equal-poles": [48.0, 120e3],
    "one-pole+lower-corner": [48.0, 62.5e3, 20.0],
    "two-pole+lower-corner": [48.0, 50e3, 0.9, 20.0],
    "one-pole+shelf": [48.0, 62.5e3, 20.0],
}


def response(name: str, rows: int = 1) -> FloatArray:
    """Return the magnitude of a shape with its true parameters, shape (rows, points)."""
    parameters = np.tile(np.log(TRUTH[name]), (rows, 1))
    values, _ = shape_named(name).evaluate(parameters, np.tile(np.log(SWEPT), (rows, 1)))
    return np.exp(values)


def noisy(name: str, seed: int, rows: int, noise: float = 2e-3) -> FloatArray:
    """Return curves with relative noise."""
    scatter = np.random.default_rng(seed).standard_normal((rows, SWEPT.size))
    return response(name, rows) * np.exp(noise * scatter)


def by_formula(name: str) -> FloatArray:
    """Return the same magnitudes from complex arithmetic, written another way."""
    s = SWEPT.astype(complex) * 1j
    gain, upper = TRUTH[name][:2]
    h: ComplexArray = gain / (1 + s / upper) ** (int(name[0]) if name[0].isdigit() else 1)
    if name.startswith("two-pole"):
        h = gain / (1 + s / (TRUTH[name][2] * upper) + (s / upper) ** 2)
    lower = TRUTH[name][-1]
    if name.endswith("lower-corner"):
        h = h * s / (s + lower)
    if name.endswith("shelf"):
        h = h * (s + lower / gain) / (s + lower)
    return np.asarray(np.abs(h))


@pytest.mark.parametrize("name", TRUTH)
def test_values(name: str) -> None:
    """The real formula in logarithms is the magnitude of the complex one."""
    assert response(name)[0] == pytest.approx(by_formula(name), rel=1e-12)


@pytest.mark.parametrize("name", TRUTH)
def test_derivatives(name: str) -> None:
    """Analytic derivatives equal central differences."""
    shape, step = shape_named(name), 1e-6
    centre = np.log(TRUTH[name])[None, :]
    _, analytic = shape.evaluate(centre, np.log(SWEPT)[None, :])
    for place in range(centre.shape[1]):
        move = np.zeros_like(centre)
        move[0, place] = step
        up, _ = shape.evaluate(centre + move, np.log(SWEPT)[None, :])
        down, _ = shape.evaluate(centre - move, np.log(SWEPT)[None, :])
        assert analytic[0, :, place] == pytest.approx((up - down)[0] / (2 * step), abs=1e-8)


@pytest.mark.parametrize("name", TRUTH)
def test_landmarks(name: str) -> None:
    """At a corner the response is plateau/sqrt(2), and its derivatives equal differences."""
    shape, step = shape_named(name), 1e-6
    centre = np.log(TRUTH[name])[None, :]
    for find in (upper_corner, lower_corner):
        found = find(shape, centre)
        if found is None:
            continue
        values, _ = shape.evaluate(centre, found.ln_value[:, None])
        assert values[0, 0] - centre[0, 0] == pytest.approx(-0.5 * math.log(2), abs=1e-9)
        for place in range(centre.shape[1]):
            move = np.zeros_like(centre)
            move[0, place] = step
            up, down = find(shape, centre + move), find(shape, centre - move)
            assert up is not None
            assert down is not None
            slope = (up.ln_value - down.ln_value)[0] / (2 * step)
            assert found.by[0, place] == pytest.approx(slope, abs=1e-6)


@pytest.mark.parametrize("name", [name for name in TRUTH if name.startswith("two")])
def test_peak_derivatives(name: str) -> None:
    """Height and place of the peak depend on the parameters as differences say."""
    shape, step = shape_named(name), 1e-6
    centre = np.log(TRUTH[name])[None, :]
    for which in (0, 1):
        found = peak(shape, centre)[which]
        for place in range(centre.shape[1]):
            move = np.zeros_like(centre)
            move[0, place] = step
            up, down = (peak(shape, centre + sign * move)[which] for sign in (1, -1))
            slope = (up.ln_value - down.ln_value)[0] / (2 * step)
            assert found.by[0, place] == pytest.approx(slope, abs=1e-6)


@pytest.mark.parametrize("name", TRUTH)
def test_coverage_with_the_shape_given(name: str) -> None:
    """Of 2,000 draws 93.5-97.3 % of the 95.45 % intervals hold the truth, each figure."""
    rows = 2000
    got = extract_many(SWEPT, noisy(name, 11, rows), u_gain_rel=2e-3, shape=name)
    exact = extract_many(SWEPT, response(name), shape=name)
    for figure in FIGURES:
        truth = exact[figure][0]
        if not np.isfinite(truth) or truth == 0.0:
            continue
        error = np.abs(got[figure] - truth) / got[f"u_{figure}"]
        good = np.isfinite(error)
        assert good.mean() > 0.99, figure
        assert 0.935 < (error[good] < 2.0).mean() < 0.973, figure


@pytest.mark.parametrize("name", ["one-pole", "two-pole", "one-pole+lower-corner"])
def test_coverage_with_the_shape_chosen(name: str) -> None:
    """Automatically chosen, the right shape is taken in 95 % and intervals cover 92 %."""
    got = extract_many(SWEPT, noisy(name, 12, 1000))
    exact = extract_many(SWEPT, response(name), shape=name)
    assert (got["shape"] == name).mean() >= 0.95
    for figure in ("gain", "corner_hz", "bandwidth_hz", "lower_corner_hz"):
        if np.isfinite(exact[figure][0]):
            error = np.abs(got[figure] - exact[figure][0]) / got[f"u_{figure}"]
            assert (error[np.isfinite(error)] < 2.0).mean() >= 0.92, figure


@pytest.mark.parametrize("name", TRUTH)
def test_one_and_many_agree(name: str) -> None:
    """The same curve gives the same digits alone and among others, whatever its shape."""
    rows = noisy(name, 13, 3)
    many = extract_many(SWEPT, rows, shape=name)
    alone = extract(GainCurve(SWEPT, rows[1]), shape=name)
    for figure in FIGURES:
        one = alone.figure(figure)
        if one is not None and one.u is not None:
            assert many[figure][1] == pytest.approx(one.value, rel=1e-8)
            assert many[f"u_{figure}"][1] == pytest.approx(one.u, rel=1e-6)
        else:
            assert not np.isfinite(many[figure][1])


def _numbers(figures: Figures) -> dict[str, tuple[float, float]]:
    found = {name: figures.figure(name) for name in ("gain", "corner_hz", "gbw_hz")}
    return {n: (one.value, one.u) for n, one in found.items() if one and one.u is not None}


@pytest.mark.parametrize("place", [0, 7, 30, 47, 55, 60])
@pytest.mark.parametrize("sigmas", [-10.0, 12.0, 400.0])
@pytest.mark.parametrize("name", ["one-pole", "two-pole"])
def test_wild_point(place: int, sigmas: float, name: str) -> None:
    """A point 10 sigma out is named, kept, and figures are those of the curve without it."""
    gain = noisy(name, 14, 1)[0]
    wrong = gain.copy()
    wrong[place] = response(name)[0, place] * math.exp(2e-3 * sigmas)
    rest = np.arange(SWEPT.size) != place
    figures = extract(GainCurve(SWEPT, wrong))
    without = _numbers(extract(GainCurve(SWEPT[rest], gain[rest])))
    assert figures.left_out == (place,)
    assert "wild point" in [reason.code for reason in figures.validity]
    assert _numbers(figures).keys() == without.keys()
    for key, (value, u) in _numbers(figures).items():
        assert abs(value - without[key][0]) < 0.05 * u


def test_clean_curves_keep_their_points() -> None:
    """Of 4,000 clean curves fewer than 0.3 % lose a point."""
    got = extract_many(SWEPT, noisy("one-pole", 15, 4000), shape="one-pole")
    assert ((got["validity"] & int(Fault.WILD_POINT)) != 0).mean() < 0.003


def test_edges_too_close() -> None:
    """Two corners that leave no plateau are refused, and close ones are remarked on."""
    for upper, code in ((30.0, "no band"), (300.0, "narrow band")):
        s = 1j * SWEPT
        gain = np.abs(10.0 / (1 + s / upper) * s / (s + 20.0))
        figures = extract(GainCurve(SWEPT, gain), shape="one-pole+lower-corner")
        assert code in [reason.code for reason in figures.validity]
        assert (figures.corner_hz is None) is (code == "no band")


def test_term_tables_of_two_corners_add_up() -> None:
    """Bandwidth is upper minus lower corner, with a term table of its own."""
    figures = extract(GainCurve(SWEPT, noisy("one-pole+lower-corner", 16, 1)[0]))
    assert figures.shape == "one-pole+lower-corner"
    assert figures.bandwidth_hz is not None
    assert figures.corner_hz is not None
    assert figures.lower_corner_hz is not None
    apart = figures.corner_hz.value - figures.lower_corner_hz.value
    assert figures.bandwidth_hz.value == pytest.approx(apart, rel=1e-12)
    assert figures.shapes_tried[0][0] == figures.shape


def test_no_gbw_without_a_design_for_equal_poles() -> None:
    """Gain times corner means nothing for a cascade: no number, and the reason."""
    figures = extract(GainCurve(SWEPT, response("3-equal-poles")[0]), shape="3-equal-poles")
    assert figures.gbw_hz is None
    assert "GBW needs a design" in [reason.code for reason in figures.validity]


@pytest.mark.parametrize("name", ["one-pole", "two-pole", "3-equal-poles"])
def test_unity_crossing(name: str) -> None:
    """Where the sweep reaches a gain of one, that is a figure with its uncertainty; else none."""
    wide: FloatArray = np.logspace(0, 8, 81)
    shape, centre = shape_named(name), np.log(TRUTH[name])[None, :]
    values, _ = shape.evaluate(centre, np.log(wide)[None, :])
    figures = extract(GainCurve(wide, np.exp(values[0])), shape=name)
    assert figures.unity_hz is not None
    at, _ = shape.evaluate(centre, np.log([[figures.unity_hz.value]]))
    assert at[0, 0] == pytest.approx(0.0, abs=1e-7)
    assert extract(GainCurve(SWEPT[:-8], response(name)[0, :-8]), shape=name).unity_hz is None
    rows = np.exp(values + 2e-3 * np.random.default_rng(17).standard_normal((500, wide.size)))
    got = extract_many(wide, rows, shape=name)
    inside = np.abs(got["unity_hz"] - figures.unity_hz.value) < 2 * got["u_unity_hz"]
    assert 0.92 < inside.mean() < 0.98


@pytest.mark.parametrize("ratio", [3.0, 30.0, 200.0, 300.0, 1000.0])
def test_coverage_where_a_second_pole_is_hard_to_see(ratio: float) -> None:
    """Whatever the second pole's distance, 90 % of the exact 95 % intervals hold the corner."""
    swept: FloatArray = np.logspace(2, 6, 41)
    x = 1j * swept / 62.5e3
    gain = np.abs(48.0 / (1 + x) / (1 + x / ratio))
    # Half power of two real poles at a and b: a root of a quadratic in the squared frequency.
    total = 1.0 + ratio**2
    square = 0.5 * (-total + math.sqrt(total**2 + 4.0 * ratio**2))
    rows = gain * np.exp(1e-3 * np.random.default_rng(18).standard_normal((1000, 41)))
    got = extract_many(swept, rows)
    error = np.abs(got["corner_hz"] - 62.5e3 * math.sqrt(square)) / got["u_corner_hz"]
    assert np.isfinite(error).mean() > 0.99
    assert (error[np.isfinite(error)] < 1.96).mean() >= 0.90
