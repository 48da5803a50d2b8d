"""``benchlog sweep``: measure boards and judge them."""

import json
import sys
from collections.abc import Iterator, Sequence
from contextlib import ExitStack
from pathlib import Path
from typing import TYPE_CHECKING

import click

from benchlog.cli.output import print_json
from benchlog.cli.params import (
    HERTZ,
    LEVEL,
    SERIAL,
    clean_serial,
    design_option,
    json_option,
    logbook_option,
    people_options,
)
from benchlog.cli.place import logbook_path, read_folder_bench, read_folder_design
from benchlog.cli.progress import SweepProgress
from benchlog.cli.show import outcome_json, print_outcome
from benchlog.cli.street import (
    Outcome,
    People,
    exit_code,
    measure,
    new_uuid,
    now,
    open_logbook,
)
from benchlog.records import SweepStart

if TYPE_CHECKING:
    from benchlog.bench.setup import Bench, BenchSetup
    from benchlog.bench.stop import StopFlag
    from benchlog.design.model import Design
    from benchlog.logbook.store import Logbook
    from benchlog.sweep.schedule import Schedule


@click.command(short_help="Sweep boards and judge them.")
@click.argument("serials", metavar="[SERIAL]...", nargs=-1, type=SERIAL)
@design_option
@click.option("--bench", "bench_path", metavar="FILE", help="Bench file; bench.toml by default.")
@logbook_option
@people_options
@click.option("--start", type=HERTZ, metavar="FREQ", help="First frequency, like 100 or 1k.")
@click.option("--stop", type=HERTZ, metavar="FREQ", help="Last frequency, like 2M.")
@click.option("--per-decade", type=click.IntRange(1, 1000), help="Points per decade.")
@click.option("--level", type=LEVEL, metavar="LEVEL", help="At the board's input: 20mVpp.")
@click.option(
    "--beyond-limits",
    is_flag=True,
    help="Allow levels above the bench's ceiling and the design's drive limits.",
)
@click.option("--dry-run", is_flag=True, help="Print the schedule and open nothing.")
@json_option
@click.pass_context
def command(  # noqa: PLR0913 - one parameter for each option
    context: click.Context,
    /,
    serials: tuple[str, ...],
    *,
    design_path: str | None,
    bench_path: str | None,
    logbook_path: str | None,
    start: float | None,
    stop: float | None,
    per_decade: int | None,
    level: float | None,
    beyond_limits: bool,
    dry_run: bool,
    as_json: bool,
    **people: str,
) -> None:
    """Sweep boards and judge them.

    Each SERIAL is swept in turn. Without any, and on a terminal: scan or type a serial, press
    Enter, read the verdict, take the next board; an empty line ends.
    """
    from benchlog.sweep.from_design import Override, schedule_for

    if not serials and not dry_run and (as_json or not sys.stdin.isatty()):
        raise click.UsageError("name the serials: without a terminal nobody can scan them")
    design = read_folder_design(context, design_path)
    setup = read_folder_bench(context, bench_path)
    schedule = schedule_for(
        design,
        setup.limits(),
        override=Override(start_hz=start, stop_hz=stop, per_decade=per_decade, level_vrms=level),
        beyond_limits=beyond_limits,
    )
    if dry_run:
        _print_schedule(schedule, as_json=as_json)
        return
    file = _logbook_file(context, logbook_path, setup)
    job = Job(design, setup, schedule, People(**people), file=file, quiet=as_json)
    outcomes = job.run(serials)
    if as_json:
        print_json([outcome_json(outcome) for outcome in outcomes])
    context.exit(job.stop_code or exit_code(outcomes))


