"""The frozen records that travel the street, from a reading to a verdict.

Levels are V RMS, gain is V/V, frequencies are hertz; a name says its unit.  Nothing here computes
more than what follows from a record's own fields.
"""

import math
from dataclasses import dataclass, field
from enum import Enum, IntFlag
from typing import Literal, TypeAlias


class Status(Enum):
    """What a reply means: SCPI-99 sends infinity (9.9E37) and not-a-number (9.91E37) as numbers."""

    OK = "ok"
    OVERLOAD = "overload"
    NOT_A_NUMBER = "not a number"


class PointFlag(IntFlag):
    """Why a point needs care; a flagged point is kept and drawn, and left out of the fit."""

    NONE = 0
    OVERLOAD = 1
    NOT_A_NUMBER = 2
    OUT_OF_BAND = 4
    UNSETTLED = 8
    WILD = 16
    CLIPPED = 32
    DISTORTED = 64


@dataclass(frozen=True, slots=True, kw_only=True)
class Reading:
    """One reply of a meter.

    Attributes:
        value_vrms: The level, V RMS; None when ``status`` is not OK.
        status: Number, overload or not-a-number.
        raw: The reply as it came, without its terminator.
    """

    value_vrms: float | None
    status: Status
    raw: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Point:
    """The settled result at one frequency.

    Attributes:
        position: Place in the schedule, counted from 0.
        frequency_hz: Programmed frequency.
        level_vrms: Programmed source level.
        input_vrms: Level read at the board's input; None without an input meter.
        output_vrms: Level read at the board's output; None when the reading was a state.
        gain: Output over input (or over the programmed level), V/V; None when a level is missing.
        u_gain_rel: Relative standard uncertainty of this gain alone (scatter), if known.
        phase_deg: Output minus input phase, degrees, where it was measured.
        flags: Why the point needs care.
        kind: ``"point"`` belongs to the curve; ``"check"`` repeats an earlier one.
        attempts: How often the point was asked for until it was read.
        raw: The replies as they came, only where one was refused or was a state.
    """

    position: int
    frequency_hz: float
    level_vrms: float
    input_vrms: float | None
    output_vrms: float | None
    gain: float | None
    u_gain_rel: float | None = None
    phase_deg: float | None = None
    flags: PointFlag = PointFlag.NONE
    kind: Literal["point", "check"] = "point"
    attempts: int = 1
    raw: str | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Term:
    """One type B contribution that travels with a curve (JCGM 100, 4.3).

    Attributes:
        name: What it is, for the term table: ``"output meter accuracy"``.
        kind: ``"scale"`` is common to all points and moves the gain, not the corner;
            ``"flatness"`` is common to a band and moves the corner; ``"reading"`` is independent
            from point to point.
        u_rel: Relative standard uncertainty of gain.
        band_hz: From and to, hertz, for a flatness or reading term; None is everywhere.
        dof: Degrees of freedom of ``u_rel``.
        source: Where the number comes from: a driver file's accuracy table, the bench file.
    """

    name: str
    kind: Literal["scale", "flatness", "reading"]
    u_rel: float
    band_hz: tuple[float, float] | None = None
    dof: float = math.inf
    source: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class TermShare:
    """One row of a figure's term table: what one cause contributes to its uncertainty.

    Attributes:
        name: The cause.
        u: Standard uncertainty it alone would give, in the figure's unit.
        dof: Degrees of freedom of ``u``.
        kind: ``"A"`` by statistics of these readings, ``"B"`` by other knowledge.
    """

    name: str
    u: float
    dof: float
    kind: Literal["A", "B"]


