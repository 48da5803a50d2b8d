"""Figures of many sweeps at once, as arrays."""

from typing import Any

import numpy as np
import numpy.typing as npt

from benchlog.curve import FloatArray, FloatsLike, GainCurve
from benchlog.design.model import Design
from benchlog.errors import CurveError, Misuse
from benchlog.extract.by_design import SHAPE as BY_DESIGN
from benchlog.extract.choose import choose, shape_named
from benchlog.extract.draw import drawn
from benchlog.extract.figures import extract
from benchlog.extract.landmarks import Landmark
from benchlog.extract.models.polynomial import shared_row
from benchlog.extract.reduce import Data, Reduced, gbw_faults, implied_gbw, prepare, too_few
from benchlog.extract.sentences import faults_behind
from benchlog.extract.through_design import corner_is_the_amplifiers, has_noise_gain
from benchlog.extract.validity import FIGURES_TAKEN, Fault

_DB_PER_NEPER = 20.0 / np.log(10.0)
# So many points at a time keep the working arrays in the processor's cache.
_CHUNK_POINTS = 65536
_LONGEST_NAME = 40
FIGURES = (
    "gain",
    "gain_db",
    "corner_hz",
    "lower_corner_hz",
    "bandwidth_hz",
    "gbw_hz",
    "peaking_db",
    "peaking_hz",
    "unity_hz",
)


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
        phase_deg: Degrees, fitted together with gain; shape that broadcasts to gain's.
        u_gain_rel: Relative standard uncertainty of each gain, shape that broadcasts to gain's.
        shape: ``"auto"``, ``"design"``, or a name that ``choose.shape_named`` knows.

    Returns:
        Arrays of shape (sweeps,): each name of ``FIGURES`` and the same with ``u_`` before it, NaN
        where a sweep cannot carry the figure; ``shape``, the name of the fitted shape; and
        ``validity``, bits of ``benchlog.extract.validity.Fault``.

    Raises:
        CurveError: Shapes do not fit together.
        Misuse: There is no such shape.
    """
    _check_shape(shape, design)
    gains = np.asarray(gain, dtype=float)
    if gains.ndim != 2:
        raise CurveError(
            f"gain has {gains.ndim} dimensions", where="gain", expected="(sweeps, points)"
        )
    frequencies = _beside(frequency_hz, gains, "frequency_hz")
    noise = None if u_gain_rel is None else _beside(u_gain_rel, gains, "u_gain_rel")
    phases = None if phase_deg is None else _beside(phase_deg, gains, "phase_deg")
    chunks = []
    size = max(1, _CHUNK_POINTS // max(gains.shape[1], 1))
    for at in range(0, max(len(gains), 1), size):
        rows = slice(at, at + size)
        data = _data(
            frequencies[rows],
            gains[rows],
            u_gain_rel=None if noise is None else noise[rows],
            phase_deg=None if phases is None else phases[rows],
        )
        chunks.append(_chunk(data, design, shape))
    return {name: np.concatenate([chunk[name] for chunk in chunks]) for name in chunks[0]}


def _check_shape(shape: str, design: Design | None) -> None:
    if shape == BY_DESIGN and not has_noise_gain(design):
        raise Misuse("the shape design needs a design with an amplifier in a loop")
    if shape not in {"auto", BY_DESIGN}:
        shape_named(shape)


def _data(
    frequency_hz: FloatArray,
    gain: FloatArray,
    *,
    u_gain_rel: FloatArray | None,
    phase_deg: FloatArray | None,
) -> Data:
    with np.errstate(invalid="ignore"):
        row = shared_row(frequency_hz)
        usable = (gain > 0) & (gain < np.inf) & ((row > 0) & (row < np.inf))
        if u_gain_rel is not None:
            usable &= np.isfinite(u_gain_rel) & (u_gain_rel > 0)
        if phase_deg is not None:
            usable &= np.isfinite(phase_deg)
    return prepare(frequency_hz, gain, u_gain_rel=u_gain_rel, usable=usable, phase_deg=phase_deg)


def _chunk(data: Data, design: Design | None, shape: str) -> dict[str, npt.NDArray[Any]]:
    choice = choose(data, design, shape="auto" if shape == BY_DESIGN else shape)
    needed = set(choice.chosen.tolist()) | set(choice.runner_up.tolist()) - {-1}
    through = design if has_noise_gain(design) else None
    by_corner = through is None or corner_is_the_amplifiers(through.chain())
    by_shape = {
        place: _of_shape(choice.tried[place], through if by_corner else None)
        for place in sorted(needed)
    }
    rows = len(choice.chosen)
    answer: dict[str, npt.NDArray[Any]] = {
        "validity": _taken(by_shape, choice.chosen, "validity").astype(np.int64),
        "shape": np.array([one.shape.name for one in choice.tried])[choice.chosen],
    }
    answer["validity"] |= choice.remarks()
    compared = bool((choice.runner_up >= 0).any())
    for name in FIGURES:
        value = _taken(by_shape, choice.chosen, name) if rows else np.empty(0)
        u = _taken(by_shape, choice.chosen, f"u_{name}")
        answer[name], answer[f"u_{name}"] = value, u
        if compared:
            other = _taken(by_shape, choice.runner_up, name)
            apart = np.where(np.isfinite(other), other - value, 0.0)
            answer[f"u_{name}"] = np.hypot(u, apart)
    if through is not None:
        unexplained = (answer["validity"] & int(Fault.POOR_FIT | Fault.NOT_CONVERGED)) != 0
        every = not by_corner or shape == BY_DESIGN
        rows_left = np.arange(rows) if every else np.flatnonzero(unexplained & (shape == "auto"))
        _one_by_one(answer, data, through, shape=shape, rows=rows_left)
    return answer


def _one_by_one(
    answer: dict[str, npt.NDArray[Any]],
    data: Data,
    design: Design,
    *,
    shape: str,
    rows: npt.NDArray[np.int64],
) -> None:
    """Take the figures from ``extract``, where the design's own response is needed for them."""
    answer["shape"] = answer["shape"].astype(f"U{_LONGEST_NAME}")
    for row in rows:
        counts = data.weight[row] > 0
        if not counts.any():
            continue
        figures = extract(
            GainCurve(
                np.exp(data.ln_frequency[row][counts]),
                np.exp(data.ln_gain[row][counts]),
                None if data.phase is None else np.degrees(data.phase.radians[row][counts]),
                u_gain_rel=data.weight[row][counts] ** -0.5 if data.stated else None,
            ),
            design,
            shape=shape,
        )
        answer["shape"][row] = figures.shape
        answer["validity"][row] = faults_behind(figures.validity)
        for name in FIGURES:
            one = figures.figure(name)
            known = one is not None and one.u is not None
            answer[name][row] = one.value if one is not None and known else np.nan
            answer[f"u_{name}"][row] = one.u if one is not None and known else np.nan


