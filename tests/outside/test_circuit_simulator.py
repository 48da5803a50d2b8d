"""Figures from curves that a circuit simulator computed, against what its netlists hold.

Source:
    ngspice, AC analysis of the netlists in ``netlists/``; each ``.out`` is its output (frequency,
    real part, frequency, imaginary part), committed so that these tests need no simulator.  Where
    it is installed the netlists are run again and compared.
"""

import shutil
import subprocess
from pathlib import Path

import numpy as np
import pytest
from scipy.interpolate import CubicSpline
from scipy.optimize import brentq

from benchlog.curve import ComplexArray, FloatArray, GainCurve
from benchlog.design.read import read_design
from benchlog.extract.figures import extract

NETLISTS = Path(__file__).parent / "netlists"
CASES = sorted(path.stem for path in NETLISTS.glob("*.cir"))

A0, GBW_HZ = 2e5, 3e6
# Gain between the corners by the netlist's resistors: ideal gain and noise gain, worked by hand.
GAINS = {
    "ac_coupled": (48.0, 48.0),
    "difference_minus": (4.7, 5.7),
    "difference_plus": (4.7, 5.7),
    "feedback_capacitor": (10.0, 11.0),
    "follower": (1.0, 1.0),
    "inverting_1": (1.0, 2.0),
    "inverting_10": (10.0, 11.0),
    "inverting_100": (100.0, 101.0),
    "non_inverting": (48.0, 48.0),
    "peaking": (2.0, 2.0),
    "summing": (100 / 33, 1 + 100 / 22 + 100 / 33 + 100 / 10),
    "three_stages": (10.0, 10.0),
    "two_stages": (10.0, 10.0),
}
STAGES = {"two_stages": 2, "three_stages": 3}
HALF_POWER = np.sqrt(0.5)


def simulated(path: Path) -> tuple[FloatArray, ComplexArray]:
    """Return frequency in hertz and complex gain of a simulator's output file."""
    columns = np.loadtxt(path)
    return columns[:, 0], columns[:, 1] + 1j * columns[:, 3]


def gain_of(case: str) -> float:
    """Return the gain between the corners that the netlist's resistors and A0 give."""
    if case == "open_loop":
        return A0
    ideal, noise_gain = GAINS[case]
    return float((ideal / (1 + noise_gain / A0)) ** STAGES.get(case, 1))


def crossings_of(frequency_hz: FloatArray, gain: ComplexArray, plateau: float) -> list[float]:
    """Return where a spline through the simulator's points crosses half power, rising order."""
    x, y = np.log(frequency_hz), np.log(np.abs(gain) / plateau / HALF_POWER)
    spline = CubicSpline(x, y)

    def relative_db(ln_frequency: float) -> float:
        return float(spline(ln_frequency))

    places = np.flatnonzero(np.diff(np.sign(y)))
    return [float(np.exp(brentq(relative_db, x[place], x[place + 1]))) for place in places]


def curve_of(case: str, *, phase: bool) -> GainCurve:
    """Return the simulator's curve as a capture would be."""
    frequency_hz, gain = simulated(NETLISTS / f"{case}.out")
    return GainCurve(frequency_hz, np.abs(gain), np.degrees(np.angle(gain)) if phase else None)


@pytest.mark.parametrize("phase", [False, True], ids=["magnitude", "with phase"])
@pytest.mark.parametrize("case", CASES)
def test_gain_and_corners_of_the_netlist(case: str, phase: bool) -> None:  # noqa: FBT001 - a case
    """Gain within 0.02 %, corners within 0.05 %."""
    figures = extract(curve_of(case, phase=phase), read_design(NETLISTS / f"{case}.toml"))
    *lower, corner_hz = crossings_of(*simulated(NETLISTS / f"{case}.out"), gain_of(case))

    assert figures.gain is not None, figures.validity
    assert figures.corner_hz is not None, figures.validity
    assert figures.gain.value == pytest.approx(gain_of(case), rel=2e-4)
    assert figures.corner_hz.value == pytest.approx(corner_hz, rel=5e-4)
    if lower:
        assert figures.lower_corner_hz is not None, figures.validity
        assert figures.lower_corner_hz.value == pytest.approx(lower[0], rel=5e-4)


@pytest.mark.parametrize("phase", [False, True], ids=["magnitude", "with phase"])
@pytest.mark.parametrize("case", [case for case in CASES if case != "feedback_capacitor"])
def test_gbw_of_the_netlist(case: str, phase: bool) -> None:  # noqa: FBT001 - a case
    """Within 0.5 %, through the design's own noise gain."""
    figures = extract(curve_of(case, phase=phase), read_design(NETLISTS / f"{case}.toml"))

    assert figures.gbw_hz is not None, figures.validity
    assert figures.gbw_hz.bound is None
    assert figures.gbw_hz.value == pytest.approx(GBW_HZ, rel=5e-3)
    assert figures.gbw_basis == "design"


def test_feedback_capacitor_hides_the_gbw() -> None:
    """With 0.3 % noise a faster amplifier would give the same curve: a bound, and its reason."""
    curve = curve_of("feedback_capacitor", phase=False)
    noise = np.random.default_rng(3).standard_normal(len(curve))
    noisy = GainCurve(
        curve.frequency_hz,
        curve.gain * (1 + 3e-3 * noise),
        u_gain_rel=np.full(len(curve), 3e-3),
    )

    figures = extract(noisy, read_design(NETLISTS / "feedback_capacitor.toml"))

    assert figures.gbw_hz is not None
    assert figures.gbw_hz.bound == "at least"
    assert figures.gbw_hz.value < GBW_HZ
    assert "feedback_capacitor" in str(figures.limited_by)


@pytest.mark.skipif(shutil.which("ngspice") is None, reason="ngspice is not installed")
@pytest.mark.parametrize("case", CASES)
def test_simulator_still_says_so(case: str, tmp_path: Path) -> None:
    """The committed curves are what the netlists give."""
    shutil.copy(NETLISTS / f"{case}.cir", tmp_path)
    subprocess.run(["ngspice", "-b", f"{case}.cir"], cwd=tmp_path, capture_output=True, check=False)
    frequency_hz, gain = simulated(tmp_path / f"{case}.out")
    committed_hz, committed = simulated(NETLISTS / f"{case}.out")

    assert frequency_hz == pytest.approx(committed_hz, rel=1e-9)
    assert np.abs(gain - committed) == pytest.approx(np.zeros(gain.size), abs=1e-9 * gain_of(case))
