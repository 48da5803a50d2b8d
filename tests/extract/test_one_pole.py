"""Figures of one-pole curves, one and many: values, uncertainties, refusals."""

import math

import numpy as np
import pytest
from scipy.stats import chi2

from benchlog.curve import FloatArray, GainCurve
from benchlog.design.example import EXAMPLE_DESIGN
from benchlog.design.read import parse_design
from benchlog.errors import CurveError, Misuse
from benchlog.extract.choose import shape_named
from benchlog.extract.figures import extract
from benchlog.extract.many import extract_many
from benchlog.extract.reduce import prepare, reduce_sweeps
from benchlog.extract.validity import Fault
from benchlog.records import FIGURE_NAMES, Figure, Figures, Term

DESIGN = parse_design(EXAMPLE_DESIGN, where="example")
SWEPT: FloatArray = np.logspace(2, 6, 41)


def one_pole(frequency_hz: FloatArray, gain: float, corner_hz: float) -> FloatArray:
    """Return the magnitude of one pole."""
    return np.asarray(gain / np.sqrt(1.0 + (frequency_hz / corner_hz) ** 2))


def noisy(seed: int, *, noise: float = 1e-3, corner_hz: float = 62.5e3) -> FloatArray:
    """Return the example design's curve with relative noise."""
    scatter = np.random.default_rng(seed).standard_normal(SWEPT.size)
    return one_pole(SWEPT, 48.0, corner_hz) * np.exp(noise * scatter)


def known(figure: Figure | None) -> tuple[float, float]:
    """Return value and u of a figure that must be a number."""
    assert figure is not None
    assert figure.u is not None
    return figure.value, figure.u


def codes(figures: Figures) -> list[str]:
    """Return the codes of the reasons."""
    return [reason.code for reason in figures.validity]


def test_exact_curve() -> None:
    """A curve without noise gives gain, corner and their product to ten digits."""
    figures = extract(GainCurve(SWEPT, one_pole(SWEPT, 48.0, 62.5e3)))
    assert known(figures.gain)[0] == pytest.approx(48.0, rel=1e-9)
    assert known(figures.gain_db)[0] == pytest.approx(20 * math.log10(48.0), rel=1e-9)
    assert known(figures.corner_hz)[0] == pytest.approx(62.5e3, rel=1e-9)
    assert known(figures.gbw_hz)[0] == pytest.approx(3e6, rel=1e-9)
    assert figures.gbw_basis == "signal gain"
    assert figures.validity == ()


def test_gbw_through_the_noise_gain_of_an_inverting_stage() -> None:
    """An inverting stage of gain 10 has noise gain 11: GBW is corner times 11, not times 10."""
    text = EXAMPLE_DESIGN.replace('"non-inverting"', '"inverting"').replace(
        'ground = "1k"', 'input = "4.7k"'
    )
    design = parse_design(text, where="inverting")
    figures = extract(GainCurve(SWEPT, one_pole(SWEPT, 10.0, 200e3)), design)
    a0 = float(design.amplifiers[0].open_loop_gain)
    assert figures.gbw_basis == "design"
    assert known(figures.gbw_hz)[0] == pytest.approx(200e3 * 11 / (1 + 11 / a0), rel=1e-3)


def test_term_table_adds_up() -> None:
    """The root sum of squares of every term table is u; a scale term moves gain, not corner."""
    terms = (
        Term(name="meter", kind="scale", u_rel=2e-3, dof=10.0),
        Term(name="flatness", kind="flatness", u_rel=1e-3, band_hz=(2e4, 1e6)),
        Term(name="resolution", kind="reading", u_rel=5e-4),
    )
    figures = extract(GainCurve(SWEPT, noisy(3), terms=terms), DESIGN)
    for name in FIGURE_NAMES:
        figure = figures.figure(name)
        if figure is not None and figure.u is not None:
            total = math.sqrt(sum(term.u**2 for term in figure.terms))
            assert total == pytest.approx(figure.u, rel=1e-12)
    corner = {term.name: term.u for term in (figures.corner_hz.terms if figures.corner_hz else ())}
    gain = {term.name: term.u for term in (figures.gain.terms if figures.gain else ())}
    assert corner.get("meter", 0.0) < 1e-9 * 62.5e3
    assert gain["meter"] == pytest.approx(48.0 * 2e-3, rel=1e-2)
    assert corner["flatness"] > 1e-4 * 62.5e3


def test_flatness_moves_the_corner_as_a_moved_curve_does() -> None:
    """The linear sensitivity equals what a fit to the moved curve gives."""
    band_hz = (2e4, 1e6)
    exact = one_pole(SWEPT, 48.0, 62.5e3)
    moved = exact * np.where((band_hz[0] <= SWEPT) & (band_hz[1] >= SWEPT), 1 + 1e-5, 1.0)
    term = Term(name="flatness", kind="flatness", u_rel=1e-5, band_hz=band_hz)
    figures = extract(GainCurve(SWEPT, exact, terms=(term,)))
    again = extract(GainCurve(SWEPT, moved))
    shift = abs(known(again.corner_hz)[0] - known(figures.corner_hz)[0])
    assert known(figures.corner_hz)[1] == pytest.approx(shift, rel=1e-3)


