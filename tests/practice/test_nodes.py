"""Node equations against what can be worked out by hand."""

import numpy as np
import pytest

from benchlog.curve import FloatArray
from benchlog.practice.nodes import EMF, GROUND, Netlist, OpAmp

FREQUENCY_HZ: FloatArray = np.geomspace(1.0, 1e7, 29)


def test_divider() -> None:
    """Two resistors share a voltage in the ratio of their values."""
    net = Netlist()
    net.resistor(EMF, "tap", 3e3)
    net.resistor("tap", GROUND, 1e3)
    np.testing.assert_allclose(net.solve(FREQUENCY_HZ).at("tap"), 0.25, rtol=1e-12)


def test_low_pass() -> None:
    """R and C make ``1 / (1 + j f/fc)`` with ``fc = 1 / (2 pi R C)``."""
    net = Netlist()
    net.resistor(EMF, "tap", 1e3)
    net.capacitor("tap", GROUND, 1e-9)
    corner_hz = 1 / (2 * np.pi * 1e3 * 1e-9)
    expected = 1 / (1 + 1j * FREQUENCY_HZ / corner_hz)
    np.testing.assert_allclose(net.solve(FREQUENCY_HZ).at("tap"), expected, rtol=1e-12)


def test_bridge() -> None:
    """Five resistors, worked by hand with two node equations.

    Node a: (1-a)/1 = (a-b)/5 + a/3, node b: (1-b)/2 = (b-a)/5 + b/4 (kilohm), so
    23a - 3b = 15 and -4a + 19b = 10: a = 315/425, b = 290/425.
    """
    net = Netlist()
    for one, other, ohm in (
        (EMF, "a", 1e3),
        ("a", GROUND, 3e3),
        (EMF, "b", 2e3),
        ("b", GROUND, 4e3),
        ("a", "b", 5e3),
    ):
        net.resistor(one, other, ohm)
    solution = net.solve(np.array([1.0]))
    assert solution.at("a")[0] == pytest.approx(315 / 425)
    assert solution.at("b")[0] == pytest.approx(290 / 425)


def test_open_loop_gain() -> None:
    """``1/A = (1/A0 + j f/GBW)(1 + j f/f2)``: A0 at DC, 1 in magnitude near the GBW."""
    amplifier = OpAmp(gbw_hz=1e6, open_loop_gain=2e5, second_pole_hz=3e6)
    inverse = amplifier.inverse_gain(np.array([1e-3, 5.0, 1e6]))
    assert abs(1 / inverse[0]) == pytest.approx(2e5)
    assert abs(1 / inverse[1]) == pytest.approx(2e5 / np.sqrt(2))
    assert abs(1 / inverse[2]) == pytest.approx(1 / np.sqrt(1 + 1 / 9), rel=1e-6)


def test_noise_sees_the_noise_gain_of_an_inverting_stage() -> None:
    """An inverting stage of -1 amplifies its own input noise by 2."""
    net = Netlist()
    net.resistor(EMF, "minus", 1e3)
    net.resistor("minus", "out", 1e3)
    net.op_amp(GROUND, "minus", out="out", amplifier=OpAmp(gbw_hz=1e6))
    low = np.array([1.0])
    assert net.solve(low).at("out")[0] == pytest.approx(-1.0, rel=1e-5)
    assert net.solve(low, from_amplifier=0).at("out")[0] == pytest.approx(2.0, rel=1e-5)


def test_emf_does_not_move_with_the_load() -> None:
    """The electromotive force is what it is."""
    net = Netlist()
    net.resistor(EMF, GROUND, 1e-3)
    assert net.solve(np.array([1.0])).at(EMF)[0] == 1.0
