"""Sine fits against the exact Fisher matrix and published asymptotic bounds.

Source:
    Rife and Boorstyn, IEEE Trans. IT 20(5), 1974 (complex tone; the real tone's frequency variance
    is twice as large); Andersson and Händel, IMEKO IWADC 2003 (bounds for both fits of IEEE Std
    1057); formulas from memory, figures recomputed from the Fisher matrix below.
"""

import numpy as np
import pytest
from scipy.optimize import curve_fit

from benchlog.capture.sinefit import fit_common, fit_known
from benchlog.curve import FloatArray

PHASE_RAD = 0.7


def fisher(count: int, cycles: float, *, amplitude: float, sigma: float) -> FloatArray:
    """Return exact standard deviations of A, phase at time zero, offset and angular frequency."""
    n = np.arange(count)
    angle = 2 * np.pi * cycles / count * n + PHASE_RAD
    slopes = np.stack(
        [np.cos(angle), -amplitude * np.sin(angle), np.ones(count), -amplitude * n * np.sin(angle)]
    )
    return np.asarray(sigma * np.sqrt(np.diag(np.linalg.inv(slopes @ slopes.T))))


@pytest.mark.parametrize(
    ("count", "cycles", "s_amplitude", "s_phase", "s_omega"),
    [
        (64, 5.0, 1.768897e-3, 3.460231e-3, 9.700867e-5),
        (64, 5.3, 1.793346e-3, 3.396360e-3, 9.203152e-5),
        (1000, 10.0, 4.472228e-4, 8.849884e-4, 1.552970e-6),
        (1000, 10.25, 4.506370e-4, 8.776472e-4, 1.515275e-6),
    ],
)
def test_stated_uncertainty_is_the_bound(
    count: int, cycles: float, s_amplitude: float, s_phase: float, s_omega: float
) -> None:
    """With A = 1 and sigma = 0.01: u over the residual's scatter is the exact bound over sigma."""
    exact = fisher(count, cycles, amplitude=1.0, sigma=0.01)
    assert exact[[0, 1, 3]] == pytest.approx([s_amplitude, s_phase, s_omega], rel=1e-6)

    time_s = np.arange(count, dtype=float)
    omega = 2 * np.pi * cycles / count
    noise = 0.01 * np.random.default_rng(4).standard_normal(count)
    fit = fit_common(time_s, (np.cos(omega * time_s + PHASE_RAD) + noise)[None, :])
    scatter = np.sqrt((fit.residuals**2).sum() / (count - 4)) / 0.01

    assert fit.u_amplitude[0] / scatter == pytest.approx(s_amplitude, rel=0.02)
    assert fit.u_phase_rad[0] / scatter == pytest.approx(s_phase, rel=0.02)
    assert 2 * np.pi * fit.u_frequency_hz / scatter == pytest.approx(s_omega, rel=0.02)


def test_scatter_reaches_the_bound() -> None:
    """800 records of 1000 samples, 10.25 cycles, A 1.2345, sigma 0.01: ratios of CHECKS within 8 %.

    The residual sums of squares have the mean (N - 3) and (N - 4) sigma squared.
    """
    count, cycles, amplitude, sigma = 1000, 10.25, 1.2345, 0.01
    time_s = np.arange(count, dtype=float)
    clean = amplitude * np.cos(2 * np.pi * cycles / count * time_s + PHASE_RAD)
    random = np.random.default_rng(11)
    known, common, sums = [], [], []
    for _ in range(800):
        samples = (clean + sigma * random.standard_normal(count))[None, :]
        three = fit_known(time_s, samples, cycles / count)
        four = fit_common(time_s, samples, 1.01 * cycles / count)
        known.append([three.amplitude[0], three.phase_rad[0]])
        common.append([four.amplitude[0], four.phase_rad[0], 2 * np.pi * four.frequency_hz])
        sums.append([(three.residuals**2).sum(), (four.residuals**2).sum()])

    exact = fisher(count, cycles, amplitude=amplitude, sigma=sigma)
    asymptotic = np.array([np.sqrt(2 / count), np.sqrt(2 / count) / amplitude]) * sigma
    assert np.std(known, axis=0) / asymptotic == pytest.approx([1, 1], abs=0.08)
    assert np.std(common, axis=0) / exact[[0, 1, 3]] == pytest.approx([1, 1, 1], abs=0.08)
    assert np.mean(sums, axis=0) / sigma**2 == pytest.approx([997, 996], abs=6)


