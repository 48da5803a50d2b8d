"""``benchlog bench``: check the bench, or play one."""

import sys
import threading
import time
from typing import TYPE_CHECKING

import click

from benchlog.cli.new import PRACTICE_PORTS
from benchlog.cli.output import print_json
from benchlog.cli.params import design_option, folder_of, json_option
from benchlog.cli.place import DESIGN, read_folder_bench, read_folder_design
from benchlog.errors import BenchlogError, ExitCode, InstrumentError

if TYPE_CHECKING:
    from benchlog.bench.setup import Place
    from benchlog.design.model import Design
    from benchlog.practice.server import PracticeServer

CAUTIONS = """\
Before anything is switched on:
  - The source drives voltage into the board. Check supply, polarity and the level first.
  - Mains-powered supplies and instruments: use them as their makers say, and never with a
    protective earth lifted. The ground of an earthed instrument is earth: do not clip it to
    anything that is not.
  - Capacitors stay charged after the supply is off. Discharge them before you touch the board.
  - Handle boards against static.
  - Local safety rules and qualified people decide; this tool does not."""


@click.group(name="bench", short_help="Check the bench, or start the practice bench.")
def command() -> None:
    """Check the bench, or start the practice bench."""


@command.command("check")
@click.option("--bench", "bench_path", metavar="FILE", help="Bench file; bench.toml by default.")
@json_option
@click.pass_context
def check(context: click.Context, bench_path: str | None, *, as_json: bool) -> None:
    """Open every instrument, let it identify itself, and say what is not as it must be.

    Nothing is switched on.
    """
    setup = read_folder_bench(context, bench_path)
    rows = [_checked(place) for place in setup.places()]
    troubled = any(row["trouble"] for row in rows)
    if as_json:
        print_json({"bench": setup.name, "instruments": rows, "ready": not troubled})
    else:
        click.echo(f"bench {setup.name}")
        for row in rows:
            _print_row(row)
        click.echo(CAUTIONS)
        click.echo("ready" if not troubled else "NOT READY")
    if troubled:
        context.exit(ExitCode.INSTRUMENT)


def _checked(place: "Place") -> dict[str, object]:
    from benchlog.bench.link import open_link

    row: dict[str, object] = {
        "role": place.role,
        "address": place.address,
        "driver": place.driver.name,
        "identity": None,
        "round_trip_s": None,
        "calibration_due": place.calibration_due,
        "overdue": place.calibration_due is not None
        and place.calibration_due < time.strftime("%Y-%m-%d"),
        "trouble": None,
    }
    try:
        wire = open_link(place.address, settings=place.driver.link)
    except BenchlogError as error:
        return row | {"trouble": str(error)}
    try:
        began_s = time.perf_counter()
        wire.ask("*IDN?", timeout_s=place.driver.link.timeout_s)
        row |= {"identity": wire.identity, "round_trip_s": time.perf_counter() - began_s}
    except InstrumentError as error:
        return row | {"trouble": str(error)}
    finally:
        wire.close()
    if place.identity is not None and place.identity not in wire.identity:
        row["trouble"] = (
            f"another instrument answers: {wire.identity!r}\n  expected: {place.identity!r} in it"
        )
    return row


def _print_row(row: dict[str, object]) -> None:
    click.echo(f"  {row['role']}: {row['address']}, driver {row['driver']}")
    if row["trouble"]:
        click.echo("    TROUBLE " + str(row["trouble"]).replace("\n", "\n    "))
        return
    took_s = row["round_trip_s"]
    took = f" in {1000.0 * took_s:.1f} ms" if isinstance(took_s, float) else ""
    click.echo(f"    answers{took}: {row['identity']}")
    if row["overdue"]:
        click.echo(f"    CALIBRATION OVERDUE since {row['calibration_due']}")
    elif row["calibration_due"]:
        click.echo(f"    calibration due {row['calibration_due']}")


@command.command("practice")
@design_option
@click.option(
    "--port",
    default=PRACTICE_PORTS[0],
    show_default=True,
    type=click.IntRange(0, 65533),
    help="Port of the source; output and input meter follow. 0 takes free ports.",
)
@click.option("--seed", default=1, show_default=True, help="Which lot of boards is invented.")
@click.pass_context
def practice(context: click.Context, design_path: str | None, *, port: int, seed: int) -> None:
    """Play a bench: SCPI instruments on this computer around an invented board.

    Sweep it from another terminal. Enter puts the next board on the bench; Ctrl-C ends it.
    The boards are built to --design, to the bench folder's design.toml, or to the example.
    """
    from benchlog.practice.server import PracticeServer
    from benchlog.practice.world import World

    design = _practice_design(context, design_path)
    ports = (port, port + 1, port + 2) if port else (0, 0, 0)
    with PracticeServer(World(seed=seed), ports=ports) as server:
        _put(server, design, seed=seed, number=1)
        click.echo(f"practice bench: every measurement on it is SIMULATED; design {design.name!r}")
        for role, address in zip(server.addresses._fields, server.addresses, strict=True):
            click.echo(f"  {role:<13} {address}")
        click.echo("ready; Enter puts the next board on the bench, Ctrl-C ends")
        sys.stdout.flush()
        _serve(server, design, seed)


def _practice_design(context: click.Context, path: str | None) -> "Design":
    if path is not None or (folder_of(context) / DESIGN).exists():
        return read_folder_design(context, path)
    from benchlog.design.example import EXAMPLE_DESIGN
    from benchlog.design.read import parse_design

    return parse_design(EXAMPLE_DESIGN, where="the example design")


def _serve(server: "PracticeServer", design: "Design", seed: int) -> None:
    """Change boards at each Enter; without a terminal, keep the first until the end."""
    if sys.stdin is None or not sys.stdin.isatty():
        threading.Event().wait()
    number = 1
    for _ in sys.stdin:
        number += 1
        _put(server, design, seed=seed, number=number)
        click.echo(f"board {number} is on the bench")


def _put(server: "PracticeServer", design: "Design", *, seed: int, number: int) -> None:
    from benchlog.practice.board import PracticeBoard

    server.put_board(PracticeBoard(design, seed=1000 * seed + number, label=f"board {number}"))