Bound: TypeAlias = Literal["at least", "at most"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Figure:
    """One number drawn from a curve.

    Attributes:
        value: The number, or the bound when ``bound`` is set.
        unit: Its unit: ``"V/V"``, ``"dB"``, ``"Hz"``.
        u: Standard uncertainty; None when ``value`` is a bound.
        dof: Effective degrees of freedom of ``u`` (JCGM 100, G.4).
        k: Coverage factor for 95.45 %: 2 for infinite ``dof``.
        bound: ``"at least"`` or ``"at most"`` when the data bound the figure on one side only.
        terms: The term table; the root sum of squares of its rows is ``u``.
    """

    value: float
    unit: str
    u: float | None = None
    dof: float = math.inf
    k: float = 2.0
    bound: Bound | None = None
    terms: tuple[TermShare, ...] = ()

    @property
    def U(self) -> float | None:  # noqa: N802 - the symbol of JCGM 100, 6.2
        """Expanded uncertainty ``k * u``; None for a bound."""
        return None if self.u is None else self.k * self.u


@dataclass(frozen=True, slots=True, kw_only=True)
class Reason:
    """Why a curve cannot carry certain figures, or why one needs care.

    Attributes:
        code: Short name, stable for scripts: ``"corner above the sweep"``.
        text: One sentence for people: what was seen and what to do.
        figures: Names of the figures it takes away (fields of ``Figures``); empty for a remark.
    """

    code: str
    text: str
    figures: tuple[str, ...] = ()


FIGURE_NAMES = (
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


@dataclass(frozen=True, slots=True, kw_only=True)
class Figures:
    """What a curve says about a board; each figure is None where the curve cannot carry it.

    Attributes:
        shape: Name of the fitted response shape.
        validity: Reasons, none for a clean curve.
        gbw_basis: ``"design"`` (noise gain known) or ``"signal gain"``; None without a GBW.
        limited_by: The element that hides the GBW when it is a bound.
        shapes_tried: Name and AICc of every shape that was fitted, best first.
        chosen_because: One sentence: why this shape.
        method: Version of the extraction method.
        left_out: Positions (in the curve's arrays) of points that were not fitted.
    """

    gain: Figure | None = None
    gain_db: Figure | None = None
    corner_hz: Figure | None = None
    lower_corner_hz: Figure | None = None
    bandwidth_hz: Figure | None = None
    gbw_hz: Figure | None = None
    peaking_db: Figure | None = None
    peaking_hz: Figure | None = None
    unity_hz: Figure | None = None
    shape: str
    validity: tuple[Reason, ...] = ()
    gbw_basis: Literal["design", "signal gain"] | None = None
    limited_by: str | None = None
    shapes_tried: tuple[tuple[str, float], ...] = ()
    chosen_because: str = ""
    method: str = ""
    left_out: tuple[int, ...] = ()

    def figure(self, name: str) -> Figure | None:
        """Return a figure by its field name; raises KeyError for a name that is none."""
        if name not in FIGURE_NAMES:
            raise KeyError(name)
        found: Figure | None = getattr(self, name)
        return found

    def why_missing(self, name: str) -> Reason | None:
        """Return the first reason that takes a figure away."""
        return next((reason for reason in self.validity if name in reason.figures), None)


VerdictWord: TypeAlias = Literal["pass", "conditional pass", "conditional fail", "invalid", "fail"]
RuleName: TypeAlias = Literal["simple", "guarded", "four-state", "guarded-rejection"]

# From best to worst; a sweep is as good as its worst line.
VERDICT_ORDER: tuple[VerdictWord, ...] = (
    "pass",
    "conditional pass",
    "conditional fail",
    "invalid",
    "fail",
)


@dataclass(frozen=True, slots=True, kw_only=True)
class LineVerdict:
    """One line of a budget held against one figure.

    Attributes:
        figure: Field name of the figure judged.
        minimum, maximum: The limits, in the figure's unit.
        value, u, U, k, dof: The figure as judged; None where there was none.
        conformance_probability: Probability that the true value is inside (JCGM 106, 7).
        verdict: The word.
        rule, guard: The decision rule and its guard band in multiples of U.
        basis: ``"figure"``, or ``"bound"`` when one side was enough.
        reason: A sentence when the word is not a plain pass.
    """

    figure: str
    minimum: float | None
    maximum: float | None
    unit: str
    value: float | None
    u: float | None
    U: float | None
    k: float | None
    dof: float | None
    conformance_probability: float | None
    verdict: VerdictWord
    rule: RuleName
    guard: float
    basis: Literal["figure", "bound"] | None
    reason: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Verdict:
    """The worst line, and all lines."""

    overall: VerdictWord
    lines: tuple[LineVerdict, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class SweepStart:
    """Everything known when a sweep begins; the logbook keeps it before the first point.

    Attributes:
        uuid: The sweep's name across logbooks.
        serial: The board's serial, text.
        kind: ``"sweep"`` from instruments, ``"capture"`` from a file, ``"through"`` board bypassed.
        started_at: UTC, ISO 8601.
        design_sha256: Names the design text stored beside it; None without a design.
        reference: What gain is referred to.
        source_ohm: Output resistance of the source when the reference is not the input.
        simulated: True when the instruments say they are a practice bench.
        settings: Schedule, bench and software, JSON text, so that the sweep can be repeated.
        instruments: Role, identity and driver of each instrument used.
    """

    uuid: str
    serial: str
    kind: Literal["sweep", "capture", "through"]
    started_at: str
    design_sha256: str | None
    reference: Literal["input", "through", "programmed"] = "input"
    source_ohm: float | None = None
    simulated: bool = False
    operator: str = ""
    lot: str = ""
    reason: str = ""
    note: str = ""
    settings: str = "{}"
    capture_sha256: str | None = None
    instruments: tuple["InstrumentUsed", ...] = field(default=())
    terms: tuple[Term, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class InstrumentUsed:
    """An instrument as it was when a sweep began."""

    role: Literal["source", "input meter", "output meter", "scope"]
    identity: str
    address: str
    driver: str
    calibration_due: str | None = None


SweepEnd: TypeAlias = Literal["complete", "stopped", "failed"]
# What a reader may find: a sweep that a crash cut off has no end.
SweepState: TypeAlias = SweepEnd | Literal["unfinished"]
