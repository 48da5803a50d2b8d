"""``benchlog demo``: the whole street on the practice bench, with invented boards."""

from collections.abc import Mapping
from contextlib import ExitStack
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING

import click

from benchlog.cli.new import bench_text, make_folder
from benchlog.cli.output import print_json
from benchlog.cli.params import json_option
from benchlog.cli.place import BENCH, DESIGN, LOGBOOK
from benchlog.cli.show import outcome_json
from benchlog.cli.street import Outcome, People, open_logbook
from benchlog.cli.sweep import Job
from benchlog.errors import ExitCode

if TYPE_CHECKING:
    from benchlog.bench.stop import StopFlag
    from benchlog.design.model import Design
    from benchlog.practice.server import PracticeServer

CAPTURE = "capture_0006.csv"
HISTORY_OF = "0003"


@dataclass(frozen=True, slots=True, kw_only=True)
class DemoBoard:
    """One invented board.

    Attributes:
        serial: Its label.
        story: What is true of it, which nobody on a real bench would know.
        promised: First word of the verdict it must get.
        changes: Parts that are not what the design says.
        spread: Whether the other parts vary within their tolerance.
    """

    serial: str
    story: str
    promised: str
    changes: Mapping[str, float] = field(default_factory=dict)
    spread: bool = True


# The gain of 0005 lies on the lower limit, 33.3 dB: closer than its uncertainty on either side.
BOARDS = (
    DemoBoard(serial="0001", story="good", promised="pass"),
    DemoBoard(serial="0002", story="good", promised="pass"),
    DemoBoard(
        serial="0003",
        story="1.2k fitted in the place of 1k: gain low",
        promised="fail",
        changes={"stage[1].ground": 1200.0, "amplifier.main.gbw": 3.1e6},
    ),
    DemoBoard(
        serial="0004",
        story="a slow amplifier: GBW low",
        promised="fail",
        changes={"amplifier.main.gbw": 1.95e6},
        spread=False,
    ),
    DemoBoard(
        serial="0005",
        story="gain on its lower limit, inside the guard band",
        promised="conditional",
        changes={"stage[1].ground": 1038.7, "amplifier.main.gbw": 3e6},
        spread=False,
    ),
)


@click.command(short_help="Sweep five invented boards on the practice bench, start to finish.")
@click.argument("directory", metavar="[DIR]", required=False, type=click.Path(path_type=Path))
@json_option
@click.pass_context
def command(context: click.Context, directory: Path | None, *, as_json: bool) -> None:
    """Sweep five invented boards on the practice bench, import a capture, show a history.

    Everything is kept in DIR, a new folder benchlog-demo by default. All of it is invented, and
    marked as simulated.
    """
    from benchlog.bench.stop import stop_on_signals
    from benchlog.design.read import read_design
    from benchlog.practice.server import PracticeServer
    from benchlog.practice.world import World

    folder = directory or _free_folder()
    with ExitStack() as stack:
        server = stack.enter_context(PracticeServer(World(seed=7)))
        ports = [int(address.split("::")[2]) for address in server.addresses]
        make_folder(folder, bench_text((ports[0], ports[1], ports[2])))
        design = read_design(folder / DESIGN)
        stop = stack.enter_context(stop_on_signals())
        outcomes = _swept(folder, design, server, stop=stop, quiet=as_json)
    if stop.is_set():
        context.exit(stop.exit_code)
    if not as_json:
        _rest_of_the_street(context, folder)
        _print_summary(folder, outcomes)
    else:
        print_json([outcome_json(outcome) for outcome in outcomes])
    kept = [
        outcome.verdict is not None and outcome.verdict.overall.startswith(board.promised)
        for board, outcome in zip(BOARDS, outcomes, strict=False)
    ]
    context.exit(ExitCode.ALL_PASS if len(kept) == len(BOARDS) and all(kept) else ExitCode.NOT_DONE)


def _swept(
    folder: Path, design: "Design", server: "PracticeServer", *, stop: "StopFlag", quiet: bool
) -> list[Outcome]:
    from benchlog.bench.setup import open_bench, read_bench
    from benchlog.practice.board import PracticeBoard
    from benchlog.sweep.from_design import schedule_for

    setup = read_bench(folder / BENCH)
    schedule = schedule_for(design, setup.limits())
    people = People(operator="demo", lot="demo lot", note="invented")
    job = Job(design, setup, schedule, people, file=setup.logbook, quiet=quiet)
    click.echo(schedule.statement(), err=True)
    outcomes = []
    with open_logbook(setup.logbook) as logbook, open_bench(setup, stop=stop) as bench:
        for seed, board in enumerate(BOARDS, start=1):
            if stop.is_set():
                break
            server.put_board(
                PracticeBoard(
                    design,
                    seed=seed,
                    label=board.serial,
                    spread=board.spread,
                    changes=board.changes,
                )
            )
            outcomes.append(job.one(board.serial, bench=bench, logbook=logbook, stop=stop))
    return outcomes


def _rest_of_the_street(context: click.Context, folder: Path) -> None:
    """Import a capture and show a history, by the commands that a user would type."""
    from benchlog.capture.example import example_capture
    from benchlog.cli import program

    (folder / CAPTURE).write_text(example_capture(), encoding="utf-8")
    for arguments in (
        ["import", str(folder / CAPTURE), "--serial", "0006", "--note", "invented"],
        ["history", HISTORY_OF],
    ):
        click.echo(f"\n$ benchlog -C {folder} {' '.join(arguments)}")
        program.main(
            ["-C", str(folder), *arguments],
            prog_name=context.find_root().info_name,
            standalone_mode=False,
        )


def _print_summary(folder: Path, outcomes: list[Outcome]) -> None:
    from benchlog.report.tables import figure_text, plain_table

    rows = []
    for board, outcome in zip(BOARDS, outcomes, strict=False):
        figures, verdict = outcome.figures, outcome.verdict
        rows.append(
            (
                board.serial,
                board.story,
                figure_text(figures.gain_db if figures else None),
                figure_text(figures.corner_hz if figures else None),
                figure_text(figures.gbw_hz if figures else None),
                (verdict.overall if verdict else outcome.state).upper(),
            )
        )
    click.echo("\nThe five boards, with what is true of them (all invented, all SIMULATED):")
    headings = ("serial", "what is true of it", "gain", "corner", "GBW", "verdict")
    click.echo(plain_table(headings, rows))
    click.echo(f"\nEverything is kept in {folder}:")
    for name, text in (
        (BENCH, "the instruments"),
        (DESIGN, "the design with its budget"),
        (LOGBOOK, "every point, figure and verdict"),
        (CAPTURE, "the capture that was imported as 0006"),
    ):
        click.echo(f"  {folder / name!s:<40} {text}")
    click.echo(f"next: benchlog -C {folder} history")


def _free_folder() -> Path:
    """Return benchlog-demo, or the first of benchlog-demo-2, -3, ... that is not there."""
    number, folder = 1, Path("benchlog-demo")
    while folder.exists():
        number += 1
        folder = Path(f"benchlog-demo-{number}")
    return folder