@pytest.mark.parametrize("stated", [False, True])
def test_coverage(stated: bool) -> None:  # noqa: FBT001 - a case of the table
    """Of 2,000 draws with a fixed seed 93.5-97.5 % of the 95.45 % intervals hold the truth.

    GBW is held against boards with spread parts, not only against noise.
    """
    rng = np.random.default_rng(20)
    draws = 2000
    factors = 1 + 0.01 * rng.uniform(-1, 1, (2, draws, 1))
    names = ("stage[1].feedback", "stage[1].ground")
    chain = DESIGN.chain()
    exact = np.abs(
        chain.response(SWEPT, gbw_hz=2.7e6, factors=dict(zip(names, factors, strict=True)))
    )
    gains = exact * (1 + 2e-3 * rng.standard_normal(exact.shape))
    noise = 2e-3 if stated else None
    got = extract_many(SWEPT, gains, DESIGN, u_gain_rel=noise, shape="one-pole")
    ok = np.isfinite(got["gbw_hz"])
    assert ok.mean() > 0.995
    k = 2.0 if stated else 2.0665
    inside = np.abs(got["gbw_hz"] - 2.7e6) < k * got["u_gbw_hz"]
    plateau = chain.plateau(factors=dict(zip(names, factors, strict=True)))
    gain_inside = np.abs(got["gain"] - np.ravel(plateau)) < k * got["u_gain"]
    assert 0.935 < inside[ok].mean() < 0.975
    assert 0.935 < gain_inside[ok].mean() < 0.975


def test_scatter_reaches_the_bound_of_information() -> None:
    """The scatter of the corner is within 1.05 of the Cramér-Rao bound of the same points."""
    rng = np.random.default_rng(4)
    exact = one_pole(SWEPT, 48.0, 62.5e3)
    got = extract_many(SWEPT, exact * np.exp(1e-3 * rng.standard_normal((4000, SWEPT.size))))
    x = (SWEPT / 62.5e3) ** 2
    slopes = np.stack([np.ones_like(x), x / (1 + x)], axis=1)
    bound = 1e-3 * np.sqrt(np.diag(np.linalg.inv(slopes.T @ slopes)))
    scatter = np.nanstd(np.log(got["gain"])), np.nanstd(np.log(got["corner_hz"]))
    assert scatter[0] / bound[0] < 1.05
    assert scatter[1] / bound[1] < 1.05
    assert scatter[1] / bound[1] > 0.95


def test_one_and_many_agree() -> None:
    """The same sweep gives the same digits alone, among others, and padded."""
    alone = extract(GainCurve(SWEPT, noisy(5)), DESIGN)
    rows = np.full((3, 50), np.nan)
    frequencies = np.full((3, 50), np.nan)
    for row in range(3):
        rows[row, :41], frequencies[row, :41] = noisy(4 + row), SWEPT
    many = extract_many(frequencies, rows, DESIGN)
    for name in ("gain", "gain_db", "corner_hz", "gbw_hz"):
        value, u = known(alone.figure(name))
        assert many[name][1] == pytest.approx(value, rel=1e-9)
        assert many[f"u_{name}"][1] == pytest.approx(u, rel=1e-7)


def test_corner_above_the_sweep() -> None:
    """A sweep that ends at 1 kHz on a 92 kHz board gives gain and an honest bound, no corner."""
    rng = np.random.default_rng(1)
    frequency_hz: FloatArray = np.logspace(1, 3, 41)
    exact = one_pole(frequency_hz, 48.0, 92e3)
    gain = exact * (1 + 1e-3 * rng.standard_normal(41))
    figures = extract(GainCurve(frequency_hz, gain), DESIGN)
    assert "corner above the sweep" in codes(figures)
    assert figures.corner_hz is not None
    assert (figures.corner_hz.bound, figures.corner_hz.u) == ("at least", None)
    assert figures.corner_hz.value <= 1e3
    assert figures.gbw_hz is None or figures.gbw_hz.bound == "at least"
    assert known(figures.gain)[0] == pytest.approx(48.0, rel=1e-3)


def test_bound_is_rarely_wrong() -> None:
    """The lower bound lies above the true corner in about 5 % of draws at most."""
    rng = np.random.default_rng(2)
    frequency_hz: FloatArray = np.logspace(2, np.log10(50e3), 31)
    exact = one_pole(frequency_hz, 48.0, 50.5e3)
    wrong = 0
    for _ in range(300):
        noise = 2e-2 * rng.standard_normal(31)
        curve = GainCurve(frequency_hz, exact * np.exp(noise), u_gain_rel=np.full(31, 2e-2))
        figure = extract(curve).corner_hz
        wrong += figure is not None and figure.bound == "at least" and figure.value > 50.5e3
    assert wrong <= 0.08 * 300


