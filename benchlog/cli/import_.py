"""``benchlog import``: captures become sweeps of the logbook."""

import json
from pathlib import Path
from typing import TYPE_CHECKING

import click

from benchlog.cli.output import print_json
from benchlog.cli.params import (
    HERTZ,
    SERIAL,
    design_option,
    json_option,
    logbook_option,
    people_options,
)
from benchlog.cli.place import DESIGN, logbook_path, read_folder_design
from benchlog.cli.show import outcome_json, print_outcome
from benchlog.cli.street import (
    Outcome,
    People,
    begin,
    exit_code,
    figures_of,
    new_uuid,
    now,
    open_logbook,
    settle,
)
from benchlog.errors import CaptureError
from benchlog.records import Point, PointFlag, SweepStart

if TYPE_CHECKING:
    from collections.abc import Sequence

    from benchlog.capture.read import Capture
    from benchlog.design.model import Design
    from benchlog.logbook.store import Logbook


@click.command(name="import", short_help="Bring CSV captures into the logbook and judge them.")
@click.argument(
    "files", metavar="FILE...", nargs=-1, required=True, type=click.Path(path_type=Path)
)
@design_option
@click.option("--serial", type=SERIAL, help="The board's serial; asked for on a terminal.")
@logbook_option
@people_options
@click.option(
    "--unit",
    "units",
    multiple=True,
    metavar="COLUMN=UNIT",
    help="Unit that the file does not give: gain=dB, frequency=kHz, input=Vpp ...",
)
@click.option(
    "--column",
    "columns",
    multiple=True,
    metavar="SIDE=NAME",
    help="Which channel of a time record is what: input=CH1, output=CH2.",
)
@click.option(
    "--frequency", type=HERTZ, metavar="FREQ", help="Frequency of a time record, if it is known."
)
@click.option("--preview", is_flag=True, help="Show what was understood; keep nothing.")
@click.option("--again", is_flag=True, help="Import a file that is in the logbook already.")
@json_option
@click.pass_context
def command(  # noqa: PLR0913 - one parameter for each option
    context: click.Context,
    /,
    files: tuple[Path, ...],
    *,
    design_path: str | None,
    serial: str | None,
    logbook_path: str | None,
    units: tuple[str, ...],
    columns: tuple[str, ...],
    frequency: float | None,
    preview: bool,
    again: bool,
    as_json: bool,
    **people: str,
) -> None:
    """Read CSV captures of one board, draw figures, judge them, and keep it all.

    A FILE is a swept table (a frequency column and gain, gain in dB, or input and output
    amplitude), a time record of two channels, or a folder of records at several frequencies; all
    records together are one curve. Without --design and without a design.toml in the bench folder
    there are figures but no verdict.
    """
    from benchlog.capture.read import Told, inspect_captures

    design = _design(context, design_path)
    told = Told(
        units=dict(_named(text, "--unit", "gain=dB") for text in units),
        columns=dict(_named(text, "--column", "input=CH1") for text in columns),
        frequency_hz=frequency,
    )
    captures = inspect_captures(files, design=design, told=told)
    if preview:
        _preview(captures, design, as_json=as_json)
        return
    if serial is None:
        serial = click.prompt("serial", type=SERIAL, err=True) if _asks(as_json=as_json) else ""
    if not serial:
        raise click.UsageError("name the board with --serial: a file name is no serial")
    outcomes = []
    with open_logbook(_logbook(context, logbook_path)) as logbook:
        for capture in captures:
            if not again:
                _refuse_known(logbook, capture)
            outcomes.append(
                _kept(
                    logbook,
                    capture,
                    start=_start(capture, design, serial=serial, people=People(**people)),
                    design=design,
                )
            )
    if as_json:
        print_json([outcome_json(outcome) for outcome in outcomes])
    else:
        for capture, outcome in zip(captures, outcomes, strict=True):
            _print_notes(capture)
            print_outcome(outcome)
    context.exit(exit_code(outcomes))


