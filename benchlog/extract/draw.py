"""Every figure of many fitted sweeps as a logarithm with its derivatives by the parameters."""

import numpy as np

from benchlog.curve import FloatArray
from benchlog.extract.implied import Implied
from benchlog.extract.landmarks import Landmark, bandwidth, peak, signal_gbw
from benchlog.extract.reduce import Reduced


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
    }


def _through_design(reduced: Reduced, implied: Implied, by_gain: FloatArray) -> Landmark:
    by = implied.by_gain[:, None] * by_gain + implied.by_corner[:, None] * reduced.upper.by
    return Landmark(ln_value=implied.ln_gbw, by=by)
