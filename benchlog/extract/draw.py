"""Every figure of many fitted sweeps as a logarithm with its derivatives by the parameters."""

import numpy as np

from benchlog.curve import FloatArray
from benchlog.extract.implied import Implied
from benchlog.extract.landmarks import Landmark, bandwidth, crossover, peak, signal_gbw, unity
from benchlog.extract.reduce import Data, Reduced


def drawn(reduced: Reduced, implied: Implied | None) -> dict[str, Landmark]:
    """Return the figures by name; NaN where a sweep has none.

    Args:
        reduced: Fits of one shape.
        implied: GBW through the design; None takes what stands for it without a design.
    """
    parameters = reduced.fit.parameters
    by_gain = np.zeros_like(parameters)
    by_gain[:, 0] = 1.0
    height, place = peak(reduced.shape, parameters)
    nothing = Landmark(ln_value=np.full(len(parameters), np.nan), by=np.zeros_like(parameters))
    return {
        "gain": Landmark(ln_value=parameters[:, 0], by=by_gain),
        "corner_hz": reduced.upper,
        "lower_corner_hz": nothing if reduced.lower is None else reduced.lower,
        "bandwidth_hz": bandwidth(reduced.upper, reduced.lower),
        "gbw_hz": signal_gbw(reduced.shape, parameters)
        if implied is None
        else _through_design(reduced, implied, by_gain),
        "peaking_db": height,
        "peaking_hz": place,
        "unity_hz": _in_sweep(unity(reduced.shape, parameters), reduced.data),
    }


def _in_sweep(crossing: Landmark, data: Data) -> Landmark:
    """Return a crossing only where the sweep reaches it: beyond, it is the shape's claim."""
    counts = data.weight > 0
    highest = np.where(counts, data.ln_frequency, -np.inf).max(axis=1, initial=-np.inf)
    reached = crossing.ln_value <= highest
    return Landmark(ln_value=np.where(reached, crossing.ln_value, np.nan), by=crossing.by)


def _through_design(reduced: Reduced, implied: Implied, by_gain: FloatArray) -> Landmark:
    crossing = crossover(reduced.shape, reduced.fit.parameters)
    by = implied.by_gain[:, None] * by_gain + implied.by_corner[:, None] * crossing.by
    return Landmark(ln_value=implied.ln_gbw, by=by)
