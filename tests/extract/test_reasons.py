"""Reasons that take figures away fire when they must, and not for healthy curves."""

import numpy as np
import pytest

from benchlog.curve import FloatArray, GainCurve
from benchlog.extract.figures import extract

FREQUENCY_HZ = np.logspace(2, 6.3, 44)


def codes(gain: FloatArray, *, shape: str = "one-pole", u: float | None = None) -> set[str]:
    """Return the reasons that a curve gets."""
    noise = None if u is None else np.full(gain.shape, u)
    curve = GainCurve(FREQUENCY_HZ, gain, u_gain_rel=noise)
    return {reason.code for reason in extract(curve, shape=shape).validity}


def one_pole(seed: int = 0, noise: float = 1e-3) -> FloatArray:
    """Return a healthy board."""
    random = np.random.default_rng(seed)
    clean = 48.0 / np.hypot(1.0, FREQUENCY_HZ / 62.5e3)
    return np.asarray(clean * np.exp(noise * random.standard_normal(FREQUENCY_HZ.size)))


@pytest.mark.parametrize("noise", [1e-4, 1e-3, 1e-2])
@pytest.mark.parametrize("stated", [False, True], ids=["from residuals", "stated"])
def test_healthy_boards_get_no_reason(noise: float, *, stated: bool) -> None:
    """Hardly any false alarm in 300 draws."""
    u = noise if stated else None
    alarms = [codes(one_pole(seed, noise), u=u) for seed in range(300)]

    assert sum(bool(alarm) for alarm in alarms) <= 3


def test_steep_fall_is_not_first_order() -> None:
    """Two equal poles read as one: no GBW from that slope."""
    shape = np.hypot(1, FREQUENCY_HZ / 62.5e3) / (1 + (FREQUENCY_HZ / 1e5) ** 2)

    assert "slope not first order" in codes(one_pole() * shape)


def test_floor_of_noise_is_named() -> None:
    """The curve stops falling at a gain of 3."""
    gain = np.hypot(one_pole(), 3.0)

    found = codes(gain)

    assert "noise floor reached" in found
    curve = GainCurve(FREQUENCY_HZ, gain)
    assert extract(curve, shape="one-pole").corner_hz is None


def test_parameter_that_nothing_tells_is_named() -> None:
    """A second pole far beyond the sweep, asked for."""
    found = codes(one_pole(noise=1e-5), shape="two-pole")

    assert found & {"parameter not determined", "fit did not converge"}


@pytest.mark.parametrize("count", [3, 4])
def test_equal_poles_are_found_without_a_design(count: int) -> None:
    """Gain and corner come out; there is no GBW, and the reason says why."""
    random = np.random.default_rng(5)
    noise = np.exp(1e-3 * random.standard_normal(FREQUENCY_HZ.size))
    gain = 1000.0 * np.hypot(1.0, FREQUENCY_HZ / 1e5) ** -count * noise
    corner_hz = 1e5 * np.sqrt(2 ** (1 / count) - 1)

    figures = extract(GainCurve(FREQUENCY_HZ, gain))

    assert figures.shape == f"{count}-equal-poles"
    assert figures.corner_hz is not None
    assert figures.corner_hz.value == pytest.approx(corner_hz, rel=3e-3)
    assert figures.gbw_hz is None
    assert "GBW needs a design" in {reason.code for reason in figures.validity}
