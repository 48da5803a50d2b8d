"""Published examples of JCGM 100:2008, recomputed with the room's own functions."""

import math

import numpy as np
import pytest

from benchlog.curve import FloatArray
from benchlog.extract.solve import solve
from benchlog.extract.uncertainty import Cause, coverage_factor, effective_dof, shares_of
from benchlog.records import TermShare


class Line:
    """A straight line in t, as a shape for the solver."""

    name = "line"
    parameters = ("y1", "y2")

    def start(self, ln_frequency: FloatArray, ln_gain: FloatArray, used: FloatArray) -> FloatArray:
        """Start at zero."""
        del ln_gain, used
        return np.zeros((len(ln_frequency), 2))

    def evaluate(
        self, parameters: FloatArray, ln_frequency: FloatArray
    ) -> tuple[FloatArray, FloatArray]:
        """Return the line and its derivatives."""
        values = parameters[:, :1] + parameters[:, 1:] * ln_frequency
        return values, np.stack([np.ones_like(values), ln_frequency], axis=2)


def test_thermometer_calibration() -> None:
    """JCGM 100:2008, H.3: parameters, standard uncertainties, correlation (stored data, CHECKS)."""
    t = "21.521 22.012 22.512 23.003 23.507 23.999 24.513 25.002 25.503 26.010 26.511"
    b = "-.171 -.169 -.166 -.159 -.164 -.165 -.156 -.157 -.159 -.161 -.160"
    x = np.array([[float(one) - 20.0 for one in t.split()]])
    y = np.array([[float(one) for one in b.split()]])
    fit = solve(Line(), x, y, weight=np.ones_like(x))
    covariance = fit.inverse_normal[0] * fit.chi2[0] / 9
    u1, u2 = np.sqrt(np.diag(covariance))
    assert fit.parameters[0] == pytest.approx([-0.1712037901, 0.002182697740], rel=1e-8)
    assert (u1, u2) == pytest.approx((0.00287760, 0.000667938773), rel=1e-5)
    assert covariance[0, 1] / u1 / u2 == pytest.approx(-0.930430, abs=1e-6)
    at_30 = np.array([1.0, 10.0])
    cause = Cause(name="s", kind="A", covariance=covariance, dof=9)
    assert at_30 @ fit.parameters[0] == pytest.approx(-0.1493768, abs=1e-7)
    assert cause.share(at_30) == pytest.approx(0.0041386, abs=1e-7)


def _means_and_covariance() -> tuple[FloatArray, FloatArray]:
    sets = np.array(
        [
            [5.007, 19.663e-3, 1.0456],
            [4.994, 19.639e-3, 1.0438],
            [5.005, 19.640e-3, 1.0468],
            [4.990, 19.685e-3, 1.0428],
            [4.999, 19.678e-3, 1.0433],
        ]
    )
    return sets.mean(axis=0), np.cov(sets.T) / 5


def test_impedance_with_covariance() -> None:
    """JCGM 100:2008, H.2: u(R) 0.071, u(X) 0.295 (0.2956 unrounded), u(Z) 0.236 ohm."""
    (volt, ampere, phi), covariance = _means_and_covariance()
    cause = Cause(name="sets", kind="A", covariance=covariance, dof=4)
    z = volt / ampere
    r, x = z * math.cos(phi), z * math.sin(phi)
    u = [
        shares_of([cause], np.array(s), scale=value)[0].u
        for value, s in (
            (r, [1 / volt, -1 / ampere, -math.tan(phi)]),
            (x, [1 / volt, -1 / ampere, 1 / math.tan(phi)]),
            (z, [1 / volt, -1 / ampere, 0.0]),
        )
    ]
    assert (r, x, z) == pytest.approx((127.732170, 219.846512, 254.259702), abs=1e-5)
    assert u == pytest.approx([0.071071, 0.295582, 0.236336], abs=2e-6)


def test_dropped_covariances_are_far_off() -> None:
    """JCGM 100:2008, H.2, Table H.5 (from memory): without correlations u(R) would be 0.195."""
    (volt, ampere, phi), covariance = _means_and_covariance()
    alone = Cause(name="", kind="A", covariance=np.diag(np.diag(covariance)), dof=4)
    s = np.array([1 / volt, -1 / ampere, -math.tan(phi)])
    assert alone.share(s) * volt / ampere * math.cos(phi) == pytest.approx(0.194544, abs=1e-6)


def _terms(*pairs: tuple[float, float]) -> list[TermShare]:
    return [TermShare(name="", u=u, dof=dof, kind="A") for u, dof in pairs]


def test_effective_degrees_of_freedom() -> None:
    """JCGM 100:2008, G.4.1 example (from memory): 19.0."""
    assert effective_dof(_terms((0.25, 9), (0.57, 4), (0.82, 14))) == pytest.approx(
        18.9987, abs=1e-4
    )


def test_end_gauge() -> None:
    """JCGM 100:2008, H.1: u_c 32 nm (31.664), 16.75 degrees of freedom, t99(16) 2.92."""
    difference = _terms((5.8, 24), (3.9, 5), (6.7, 8))
    u_difference = math.sqrt(sum(term.u**2 for term in difference))
    assert u_difference == pytest.approx(9.68194, abs=1e-5)
    assert effective_dof(difference) == pytest.approx(25.447, abs=1e-3)
    expansion = 50.000623e6 * 1e-6 / math.sqrt(3) * 0.1
    temperature = 50.000623e6 * 11.5e-6 * 0.05 / math.sqrt(3)
    terms = _terms((25, 18), (u_difference, 25.447), (expansion, 50), (temperature, 2))
    assert math.sqrt(sum(term.u**2 for term in terms)) == pytest.approx(31.664, abs=1e-3)
    assert effective_dof(terms) == pytest.approx(16.752, abs=2e-3)


@pytest.mark.parametrize(
    ("dof", "k"),
    [
        (1, 13.97),
        (2, 4.53),
        (3, 3.31),
        (4, 2.87),
        (5, 2.65),
        (9, 2.32),
        (10, 2.28),
        (16, 2.17),
        (19, 2.14),
        (20, 2.13),
        (50, 2.05),
        (100, 2.03),
    ],
)
def test_coverage_factors(dof: float, k: float) -> None:
    """JCGM 100:2008, Table G.2 (from memory): Student's t at 95.45 %."""
    assert coverage_factor(dof) == pytest.approx(k, abs=0.0051)


def test_infinite_degrees_of_freedom() -> None:
    """JCGM 100:2008, 6.3.3: k is 2 for the normal distribution."""
    assert coverage_factor(math.inf) == 2.0
    assert effective_dof(_terms((1.0, math.inf), (2.0, math.inf))) == math.inf
