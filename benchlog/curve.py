"""A gain curve: what a sweep or a capture becomes."""

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any, Literal, TypeAlias

import numpy as np
import numpy.typing as npt

from benchlog.errors import CurveError
from benchlog.records import Point, PointFlag, Term

FloatArray: TypeAlias = npt.NDArray[np.float64]
ComplexArray: TypeAlias = npt.NDArray[np.complex128]
FloatsLike: TypeAlias = Sequence[float] | npt.NDArray[np.floating]


@dataclass(frozen=True, slots=True, eq=False)
class GainCurve:
    """Gain (and phase) against frequency, with uncertainty and flags.

    All arrays have shape (n,) and cannot be written to.  Points keep their order; a point whose
    flag is not zero stays in the curve and is left out of a fit.

    Args:
        frequency_hz: Frequencies, hertz, positive.
        gain: Magnitude of gain, V/V, positive.
        phase_deg: Output minus input phase, degrees, or None.
        u_gain_rel: Relative standard uncertainty of each gain from its own scatter, or None.
        u_phase_deg: Standard uncertainty of each phase; None means ``u_gain_rel`` in radians.
        flags: A ``PointFlag`` for each point; None means none.
        reference: What gain is referred to: a reading at the board's ``"input"``, a
            ``"through"`` with the board bypassed, or the ``"programmed"`` open-circuit level.
        source_ohm: Output resistance of the source; matters where the reference is not the input.
        terms: Type B contributions that travel with the curve.

    Raises:
        CurveError: Shapes differ, fewer than one point, or a value that no curve can have.
    """

    frequency_hz: FloatArray
    gain: FloatArray
    phase_deg: FloatArray | None = None
    u_gain_rel: FloatArray | None = None
    u_phase_deg: FloatArray | None = field(default=None, kw_only=True)
    flags: npt.NDArray[np.int64] | None = field(default=None, kw_only=True)
    reference: Literal["input", "through", "programmed"] = field(default="input", kw_only=True)
    source_ohm: float | None = field(default=None, kw_only=True)
    terms: tuple[Term, ...] = field(default=(), kw_only=True)

    def __post_init__(self) -> None:
        for name in ("frequency_hz", "gain", "phase_deg", "u_gain_rel", "u_phase_deg"):
            given = getattr(self, name)
            if given is not None:
                object.__setattr__(self, name, _frozen(given, np.float64, name))
        flags = np.zeros(self.gain.size, np.int64) if self.flags is None else self.flags
        object.__setattr__(self, "flags", _frozen(flags, np.int64, "flags"))
        self._check()

    def _check(self) -> None:
        size = self.frequency_hz.size
        if size == 0:
            raise CurveError("a curve needs at least one point", where="frequency_hz")
        for name in ("gain", "phase_deg", "u_gain_rel", "u_phase_deg", "flags"):
            array = getattr(self, name)
            if array is not None and array.shape != (size,):
                raise CurveError(
                    f"{name} has shape {array.shape} beside {size} frequencies",
                    where=name,
                    expected="one value for each frequency",
                )
        for name in ("frequency_hz", "gain", "u_gain_rel", "u_phase_deg"):
            array = getattr(self, name)
            if array is not None:
                _check_positive(array, name)
        if self.phase_deg is not None and not np.all(np.isfinite(self.phase_deg)):
            raise CurveError("phase_deg is not finite everywhere", where="phase_deg")

    def __len__(self) -> int:
        """Count all points, flagged ones too."""
        return int(self.frequency_hz.size)

    @property
    def usable(self) -> npt.NDArray[np.bool_]:
        """Which points carry no flag, shape (n,)."""
        return np.equal(self.flags, 0) if self.flags is not None else np.ones(len(self), np.bool_)


def curve_from_points(
    points: Sequence[Point],
    *,
    reference: Literal["input", "through", "programmed"] = "input",
    source_ohm: float | None = None,
    terms: tuple[Term, ...] = (),
) -> GainCurve:
    """Make the curve of a sweep; points without a gain and repeated checks are not in it.

    Raises:
        CurveError: No point of the sweep has a gain.
    """
    kept = [point for point in points if point.kind == "point" and point.gain is not None]
    if not kept:
        raise CurveError(
            "no point of this sweep has a gain", hint="look at the flags of its points"
        )
    return GainCurve(
        np.array([point.frequency_hz for point in kept]),
        np.array([point.gain for point in kept], dtype=np.float64),
        _column([point.phase_deg for point in kept]),
        _column([point.u_gain_rel for point in kept]),
        flags=np.array([int(point.flags) for point in kept], dtype=np.int64),
        reference=reference,
        source_ohm=source_ohm,
        terms=terms,
    )


def _column(values: Sequence[float | None]) -> FloatArray | None:
    """Return the values as an array, or None when any is missing."""
    known = [value for value in values if value is not None]
    return np.array(known) if len(known) == len(values) else None


def _frozen(given: npt.ArrayLike, dtype: type, name: str) -> npt.NDArray[Any]:
    try:
        array: npt.NDArray[Any] = np.array(given, dtype=dtype)
    except (TypeError, ValueError) as error:
        raise CurveError(f"{name} is not an array of numbers", where=name) from error
    if array.ndim != 1:
        raise CurveError(f"{name} has {array.ndim} dimensions", where=name, expected="one")
    array.flags.writeable = False
    return array


def _check_positive(array: FloatArray, name: str) -> None:
    bad = np.flatnonzero(~(np.isfinite(array) & (array > 0)))
    if bad.size:
        raise CurveError(
            f"{name} has {array[bad[0]]} at position {bad[0]}",
            where=name,
            expected="finite values above zero",
        )


__all__ = [
    "ComplexArray",
    "FloatArray",
    "FloatsLike",
    "GainCurve",
    "PointFlag",
    "curve_from_points",
]