@pytest.mark.parametrize(
    ("frequency_hz", "gain", "code"),
    [
        pytest.param([1e2, 1e3, 1e5], [48.0, 48.0, 20.0], "too few points", id="few"),
        pytest.param(
            np.logspace(5, 7, 41),
            one_pole(np.logspace(5, 7, 41), 48.0, 62.5e3),
            "plateau not reached",
            id="plateau",
        ),
        pytest.param(
            np.logspace(2, 5, 31),
            one_pole(np.logspace(2, 5, 31), 48.0, 85e3),
            "too few points past the corner",
            id="past",
        ),
        pytest.param(
            SWEPT,
            one_pole(SWEPT, 48.0, 62.5e3) * (1 + 0.05 * np.sin(np.log(SWEPT))),
            "poor fit",
            id="ripple",
        ),
    ],
)
def test_named_reasons(frequency_hz: FloatArray, gain: FloatArray, code: str) -> None:
    """What a curve cannot carry is None or a bound, with a reason of this name."""
    figures = extract(GainCurve(np.asarray(frequency_hz), np.asarray(gain)), shape="one-pole")
    assert code in codes(figures)
    assert figures.gbw_hz is None or figures.gbw_hz.bound is not None
    assert figures.corner_hz is None or figures.corner_hz.bound == "at least"


def test_poor_fit_against_stated_noise() -> None:
    """Residuals far above the stated noise are a poor fit; at the stated noise they are not."""
    stated = np.full(SWEPT.size, 1e-3)
    assert "poor fit" not in codes(extract(GainCurve(SWEPT, noisy(1), u_gain_rel=stated)))
    loud = noisy(1, noise=3e-3)
    assert "poor fit" in codes(extract(GainCurve(SWEPT, loud, u_gain_rel=stated)))


def test_false_alarms_are_rare() -> None:
    """Of 5,000 clean curves fewer than 0.5 % get any reason."""
    rng = np.random.default_rng(7)
    exact = one_pole(SWEPT, 48.0, 62.5e3)
    rows = exact * np.exp(1e-3 * rng.standard_normal((5000, SWEPT.size)))
    assert (extract_many(SWEPT, rows)["validity"] != 0).mean() < 0.005


def test_wrong_resistor() -> None:
    """A gain that the parts cannot give leaves GBW from the measured gain, and says so."""
    gain = 44.0
    figures = extract(GainCurve(SWEPT, one_pole(SWEPT, gain, 3e6 / gain)), DESIGN)
    assert codes(figures) == ["noise gain from the measured gain"]
    assert known(figures.gbw_hz)[0] == pytest.approx(3e6, rel=1e-3)


def test_flagged_points_are_left_out() -> None:
    """A flagged point does not move a figure, and its place is told."""
    gain = noisy(8)
    flags = np.zeros(41, np.int64)
    flags[20], wrong = 1, gain.copy()
    wrong[20] *= 3.0
    kept = np.flatnonzero(flags == 0)
    one = extract(GainCurve(SWEPT, wrong, flags=flags))
    other = extract(GainCurve(SWEPT[kept], gain[kept]))
    assert one.left_out == (20,)
    assert known(one.corner_hz)[0] == pytest.approx(known(other.corner_hz)[0], rel=1e-9)


def test_chi_squared_follows_its_distribution() -> None:
    """With stated noise the weighted residuals are chi squared with n - p degrees of freedom."""
    rng = np.random.default_rng(9)
    rows = one_pole(SWEPT, 48.0, 62.5e3) * np.exp(1e-3 * rng.standard_normal((2000, 41)))
    data = prepare(
        np.tile(SWEPT, (2000, 1)),
        rows,
        u_gain_rel=np.full(rows.shape, 1e-3),
        usable=np.ones(rows.shape, np.bool_),
    )
    fit = reduce_sweeps(shape_named("one-pole"), data).fit
    assert (fit.chi2 < chi2.ppf(0.05, 39)).mean() == pytest.approx(0.05, abs=0.015)
    assert (fit.chi2 > chi2.ppf(0.95, 39)).mean() == pytest.approx(0.05, abs=0.015)


def test_malformed_arguments() -> None:
    """Arrays that do not fit together and unknown shapes are refused; nothing else is."""
    with pytest.raises(CurveError, match="dimensions"):
        extract_many([1.0], [1.0])
    with pytest.raises(CurveError, match="frequency_hz has shape"):
        extract_many([1.0, 2.0], [[1.0, 2.0, 3.0]])
    with pytest.raises(Misuse, match="no shape"):
        extract_many([1.0], [[1.0]], shape="round")
    with pytest.raises(Misuse, match="no shape"):
        extract(GainCurve(np.ones(1), np.ones(1)), shape="round")


def test_empty_and_useless_rows() -> None:
    """A row of padding has no figures and says why."""
    got = extract_many(SWEPT, np.full((1, 41), np.nan))
    assert got["validity"][0] & Fault.TOO_FEW_POINTS
    assert np.isnan(got["gain"][0])
