"""The gain-bandwidth product that a curve implies.

With a design: the GBW at which the design's response, with its noise gain, capacitors and second
poles, has its corner where the curve has it.  No part is exactly what is written on it: each is
free within its tolerance, and the measured gain, which the same parts set, narrows them.
"""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from benchlog.circuit.chain import Chain
from benchlog.curve import FloatArray

_LOWEST_LN_HZ, _HIGHEST_LN_HZ = np.log(1.0), np.log(1e13)
_HALVINGS = 60
_LN_ROOT_TWO = 0.5 * np.log(2.0)
_SMALL = 1e-4
# Beyond the worst case of all tolerances, a gain is not what these parts give.
_EXPANDED = 2.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Implied:
    """GBW of many sweeps, as logarithms with what they depend on; arrays of shape (sweeps,).

    Attributes:
        ln_gbw: NaN where no GBW gives this corner.
        by_gain: Derivative of ln GBW by ln gain.
        by_corner: Derivative of ln GBW by ln corner.
        u_parts: Standard uncertainty of ln GBW that the tolerances leave.
        contradicted: Where the measured gain is not what the parts give.
        gain_tells: Where the measured gain alone tells the noise gain.
    """

    ln_gbw: FloatArray
    by_gain: FloatArray
    by_corner: FloatArray
    u_parts: FloatArray
    contradicted: npt.NDArray[np.bool_]
    gain_tells: npt.NDArray[np.bool_]


