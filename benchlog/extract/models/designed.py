"""A design's own response, every part free within its tolerance."""

import numpy as np

from benchlog.circuit.chain import Chain
from benchlog.curve import FloatArray

# Central differences: the response's logarithm is smooth, and the error is of the square of this.
_STEP = 1e-4


class Designed:
    """Parameters: ln GBW, ln factor of each part with a tolerance, ln of the meter's scale if free.

    Args:
        chain: The design's stages.
        source_ohm: Output resistance of the source where gain counts from its open-circuit level.
        u_scale: Relative standard uncertainty of what is common to all points; 0 holds it at 1.
        hold_gbw: Whether the GBW stays where a fit starts.
    """

    name = "design"

    def __init__(
        self,
        chain: Chain,
        *,
        source_ohm: float = 0.0,
        u_scale: float = 0.0,
        hold_gbw: bool = False,
    ) -> None:
        parts = [part for part in chain.parts() if part.tolerance > 0]
        self.chain, self._source_ohm = chain, source_ohm
        self._held = hold_gbw
        self._u_scale = u_scale
        self.parts = tuple(part.name for part in parts)
        scale = ("ln_scale",) if u_scale > 0 else ()
        self.parameters = ("ln_gbw", *(f"ln_{name}" for name in self.parts), *scale)
        u = [np.inf, *(part.u_rel for part in parts), *([u_scale] if scale else [])]
        self.prior_weight: FloatArray = 1.0 / np.array(u) ** 2

    def holding_gbw(self) -> "Designed":
        """Return the same response whose GBW a fit leaves alone."""
        return Designed(
            self.chain, source_ohm=self._source_ohm, u_scale=self._u_scale, hold_gbw=True
        )

    def start(self, ln_frequency: FloatArray, ln_gain: FloatArray, used: FloatArray) -> FloatArray:
        """Start at the nominal design."""
        del ln_gain, used
        start = np.zeros((len(ln_frequency), len(self.parameters)))
        start[:, 0] = np.log(self.chain.gbw_hz)
        return start

    def ln_gain(self, parameters: FloatArray, ln_frequency: FloatArray) -> FloatArray:
        """Return ln gain, shape (sweeps, points)."""
        factors = {
            name: np.exp(parameters[:, place : place + 1])
            for place, name in enumerate(self.parts, start=1)
        }
        response = self.chain.response(
            np.exp(ln_frequency),
            gbw_hz=np.exp(parameters[:, :1]),
            factors=factors or None,
            source_ohm=self._source_ohm,
        )
        values = np.log(np.abs(response))
        return np.asarray(values + parameters[:, -1:] if self._u_scale > 0 else values)

    def ln_plateau(self, parameters: FloatArray) -> FloatArray:
        """Return ln gain between the corners, shape (sweeps,)."""
        factors = {
            name: np.exp(parameters[:, place : place + 1])
            for place, name in enumerate(self.parts, start=1)
        }
        gain = self.chain.plateau(factors=factors or None, source_ohm=self._source_ohm)
        flat = np.broadcast_to(np.asarray(gain, dtype=float).reshape(-1), (len(parameters),))
        return np.asarray(np.log(flat) + (parameters[:, -1] if self._u_scale > 0 else 0.0))

    def evaluate(
        self, parameters: FloatArray, ln_frequency: FloatArray
    ) -> tuple[FloatArray, FloatArray]:
        """Return ln gain and its derivatives; see ``Shape``."""
        values = self.ln_gain(parameters, ln_frequency)
        derivatives = np.zeros((*values.shape, len(self.parameters)))
        for place, name in enumerate(self.parameters):
            if name == "ln_scale":
                derivatives[:, :, place] = 1.0
            elif place > 0 or not self._held:
                move = np.zeros(len(self.parameters))
                move[place] = _STEP
                up = self.ln_gain(parameters + move, ln_frequency)
                down = self.ln_gain(parameters - move, ln_frequency)
                derivatives[:, :, place] = (up - down) / (2.0 * _STEP)
        return values, derivatives
