"""Magnitude and phase together: formulas, delay and sign, coverage, and phase left out."""

import numpy as np
import pytest

from benchlog.curve import ComplexArray, FloatArray, GainCurve
from benchlog.extract.choose import shape_named
from benchlog.extract.figures import extract
from benchlog.extract.many import FIGURES, extract_many
from benchlog.extract.validity import Fault

SWEPT: FloatArray = np.logspace(0, 6, 61)
TRUTH: dict[str, list[float]] = {
    "one-pole": [48.0, 62.5e3],
    "two-pole": [48.0, 50e3, 1.2],
    "3-equal-poles": [48.0, 120e3],
    "one-pole+lower-corner": [48.0, 62.5e3, 20.0],
    "one-pole+shelf": [48.0, 62.5e3, 20.0],
}
NOISE = 2e-3


def response(name: str) -> ComplexArray:
    """Return the complex response of a shape, by complex arithmetic."""
    s = SWEPT.astype(complex) * 1j
    gain, upper = TRUTH[name][:2]
    h = gain / (1 + s / upper) ** (3 if name.startswith("3") else 1)
    if name.startswith("two-pole"):
        h = gain / (1 + s / (TRUTH[name][2] * upper) + (s / upper) ** 2)
    if name.endswith("lower-corner"):
        h = h * s / (s + TRUTH[name][-1])
    if name.endswith("shelf"):
        h = h * (s + TRUTH[name][-1] / gain) / (s + TRUTH[name][-1])
    return np.asarray(h, dtype=np.complex128)


def noisy(
    name: str, seed: int, rows: int, *, delay_s: float = 40e-9, sign: float = -1.0
) -> ComplexArray:
    """Return noisy curves of an inverting board behind a delay, shape (rows, points)."""
    rng = np.random.default_rng(seed)
    scatter = rng.standard_normal((rows, 61)) + 1j * rng.standard_normal((rows, 61))
    turned = sign * np.exp(-2j * np.pi * SWEPT * delay_s)
    return np.asarray(response(name) * turned * np.exp(NOISE * scatter), dtype=np.complex128)


@pytest.mark.parametrize("name", TRUTH)
def test_phase_and_its_derivatives(name: str) -> None:
    """The real formula is the complex one's phase, and derivatives equal differences."""
    shape, step = shape_named(name), 1e-6
    centre, x = np.log(TRUTH[name])[None, :], np.log(SWEPT)[None, :]
    phase, by = shape.phase(centre, x)
    assert np.exp(1j * phase[0]) == pytest.approx(np.exp(1j * np.angle(response(name))), abs=1e-9)
    for place in range(centre.shape[1]):
        move = np.zeros_like(centre)
        move[0, place] = step
        slope = (shape.phase(centre + move, x)[0] - shape.phase(centre - move, x)[0]) / (2 * step)
        assert by[0, :, place] == pytest.approx(slope[0], abs=1e-7)


@pytest.mark.parametrize("name", TRUTH)
@pytest.mark.parametrize("stated", [False, True], ids=["residuals", "stated"])
def test_coverage_with_phase(name: str, stated: bool) -> None:  # noqa: FBT001 - a case
    """Of 1,000 draws with phase 93-97.5 % of the 95.45 % intervals hold the truth."""
    h = noisy(name, 21, 1000)
    got = extract_many(
        SWEPT,
        np.abs(h),
        phase_deg=np.degrees(np.angle(h)),
        u_gain_rel=NOISE if stated else None,
        shape=name,
    )
    alone = extract_many(SWEPT, np.abs(h), u_gain_rel=NOISE if stated else None, shape=name)
    exact = extract_many(SWEPT, np.abs(response(name))[None, :], shape=name)
    for figure in FIGURES:
        truth = exact[figure][0]
        if not np.isfinite(truth) or truth == 0.0:
            continue
        error = np.abs(got[figure] - truth) / got[f"u_{figure}"]
        good = np.isfinite(error)
        assert good.mean() > 0.98, figure
        assert 0.93 < (error[good] < 2.0).mean() < 0.975, figure
    assert np.nanmean(got["u_corner_hz"]) < 0.95 * np.nanmean(alone["u_corner_hz"])


@pytest.mark.parametrize("sign", [-1.0, 1.0])
@pytest.mark.parametrize("delay_s", [0.0, 300e-9])
def test_delay_and_sign_are_free(sign: float, delay_s: float) -> None:
    """Neither an inverting board nor a delay moves a figure."""
    h = noisy("one-pole", 22, 1, sign=sign, delay_s=delay_s)[0]
    figures = extract(GainCurve(SWEPT, np.abs(h), np.degrees(np.angle(h))))
    assert figures.corner_hz is not None
    assert figures.corner_hz.u is not None
    assert figures.validity == ()
    assert abs(figures.corner_hz.value - 62.5e3) < 4 * figures.corner_hz.u


def test_phase_that_disagrees_is_left_out() -> None:
    """A swapped pair of channels: the figures are those of the magnitude, and it is said."""
    h = noisy("one-pole", 23, 1)[0]
    wrong = GainCurve(SWEPT, np.abs(h), np.degrees(np.angle(np.conj(h))))
    figures, alone = extract(wrong), extract(GainCurve(SWEPT, np.abs(h)))
    assert [reason.code for reason in figures.validity] == ["phase disagrees with magnitude"]
    assert figures.corner_hz == alone.corner_hz
    assert figures.gain == alone.gain
    assert figures.shapes_tried == alone.shapes_tried


def test_one_and_many_agree_with_phase() -> None:
    """The same digits alone and in arrays, with phase that agrees and with one that does not."""
    h = noisy("one-pole", 24, 2)
    phase = np.degrees(np.angle(h))
    phase[1] *= -1
    many = extract_many(SWEPT, np.abs(h), phase_deg=phase)
    for row in range(2):
        one = extract(GainCurve(SWEPT, np.abs(h[row]), phase[row])).corner_hz
        assert one is not None
        assert many["corner_hz"][row] == pytest.approx(one.value, rel=1e-8)
    assert many["validity"].tolist() == [0, int(Fault.PHASE_DISAGREES)]


def test_phase_noise_of_another_size() -> None:
    """A phase meter ten times as noisy as the voltmeter costs nothing and alarms no one."""
    rng = np.random.default_rng(25)
    exact = response("one-pole")
    gain = np.abs(exact) * np.exp(1e-3 * rng.standard_normal((500, 61)))
    phase = np.degrees(np.angle(exact)) + 0.5 * rng.standard_normal((500, 61))
    got = extract_many(SWEPT, gain, phase_deg=phase, shape="one-pole")
    alone = extract_many(SWEPT, gain, shape="one-pole")
    assert (got["validity"] != 0).mean() < 0.01
    assert np.nanmean(got["u_corner_hz"]) < 1.02 * np.nanmean(alone["u_corner_hz"])
    error = np.abs(got["corner_hz"] - 62.5e3) / got["u_corner_hz"]
    assert (error < 2.0).mean() > 0.93
