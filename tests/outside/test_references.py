"""The same data through libraries that no one here wrote; each is skipped where it is absent."""

import numpy as np
import pytest
from scipy.optimize import curve_fit

from benchlog.curve import FloatArray, GainCurve
from benchlog.design.example import EXAMPLE_DESIGN
from benchlog.design.read import parse_design
from benchlog.extract.figures import extract
from benchlog.records import Figure

SWEPT: FloatArray = np.logspace(2, 6, 61)
NOISE = 2e-3


def noisy(seed: int, *, f0_hz: float = 62.5e3, q: float | None = None) -> FloatArray:
    """Return a noisy curve of one pole, or of two with a Q."""
    x = SWEPT / f0_hz
    exact = 48.0 / np.abs(1 + 1j * x) if q is None else 48.0 / np.abs(1 + 1j * x / q - x**2)
    return np.asarray(
        exact * np.exp(NOISE * np.random.default_rng(seed).standard_normal(SWEPT.size))
    )


def one_pole(frequency_hz: FloatArray, ln_gain: float, ln_corner: float) -> FloatArray:
    """Return ln gain of one pole."""
    return np.asarray(ln_gain - 0.5 * np.log1p((frequency_hz / np.exp(ln_corner)) ** 2))


def two_pole(frequency_hz: FloatArray, ln_gain: float, ln_f0: float, ln_q: float) -> FloatArray:
    """Return ln gain of two poles."""
    square = (frequency_hz / np.exp(ln_f0)) ** 2
    return np.asarray(ln_gain - 0.5 * np.log((1 - square) ** 2 + square * np.exp(-2 * ln_q)))


def known(figure: Figure | None) -> tuple[float, float]:
    """Return value and u."""
    assert figure is not None
    assert figure.u is not None
    return figure.value, figure.u


@pytest.mark.parametrize("stated", [False, True], ids=["residuals", "stated noise"])
@pytest.mark.parametrize("seed", range(4))
def test_curve_fit(seed: int, stated: bool) -> None:  # noqa: FBT001 - a case of the table
    """The curve_fit of scipy gives the same gain and corner, and the same uncertainties."""
    gain = noisy(seed)
    sigma = np.full(SWEPT.size, NOISE) if stated else None
    best, covariance = curve_fit(
        one_pole, SWEPT, np.log(gain), p0=(3.0, 10.0), sigma=sigma, absolute_sigma=stated
    )
    u = np.sqrt(np.diag(covariance))
    figures = extract(GainCurve(SWEPT, gain, u_gain_rel=sigma), shape="one-pole")
    for place, figure in enumerate((figures.gain, figures.corner_hz)):
        value = np.exp(best[place])
        assert known(figure)[0] == pytest.approx(value, rel=1e-6)
        assert known(figure)[1] == pytest.approx(value * u[place], rel=1e-4)


def test_lmfit() -> None:
    """The models of lmfit give the same two-pole parameters, through its own minimiser."""
    lmfit = pytest.importorskip("lmfit", reason="lmfit is not installed")
    gain = noisy(5, q=1.3)
    fitted = lmfit.Model(two_pole).fit(
        np.log(gain), frequency_hz=SWEPT, ln_gain=3.8, ln_f0=11.0, ln_q=0.0
    )
    figures = extract(GainCurve(SWEPT, gain), shape="two-pole")
    value, u = known(figures.gain)
    assert value == pytest.approx(np.exp(fitted.params["ln_gain"].value), rel=1e-6)
    assert u / value == pytest.approx(fitted.params["ln_gain"].stderr, rel=1e-3)
    gbw = np.exp(sum(fitted.params[name].value for name in ("ln_gain", "ln_f0", "ln_q")))
    assert known(figures.gbw_hz)[0] == pytest.approx(gbw, rel=1e-5)


def test_uncertainties() -> None:
    """The package uncertainties propagates the same covariance to the same u of GBW."""
    uncertainties = pytest.importorskip("uncertainties", reason="uncertainties is not installed")
    gain = noisy(6)
    best, covariance = curve_fit(one_pole, SWEPT, np.log(gain), p0=(3.0, 10.0))
    ln_gain, ln_corner = uncertainties.correlated_values(best, covariance)
    total = ln_gain + ln_corner
    value, u = known(extract(GainCurve(SWEPT, gain), shape="one-pole").gbw_hz)
    assert value == pytest.approx(np.exp(total.nominal_value), rel=1e-6)
    assert u / value == pytest.approx(total.std_dev, rel=1e-4)


def test_control() -> None:
    """python-control closes the example design's loop with the same gain and corner."""
    control = pytest.importorskip("control", reason="python-control is not installed")
    s = control.tf("s")
    open_loop = 200e3 / (1 + s / (2 * np.pi * 3e6 / 200e3))
    closed = control.feedback(open_loop, 1 / 48)
    response = np.abs(closed(2j * np.pi * SWEPT))
    figures = extract(GainCurve(SWEPT, response), parse_design(EXAMPLE_DESIGN, where="example"))
    assert known(figures.gain)[0] == pytest.approx(abs(control.dcgain(closed)), rel=1e-9)
    pole_hz = abs(control.poles(closed)[0]) / 2 / np.pi
    assert known(figures.corner_hz)[0] == pytest.approx(pole_hz, rel=1e-9)
    assert known(figures.gbw_hz)[0] == pytest.approx(3e6, rel=1e-9)


def test_monte_carlo_of_the_same_model() -> None:
    """Drawn noise and a drawn flatness band scatter the corner as its u says (JCGM 101)."""
    from benchlog.extract.many import extract_many
    from benchlog.records import Term

    rng, draws = np.random.default_rng(7), 4000
    band = (SWEPT >= 3e4) & (SWEPT <= 1e6)
    exact = 48.0 / np.sqrt(1 + (SWEPT / 62.5e3) ** 2)
    moved = 3e-3 * rng.standard_normal((draws, 1)) * band + 2e-3 * rng.standard_normal((draws, 61))
    got = extract_many(SWEPT, exact * np.exp(moved), u_gain_rel=2e-3, shape="one-pole")
    term = Term(name="flatness", kind="flatness", u_rel=3e-3, band_hz=(3e4, 1e6))
    curve = GainCurve(SWEPT, exact, u_gain_rel=np.full(61, 2e-3), terms=(term,))
    _, u = known(extract(curve, shape="one-pole").corner_hz)
    assert np.nanstd(got["corner_hz"]) == pytest.approx(u, rel=0.03)
