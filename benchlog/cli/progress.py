"""Showing where a sweep stands, on stderr, without holding it up."""

import sys
import time
from types import TracebackType
from typing import TYPE_CHECKING, Any, Self

import click

from benchlog.notation import decibels, si

if TYPE_CHECKING:
    from benchlog.bench.perform import Progress

_LINES = 4


class SweepProgress:
    """One line that follows the sweep on a terminal; a few lines where there is none.

    The time left comes from the time model of settling and readings, not from counting points:
    the low frequencies take most of it.
    """

    def __init__(self, serial: str) -> None:
        self._serial = serial
        self._live: Any = None
        self._task: Any = None
        self._said = 0

    def __enter__(self) -> Self:
        """Start the live line where stderr is a terminal."""
        if sys.stderr.isatty():
            from rich.console import Console
            from rich.progress import BarColumn, Progress, TextColumn

            self._live = Progress(
                TextColumn(f"sweep {self._serial}", markup=False),
                BarColumn(),
                TextColumn("{task.description}", markup=False),
                console=Console(stderr=True),
                transient=True,
            )
            self._live.start()
            self._task = self._live.add_task("starting", total=None)
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        """Take the live line away."""
        if self._live is not None:
            self._live.stop()

    def __call__(self, progress: "Progress") -> None:
        """Show the state of the sweep."""
        if progress.trouble is not None:
            self._say(f"trouble at {si(progress.frequency_hz, 'Hz')}: {progress.trouble}")
        text = f"{progress.kept}/{progress.count}  {_reading(progress)}  {_left(progress)}"
        if self._live is not None:
            self._live.update(
                self._task, total=progress.count, completed=progress.kept, description=text
            )
            return
        part = progress.kept * _LINES // progress.count
        if progress.point is not None and part > self._said:
            self._said = part
            self._say(text)

    def _say(self, text: str) -> None:
        if self._live is not None:
            self._live.console.print(f"sweep {self._serial}: {text}", markup=False)
        else:
            click.echo(f"sweep {self._serial}: {text}", err=True)


def _reading(progress: "Progress") -> str:
    at = si(progress.frequency_hz, "Hz")
    if progress.point is None or not progress.point.gain:
        return at
    return f"{at}  {decibels(progress.point.gain):.2f} dB"


def _left(progress: "Progress") -> str:
    seconds = progress.seconds_left
    if seconds >= 60:
        return f"about {time.strftime('%M:%S', time.gmtime(seconds))} left"
    return f"about {seconds:.0f} s left"


class ReadProgress:
    """A line that tells how much of a large file was read, where stderr is a terminal."""

    def __init__(self) -> None:
        self._shown = -1

    def __call__(self, part: float) -> None:
        """Show the part, 0 to 1; each whole per cent once."""
        percent = int(100 * part)
        if percent == self._shown or not sys.stderr.isatty():
            return
        self._shown = percent
        end = "\n" if percent == 100 else ""
        click.echo(f"\rreading {percent:3d} %{end}", nl=False, err=True)
