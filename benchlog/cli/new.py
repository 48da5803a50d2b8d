"""``benchlog new``: a bench folder to start from."""

from pathlib import Path

import click

from benchlog.cli.place import BENCH, DESIGN, LOGBOOK
from benchlog.errors import BenchlogError

EXAMPLE_BENCH = """\
# The instruments used together.  The addresses below are those of the practice bench
# (`benchlog bench practice`); put those of your own instruments in their place.

name = "bench 1"
logbook = "logbook.db"
mains = "50 Hz"
max_level = "2 Vpp"                 # the source is never set higher than this

[source]
driver = "source_generic"           # `benchlog driver list`, or the path of a driver file
address = "TCPIP::127.0.0.1::{source}::SOCKET"
impedance = "50 ohm"
load = "high impedance"             # what its display counts with; the board is no 50 ohm load

[input_meter]                       # reads the level at the board's input
driver = "meter_generic"
address = "TCPIP::127.0.0.1::{input_meter}::SOCKET"

[output_meter]                      # reads the level at the board's output
driver = "meter_generic"
address = "TCPIP::127.0.0.1::{output_meter}::SOCKET"
"""
PRACTICE_PORTS = (5025, 5026, 5027)


def bench_text(ports: tuple[int, int, int] = PRACTICE_PORTS) -> str:
    """Return a bench file for the practice bench on these ports: source, output, input meter."""
    source, output_meter, input_meter = ports
    return EXAMPLE_BENCH.format(source=source, output_meter=output_meter, input_meter=input_meter)


def make_folder(folder: Path, bench: str) -> None:
    """Write the files of a bench folder.

    Raises:
        BenchlogError: One of them is there already, or the folder cannot be written.
    """
    from benchlog.design.example import EXAMPLE_DESIGN
    from benchlog.logbook.store import Logbook

    try:
        folder.mkdir(parents=True, exist_ok=True)
        for name, text in ((BENCH, bench), (DESIGN, EXAMPLE_DESIGN)):
            with (folder / name).open("x", encoding="utf-8") as file:
                file.write(text)
    except FileExistsError as error:
        raise BenchlogError(
            "the bench folder is there already; nothing was changed",
            where=str(error.filename or folder),
            expected="a folder without bench.toml and design.toml",
            hint="choose another folder, or use the one that is there",
        ) from error
    except OSError as error:
        raise BenchlogError(
            f"the bench folder cannot be written: {error.strerror}", where=str(folder)
        ) from error
    with Logbook(folder / LOGBOOK, create=True):
        pass


@click.command(short_help="Make a bench folder: bench file, a design to edit, an empty logbook.")
@click.argument("directory", metavar="DIR", type=click.Path(path_type=Path))
def command(directory: Path) -> None:
    """Make a bench folder: bench file, a design to edit, an empty logbook."""
    make_folder(directory, bench_text())
    click.echo(f"made {directory}{'' if str(directory).endswith('/') else '/'}")
    click.echo(f"  {BENCH:<12} the instruments; set up for the practice bench")
    click.echo(f"  {DESIGN:<12} an invented design; edit it to yours")
    click.echo(f"  {LOGBOOK:<12} the logbook, empty")
    click.echo("next: start `benchlog bench practice` in another terminal, then here")
    click.echo(f"  benchlog -C {directory} sweep 0001 0002")
