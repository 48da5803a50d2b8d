"""Figures of many sweeps at once, as arrays."""

from typing import Any

import numpy as np
import numpy.typing as npt

from benchlog.curve import FloatArray, FloatsLike
from benchlog.design.model import Design
from benchlog.errors import CurveError, Misuse
from benchlog.extract.reduce import SHAPE, gbw_faults, implied_gbw, reduce_sweeps
from benchlog.extract.validity import FIGURES_TAKEN

_DB_PER_NEPER = 20.0 / np.log(10.0)
# So many sweeps at a time keep the working arrays in the processor's cache.
_CHUNK = 2048


def extract_many(
    frequency_hz: FloatsLike,
    gain: npt.ArrayLike,
    design: Design | None = None,
    *,
    phase_deg: npt.ArrayLike | None = None,
    u_gain_rel: npt.ArrayLike | None = None,
    shape: str = "auto",
) -> dict[str, npt.NDArray[Any]]:
    """Draw the figures of many sweeps; the same answers as ``extract`` gives one by one.

    Args:
        frequency_hz: Hertz, shape (points,) for all sweeps or (sweeps, points).
        gain: V/V, shape (sweeps, points); NaN pads sweeps of unequal length.
        design: What the boards are built to.
        phase_deg: Not used by the shapes there are.
        u_gain_rel: Relative standard uncertainty of each gain, shape that broadcasts to gain's.
        shape: ``"auto"`` or ``"one-pole"``.

    Returns:
        Arrays of shape (sweeps,): ``gain, u_gain, gain_db, u_gain_db, corner_hz, u_corner_hz,
        gbw_hz, u_gbw_hz``, NaN where a sweep cannot carry the figure, and ``validity``, bits of
        ``benchlog.extract.validity.Fault``.

    Raises:
        CurveError: Shapes do not fit together.
        Misuse: There is no such shape.
    """
    del phase_deg
    if shape not in {"auto", SHAPE.name}:
        raise Misuse(f"there is no shape {shape!r}")
    gains = np.asarray(gain, dtype=float)
    if gains.ndim != 2:
        raise CurveError(
            f"gain has {gains.ndim} dimensions", where="gain", expected="(sweeps, points)"
        )
    frequencies = _beside(frequency_hz, gains, "frequency_hz")
    noise = None if u_gain_rel is None else _beside(u_gain_rel, gains, "u_gain_rel")
    chunks = [
        _chunk(
            frequencies[rows],
            gains[rows],
            design,
            u_gain_rel=None if noise is None else noise[rows],
        )
        for rows in (slice(at, at + _CHUNK) for at in range(0, max(len(gains), 1), _CHUNK))
    ]
    return {name: np.concatenate([chunk[name] for chunk in chunks]) for name in chunks[0]}


def _chunk(
    frequency_hz: FloatArray,
    gain: FloatArray,
    design: Design | None,
    *,
    u_gain_rel: FloatArray | None,
) -> dict[str, npt.NDArray[Any]]:
    with np.errstate(invalid="ignore"):
        usable = np.isfinite(gain) & (gain > 0) & (frequency_hz > 0)
        if u_gain_rel is not None:
            usable &= np.isfinite(u_gain_rel) & (u_gain_rel > 0)
    reduced = reduce_sweeps(frequency_hz, gain, u_gain_rel=u_gain_rel, usable=usable)
    with np.errstate(invalid="ignore", over="ignore"):
        covariance = reduced.covariance
        u_ln_gain, u_ln_corner = np.sqrt(np.einsum("spp->ps", covariance))
        implied = implied_gbw(reduced, design, u_ln_gain=u_ln_gain)
        by = np.stack([implied.by_gain, implied.by_corner], axis=1)
        u_ln_gbw = np.sqrt(np.einsum("sp,spq,sq->s", by, covariance, by) + implied.u_parts**2)
        gains, corners = np.exp(reduced.fit.parameters.T)
        gbws = np.exp(implied.ln_gbw)
    faults = np.where(reduced.faults == 0, gbw_faults(implied), reduced.faults)
    figures = {
        "gain": (gains, gains * u_ln_gain),
        "gain_db": (_DB_PER_NEPER * np.log(gains), _DB_PER_NEPER * u_ln_gain),
        "corner_hz": (corners, corners * u_ln_corner),
        "gbw_hz": (gbws, gbws * u_ln_gbw),
    }
    answer: dict[str, npt.NDArray[Any]] = {"validity": faults}
    for name, (value, u) in figures.items():
        taken = np.zeros(len(faults), np.bool_)
        for fault, names in FIGURES_TAKEN.items():
            if name in names:
                taken |= (faults & int(fault)) != 0
        answer[name] = np.where(taken, np.nan, value)
        answer[f"u_{name}"] = np.where(taken, np.nan, u)
    return answer


def _beside(given: npt.ArrayLike, gains: FloatArray, name: str) -> FloatArray:
    try:
        return np.broadcast_to(np.asarray(given, dtype=float), gains.shape)
    except ValueError as error:
        raise CurveError(
            f"{name} has shape {np.shape(given)} beside gains of shape {gains.shape}",
            where=name,
            expected="one value for each gain, or one row for all sweeps",
        ) from error