def _kept(
    logbook: "Logbook", capture: "Capture", *, start: SweepStart, design: "Design | None"
) -> Outcome:
    """Keep a capture whole or not at all, then draw figures and judge."""
    points = _points(capture)
    with logbook.together():
        begin(logbook, start, design)
        logbook.add_points(start.uuid, points)
        logbook.end_sweep(start.uuid, "complete", "Imported.")
    outcome = Outcome(start=start, design=design, state="complete", why="Imported.", points=points)
    return settle(logbook, outcome)


def _points(capture: "Capture") -> tuple[Point, ...]:
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


def _start(
    capture: "Capture", design: "Design | None", *, serial: str, people: People
) -> SweepStart:
    return SweepStart(
        uuid=new_uuid(),
        serial=serial,
        kind="capture",
        started_at=now(),
        design_sha256=None if design is None else design.sha256,
        reference=capture.curve.reference,
        operator=people.operator,
        lot=people.lot,
        reason=people.reason,
        note=people.note,
        settings=json.dumps(
            {"files": [file.name for file in capture.files], "notes": list(capture.notes)}
        ),
        capture_sha256=capture.sha256,
        terms=capture.curve.terms,
    )


def _design(context: click.Context, path: str | None) -> "Design | None":
    from benchlog.cli.params import folder_of

    if path is None and not (folder_of(context) / DESIGN).exists():
        return None
    return read_folder_design(context, path)


def _logbook(context: click.Context, named: str | None) -> Path:
    return logbook_path(context, named)


def _asks(*, as_json: bool) -> bool:
    """Tell whether a person can be asked."""
    import sys

    return not as_json and sys.stdin is not None and sys.stdin.isatty()


def _named(text: str, option: str, example: str) -> tuple[str, str]:
    """Split ``gain=dB``."""
    name, equals, value = text.partition("=")
    if not equals or not name.strip() or not value.strip():
        raise click.BadParameter(f"{text!r} is not COLUMN=UNIT, like {example}", param_hint=option)
    return name.strip(), value.strip()


def _refuse_known(logbook: "Logbook", capture: "Capture") -> None:
    known = logbook.captures(capture.sha256)
    if known:
        raise CaptureError(
            f"this capture is in the logbook already, as serial {known[-1].start.serial}",
            where=_title(capture),
            expected="a capture that was not imported before",
            hint="--again imports it once more",
        )


def _title(capture: "Capture") -> str:
    first = str(capture.files[0])
    return first if len(capture.files) == 1 else f"{first} and {len(capture.files) - 1} more"


def _print_notes(capture: "Capture") -> None:
    for note in capture.notes:
        click.echo(f"{_title(capture)}: {note}")


def _preview(captures: "Sequence[Capture]", design: "Design | None", *, as_json: bool) -> None:
    """Show what was understood of each capture, and what it would come to."""
    from benchlog.judge.verdict import judge

    outcomes = []
    for capture in captures:
        figures = figures_of(capture.curve, design)
        outcomes.append(
            Outcome(
                start=_start(capture, design, serial="preview", people=People()),
                design=design,
                state="complete",
                why="Preview: nothing was kept.",
                points=_points(capture),
                figures=figures,
                verdict=None if design is None else judge(figures, design.budget),
            )
        )
    if as_json:
        print_json(
            [
                outcome_json(outcome)
                | {
                    "files": [str(file) for file in capture.files],
                    "understood": dict(capture.understood),
                    "notes": list(capture.notes),
                }
                for capture, outcome in zip(captures, outcomes, strict=True)
            ]
        )
        return
    for capture, outcome in zip(captures, outcomes, strict=True):
        click.echo(_title(capture))
        for name, value in capture.understood.items():
            click.echo(f"  {name:<12} {value}")
        _print_notes(capture)
        print_outcome(outcome, terms=True)
    click.echo("preview: nothing was kept")
