"""Published relations of two-pole loops and of cascades, held against fitted shapes."""

import math

import numpy as np
import pytest

from benchlog.curve import FloatArray, GainCurve
from benchlog.extract.figures import extract
from benchlog.records import Figure

SWEPT: FloatArray = np.logspace(-3, 1.5, 91) * 1e5


def _number(figure: Figure | None) -> float:
    assert figure is not None
    return figure.value


@pytest.mark.parametrize(
    ("margin", "peak_db", "f3db", "second_pole"),
    [
        (30.0, 5.721, 1.5836, 0.5774),
        (45.0, 2.350, 1.6119, 1.0000),
        (50.0, 1.521, 1.6175, 1.1918),
        (60.0, 0.280, 1.6005, 1.7321),
        (70.0, 0.0, 1.4814, 2.7475),
        (76.345, 0.0, 1.3246, 4.1162),
    ],
)
def test_phase_margin(margin: float, peak_db: float, f3db: float, second_pole: float) -> None:
    """Peak and -3 dB point of a loop with crossover 100 kHz and a second pole at its phase margin.

    Source: exact two-pole loop relations (maximally flat at 65.5 degrees in Gray & Meyer, from
    memory); computed, four digits.
    """
    crossover = 1e5
    assert math.degrees(math.atan(second_pole)) == pytest.approx(margin, abs=0.01)
    # A loop L = wa/s/(1 + s/w2) that is 1 at the crossover.
    asymptote = crossover * math.sqrt(1 + second_pole**-2)
    s = 1j * SWEPT
    loop = asymptote / s / (1 + s / (second_pole * crossover))
    figures = extract(GainCurve(SWEPT, np.abs(20 * loop / (1 + loop))), shape="two-pole")
    assert _number(figures.corner_hz) / crossover == pytest.approx(f3db, rel=1e-4)
    assert _number(figures.peaking_db) == pytest.approx(peak_db, abs=6e-4)
    # Without a design, gain times Q times f0 is exact for such a loop.
    assert _number(figures.gbw_hz) == pytest.approx(20 * asymptote, rel=1e-6)


@pytest.mark.parametrize(
    ("zeta", "f3db"), [(0.1, 1.5428), (0.3, 1.4537), (0.5, 1.2720), (0.7071, 1.0), (1.0, 0.6436)]
)
def test_second_order(zeta: float, f3db: float) -> None:
    """f3dB/f0 = sqrt(1 - 2 z^2 + sqrt(2 - 4 z^2 + 4 z^4)), any textbook of control."""
    x = SWEPT / 1e5
    gain = 1 / np.abs(1 + 2j * zeta * x - x**2)
    figures = extract(GainCurve(SWEPT, gain), shape="two-pole")
    assert _number(figures.corner_hz) / 1e5 == pytest.approx(f3db, abs=6e-5)


@pytest.mark.parametrize(
    ("count", "shrinkage"),
    [(2, 0.643594), (3, 0.509825), (4, 0.434979), (5, 0.385614), (6, 0.349946), (8, 0.300845)],
)
def test_cascade(count: int, shrinkage: float) -> None:
    """N equal poles keep sqrt(2^(1/n) - 1) of the bandwidth (textbooks: 0.64, 0.51 for 2, 3)."""
    gain = 1000 / np.abs(1 + 1j * SWEPT / 1e5) ** count
    figures = extract(GainCurve(SWEPT, gain), shape=f"{count}-equal-poles")
    assert _number(figures.corner_hz) / 1e5 == pytest.approx(shrinkage, abs=1e-6)


@pytest.mark.parametrize(
    ("second_pole", "shift"), [(1, 1.2720), (2, 1.4142), (3, 1.3617), (5, 1.2304), (10, 1.1095)]
)
def test_ignored_second_pole(second_pole: float, shift: float) -> None:
    """Gain times corner would be high by this factor; gain times Q f0 is not (computed)."""
    s = 1j * SWEPT / 1e5
    loop = 1 / s / (1 + s / second_pole)
    figures = extract(GainCurve(SWEPT, np.abs(loop / (1 + loop))), shape="auto")
    assert figures.shape == "two-pole"
    assert _number(figures.corner_hz) / 1e5 == pytest.approx(shift, rel=1e-4)
    assert _number(figures.gbw_hz) == pytest.approx(1e5, rel=1e-4)
