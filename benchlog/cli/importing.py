"""From captures to judged sweeps of the logbook, and the preview that keeps nothing."""

import json
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import click

from benchlog.capture.originals import keep_original
from benchlog.capture.read import Capture
from benchlog.cli.show import outcome_json, print_outcome
from benchlog.cli.street import Outcome, People, begin, figures_of, new_uuid, now, settle
from benchlog.design.model import Design
from benchlog.errors import CaptureError
from benchlog.logbook.store import Logbook
from benchlog.records import Point, PointFlag, SweepStart

ORIGINALS = "captures"


@dataclass(frozen=True, slots=True, kw_only=True)
class Import:
    """One board's capture on its way into the logbook."""

    serial: str
    capture: Capture
    design: Design | None
    people: People

    @property
    def title(self) -> str:
        """What to call it in messages."""
        first, *more = self.capture.files
        return f"{first} and {len(more)} more" if more else str(first)

    def start(self) -> SweepStart:
        """Return what the logbook is told before the points."""
        capture, people = self.capture, self.people
        return SweepStart(
            uuid=new_uuid(),
            serial=self.serial,
            kind="capture",
            started_at=now(),
            design_sha256=None if self.design is None else self.design.sha256,
            reference=capture.curve.reference,
            operator=people.operator,
            lot=people.lot,
            reason=people.reason,
            note=people.note,
            settings=json.dumps(
                {
                    "files": [file.name for file in capture.files],
                    "understood": dict(capture.understood),
                    "notes": list(capture.notes),
                }
            ),
            capture_sha256=capture.sha256,
            terms=capture.curve.terms,
        )

    def previewed(self) -> Outcome:
        """Return what it would come to; nothing is kept."""
        from benchlog.judge.verdict import judge

        figures = figures_of(self.capture.curve, self.design)
        return Outcome(
            start=self.start(),
            design=self.design,
            state="complete",
            why="Preview: nothing was kept.",
            points=_points(self.capture),
            figures=figures,
            verdict=None if self.design is None else judge(figures, self.design.budget),
        )

    def keep(self, logbook: Logbook, *, originals: Path | None) -> Outcome:
        """Keep the capture whole or not at all, then draw figures and judge.

        Args:
            logbook: Where to.
            originals: Folder for compressed copies of the files; None keeps none.
        """
        for file in self.capture.files if originals is not None else ():
            keep_original(file, originals or Path())
        start, points = self.start(), _points(self.capture)
        with logbook.together():
            begin(logbook, start, self.design)
            logbook.add_points(start.uuid, points)
            logbook.end_sweep(start.uuid, "complete", "Imported.")
        kept = Outcome(
            start=start, design=self.design, state="complete", why="Imported.", points=points
        )
        return settle(logbook, kept)

    def refuse_known(self, logbook: Logbook) -> None:
        """Refuse bytes that the logbook has already.

        Raises:
            CaptureError: It has.
        """
        known = logbook.captures(self.capture.sha256)
        if known:
            raise CaptureError(
                f"this capture is in the logbook already, as serial {known[-1].start.serial}",
                where=self.title,
                expected="a capture that was not imported before",
                hint="--again imports it once more",
            )


def print_preview(imports: Sequence[Import]) -> None:
    """Show what was understood of each capture, and what it would come to."""
    for one in imports:
        click.echo(f"{one.title}\n  {'serial':<12} {one.serial or 'not given yet'}")
        for name, value in one.capture.understood.items():
            click.echo(f"  {name:<12} {value}")
        print_notes(one)
        print_outcome(one.previewed(), terms=True)


def preview_json(imports: Sequence[Import]) -> list[dict[str, Any]]:
    """Return the same for scripts."""
    return [
        outcome_json(one.previewed())
        | {
            "files": [str(file) for file in one.capture.files],
            "understood": dict(one.capture.understood),
            "notes": list(one.capture.notes),
        }
        for one in imports
    ]


def print_notes(one: Import) -> None:
    """Print what a person should know about a capture."""
    for note in one.capture.notes:
        click.echo(f"{one.title}: {note}")


def _points(capture: Capture) -> tuple[Point, ...]:
    curve = capture.curve
    return tuple(
        Point(
            position=place,
            frequency_hz=float(curve.frequency_hz[place]),
            level_vrms=0.0,
            input_vrms=None,
            output_vrms=None,
            gain=float(curve.gain[place]),
            u_gain_rel=None if curve.u_gain_rel is None else float(curve.u_gain_rel[place]),
            phase_deg=None if curve.phase_deg is None else float(curve.phase_deg[place]),
            flags=PointFlag.NONE if curve.flags is None else PointFlag(int(curve.flags[place])),
        )
        for place in range(len(curve))
    )