class Job:
    """Sweeping boards with one design, one bench, one schedule."""

    def __init__(  # noqa: PLR0917 - what belongs to a job
        self,
        design: "Design",
        setup: "BenchSetup",
        schedule: "Schedule",
        people: People,
        *,
        file: Path,
        quiet: bool = False,
    ) -> None:
        self.design, self.setup, self.schedule, self.people = design, setup, schedule, people
        self.file, self.quiet = file, quiet
        self.stop_code: int | None = None

    def run(self, serials: Sequence[str]) -> list[Outcome]:
        """Sweep the boards that are named, or scanned one after another."""
        from benchlog.bench.setup import open_bench
        from benchlog.bench.stop import stop_on_signals

        outcomes: list[Outcome] = []
        with ExitStack() as stack:
            stop = stack.enter_context(stop_on_signals())
            logbook = stack.enter_context(open_logbook(self.file))
            bench = stack.enter_context(open_bench(self.setup, stop=stop))
            for note in (*self.schedule.notes, self.schedule.statement()):
                click.echo(note, err=True)
            for serial in serials or _scanned(stop):
                outcome = self.one(serial, bench=bench, logbook=logbook, stop=stop)
                outcomes.append(outcome)
                if outcome.error is not None:
                    click.echo(f"error: {outcome.error}\n  sweep:    {outcome.why}", err=True)
                if stop.is_set() or outcome.error is not None:
                    break
        if stop.is_set():
            self.stop_code = stop.exit_code
            click.echo(stop.why, err=True)
        return outcomes

    def one(self, serial: str, *, bench: "Bench", logbook: "Logbook", stop: "StopFlag") -> Outcome:
        """Sweep one board and show what became of it."""
        with SweepProgress(serial) as progress:
            outcome = measure(
                bench,
                self.schedule,
                start=self.start(serial, bench),
                design=self.design,
                logbook=logbook,
                stop=stop,
                progress=progress,
            )
        if not self.quiet:
            print_outcome(outcome, large=True)
        return outcome

    def start(self, serial: str, bench: "Bench") -> SweepStart:
        """Return what the logbook is told before the first point."""
        return SweepStart(
            uuid=new_uuid(),
            serial=serial,
            kind="sweep",
            started_at=now(),
            design_sha256=self.design.sha256,
            reference="input" if bench.input_meter is not None else "programmed",
            source_ohm=self.setup.source_ohm,
            simulated=bench.simulated,
            operator=self.people.operator,
            lot=self.people.lot,
            reason=self.people.reason,
            note=self.people.note,
            settings=_settings(self.schedule, self.setup),
            instruments=bench.instruments(),
            terms=self.setup.terms(),
        )


def _logbook_file(context: click.Context, named: str | None, setup: "BenchSetup") -> Path:
    return setup.logbook if named is None else logbook_path(context, named)


def _scanned(stop: "StopFlag") -> Iterator[str]:
    """Ask for one serial after another; an empty line or the end of input ends."""
    while not stop.is_set():
        try:
            with stop.asking():
                text = input("\nserial (Enter alone ends): ")
        except (EOFError, KeyboardInterrupt):
            return
        if not text.strip():
            return
        try:
            yield clean_serial(text)
        except ValueError as error:
            click.echo(f"error: {error}", err=True)


def _settings(schedule: "Schedule", setup: "BenchSetup") -> str:
    from benchlog import __version__

    return json.dumps(
        {"program": __version__, "bench": setup.text, "schedule": schedule.settings()}
    )


def _print_schedule(schedule: "Schedule", *, as_json: bool) -> None:
    from benchlog.notation import si
    from benchlog.report.tables import plain_table

    if as_json:
        print_json(
            [
                {
                    "position": step.position,
                    "frequency_hz": step.frequency_hz,
                    "level_vrms": step.level_vrms,
                    "input_vrms": schedule.at_board(step.level_vrms),
                    "expected_output_vrms": step.output_vrms,
                }
                for step in schedule.steps
            ]
        )
        return
    rows = [
        (
            str(step.position + 1),
            si(step.frequency_hz, "Hz", 6),
            si(step.level_vrms, "Vrms"),
            si(schedule.at_board(step.level_vrms), "Vrms"),
            "-" if step.output_vrms is None else si(step.output_vrms, "Vrms"),
        )
        for step in schedule.steps
    ]
    headings = ("point", "frequency", "source set to", "at the board", "expected at the output")
    click.echo(plain_table(headings, rows))
    for note in (*schedule.notes, schedule.statement(), "Dry run: nothing was opened."):
        click.echo(note)
