"""Straight equations and one step beside a fit that goes on to the last digit."""

import numpy as np
import pytest
from scipy.optimize import least_squares

from benchlog.curve import FloatArray
from benchlog.extract.choose import shape_named
from benchlog.extract.models.polynomial import weighted_polynomial
from benchlog.extract.solve import Fit, solve

SWEPT: FloatArray = np.logspace(2, 6, 61)
NAMES = ("one-pole", "two-pole", "3-equal-poles")


def _truth(name: str) -> FloatArray:
    own = {"two-pole": [np.log(5e4), 0.1]}.get(name, [np.log(6e4)])
    return np.array([[np.log(48.0), *own]])


@pytest.mark.parametrize("noise", [1e-4, 1e-3, 1e-2, 0.1])
@pytest.mark.parametrize("name", NAMES)
def test_within_a_thousandth_of_u(name: str, noise: float) -> None:
    """Padded sweeps with noise of unequal size end where a general solver ends."""
    rng = np.random.default_rng(21)
    shape, x = shape_named(name), np.broadcast_to(np.log(SWEPT), (20, SWEPT.size))
    sigma = noise * rng.uniform(0.5, 2.0, x.shape)
    y = shape.evaluate(np.repeat(_truth(name), 20, axis=0), x)[0]
    y = y + sigma * rng.standard_normal(x.shape)
    weight = np.where(rng.random(x.shape) < 0.1, 0.0, sigma**-2.0)
    fit: Fit = solve(shape, x, np.where(weight > 0, y, np.nan), weight=weight)
    assert fit.converged.all()
    u = np.sqrt(np.einsum("spp->sp", fit.inverse_normal))
    for row in range(20):
        used = weight[row] > 0

        def away(p: FloatArray, row: int = row, used: FloatArray = used) -> FloatArray:
            values = shape.evaluate(p[None, :], x[row : row + 1])[0][0]
            return np.asarray((y[row] - values)[used] / sigma[row][used])

        best = least_squares(away, _truth(name)[0], xtol=1e-15, ftol=1e-15, gtol=1e-15)
        assert np.abs((fit.parameters[row] - best.x) / u[row]).max() < 1e-3


@pytest.mark.parametrize("name", NAMES)
def test_rows_of_their_own_frequencies(name: str) -> None:
    """A frequency row for all sweeps and the same row for each give the same parameters."""
    shape, x = shape_named(name), np.broadcast_to(np.log(SWEPT), (3, SWEPT.size))
    y = shape.evaluate(np.repeat(_truth(name), 3, axis=0), x)[0]
    y = y + 1e-3 * np.random.default_rng(22).standard_normal(x.shape)
    shared, own = (solve(shape, given, y, weight=np.ones(x.shape)) for given in (x, x.copy()))
    assert shared.parameters == pytest.approx(own.parameters, abs=1e-8)


@pytest.mark.parametrize("degree", [1, 2])
def test_polynomial_comes_back(degree: int) -> None:
    """Exact data give the coefficients that they were made of."""
    variable = np.linspace(0.1, 3.0, 20)[None, :]
    wanted = np.array([[2.0, 0.7, 0.3]])[:, : degree + 1]
    size = 1.0 / sum(c * variable**power for power, c in enumerate(wanted[0]))
    got = weighted_polynomial(size, variable, np.ones(size.shape), degree=degree)
    assert got == pytest.approx(wanted, rel=1e-9)
