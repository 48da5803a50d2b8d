"""A small invented sweep, for tests that need something to store."""

import hashlib
from uuid import uuid4

from benchlog.records import (
    Figure,
    Figures,
    InstrumentUsed,
    LineVerdict,
    Point,
    SweepStart,
    Term,
    TermShare,
    Verdict,
)

DESIGN_TEXT = 'name = "line preamp"\nrevision = "C"\n'
DESIGN_SHA256 = hashlib.sha256(DESIGN_TEXT.encode()).hexdigest()


def sample_start(serial: str = "0042", **changes: object) -> SweepStart:
    """Return the start of an invented sweep; ``changes`` replaces fields."""
    fields: dict[str, object] = {
        "uuid": str(uuid4()),
        "serial": serial,
        "kind": "sweep",
        "started_at": "2026-03-31T09:15:00+00:00",
        "design_sha256": None,
        "operator": "kim",
        "lot": "L7",
        "settings": '{"per_decade": 10}',
        "instruments": (
            InstrumentUsed(
                role="source",
                identity="invented,source,S1,1.0",
                address="TCPIP::127.0.0.1::5025::SOCKET",
                driver="source_generic",
                calibration_due="2027-03-31",
            ),
            InstrumentUsed(
                role="output meter",
                identity="invented,meter,M1,1.0",
                address="TCPIP::127.0.0.1::5026::SOCKET",
                driver="meter_generic",
            ),
        ),
        "terms": (Term(name="output meter accuracy", kind="scale", u_rel=1e-3, source="driver"),),
    }
    return SweepStart(**{**fields, **changes})  # type: ignore[arg-type]


def sample_points(count: int = 3) -> tuple[Point, ...]:
    """Return points of an invented sweep, ten per decade from 100 Hz."""
    return tuple(
        Point(
            position=position,
            frequency_hz=100.0 * 10 ** (position / 10),
            level_vrms=0.00707,
            input_vrms=0.00706 + position * 1e-5,
            output_vrms=0.338,
            gain=0.338 / (0.00706 + position * 1e-5),
            u_gain_rel=1.1e-4,
        )
        for position in range(count)
    )


def sample_figures(gain: float = 48.0) -> Figures:
    """Return invented figures with a term table."""
    share = TermShare(name="scatter", u=0.02, dof=12.0, kind="A")
    return Figures(
        gain=Figure(value=gain, unit="V/V", u=0.02, dof=12.0, k=2.23, terms=(share,)),
        corner_hz=Figure(value=62e3, unit="Hz", u=300.0),
        gbw_hz=Figure(value=2.9e6, unit="Hz", bound="at least"),
        shape="one-pole",
        gbw_basis="design",
        method="1",
    )


def sample_verdict(word: str = "pass") -> Verdict:
    """Return an invented verdict of one line."""
    line = LineVerdict(
        figure="gain",
        minimum=46.0,
        maximum=50.0,
        unit="V/V",
        value=48.0,
        u=0.02,
        U=0.0446,
        k=2.23,
        dof=12.0,
        conformance_probability=1.0,
        verdict=word,  # type: ignore[arg-type]
        rule="four-state",
        guard=1.0,
        basis="figure",
    )
    return Verdict(overall=word, lines=(line,))  # type: ignore[arg-type]