def _taken(
    by_shape: dict[int, dict[str, FloatArray]], which: npt.NDArray[np.int64], name: str
) -> FloatArray:
    """Return one figure of each sweep's own shape; NaN where there is none."""
    answer = np.full(len(which), np.nan)
    for place, figures in by_shape.items():
        np.copyto(answer, figures[name], where=which == place)
    return answer


def _of_shape(reduced: Reduced, design: Design | None) -> dict[str, FloatArray]:
    """Return figures, their uncertainties and faults for one shape on all sweeps."""
    with np.errstate(all="ignore"):
        covariance = reduced.covariance
        implied = None
        if design is not None:
            implied = implied_gbw(reduced, design, u_ln_gain=np.sqrt(covariance[:, 0, 0]))
        landmarks = drawn(reduced, implied)
        faults = reduced.faults.copy()
        if implied is None:
            lacking = ~np.isfinite(landmarks["gbw_hz"].ln_value) & ~too_few(reduced)
            faults |= np.where(lacking, int(Fault.GBW_NEEDS_DESIGN), 0)
        else:
            faults |= np.where(faults == 0, gbw_faults(implied), 0)
        answer = {"validity": faults.astype(float)}
        for name, one in landmarks.items():
            u_ln = _spread(one, covariance)
            if name == "gbw_hz" and implied is not None:
                u_ln = np.hypot(u_ln, implied.u_parts)
            answer[name], answer[f"u_{name}"] = np.exp(one.ln_value), np.exp(one.ln_value) * u_ln
            if name in {"gain", "peaking_db"}:
                in_db = "gain_db" if name == "gain" else name
                answer[in_db] = _DB_PER_NEPER * one.ln_value
                answer[f"u_{in_db}"] = _DB_PER_NEPER * u_ln
    level = ~np.isfinite(answer["peaking_db"])
    answer["peaking_db"] = np.where(level, 0.0, answer["peaking_db"])
    answer["u_peaking_db"] = np.where(level, 0.0, answer["u_peaking_db"])
    _take_away(answer, faults)
    return answer


def _spread(one: Landmark, covariance: FloatArray) -> FloatArray:
    """Return the standard uncertainty of a landmark's logarithm, shape (sweeps,)."""
    if np.isnan(one.ln_value).all():
        return one.ln_value
    moved = (covariance @ one.by[:, :, None])[:, :, 0]
    return np.asarray(np.sqrt(np.einsum("sp,sp->s", one.by, moved)))


def _take_away(answer: dict[str, FloatArray], faults: npt.NDArray[np.int64]) -> None:
    for name in FIGURES:
        bits = sum(int(fault) for fault, names in FIGURES_TAKEN.items() if name in names)
        gone = (faults & bits) != 0
        answer[name] = np.where(gone, np.nan, answer[name])
        answer[f"u_{name}"] = np.where(gone, np.nan, answer[f"u_{name}"])


def _beside(given: npt.ArrayLike, gains: FloatArray, name: str) -> FloatArray:
    try:
        return np.broadcast_to(np.asarray(given, dtype=float), gains.shape)
    except ValueError as error:
        raise CurveError(
            f"{name} has shape {np.shape(given)} beside gains of shape {gains.shape}",
            where=name,
            expected="one value for each gain, or one row for all sweeps",
        ) from error