class DesignGbw:
    """What a chain implies; made once for a design and used for many sweeps.

    Args:
        chain: The design's stages.
        source_ohm: Output resistance of the source where gain counts from its open-circuit level.
    """

    def __init__(self, chain: Chain, source_ohm: float = 0.0) -> None:
        parts = [part for part in chain.parts() if part.tolerance > 0]
        self._chain = chain
        self._source_ohm = source_ohm
        self._names = tuple(part.name for part in parts)
        self._u: FloatArray = np.array([part.u_rel for part in parts])
        self._widest: FloatArray = np.array([part.tolerance for part in parts])
        self._gain_by_part = self._plateau_slopes()

    def of(self, ln_gain: FloatArray, ln_corner: FloatArray, u_ln_gain: FloatArray) -> Implied:
        """Return the GBW that gains and corners imply, all of shape (sweeps,)."""
        spread = self._gain_by_part * self._u**2
        variance = float(self._gain_by_part @ spread) + u_ln_gain**2
        # One linear update of the parts by the measured gain: the best estimate of normal
        # quantities given a linear observation of them.
        to_parts = spread[None, :] / np.where(variance > 0, variance, np.inf)[:, None]
        parts, excess = self._moved_parts(ln_gain, to_parts)
        room = np.abs(self._gain_by_part) @ self._widest + _EXPANDED * u_ln_gain
        contradicted = np.abs(excess) > room
        # In a single stage gain and noise gain hang on the same ratio, whichever part is wrong.
        alone = len(self._chain.stages) == 1 and bool(self._names)
        gain_tells = np.full(ln_gain.shape, alone)
        ln_gbw, by_corner, by_part = self._solved_with_slopes(ln_corner, parts)
        by_gain = np.einsum("sp,sp->s", by_part, to_parts)
        # What the gain, itself uncertain by causes counted elsewhere, does not tell of the parts.
        untold = by_part - by_gain[:, None] * self._gain_by_part
        return Implied(
            ln_gbw=np.where(contradicted & ~gain_tells, np.nan, ln_gbw),
            by_gain=by_gain,
            by_corner=by_corner,
            u_parts=np.sqrt(untold**2 @ self._u**2),
            contradicted=contradicted,
            gain_tells=gain_tells,
        )

    def _moved_parts(
        self, ln_gain: FloatArray, to_parts: FloatArray
    ) -> tuple[FloatArray, FloatArray]:
        """Return ln factors of the parts, shape (sweeps, parts), and the excess of the gain."""
        parts = np.zeros((ln_gain.size, len(self._names)))
        first = ln_gain - np.log(self._plateaus(parts))
        excess = first
        # The plateau is not quite linear in the logarithms of the parts: a second step mends it.
        for _ in range(2):
            parts = parts + to_parts * excess[:, None]
            reached = np.log(self._plateaus(parts)) - (ln_gain - first)
            explained = np.einsum("sp,p->s", to_parts, self._gain_by_part) * first
            excess = explained - reached
        return parts, first

    def _plateau_slopes(self) -> FloatArray:
        """Return derivatives of the plateau's logarithm by the logarithm of each part."""
        if not self._names:
            return np.zeros(0)
        ends = np.concatenate([np.eye(len(self._names)), -np.eye(len(self._names))]) * _SMALL
        up, down = np.log(self._plateaus(ends)).reshape(2, -1)
        slopes: FloatArray = (up - down) / (2 * _SMALL)
        return slopes

    def _solved_with_slopes(
        self, ln_corner: FloatArray, parts: FloatArray
    ) -> tuple[FloatArray, FloatArray, FloatArray]:
        """Return ln GBW and its derivatives by ln corner and by the parts.

        All the neighbours that the derivatives need are solved in one go.
        """
        count = len(self._names)
        moves = np.zeros((2 * count + 3, count + 1))
        for place in range(count + 1):
            moves[2 * place + 1, place], moves[2 * place + 2, place] = _SMALL, -_SMALL
        corners = (ln_corner[None, :] + moves[:, :1]).reshape(-1)
        moved = (parts[None, :, :] + moves[:, None, 1:]).reshape(corners.size, count)
        solved = self._solve(corners, moved).reshape(len(moves), -1)
        slopes = (solved[1::2] - solved[2::2]) / (2 * _SMALL)
        return solved[0], slopes[0], slopes[1:].T

    def _solve(self, ln_corner: FloatArray, parts: FloatArray) -> FloatArray:
        """Bisect ln GBW for a half-power corner, shape (rows,); NaN where there is none."""
        frequency_hz = np.exp(ln_corner)
        half_power = np.log(self._plateaus(parts)) - _LN_ROOT_TWO
        factors = self._factors(parts)

        def high_enough(ln_gbw: FloatArray) -> npt.NDArray[np.bool_]:
            response = self._chain.response(
                frequency_hz,
                gbw_hz=np.exp(ln_gbw),
                factors=factors,
                source_ohm=self._source_ohm,
            )
            enough: npt.NDArray[np.bool_] = np.log(np.abs(response)) >= half_power
            return enough

        low = np.full(ln_corner.shape, _LOWEST_LN_HZ)
        high = np.full(ln_corner.shape, _HIGHEST_LN_HZ)
        reachable = high_enough(high) & ~high_enough(low)
        for _ in range(_HALVINGS):
            middle = 0.5 * (low + high)
            enough = high_enough(middle)
            high = np.where(enough, middle, high)
            low = np.where(enough, low, middle)
        return np.where(reachable, 0.5 * (low + high), np.nan)

    def _factors(self, parts: FloatArray) -> dict[str, FloatArray] | None:
        scale = np.exp(parts)
        return {name: scale[:, place] for place, name in enumerate(self._names)} or None

    def _plateaus(self, parts: FloatArray) -> FloatArray:
        """Return the plateau for each row of ln factors, shape (rows,)."""
        factors = self._factors(parts)
        columns = None if factors is None else {name: f[:, None] for name, f in factors.items()}
        gain = self._chain.plateau(factors=columns, source_ohm=self._source_ohm)
        return np.broadcast_to(np.asarray(gain, dtype=float).reshape(-1), (len(parts),))


def signal_gain_gbw(ln_gain: FloatArray, ln_corner: FloatArray) -> Implied:
    """Return gain times corner: all that can be said of a one-pole curve without a design."""
    ones = np.ones_like(ln_gain)
    never = np.zeros(ln_gain.shape, np.bool_)
    return Implied(
        ln_gbw=ln_gain + ln_corner,
        by_gain=ones,
        by_corner=ones,
        u_parts=np.zeros_like(ln_gain),
        contradicted=never,
        gain_tells=never,
    )
