"""How high a corner must at least be, where the sweep ends before it."""

import numpy as np

from benchlog.curve import FloatArray
from benchlog.extract.models.shape import Shape

# One-sided 95 %: the profile of chi squared rises by 1.645 squared.
_RISE = 2.706
# Without stated noise, scatter smaller than this is luck or rounding.
_LEAST_NOISE_REL = 1e-4
# A corner this far above the sweep and one at infinity look the same, in ln hertz.
_FARTHEST = 10.0
_HALVINGS = 50


def lowest_corner_hz(
    shape: Shape,
    frequency_hz: FloatArray,
    ln_gain: FloatArray,
    *,
    weight: FloatArray,
    stated: bool,
    ln_corner: float,
) -> float:
    """Return the corner below which these points are improbable (95 %, one side).

    The bound is never above the highest frequency: what lies beyond the sweep is the shape's
    claim and not the data's.

    Args:
        shape: Has the parameters ln gain and ln corner.
        frequency_hz: Of one sweep, shape (points,).
        ln_gain: Same shape.
        weight: Same shape; inverse variances where ``stated``.
        stated: Whether the noise is stated; it is the scatter otherwise.
        ln_corner: Where the fit has its corner.
    """
    highest = float(np.log(frequency_hz.max()))
    ln_frequency = np.log(frequency_hz)[None, :]

    def chi2(corner: float) -> float:
        droop, _ = shape.evaluate(np.array([[0.0, corner]]), ln_frequency)
        above = ln_gain - droop[0]
        plateau = (above * weight).sum() / weight.sum()
        return float((weight * (above - plateau) ** 2).sum())

    best = min(ln_corner, highest + _FARTHEST)
    noise = 1.0
    if not stated:
        noise = max(chi2(best) / max(ln_gain.size - 2, 1), _LEAST_NOISE_REL**2)
    allowed = chi2(best) + _RISE * noise
    low, high = float(np.log(frequency_hz.min())), best
    for _ in range(_HALVINGS):
        middle = 0.5 * (low + high)
        low, high = (low, middle) if chi2(middle) <= allowed else (middle, high)
    return float(np.exp(min(high, highest)))
