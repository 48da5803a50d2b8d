"""extract_many beside loops of curve_fit and lmfit, and one extract beside one curve_fit.

All on one-pole sweeps of 61 points with 0.1 % noise, in one process, in turn; processor time.
Prints one line for each pair: both times for a sweep, and the ratio.

    python tests/benchmarks/extraction.py [--small]
"""

import argparse
import time
from collections.abc import Callable

import numpy as np
from scipy.optimize import curve_fit

from benchlog.curve import FloatArray, GainCurve
from benchlog.extract.figures import extract
from benchlog.extract.many import extract_many

SWEPT: FloatArray = np.logspace(2, 6, 61)


def one_pole_db(frequency_hz: FloatArray, gain: float, log_corner: float) -> FloatArray:
    """Return gain in decibels, as a person at a bench would write it."""
    corner_hz = 10.0**log_corner
    return np.asarray(20 * np.log10(gain / np.sqrt(1 + (frequency_hz / corner_hz) ** 2)))


def two_pole_db(frequency_hz: FloatArray, gain: float, log_f0: float, q: float) -> FloatArray:
    """Return two poles in decibels."""
    x = frequency_hz / 10.0**log_f0
    return np.asarray(20 * np.log10(gain / np.abs(1 + 1j * x / q - x**2)))


def seconds_each(work: Callable[[], object], count: int, rounds: int = 3) -> float:
    """Return the best processor time of some rounds, for one of a number of sweeps."""
    took = []
    for _ in range(rounds):
        start = time.process_time()
        work()
        took.append((time.process_time() - start) / count)
    return min(took)


def loop(
    model: Callable[..., FloatArray], rows: FloatArray, start: tuple[float, ...]
) -> Callable[[], None]:
    """Return a loop of curve_fit over the sweeps."""

    def run() -> None:
        for gain in rows:
            curve_fit(model, SWEPT, 20 * np.log10(gain), p0=start)

    return run


def lmfit_loop(rows: FloatArray) -> Callable[[], None] | None:
    """Return a loop of lmfit over the sweeps; None where it is not installed."""
    try:
        import lmfit
    except ImportError:
        return None
    model = lmfit.Model(one_pole_db)

    def run() -> None:
        for gain in rows:
            model.fit(20 * np.log10(gain), frequency_hz=SWEPT, gain=40.0, log_corner=4.5)

    return run


def told(name: str, ours: float, theirs: float) -> None:
    """Print one line."""
    print(f"{name}: {ours * 1e6:.1f} us, {theirs * 1e6:.1f} us, ratio {theirs / ours:.1f}")  # noqa: T201


def main() -> None:
    """Measure and print."""
    options = argparse.ArgumentParser(description=__doc__)
    options.add_argument("--small", action="store_true", help="few sweeps")
    small = options.parse_args().small
    many, few = (200, 20) if small else (20_000, 300)
    noise = np.exp(1e-3 * np.random.default_rng(1).standard_normal((many, SWEPT.size)))
    one = noise * 48.0 / np.sqrt(1 + (SWEPT / 62.5e3) ** 2)
    x = SWEPT / 50e3
    two = noise * 48.0 / np.abs(1 + 1j * x / 1.2 - x**2)
    ours = seconds_each(lambda: extract_many(SWEPT, one, shape="one-pole"), many)
    theirs = seconds_each(loop(one_pole_db, one[:few], (40.0, 4.5)), few)
    told("extract_many one-pole, curve_fit", ours, theirs)
    with_lmfit = lmfit_loop(one[: few // 5])
    if with_lmfit is not None:
        told("extract_many one-pole, lmfit", ours, seconds_each(with_lmfit, few // 5))
    both = seconds_each(lambda: extract_many(SWEPT, two, shape="two-pole"), many)
    told(
        "extract_many two-pole, curve_fit",
        both,
        seconds_each(loop(two_pole_db, two[:few], (40.0, 4.5, 0.7)), few),
    )
    alone = seconds_each(lambda: extract(GainCurve(SWEPT, one[0])), 1, rounds=10)
    told("extract auto (ratio is its inverse), curve_fit", alone, theirs)


if __name__ == "__main__":
    main()
