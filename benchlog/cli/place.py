"""Finding the files of a bench folder."""

import tomllib
from pathlib import Path
from typing import TYPE_CHECKING

import click

from benchlog.cli.params import folder_of
from benchlog.errors import LogbookError

if TYPE_CHECKING:
    from benchlog.bench.setup import BenchSetup
    from benchlog.design.model import Design
    from benchlog.logbook.store import Logbook

BENCH, DESIGN, LOGBOOK = "bench.toml", "design.toml", "logbook.db"


def read_folder_design(context: click.Context, path: str | None) -> "Design":
    """Read the design that was named, or the bench folder's own."""
    from benchlog.design.read import read_design

    return read_design(path if path is not None else folder_of(context) / DESIGN)


def read_folder_bench(context: click.Context, path: str | None = None) -> "BenchSetup":
    """Read the bench file that was named, or the bench folder's own."""
    from benchlog.bench.setup import read_bench

    return read_bench(path if path is not None else folder_of(context) / BENCH)


def logbook_path(context: click.Context, path: str | None) -> Path:
    """Return where the logbook is: as named, as the bench file says, or in the bench folder."""
    if path is not None:
        return Path(path)
    folder = folder_of(context)
    try:
        named = tomllib.loads((folder / BENCH).read_text(encoding="utf-8")).get("logbook")
    except (OSError, ValueError):
        # Asking the past must work without a bench; whoever measures reads the file in earnest.
        named = None
    return folder / (named if isinstance(named, str) else LOGBOOK)


def open_existing(context: click.Context, path: str | None, *, read_only: bool) -> "Logbook":
    """Open a logbook that must be there already."""
    from benchlog.logbook.store import Logbook

    where = logbook_path(context, path)
    if not where.exists():
        raise LogbookError(
            "there is no logbook here",
            where=str(where),
            expected="a bench folder with a logbook",
            hint="name the folder with -C DIR or the file with --logbook;"
            " `benchlog new DIR` makes one",
        )
    return Logbook(where, read_only=read_only)
