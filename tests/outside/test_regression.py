"""Certified nonlinear regressions, solved by the room's own solver.

Source:
    NIST Statistical Reference Datasets, nonlinear regression: data, certified parameters,
    standard deviations and residual sums of squares.
"""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import pytest

from benchlog.curve import FloatArray
from benchlog.extract.solve import solve

_MISRA = (
    "77.6,10.07 114.9,14.73 141.1,17.94 190.8,23.93 239.9,29.61 289.0,35.18 332.8,40.02"
    " 378.4,44.82 434.8,50.76 477.3,55.05 536.8,61.01 593.1,66.40 689.1,75.47 760.0,81.78"
)


@dataclass(frozen=True, kw_only=True)
class Certified:
    """One set: its model, its second start, and what is certified."""

    data: str
    model: Callable[[FloatArray, FloatArray], FloatArray]
    start: tuple[float, ...]
    value: tuple[float, ...]
    deviation: tuple[float, ...]
    squares: float


SETS = {
    "Misra1a": Certified(
        data=_MISRA,
        model=lambda b, x: b[0] * (1 - np.exp(-b[1] * x)),
        start=(250, 5e-4),
        value=(2.3894212918e02, 5.5015643181e-04),
        deviation=(2.7070075241e00, 7.2668688436e-06),
        squares=1.2455138894e-01,
    ),
    "Misra1b": Certified(
        data=_MISRA,
        model=lambda b, x: b[0] * (1 - (1 + b[1] * x / 2) ** -2),
        start=(300, 2e-4),
        value=(3.3799746163e02, 3.9039091287e-04),
        deviation=(3.1643950207e00, 4.2547321834e-06),
        squares=7.5464681533e-02,
    ),
    "Misra1c": Certified(
        data=_MISRA,
        model=lambda b, x: b[0] * (1 - (1 + 2 * b[1] * x) ** -0.5),
        start=(600, 2e-4),
        value=(6.3642725809e02, 2.0813627256e-04),
        deviation=(4.6638326572e00, 1.7728423155e-06),
        squares=4.0966836971e-02,
    ),
    "Misra1d": Certified(
        data=_MISRA,
        model=lambda b, x: b[0] * b[1] * x / (1 + b[1] * x),
        start=(450, 3e-4),
        value=(4.3736970754e02, 3.0227324449e-04),
        deviation=(3.6489174345e00, 2.9334354479e-06),
        squares=5.6419295283e-02,
    ),
    "DanWood": Certified(
        data="1.309,2.138 1.471,3.421 1.490,3.597 1.565,4.340 1.611,4.882 1.680,5.660",
        model=lambda b, x: b[0] * x ** b[1],
        start=(0.7, 4),
        value=(7.6886226176e-01, 3.8604055871e00),
        deviation=(1.8281973860e-02, 5.1726610913e-02),
        squares=4.3173084083e-03,
    ),
    "MGH09": Certified(
        data="4,.1957 2,.1947 1,.1735 .5,.1600 .25,.0844 .167,.0627 .125,.0456 .1,.0342"
        " .0833,.0323 .0714,.0235 .0625,.0246",
        model=lambda b, x: b[0] * (x**2 + b[1] * x) / (x**2 + b[2] * x + b[3]),
        start=(0.25, 0.39, 0.415, 0.39),
        value=(1.9280693458e-01, 1.9128232873e-01, 1.2305650693e-01, 1.3606233068e-01),
        deviation=(1.1435312227e-02, 1.9633220911e-01, 8.0842031232e-02, 9.0025542308e-02),
        squares=3.0750560385e-04,
    ),
    "Rat42": Certified(
        data="9,8.93 14,10.80 21,18.59 28,22.33 42,39.35 57,56.11 63,61.73 70,64.62 79,67.08",
        model=lambda b, x: b[0] / (1 + np.exp(b[1] - b[2] * x)),
        start=(75, 2.5, 0.07),
        value=(7.2462237576e01, 2.6180768402e00, 6.7359200066e-02),
        deviation=(1.7340283401e00, 8.8295217536e-02, 3.4465663377e-03),
        squares=8.0565229338e00,
    ),
    "BoxBOD": Certified(
        data="1,109 2,149 3,149 5,191 7,213 10,224",
        model=lambda b, x: b[0] * (1 - np.exp(-b[1] * x)),
        start=(100, 0.75),
        value=(2.1380940889e02, 5.4723748542e-01),
        deviation=(1.2354515176e01, 1.0455993237e-01),
        squares=1.1680088766e03,
    ),
}


class _Logarithmic:
    """A model whose positive parameters the solver sees as logarithms, like the house's shapes."""

    name = "certified"

    def __init__(self, certified: Certified) -> None:
        self._model = certified.model
        self._start = np.log(certified.start)
        self.parameters = tuple(f"ln_b{place}" for place in range(len(certified.start)))

    def start(self, ln_frequency: FloatArray, ln_gain: FloatArray, used: FloatArray) -> FloatArray:
        """Start where the set says."""
        del ln_gain, used
        return np.tile(self._start, (len(ln_frequency), 1))

    def evaluate(
        self, parameters: FloatArray, ln_frequency: FloatArray
    ) -> tuple[FloatArray, FloatArray]:
        """Return the model and its derivatives, by complex steps: exact to rounding."""
        b = np.exp(parameters[0]).astype(complex)
        x = ln_frequency[0].astype(complex)
        step = 1e-30
        derivatives = []
        for place, value in enumerate(b):
            moved = b.copy()
            moved[place] = value * np.exp(1j * step)
            derivatives.append(np.imag(self._model(moved, x)) / step)
        values = np.real(self._model(b, x))
        return values[None, :], np.stack(derivatives, axis=1)[None, :, :]


@pytest.mark.parametrize("name", SETS)
def test_certified_set(name: str) -> None:
    """NIST StRD: six digits of each parameter, standard deviation and sum of squares."""
    certified = SETS[name]
    data = np.array([pair.split(",") for pair in certified.data.split()], dtype=float)
    fit = solve(
        _Logarithmic(certified), data[None, :, 0], data[None, :, 1], weight=np.ones((1, len(data)))
    )
    values = np.exp(fit.parameters[0])
    variance = fit.chi2[0] / (len(data) - len(values))
    deviations = values * np.sqrt(np.diag(fit.inverse_normal[0]) * variance)
    assert fit.converged.all()
    assert values == pytest.approx(certified.value, rel=1e-6)
    assert deviations == pytest.approx(certified.deviation, rel=1e-6)
    assert fit.chi2[0] == pytest.approx(certified.squares, rel=1e-8)
