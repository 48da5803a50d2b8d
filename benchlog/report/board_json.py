"""The one JSON shape of a measured or imported board, wherever it appears."""

import math
from typing import Any

from benchlog.records import (
    FIGURE_NAMES,
    Figure,
    Figures,
    LineVerdict,
    Reason,
    SweepState,
    Verdict,
)


def board_json(  # noqa: PLR0913 - the keys of one object
    *,
    serial: str,
    design: tuple[str, str, str] | None,
    sweep: str,
    state: SweepState,
    simulated: bool,
    figures: Figures | None,
    verdict: Verdict | None,
    **more: object,
) -> dict[str, Any]:
    """Return a board as plain data: strings, finite numbers and null.

    Args:
        serial: The board's serial.
        design: Name, revision and SHA-256; None without a design.
        sweep: UUID.
        state: How the sweep ended.
        simulated: Whether a practice bench measured it.
        figures: None where none were drawn.
        verdict: None where none was given.
        more: Further keys, put at the end.
    """
    return {
        "serial": serial,
        "design": None
        if design is None
        else dict(zip(("name", "revision", "sha256"), design, strict=True)),
        "sweep": sweep,
        "state": state,
        "simulated": simulated,
        "shape": None if figures is None else figures.shape,
        "validity": [] if figures is None else [_reason(reason) for reason in figures.validity],
        "figures": None if figures is None else _figures(figures),
        "verdict": None if verdict is None else _verdict(verdict),
        **more,
    }


def _figures(figures: Figures) -> dict[str, Any]:
    data: dict[str, Any] = {name: _figure(figures.figure(name)) for name in FIGURE_NAMES}
    if data["gbw_hz"] is not None:
        data["gbw_hz"]["basis"] = figures.gbw_basis
        data["gbw_hz"]["limited_by"] = figures.limited_by
    return data


def _figure(figure: Figure | None) -> dict[str, Any] | None:
    if figure is None:
        return None
    return {
        "value": figure.value,
        "u": figure.u,
        "dof": _finite(figure.dof),
        "k": None if figure.u is None else figure.k,
        "U": figure.U,
        "unit": figure.unit,
        "bound": figure.bound,
        "terms": [
            {"name": term.name, "kind": term.kind, "u": term.u, "dof": _finite(term.dof)}
            for term in figure.terms
        ],
    }


def _reason(reason: Reason) -> dict[str, Any]:
    return {"code": reason.code, "text": reason.text, "figures": list(reason.figures)}


def _verdict(verdict: Verdict) -> dict[str, Any]:
    return {"overall": verdict.overall, "lines": [_line(line) for line in verdict.lines]}


def _line(line: LineVerdict) -> dict[str, Any]:
    return {
        "figure": line.figure,
        "min": line.minimum,
        "max": line.maximum,
        "unit": line.unit,
        "value": line.value,
        "u": line.u,
        "k": line.k,
        "dof": None if line.dof is None else _finite(line.dof),
        "U": line.U,
        "conformance_probability": line.conformance_probability,
        "verdict": line.verdict,
        "rule": line.rule,
        "guard": line.guard,
        "basis": line.basis,
        "reason": line.reason,
    }


def _finite(value: float) -> float | None:
    """Return a number that JSON has; infinity, which it has not, becomes null."""
    return value if math.isfinite(value) else None
