"""A real process that sweeps, to be killed by tests.

Each line on standard input names a sweep; a child process is made for it, so that the price of
starting Python is paid once.  Lines on standard output: ``pid N``, ``kept POSITION`` once a point
is durable, ``end STATE EXIT_CODE``, and ``gone STATUS`` when the child has ended.
"""

import os
import sys
from pathlib import Path

from benchlog.bench.runner import run_sweep
from benchlog.bench.setup import open_bench, read_bench
from benchlog.bench.stop import stop_on_signals
from benchlog.logbook.store import Logbook
from benchlog.records import Point
from benchlog.sweep.schedule import log_spaced, spaced_schedule
from tests.fakes.sample_sweep import sample_start

# 20 Hz first: a settling that a test can catch the process in.
SCHEDULE = spaced_schedule([*log_spaced(1e4, 1e6, 10), 20.0], 0.007)


def say(*words: object) -> None:
    """Write a line that is on its way when this returns."""
    os.write(1, (" ".join(map(str, words)) + "\n").encode())


def sweep(bench_file: Path, uuid: str) -> None:
    """Sweep as the command line does, and leave."""
    start = sample_start(uuid=uuid)
    with (
        stop_on_signals() as stop,
        Logbook(bench_file.parent / "logbook.db") as logbook,
        open_bench(read_bench(bench_file), stop=stop) as bench,
    ):
        say("pid", os.getpid())
        logbook.begin_sweep(start)

        def keep(point: Point) -> None:
            logbook.add_point(uuid, point)
            say("kept", point.position)

        result = run_sweep(bench, SCHEDULE, keep=keep, stop=stop)
        logbook.end_sweep(uuid, result.state, result.why)
        say("end", result.state, stop.exit_code)


def main() -> None:
    """Make a child for each line."""
    bench_file = Path(sys.argv[1])
    for line in sys.stdin:
        child = os.fork()
        if child == 0:
            try:
                sweep(bench_file, line.strip())
            finally:
                os._exit(0)
        _, status = os.waitpid(child, 0)
        say("gone", status)


if __name__ == "__main__":
    main()
