"""The street of one board: points, curve, figures, verdict, all kept as they are made.

Every command that measures, imports or judges goes through here.
"""

import json
import uuid
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from datetime import UTC, datetime
from pathlib import Path
from typing import TYPE_CHECKING

from benchlog.design.model import Design
from benchlog.design.read import parse_design
from benchlog.errors import BenchlogError, CurveError, ExitCode, LogbookError
from benchlog.logbook.rows import StoredSweep
from benchlog.logbook.store import Logbook
from benchlog.records import (
    FIGURE_NAMES,
    Figures,
    Point,
    Reason,
    SweepStart,
    SweepState,
    Verdict,
)

if TYPE_CHECKING:
    from benchlog.bench.perform import Progress
    from benchlog.bench.setup import Bench
    from benchlog.bench.stop import StopFlag
    from benchlog.curve import GainCurve
    from benchlog.sweep.schedule import Schedule

EXTRACT_SETTINGS = json.dumps({"shape": "auto"})


@dataclass(frozen=True, slots=True, kw_only=True)
class People:
    """What a person says about a measurement."""

    operator: str = ""
    lot: str = ""
    reason: str = ""
    note: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Outcome:
    """What became of one board.

    Attributes:
        start: As the logbook keeps it.
        design: What it was held against; None without a design.
        state, why: How the sweep ended.
        points: As measured or imported.
        figures: None where the sweep did not come to its end.
        verdict: None without a design, or where there are no figures.
        error: What ended the sweep, where it was trouble.
    """

    start: SweepStart
    design: Design | None
    state: SweepState
    why: str
    points: tuple[Point, ...]
    figures: Figures | None = None
    verdict: Verdict | None = None
    error: BenchlogError | None = None


def now() -> str:
    """Return the time as the logbook writes it."""
    return datetime.now(UTC).isoformat(timespec="milliseconds")


def new_uuid() -> str:
    """Return a name for a sweep that no other bench will give."""
    return str(uuid.uuid4())


def measure(  # noqa: PLR0913 - bench, board, record: what one sweep takes
    bench: "Bench",
    schedule: "Schedule",
    *,
    start: SweepStart,
    design: Design,
    logbook: Logbook,
    stop: "StopFlag",
    progress: "Callable[[Progress], None] | None" = None,
) -> Outcome:
    """Sweep a board; each point is in the logbook before the next is asked for.

    Raises:
        LogbookError: The sweep could not be begun; nothing was driven.
    """
    from benchlog.bench.runner import run_sweep

    begin(logbook, start, design)

    def keep(point: Point) -> None:
        logbook.add_point(start.uuid, point)

    try:
        result = run_sweep(bench, schedule, keep=keep, progress=progress, stop=stop)
    except BaseException as error:
        _try_to_end(logbook, start.uuid, f"The program failed: {type(error).__name__}.")
        raise
    if isinstance(result.error, LogbookError):
        _try_to_end(logbook, start.uuid, result.why)
    else:
        logbook.end_sweep(start.uuid, result.state, result.why)
    outcome = Outcome(
        start=start,
        design=design,
        state=result.state,
        why=result.why,
        points=result.points,
        error=result.error,
    )
    return settle(logbook, outcome) if result.state == "complete" else outcome


def begin(logbook: Logbook, start: SweepStart, design: Design | None) -> None:
    """Write the start row, and the design where the logbook does not have it yet."""
    if design is None:
        logbook.begin_sweep(start)
        return
    logbook.begin_sweep(
        start, design_text=design.text, design_name=design.name, design_revision=design.revision
    )


def add_design(logbook: Logbook, design: Design) -> None:
    """Keep a design's text, where the logbook does not have it yet."""
    logbook.add_design(
        design.text, sha256=design.sha256, name=design.name, revision=design.revision
    )


def settle(logbook: Logbook, outcome: Outcome) -> Outcome:
    """Draw figures from the stored points and judge them; both become new rows."""
    figures = figures_of(_curve(logbook, outcome.start.uuid), outcome.design)
    figures_id = logbook.add_figures(outcome.start.uuid, figures, EXTRACT_SETTINGS)
    verdict = None
    if outcome.design is not None:
        verdict = judge_and_keep(logbook, figures_id, figures=figures, design=outcome.design)
    return replace(outcome, figures=figures, verdict=verdict)


def figures_of(curve: "GainCurve | None", design: Design | None) -> Figures:
    """Draw figures from a curve; a sweep without any gain has none, and says so."""
    from benchlog.extract.figures import extract

    if curve is None:
        reason = Reason(
            code="no usable point",
            text="No point of this sweep has a gain: look at the flags of its points.",
            figures=FIGURE_NAMES,
        )
        return Figures(shape="none", validity=(reason,))
    return extract(curve, design)


def judge_and_keep(
    logbook: Logbook, figures_id: int, *, figures: Figures, design: Design
) -> Verdict:
    """Judge figures against a design's budget; the verdict becomes a new row."""
    from benchlog.judge.verdict import judge

    verdict = judge(figures, design.budget)
    logbook.add_verdict(figures_id, verdict, design.budget.text(), design_sha256=design.sha256)
    return verdict


def stored_outcome(logbook: Logbook, sweep: StoredSweep, design: Design | None) -> Outcome:
    """Return what the logbook knows of a sweep, with its latest figures and verdict."""
    figures = logbook.latest_figures(sweep.start.uuid)
    verdict = logbook.latest_verdict(sweep.start.uuid)
    return Outcome(
        start=sweep.start,
        design=design,
        state=sweep.state,
        why=sweep.why,
        points=logbook.points(sweep.start.uuid),
        figures=None if figures is None else figures.figures,
        verdict=None if verdict is None else verdict.verdict,
    )


def design_of(sweep: StoredSweep) -> Design | None:
    """Return the design that a sweep was made to, read from the logbook's own copy."""
    if sweep.design is None:
        return None
    where = f"design {sweep.design.name} {sweep.design.revision} in the logbook"
    return parse_design(sweep.design.text, where=where)


def exit_code(outcomes: Sequence[Outcome]) -> int:
    """Return the exit code of a command that judged boards (README, exit codes)."""
    for outcome in outcomes:
        if outcome.error is not None:
            return outcome.error.exit_code
    words = [outcome.verdict.overall for outcome in outcomes if outcome.verdict is not None]
    if "fail" in words:
        return ExitCode.SOME_FAIL
    unclear = any(word != "pass" for word in words) or any(
        outcome.state != "complete" for outcome in outcomes
    )
    return ExitCode.UNDECIDED if unclear else ExitCode.ALL_PASS


def open_logbook(path: Path, *, create: bool = True) -> Logbook:
    """Open a logbook for writing; a new one is made where there is none."""
    return Logbook(path, create=create and not path.exists())


def _curve(logbook: Logbook, sweep: str) -> "GainCurve | None":
    try:
        return logbook.curve(sweep)
    except CurveError:
        return None


def _try_to_end(logbook: Logbook, sweep: str, why: str) -> None:
    """Write the end row if the logbook still can; the sweep stays unfinished otherwise."""
    try:
        logbook.end_sweep(sweep, "failed", why)
    except BenchlogError:
        return