def test_noise_free_record_converges_to_rounding() -> None:
    """From a frequency that is 1 % off."""
    time_s = np.asarray(np.arange(1000) * 1e-6, dtype=np.float64)
    angle = 2 * np.pi * 10.25e3 * time_s
    samples: FloatArray = np.stack([np.cos(angle + 0.1), 2.5 * np.cos(angle - 0.5) + 3.0])

    fit = fit_common(time_s, samples, 10.15e3)

    assert fit.converged
    assert fit.frequency_hz == pytest.approx(10.25e3, rel=1e-12)
    assert fit.amplitude == pytest.approx([1.0, 2.5], rel=1e-12)
    assert fit.phase_rad == pytest.approx([0.1, -0.5], rel=1e-9)
    assert fit.offset == pytest.approx([0.0, 3.0], abs=1e-12)


@pytest.mark.parametrize("cycles", [5.3, 12.0, 400.7])
def test_spectrum_finds_the_line(cycles: float) -> None:
    """Without a first guess, in noise of 40 dB."""
    time_s = np.asarray(np.arange(2000) * 1e-3, dtype=np.float64)
    noise = 7e-3 * np.random.default_rng(2).standard_normal((2, 2000))
    samples: FloatArray = np.cos(2 * np.pi * cycles / 2.0 * time_s)[None, :] + noise

    fit = fit_common(time_s, samples)

    assert abs(fit.frequency_hz - cycles / 2.0) < 5 * fit.u_frequency_hz
    assert abs(fit.amplitude[0] - 1.0) < 5 * fit.u_amplitude[0]


@pytest.mark.parametrize("snr_db", [40.0, 60.0])
def test_bias_and_scatter_at_a_broken_number_of_cycles(snr_db: float) -> None:
    """5.3 cycles in 64 samples, 600 records: no bias beyond its own noise, scatter at the bound."""
    sigma = 10 ** (-snr_db / 20) / np.sqrt(2)
    time_s = np.arange(64, dtype=np.float64)
    clean = np.cos(2 * np.pi * 5.3 / 64 * time_s + PHASE_RAD)
    random = np.random.default_rng(int(snr_db))
    fits = [
        fit_common(time_s, (clean + sigma * random.standard_normal(64))[None, :])
        for _ in range(600)
    ]
    found = np.array(
        [[fit.amplitude[0], fit.phase_rad[0], 2 * np.pi * fit.frequency_hz] for fit in fits]
    )
    exact = fisher(64, 5.3, amplitude=1.0, sigma=sigma)[[0, 1, 3]]
    truth = np.array([1.0, PHASE_RAD, 2 * np.pi * 5.3 / 64])

    assert np.all(np.abs(found.mean(axis=0) - truth) < 4 * exact / np.sqrt(600))
    assert found.std(axis=0) / exact == pytest.approx([1, 1, 1], abs=0.1)


def test_same_answer_from_general_libraries() -> None:
    """Numpy's least squares at the known frequency, scipy's curve_fit at the unknown one."""
    time_s = np.linspace(0.0, 1e-3, 500)
    random = np.random.default_rng(8)
    angle = 2 * np.pi * 7.3e3 * time_s
    samples = 0.5 * np.cos(angle - 0.4) + 0.1 + 1e-3 * random.standard_normal(500)

    basis = np.stack([np.cos(angle), np.sin(angle), np.ones(500)], axis=1)
    (cosine, sine, offset), *_ = np.linalg.lstsq(basis, samples, rcond=None)
    three = fit_known(time_s, samples[None, :], 7.3e3)
    assert three.amplitude[0] == pytest.approx(np.hypot(cosine, sine), rel=1e-12)
    assert three.phase_rad[0] == pytest.approx(np.arctan2(-sine, cosine), rel=1e-10)
    assert three.offset[0] == pytest.approx(offset, rel=1e-10)

    def model(t: FloatArray, *p: float) -> FloatArray:
        return np.asarray(p[0] * np.cos(2 * np.pi * p[1] * 1e3 * t + p[2]) + p[3])

    found, covariance = curve_fit(model, time_s, samples, p0=[0.5, 7.3, -0.4, 0.1])
    four = fit_common(time_s, samples[None, :])
    u = np.sqrt(np.diag(covariance))
    assert four.amplitude[0] == pytest.approx(found[0], rel=1e-6)
    assert four.frequency_hz == pytest.approx(1e3 * found[1], rel=1e-7)
    assert four.u_amplitude[0] == pytest.approx(u[0], rel=1e-3)
    assert four.u_phase_rad[0] == pytest.approx(u[2], rel=1e-3)
    assert four.u_frequency_hz == pytest.approx(1e3 * u[1], rel=1e-3)
